"""Place by place in words: what sees a break, what it harms, how high volts can go, what relays cover together."""

import math
from dataclasses import replace

from relaycfg.model.break_results import Share
from relaycfg.model.place_results import HighestVoltage, PlaceAsymmetry, Together
from relaycfg.text import breaks_text, check_text, derive_text

HIGHEST = HighestVoltage(
    "Workshop", 412.23, 412.26, "L1", "branch and bound", 9, 41, ("Kiln", "Oven"), "Workshop", 411.9, 405.5
)


def flat(text):
    return " ".join(text.split())


def test_each_element_has_its_share_its_time_and_the_least_asymmetry_it_sees(study):
    study = replace(study, place_asymmetry=(PlaceAsymmetry("MB", 5000.0, {"59": 1.88}),))
    for words in (derive_text(study), check_text(study)):
        assert "MB 59 61.5 % (1.0-99.0) 0.20 s 1.88:1:1" in flat(words)


def test_an_asymmetry_that_is_never_seen_says_so(study):
    study = replace(study, place_asymmetry=(PlaceAsymmetry("MB", 5000.0, {"59": None}),))
    assert "MB 59 61.5 % (1.0-99.0) 0.20 s never" in flat(derive_text(study))


def test_boards_harmed_and_healthy_are_named_place_by_place_and_like_places_share_a_line(study):
    assert "MB, Workshop: harm at MB, Workshop" in flat(derive_text(study))
    first, second = study.breaks.summaries
    apart = replace(second, boards_harmed=("Workshop",), boards_healthy=("MB",))
    study = replace(study, breaks=replace(study.breaks, summaries=(first, apart)))
    assert "Workshop: harm at Workshop; MB stays healthy" in flat(derive_text(study))


def test_relays_together_are_told_with_the_settings_they_act_at(study):
    part, whole = Share(50, 100, 0.4, 0.6), Share(90, 100, 0.83, 0.94)
    second = replace(study.site.relay, name="R2", measures_at="Workshop")
    study = replace(
        study,
        site=replace(study.site, relays=(study.site.relay, second)),
        together=(
            Together("MB", whole, {"R1": part}, part),
            Together("Workshop", whole, {"R1": part, "R2": whole}, whole),
        ),
    )
    words = flat(check_text(study))
    assert "Break at R1 R2 Together MB 50.0 % (40.0-60.0) not seen 50.0 % (40.0-60.0)" in words
    assert "Workshop 50.0 % (40.0-60.0) 90.0 % (83.0-94.0) 90.0 % (83.0-94.0)" in words
    assert "R1 at its given settings, R2 at derived ones; volts as before any switch opens." in words


def test_highest_volts_stand_with_what_is_proved_and_how_to_show_them_again(site, break_study):
    words = flat(breaks_text(site, replace(break_study, highest=(HIGHEST,))))
    assert "Workshop 412.2 (405.5)." in words
    assert '--at "Workshop" --state worst' in words


def test_a_gap_of_the_bound_is_printed_and_volts_beyond_low_voltage_are_not_pretended(site, break_study):
    gap = replace(HIGHEST, bound_v=431.0)
    wild = replace(HIGHEST, at="MB", stiff_v=281485.8, bound_v=math.inf, modelled_v=None)
    words = flat(breaks_text(site, replace(break_study, highest=(gap, wild))))
    assert "Workshop 412.2 to 431.0 (405.5); MB above 1000, loads can cancel each other (-)." in words
    assert "281485" not in words


def test_the_worst_state_lists_the_loads_that_are_on(site, break_study):
    rows = tuple(replace(row, state="worst") for row in break_study.rows[:1])
    worst = replace(break_study, rows=rows, summaries=(), highest=(HIGHEST,))
    assert "* Workshop, on: what is always on; Kiln; Oven" in breaks_text(site, worst)
