"""Readings of two lines: the neutral placed by hand-worked triangles, patterns told apart, other systems named."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from relaycfg.model.geometry import geometry_of
from relaycfg.study import read_board
from relaycfg.study.two_line_reading import place

LOST = "lost or loose neutral, source side of this board"


def first(l_n, l_l=None, system="1ph-3w", nominal_v=120.0):
    return read_board(l_n, None if l_l is None else (l_l,), system, nominal_v)


@given(
    st.sampled_from(["1ph-3w", "2ph-3w"]),
    st.floats(80, 300),
    st.floats(-0.95, 0.95),
    st.floats(0, 0.45),
)
def test_three_sides_place_the_neutral(system, source_v, along, aside):
    """Source: own arithmetic, the other way round: a point of the half plane of the star, its three distances."""
    geometry = geometry_of(system)
    corners = source_v * geometry.phasors
    across, middle = corners[0] - corners[1], corners.mean()
    inward = -middle / abs(middle) if abs(middle) > 1e-6 else 1j * across / abs(across)
    neutral = middle + along * across / 2 + aside * source_v * inward
    volts = np.abs(corners - neutral)
    found = place((volts[0], volts[1]), abs(across), geometry)
    assert found.source_v == pytest.approx(source_v)
    assert abs(found.neutral_v) == pytest.approx(abs(neutral), abs=1e-4 * source_v)
    assert found.misfit_v == pytest.approx(0, abs=1e-6 * source_v)


@pytest.mark.parametrize(
    ("system", "l_n", "l_l", "shift_v", "shares"),
    # Own arithmetic, reference cases w9 and two-of-three-208: 100 and 200 W, 1 and 2 kW in series.
    [
        ("1ph-3w", (160.0, 80.0), 240.0, 40.0, (1 / 3, 2 / 3)),
        ("1ph-3w", (160.0, 80.0), None, 40.0, (1 / 3, 2 / 3)),
        ("2ph-3w", (138.56, 69.28), 207.85, 69.28, (1 / 3, 2 / 3)),
        ("2ph-3w", (103.92, 103.92), 207.85, 60.0, (1 / 2, 1 / 2)),
    ],
)
def test_legs_in_series_are_a_lost_neutral_with_the_loads_that_divide_so(system, l_n, l_l, shift_v, shares):
    reading = first(l_n, l_l, system)
    assert reading.causes[0].name == LOST
    assert reading.causes[0].confidence == ("likely" if l_l is None else "very likely")
    assert reading.v0_v == pytest.approx(shift_v, abs=0.02 * shift_v)
    assert reading.load_shares == pytest.approx(shares)
    assert reading.v0_low_v < shift_v < reading.v0_high_v


def test_without_the_volts_between_a_star_leaves_the_neutral_open_and_says_which_causes_fit():
    """Source: own arithmetic: 104 + 104 = 208 V in series; 108 and 112 V fit a low supply and a lost neutral alike."""
    lost = first((104.0, 104.0), system="2ph-3w")
    assert (lost.v0_v, lost.load_shares) == (None, None)
    assert (lost.causes[0].name, lost.causes[0].confidence) == (LOST, "likely")
    either = first((108.0, 112.0), system="2ph-3w")
    assert [c.confidence for c in either.causes] == ["possible", "possible"]
    assert LOST in {c.name for c in either.causes}
    assert first((117.0, 119.0), system="2ph-3w").causes[0].confidence == "no finding"


def test_sound_volts_of_the_other_two_line_system_are_named_as_such():
    """120 / 120 V with 208 V between are no split phase with a shifted neutral, nor 240 V a star's."""
    star = first((120.0, 120.0), 208.0, "1ph-3w")
    legs = first((120.0, 120.0), 240.0, "2ph-3w")
    assert star.causes[0].name == "two lines of a star, not split phase"
    assert legs.causes[0].name == "split phase, not two lines of a star"
    assert (star.v0_v, legs.v0_v) == (None, None)


@pytest.mark.parametrize(
    ("l_n", "l_l", "name"),
    [
        ((2.0, 120.0), 240.0, "sensing fuse or test lead of L1 open"),
        ((2.0, 120.0), 121.0, "L1 lost on the supply side"),
        ((120.0, 2.0), 121.0, "L2 lost on the supply side"),
        ((0.0, 0.0), 0.0, "no supply, or a tester that does not work"),
        ((0.0, 1.0), None, "no supply, or a tester that does not work"),
        ((120.0, 121.0), 241.0, "healthy, or balanced"),
        ((117.0, 126.0), 243.0, "healthy, with the usual drop in the neutral or a displacement from the network"),
        ((134.0, 135.0), 269.0, "supply high as a whole"),
        ((160.0, 160.0), None, "readings that do not belong together"),
        ((60.0, 90.0), 240.0, "readings that do not belong together"),
    ],
)
def test_other_patterns_of_split_phase_are_not_called_a_lost_neutral(l_n, l_l, name):
    reading = first(l_n, l_l)
    assert reading.causes[0].name == name
    assert not any(c.name == LOST and c.confidence.endswith("likely") for c in reading.causes)


def test_a_whole_leg_without_load_is_a_lost_neutral_and_no_lost_line():
    """Source: own arithmetic: 4 and 236 V add up to 240 V, which a dead line could not."""
    for l_l in (None, 240.0):
        assert first((4.0, 236.0), l_l).causes[0].name == LOST


def test_the_band_of_split_phase_spans_what_a_supply_within_ten_percent_allows():
    """Source: own arithmetic: mean of the squares 16 000; a source of 108 V leaves sqrt(16000 - 108^2) = 65.8 V.

    Readings 1 % high add to that: sqrt(1.0201 x 16000 - 106.92^2) = 70.0 V at most. At the least half the difference
    of 158.4 and 80.8 V, 38.8 V, and half a volt for a triangle that does not close.
    """
    reading = first((160.0, 80.0))
    assert 65.8 < reading.v0_high_v < 70.1
    assert 38.2 < reading.v0_low_v < 38.9


def test_three_readings_go_on_being_those_of_three_lines():
    reading = read_board((172.5, 263.5, 263.5), (398.4, 398.4, 398.4), "3ph-4w", 230.0)
    assert reading.v0_v == pytest.approx(57.5, abs=0.1)
