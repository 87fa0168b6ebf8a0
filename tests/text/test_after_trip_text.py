"""A few lines on the relay's own wires, closing again and what is no lost neutral."""

from dataclasses import replace

import pytest

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


def test_nothing_is_printed_of_what_was_not_studied(own):
    assert after_trip(replace(own[0], own_life=None, reconnection=None, companions=None)) == []
