"""The reference machine against courses worked by hand and against a scalar machine that steps tick by tick."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from relaycfg.relay import run

TICK_S = 0.125


def one(levels, lengths, **options):
    """Trip instant of one event; ``levels`` [segments] or [segments][channels]."""
    severity = np.array(levels, float).reshape(1, len(lengths), -1)
    return float(run(severity, np.array([lengths], float), **options)[0])


def test_a_standing_excursion_trips_after_its_delay():
    assert one([230, 270], [1.0, math.inf], pickup=265, dropout=255, delay_s=0.6) == pytest.approx(1.6)


def test_delay_zero_trips_at_pickup():
    assert one([230, 270], [1.0, 0.01], pickup=265, dropout=255, delay_s=0) == 1.0


def test_pickup_is_reached_at_equality_and_dropout_is_not():
    assert one([265, 255], [0.5, 0.5], pickup=265, dropout=255, delay_s=1.0) == pytest.approx(1.0)
    assert one([265, 254.9], [0.5, 0.5], pickup=265, dropout=255, delay_s=1.0) == math.inf


def test_a_delay_reached_exactly_at_the_end_trips_despite_decimal_seconds():
    assert 0.7 + 0.1 < 0.8
    assert one([270, 271, 0], [0.7, 0.1, 1], pickup=265, dropout=255, delay_s=0.8) == pytest.approx(0.8)


def test_hysteresis_keeps_counting_between_dropout_and_pickup():
    course = [230, 270, 260, 230]
    assert one(course, [1, 0.2, 1.0, 1], pickup=265, dropout=255, delay_s=0.7) == pytest.approx(1.7)
    assert one(course, [1, 0.2, 1.0, 1], pickup=265, dropout=261, delay_s=0.7) == math.inf


def test_an_excursion_that_ends_inside_the_dropout_band_never_resets():
    assert one([270, 256], [0.02, math.inf], pickup=265, dropout=255, delay_s=30) == pytest.approx(30)


def test_undervoltage_is_the_same_machine_on_negative_volts():
    dip = [-230, -160, -190, -230]
    assert one(dip, [1, 0.3, 5, 1], pickup=-177, dropout=-1.05 * 177, delay_s=1.5) == math.inf
    assert one(dip, [1, 0.3, 5, 1], pickup=-177, dropout=-1.10 * 177, delay_s=1.5) == pytest.approx(2.5)


def test_a_shared_timer_runs_on_where_the_excursion_changes_phase():
    walk = [[270, 0, 0], [0, 270, 0], [0, 0, 270]]
    options = {"pickup": 265, "dropout": 255, "delay_s": 0.5}
    assert one(walk, [0.2] * 3, timers="per phase", **options) == math.inf
    assert one(walk, [0.2] * 3, timers="shared", **options) == pytest.approx(0.5)


def test_all_phases_never_sees_a_shifted_neutral():
    shifted = [[172, 263, 263]]
    options = {"pickup": 255, "dropout": 250, "delay_s": 0.5}
    assert one(shifted, [math.inf], phases="all", **options) == math.inf
    assert one(shifted, [math.inf], phases="any", **options) == 0.5


def test_a_held_timer_adds_up_a_train_of_excursions():
    train = [270, 0] * 4
    lengths = [0.2, 0.3] * 4
    options = {"pickup": 265, "dropout": 255, "delay_s": 0.7, "reset": "held"}
    assert one(train, lengths, hold_s=0.3, **options) == pytest.approx(1.6)
    assert one(train, lengths, hold_s=0.29, **options) == math.inf


def test_a_gap_over_several_segments_is_one_gap():
    options = {"pickup": 265, "dropout": 255, "delay_s": 0.3, "reset": "held", "hold_s": 0.5}
    assert one([270, 0, 10, 270], [0.2, 0.3, 0.3, 0.2], **options) == math.inf
    assert one([270, 0, 10, 270], [0.2, 0.2, 0.3, 0.2], **options) == pytest.approx(0.8)


def test_a_measuring_window_lengthens_every_excursion():
    options = {"pickup": 265, "dropout": 255, "delay_s": 0.25}
    assert one([270, 0], [0.24, 1], lag_s=0.0, **options) == math.inf
    assert one([270, 0], [0.24, 1], lag_s=0.02, **options) == pytest.approx(0.25)
    train = {"reset": "held", "hold_s": 1.0, "lag_s": 0.02}
    assert one([270, 0] * 2, [0.1, 0.5] * 2, **options, **train) == math.inf
    assert one([270, 0] * 3, [0.1, 0.5] * 3, **options, **train) == pytest.approx(1.21)


def test_padding_without_duration_changes_nothing():
    options = {"pickup": 265, "dropout": 255, "delay_s": 0.3}
    assert one([270, 0, 270], [0.2, 0.0, 0.2], **options) == pytest.approx(0.3)
    assert one([0, 300, 0], [0.2, 0.0, 0.2], pickup=265, dropout=255, delay_s=0) == math.inf


def test_each_event_may_have_its_own_setting():
    severity = np.full((3, 1, 1), 270.0)
    trips = run(severity, np.full((3, 1), math.inf), np.array([260, 269, 280]), 250.0, np.array([1.0, 2.0, 3.0]))
    np.testing.assert_allclose(trips, [1.0, 2.0, math.inf])


def stepped(samples, pickup, dropout, delay, hold, timers, phases):
    """Ticks until trip of one event, by plain loops over samples [ticks][channels]; None where it holds."""
    channels = len(samples[0])
    on = [False] * channels
    counters = 1 if timers == "shared" or phases == "all" else channels
    count = [0] * counters
    off = [hold + 1] * counters
    for tick, sample in enumerate(samples):
        for c in range(channels):
            on[c] = sample[c] >= dropout if on[c] else sample[c] >= pickup
        flags = [all(on)] if phases == "all" else [any(on)] if timers == "shared" else on
        for c in range(counters):
            if flags[c]:
                off[c] = 0
                if delay == 0:
                    return tick
                count[c] += 1
            else:
                off[c] += 1
                if off[c] > hold:
                    count[c] = 0
        if delay > 0 and max(count) >= delay:
            return tick + 1
    return None


courses = st.lists(
    st.tuples(st.integers(0, 4), st.lists(st.integers(0, 9), min_size=3, max_size=3)), min_size=1, max_size=12
)
options = {
    "pickup": st.integers(2, 8),
    "gap": st.integers(0, 4),
    "delay": st.integers(0, 8),
    "hold": st.integers(0, 3),
    "timers": st.sampled_from(["per phase", "shared"]),
    "phases": st.sampled_from(["any", "all"]),
}


@settings(max_examples=400, deadline=None)
@given(events=st.lists(courses, min_size=1, max_size=3), **options)
def test_the_vectorised_machine_equals_the_stepped_one(events, pickup, gap, delay, hold, timers, phases):
    longest = max(map(len, events))
    severity = np.zeros((len(events), longest, 3))
    lengths = np.zeros((len(events), longest))
    expected = []
    for e, course in enumerate(events):
        samples = [[0, 0, 0]]
        for s, (ticks, levels) in enumerate(course):
            severity[e, s], lengths[e, s] = levels, ticks * TICK_S
            samples += [levels] * ticks
        trip = stepped(samples, pickup, pickup - gap, delay, hold, timers, phases)
        expected.append(math.inf if trip is None else (trip - 1) * TICK_S)
    reset = "held" if hold else "instantaneous"
    got = run(severity, lengths, pickup, pickup - gap, delay * TICK_S, reset, hold * TICK_S, timers, phases)
    np.testing.assert_allclose(got, expected)


@settings(max_examples=100, deadline=None)
@given(course=courses, later=st.integers(1, 4), **options)
def test_a_longer_delay_never_trips_earlier(course, later, pickup, gap, delay, hold, timers, phases):
    severity = np.array([[levels for _, levels in course]], float)
    lengths = np.array([[ticks * TICK_S for ticks, _ in course]])
    figures = ["held", hold * TICK_S, timers, phases]
    early, late = (run(severity, lengths, pickup, pickup - gap, d * TICK_S, *figures) for d in (delay, delay + later))
    assert early <= late
