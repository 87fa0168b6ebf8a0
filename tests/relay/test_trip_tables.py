"""Trip tables equal the plain machine in every entry: the machine is stepped for each setting on its own."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from relaycfg.relay import run, trip_table

EIGHTHS = st.integers(0, 12).map(lambda n: n / 8)
"""Seconds that binary fractions hold exactly, so that equal means equal to the last bit."""


@st.composite
def events(draw: st.DrawFn) -> tuple[np.ndarray, np.ndarray]:
    """A few events of unequal segments; some never end, some hold segments of no duration (padding)."""
    shape = draw(st.integers(1, 4)), draw(st.integers(1, 12)), draw(st.integers(1, 3))
    rng = np.random.default_rng(draw(st.integers(0, 2**32)))
    severity = rng.integers(0, 9, shape).astype(float)
    duration_s = rng.integers(0 if draw(st.booleans()) else 1, 6, shape[:2]) / 8
    if draw(st.booleans()):
        duration_s[:, -1] = np.inf
    return severity, duration_s


def stepped(severity, duration_s, pickup, dropout, delay_s, **options) -> np.ndarray:
    """Instants [pairs, delays, events] from the plain machine, one setting after the other."""
    return np.array(
        [[run(severity, duration_s, p, d, t, **options) for t in delay_s] for p, d in zip(pickup, dropout, strict=True)]
    )


@settings(max_examples=300, deadline=None)
@given(
    events(),
    st.lists(st.tuples(st.integers(1, 10), st.integers(0, 4)), min_size=1, max_size=5),
    st.lists(EIGHTHS, min_size=1, max_size=5, unique=True).map(sorted),
    st.sampled_from(["instantaneous", "held"]),
    EIGHTHS,
    st.sampled_from(["per phase", "shared"]),
    st.sampled_from(["any", "all"]),
    st.sampled_from([0.0, 0.125, 0.25, 0.5]),
)
def test_every_entry_equals_the_plain_machine(drawn, pairs, delays, reset, hold_s, timers, phases, lag_s):
    severity, duration_s = drawn
    pickup = np.array([float(p) for p, _ in pairs])
    dropout = pickup - np.array([float(h) for _, h in pairs])
    options = {"reset": reset, "hold_s": hold_s, "timers": timers, "phases": phases, "lag_s": lag_s}
    table = trip_table(severity, duration_s, pickup, dropout, **options)
    found = table.instants(np.array(delays))
    assert found.shape == (len(pickup), len(delays), len(severity))
    assert (found == stepped(severity, duration_s, pickup, dropout, delays, **options)).all()


@pytest.mark.parametrize("timers", ["per phase", "shared"])
@pytest.mark.parametrize("reset", ["instantaneous", "held"])
def test_sampled_events_of_one_clock_equal_the_plain_machine(timers, reset):
    # Swells and dips with noise in every sample, 20 ms apart: decimal seconds, so instants agree to a nanosecond.
    rng = np.random.default_rng(7)
    volts = 230 + rng.normal(0, 2, (12, 150, 3))
    for event, begin in enumerate(rng.integers(0, 90, 12)):
        volts[event, begin : begin + rng.integers(5, 60), : rng.integers(1, 4)] += rng.uniform(10, 60)
    pickup, delay_s = np.linspace(236, 290, 13), np.array([0.0, 0.02, 0.1, 0.3, 0.5, 1.1])
    options = {"reset": reset, "hold_s": 0.06, "timers": timers, "lag_s": 0.03}
    table = trip_table(volts, np.full((1, 150), 0.02), pickup, 0.98 * pickup, **options)
    slow = stepped(volts, np.full((12, 150), 0.02), pickup, 0.98 * pickup, delay_s, **options)
    found = table.instants(delay_s)
    trips = np.isfinite(slow)
    assert 0 < trips.sum() < trips.size
    assert (np.isfinite(found) == trips).all()
    assert np.abs(found[trips] - slow[trips]).max() < 1e-9


@settings(max_examples=100, deadline=None)
@given(events(), st.integers(1, 9), st.integers(0, 3), st.booleans(), EIGHTHS)
def test_the_longest_count_parts_the_delays_that_trip_from_those_that_hold(drawn, pickup, hysteresis, shared, hold_s):
    severity, duration_s = drawn
    level, release = np.array([float(pickup)]), np.array([float(pickup - hysteresis)])
    options = {"reset": "held", "hold_s": hold_s, "timers": "shared" if shared else "per phase"}
    longest = trip_table(severity, duration_s, level, release, **options).longest_s[0]
    for event, count in enumerate(longest):
        one = severity[event : event + 1], duration_s[event : event + 1]
        assert np.isinf(run(*one, level[0], release[0], min(count, 1e6) + 1 / 16, **options)[0]) == np.isfinite(count)
        if 0 < count < np.inf:
            assert np.isfinite(run(*one, level[0], release[0], count, **options)[0])


def test_a_drop_out_below_the_pickup_joins_what_the_pickup_alone_parts():
    # Hand-worked: 1 s above 265, 1 s at 260, 1 s above 265. From 265 down to 255 it is one count of 3 s; down to 262
    # it is two of 1 s. The longest run above the pickup alone would say 1 s both times.
    severity = np.array([270.0, 260.0, 270.0, 230.0])[None, :, None]
    longest = trip_table(severity, np.ones((1, 4)), np.array([265.0, 265.0]), np.array([255.0, 262.0])).longest_s
    assert longest[:, 0].tolist() == [3.0, 1.0]


def test_a_setting_of_two_stages_trips_at_the_least_entry():
    # Hand-worked: 270 V for 2 s, then 300 V: 265 V 3 s would trip at 3 s, 290 V 0.5 s at 2.5 s.
    severity, duration_s = np.array([270.0, 300.0])[None, :, None], np.array([[2.0, np.inf]])
    entries = trip_table(severity, duration_s, np.array([265.0, 290.0]), np.array([260.0, 285.0]))
    instants = entries.instants(np.array([0.5, 3.0]))[:, :, 0]
    assert instants.tolist() == [[0.5, 3.0], [2.5, 5.0]]
    assert min(instants[0, 1], instants[1, 0]) == 2.5


def test_where_nothing_picks_up_nothing_trips():
    table = trip_table(np.full((2, 3, 1), 230.0), np.ones((2, 3)), np.array([250.0]), np.array([245.0]))
    assert table.longest_s.tolist() == [[0.0, 0.0]]
    assert np.isinf(table.instants(np.array([0.0, 1.0]))).all()
