"""Meter readings whose meaning is known: moved neutral, lost line, open lead, supply, and what cannot be told."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from relaycfg.model.geometry import three_phase
from relaycfg.study import read_meter
from relaycfg.study.reading import locate

EVEN = (398.0, 398.0, 398.0)


def first(l_n, l_l=None, nominal_v=230.0):
    return read_meter(l_n, l_l, nominal_v).causes[0]


def star(conductances, u0_v=230.0):
    """Magnitudes of a resistive star without neutral behind a stiff source, by Millman."""
    phasors = u0_v * three_phase().phasors
    shift = phasors @ np.array(conductances) / sum(conductances)
    return tuple(np.abs(phasors - shift)), shift


@given(
    st.lists(st.floats(0.15, 1.0), min_size=3, max_size=3),
    st.floats(210.0, 253.0),
)
def test_magnitudes_alone_give_back_source_displacement_and_loads(conductances, u0_v):
    volts, shift = star(conductances, u0_v)
    found = locate(np.array(volts), None)
    assert found.source_v == pytest.approx(u0_v, rel=1e-6)
    assert abs(found.neutral_v - shift) < 1e-3
    reading = read_meter(volts, None, 230.0)
    if reading.load_shares is not None:
        np.testing.assert_allclose(reading.load_shares, np.array(conductances) / sum(conductances), atol=1e-4)


def test_loads_two_to_one_to_one_are_a_lost_neutral():
    reading = read_meter((172, 263, 263), None, 230.0)
    assert reading.v0_v == pytest.approx(57.5, abs=0.1)
    assert reading.source_v == pytest.approx(229.5, abs=0.1)
    assert reading.v0_low_v < 57.5 < reading.v0_high_v
    np.testing.assert_allclose(reading.load_shares, [0.5, 0.25, 0.25], atol=0.005)
    assert reading.causes[0].name.startswith("lost or loose neutral")
    assert reading.causes[0].confidence == "likely"


def test_even_volts_between_lines_make_it_surer_and_narrower():
    alone, with_lines = (read_meter((172, 263, 263), lines, 230.0) for lines in (None, EVEN))
    assert with_lines.causes[0].confidence == "very likely"
    assert with_lines.v0_high_v - with_lines.v0_low_v < 0.5 * (alone.v0_high_v - alone.v0_low_v)


def test_displacement_is_not_that_of_magnitudes_at_assumed_angles():
    # own arithmetic on volts printed in an article, which gives the shift as 64 V; assumed angles give 31.8 V
    assert read_meter((239, 287, 177), None, 230.0).v0_v == pytest.approx(64, abs=0.5)


@pytest.mark.parametrize("nominal_v", [120.0, 230.0, 277.0])
def test_the_nominal_volts_only_scale_the_reading(nominal_v):
    volts, shift = star((2, 1, 1), nominal_v)
    reading = read_meter(volts, None, nominal_v)
    assert reading.v0_v == pytest.approx(abs(shift))
    assert reading.causes[0].name.startswith("lost or loose neutral")


def test_a_lost_line_is_not_called_a_neutral():
    assert first((0, 230, 230), (230, 398, 230)).name == "L1 lost on the supply side"
    assert first((230, 0, 230), EVEN).name == "sensing fuse or test lead of L2 open"
    undecided = read_meter((230, 230, 3), None, 230.0)
    assert [c.name for c in undecided.causes[:2]] == [
        "L3 lost on the supply side",
        "sensing fuse or test lead of L3 open",
    ]
    assert undecided.v0_v is None


def test_a_line_at_nothing_with_the_others_at_line_to_line_volts_is_a_lost_neutral():
    reading = read_meter((0, 398, 396), EVEN, 230.0)
    assert reading.causes[0].name.startswith("lost or loose neutral")
    assert reading.v0_v == pytest.approx(230, abs=2)


def test_one_low_reading_without_a_high_one_may_be_a_weak_line():
    assert first((170, 230, 230)).name.startswith("one line weak")
    assert first((170, 230, 230), (347, 398, 347)).name.startswith("a line weak")


def test_what_a_public_supply_may_do_is_only_possible_until_the_lines_are_measured():
    reading = read_meter((207, 253, 253), None, 230.0)
    assert [c.confidence for c in reading.causes[:2]] == ["possible", "possible"]
    assert reading.causes[0].name.startswith("lost or loose neutral")
    assert reading.causes[1].name == "lines uneven in the supply, neutral sound"
    assert any("between lines, they decide" in step for step in reading.check_first)
    sure = read_meter((207, 253, 253), (410.0, 410.0, 410.0), 230.0)
    assert sure.causes[0].confidence == "very likely"
    assert not any("between lines" in step for step in sure.check_first)


@pytest.mark.parametrize("nominal_v", [120.0, 230.0])
def test_beyond_what_a_supply_may_do_it_is_likely(nominal_v):
    # displacement at angles a third of a turn apart: 18 V of 230 may be the supply, 24 V no longer
    for shift, confidence in ((18, "possible"), (24, "likely")):
        low = nominal_v * (1 - 2 * shift / 230)
        high = nominal_v * (1 + shift / 230)
        assert read_meter((low, high, high), None, nominal_v).causes[0].confidence == confidence


def test_a_healthy_reading_without_load_proves_nothing():
    reading = read_meter((230, 231, 229), None, 230.0)
    assert reading.causes[0].confidence == "no finding"
    assert "without load proves nothing" in reading.check_first[0]
    assert reading.load_shares is None


@pytest.mark.parametrize(("volts", "side"), [(260.0, "high"), (200.0, "low")])
def test_a_supply_off_as_a_whole_is_said_first(volts, side):
    assert first((volts, volts, volts)).name == f"supply {side} as a whole"


def test_a_pattern_no_even_source_can_give_is_refused():
    reading = read_meter((100, 400, 100), None, 230.0)
    assert reading.causes[0].name == "readings that do not belong together"
    assert reading.v0_v is None


def test_nothing_on_any_line_is_no_verdict_on_the_neutral():
    assert first((0, 0, 0)).name.startswith("no supply")
    assert first((0, 230, 0)).name.startswith("two lines lost")


@pytest.mark.parametrize("l_n", [(172, 263, 263), (0, 230, 230), (100, 400, 100), (210, 380, 390)])
def test_nobody_is_told_to_reset(l_n):
    assert any("Do not reset" in caution for caution in read_meter(l_n, None, 230.0).do_not)


def test_a_neutral_outside_the_triangle_has_no_resistive_loads():
    phasors = three_phase().phasors
    volts = tuple(np.abs(230 * phasors - 150 * -phasors[0]))
    assert read_meter(volts, (398.4, 398.4, 398.4), 230.0).load_shares is None
