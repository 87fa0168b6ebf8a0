"""A few lines on the relay's own wires, closing again and what is no lost neutral."""

from dataclasses import replace

import pytest

from relaycfg.model.break_results import Share
from relaycfg.study import check, derive
from relaycfg.text import check_text, derive_text
from relaycfg.text.after_trip import after_trip
from tests.cautions import bench
from tests.study import yard

MOST_LINES = 12


@pytest.fixture(scope="module")
def own(tmp_path_factory):
    """A derived study of the yard, and loads 2:1:1 checked with a coil on the floating system, closing by itself."""
    relay = yard.RELAY.replace('kind = "shunt", from = "auxiliary"', 'kind = "shunt", from = "L1-N"')
    site = bench.star(
        tmp_path_factory.mktemp("star"), relay=relay.replace("[19, 29] }\noutput", "[195, 253] }\noutput")
    )
    rest = '[reconnect]\nafter_any_trip = "automatic"\ndelay_s = 30\nattempts = 5\n'
    found = check(site, bench.settings(site, bench.stage("displacement", 1, 40.0, 0.5), rest=rest), 50, 1)
    return derive(yard.site(tmp_path_factory.mktemp("yard")), 100, 1), found


def test_it_takes_at_most_twelve_lines_and_stands_in_both_texts(own):
    derived, checked = own
    for study, text in ((derived, derive_text(derived)), (checked, check_text(checked))):
        lines = after_trip(study)
        assert 0 < len(lines) <= MOST_LINES
        assert all(len(line) <= 100 for line in lines)
        assert "\n".join(lines) in text


def test_the_coil_its_share_and_its_volts_are_named(own):
    text = " ".join(" ".join(after_trip(own[1])).split())
    # 172.5 V nominal and 146.6 to 189.8 V between the supply's limits, below 195 V in every state
    assert "Trip fails for supply or coil in 100.0 % (92.9-100.0) of harmful states" in text
    assert "trip coil (shunt) L1-N 147 to 190 V" in text


def test_an_automatic_setting_is_shown_with_its_wait_and_attempts(own):
    text = " ".join(" ".join(after_trip(own[1])).split())
    assert "Closing again: by itself as set (30 s, 5 attempts) it pumps 6 times an hour" in text
    assert "by hand after every trip" in " ".join(" ".join(after_trip(own[0])).split())


def test_a_feed_whose_range_is_not_stated_says_so(own):
    checked = own[1]
    feed = replace(checked.own_life.feeds[0], allowed=None)
    text = " ".join(after_trip(replace(checked, own_life=replace(checked.own_life, feeds=(feed,)))))
    assert "(range not stated)" in text


def test_the_pattern_misread_most_often_stands_with_both_ways_of_reading(own):
    found = own[0].companions
    one = replace(found.confusion[0], truth="dip", kind="other")
    known = replace(one, with_lines=True, named_neutral=Share(3, 50, 0.0, 1.0))
    dip = (known, replace(one, with_lines=False, named_neutral=Share(40, 50, 0.0, 1.0)))
    rest = tuple(c for c in found.confusion if c.kind != "other")
    text = " ".join(after_trip(replace(own[0], companions=replace(found, confusion=(*rest, *dip)))))
    said = '"dip" is misread as one in 80.0 % where volts between lines are not measured, 6.0 % where they are'
    assert said in " ".join(text.split())


def test_the_courses_left_connected_are_those_of_the_worst_place(own):
    again = own[0].reconnection
    fast = replace(again.pumping[0], at="Yard", alike_per_hour=99.0, ends={"left connected unseen": 3})
    worst = replace(fast, at="Shed", alike_per_hour=1.0, ends={"left connected unseen": 150})
    text = " ".join(after_trip(replace(own[0], reconnection=replace(again, pumping=(fast, worst)))))
    assert "up to 150 of 200 courses (Shed) end connected, unseen" in " ".join(text.split())


def test_nothing_is_printed_of_what_was_not_studied(own):
    assert after_trip(replace(own[0], own_life=None, reconnection=None, companions=None)) == []


def test_a_pattern_in_which_no_stage_counts_is_named_with_its_volts(own):
    # By hand: 172.5 V on L1 with the neutral lost, below the coil's 195 V; the yard's feeds are another's.
    text = " ".join(" ".join(after_trip(own[1])).split())
    unfed = [p for p in own[1].companions.patterns if p.unfed]
    assert f"In {len(unfed)} of {len(own[1].companions.patterns)} patterns no stage counts: neutral lost at" in text
    assert "coil unfed (17" in text
    assert "no stage counts" not in " ".join(after_trip(own[0]))
