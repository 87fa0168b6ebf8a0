"""A measuring window lengthens every run of an excursion: trips and gaps by hand, and against the longer run itself."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from relaycfg.relay import run

TICK_S = 0.125
HIGH, LOW = 9.0, 0.0


def one(levels, lengths, **options):
    """Trip instant of one event of one channel picked up at 5."""
    severity = np.array(levels, float).reshape(1, len(lengths), -1)
    return float(run(severity, np.array([lengths], float), 5.0, 5.0, **options)[0])


def test_the_gap_between_excursions_is_shorter_by_the_lag():
    """Source: own arithmetic: runs of 0.12 s, of which 0.02 s lag; a gap of 0.31 s is one of 0.29 s."""
    options = {"delay_s": 0.2, "reset": "held", "hold_s": 0.3, "lag_s": 0.02}
    assert one([HIGH, LOW, HIGH, LOW], [0.1, 0.31, 0.1, 1], **options) == pytest.approx(0.41 + 0.08)
    assert one([HIGH, LOW, HIGH, LOW], [0.1, 0.33, 0.1, 1], **options) == math.inf


def test_a_lag_runs_on_over_segments_and_padding_and_only_once():
    """Source: own arithmetic: 0.1 s and 0.02 s of lag."""
    for pieces in ([0.005, 0.0, 0.01, 1.0], [0.02, 0.3, 0.0, 1.0], [0.0, 0.015, 0.02, 1.0]):
        course = ([HIGH, LOW, LOW, LOW, LOW], [0.1, *pieces])
        assert one(*course, delay_s=0.119, lag_s=0.02) == pytest.approx(0.119)
        assert one(*course, delay_s=0.121, lag_s=0.02) == math.inf


def ticks(course):
    """Levels tick by tick."""
    return [level for level, count in course for _ in range(count)]


on_off = st.lists(st.tuples(st.sampled_from([HIGH, LOW]), st.integers(0, 4)), min_size=1, max_size=10)


@settings(max_examples=150, deadline=None)
@given(on_off, st.integers(1, 8), st.integers(0, 3), st.integers(0, 3))
def test_a_lagging_machine_is_a_plain_one_on_the_longer_excursions(course, delay, hold, lag):
    """Source: definition: a tick counts where one of the ``lag`` ticks before it, or itself, was picked up."""
    levels = [*ticks(course), *[LOW] * (lag + 1)]
    longer = [max(levels[max(0, k - lag) : k + 1]) for k in range(len(levels))]
    options = {"delay_s": delay * TICK_S, "reset": "held", "hold_s": hold * TICK_S}
    lagging = one(
        [level for level, _ in course] + [LOW], [n * TICK_S for _, n in course] + [9], lag_s=lag * TICK_S, **options
    )
    plain = one([*longer, LOW], [TICK_S] * len(longer) + [9], **options)
    assert lagging == pytest.approx(plain)
