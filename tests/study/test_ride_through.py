"""Ride-through R is the delay at which the step-by-step machine stops tripping, for every pickup."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from relaycfg.relay import run
from relaycfg.study.ride_through import NOTHING, STANDING, Runs, behind_name, ride_through, run_lengths


def runs(
    severity: np.ndarray, duration_s: np.ndarray, standing: float, shared: bool = False, window: float = 0.0
) -> Runs:
    names = tuple(f"course {k}" for k in range(len(severity)))
    numbers = tuple(range(len(severity)))
    return Runs(severity, duration_s, names, numbers, dict(enumerate(names)), standing, "standing", window, shared)


LEVELS = st.integers(min_value=200, max_value=300)


@st.composite
def courses(draw: st.DrawFn) -> tuple[np.ndarray, np.ndarray]:
    count, segments = draw(st.integers(1, 4)), draw(st.integers(1, 6))
    volts = [[[draw(LEVELS) for _ in range(3)] for _ in range(segments)] for _ in range(count)]
    seconds = [[draw(st.integers(0, 8)) / 4 for _ in range(segments)] for _ in range(count)]
    return np.array(volts, float), np.array(seconds, float)


@settings(max_examples=150, deadline=None)
@given(
    courses(),
    st.integers(210, 310),
    st.integers(0, 40),
    st.booleans(),
    st.integers(1, 40),
    st.sampled_from([0.0, 0.3, 0.6]),
    st.sampled_from([0.0, 0.7]),
)
def test_a_stage_is_secure_iff_its_delay_is_longer_than_r(
    drawn: tuple[np.ndarray, np.ndarray],
    pickup: int,
    hysteresis: int,
    shared: bool,
    quarters: int,
    window: float,
    hold_s: float,
) -> None:
    severity, seconds = drawn
    standing = 205.0
    level, release, delay = float(pickup), float(pickup - hysteresis), quarters / 4 + 0.125
    own = runs(severity, seconds, standing, shared, window)
    reach = ride_through(own, np.array([level]), np.array([release]), hold_s)
    count = len(severity)
    around = np.full((count, 1, 3), standing)
    trip = run(
        np.concatenate([around, severity, around], axis=1),
        np.concatenate([np.full((count, 1), 9.0), seconds, np.full((count, 1), np.inf)], axis=1),
        level,
        release,
        delay,
        "held" if hold_s else "instantaneous",
        hold_s,
        "shared" if shared else "per phase",
        lag_s=window,
    )
    assert bool(np.isinf(trip).all()) == (delay > reach.seconds[0])


def test_r_never_rises_with_the_pickup() -> None:
    rng = np.random.default_rng(3)
    severity = rng.uniform(200, 300, (20, 6, 3))
    seconds = rng.uniform(0, 2, (20, 6))
    pickup = np.arange(206.0, 310.0)
    reach = ride_through(runs(severity, seconds, 205.0), pickup, 0.97 * pickup).seconds
    finite = np.isfinite(reach)
    assert (np.diff(reach[finite]) <= 1e-12).all()
    assert (np.diff(finite.astype(int)) >= 0).all()


@pytest.mark.parametrize(("ratio", "volts"), [(0.999999, 255.6), (0.98, 260.8), (0.95, 269.0)])
def test_the_standing_case_sets_the_lowest_pickup_by_the_closed_form(ratio: float, volts: float) -> None:
    # Own arithmetic: p >= x0 / (r (1 - a)); 253 V and 1 percent need 255.6 V without drop-out (256 on whole volts),
    # 260.8 V (261) at 0.98 and 269.0 V (270) at 0.95.
    swell = np.full((1, 1, 3), 300.0)
    pickup = np.arange(240.0, 300.0, 0.1)
    sensitive = pickup * 0.99
    reach = ride_through(runs(swell, np.array([[1.0]]), 253.0), sensitive, sensitive * ratio)
    assert float(pickup[np.isfinite(reach.seconds)][0]) == pytest.approx(volts, abs=0.11)


def test_the_measuring_window_lengthens_every_run() -> None:
    swell = np.full((1, 1, 3), 300.0)
    bare = run_lengths(runs(swell, np.array([[1.0]]), 230.0), np.array([280.0]), np.array([270.0]))
    windowed = run_lengths(runs(swell, np.array([[1.0]]), 230.0, window=0.02), np.array([280.0]), np.array([270.0]))
    assert windowed[0, 0] - bare[0, 0] == pytest.approx(0.02)


def test_what_stands_behind_r_is_named() -> None:
    swell = np.full((1, 1, 3), 300.0)
    own = runs(swell, np.array([[1.0]]), 253.0)
    reach = ride_through(own, np.array([250.0, 280.0, 301.0]), np.array([249.0, 270.0, 300.0]))
    assert [int(k) for k in reach.behind] == [STANDING, 0, NOTHING]
    assert behind_name(own, STANDING) == "standing"
    assert behind_name(own, 0) == "course 0"
    assert behind_name(own, NOTHING) == "no case picks it up"


def test_a_held_count_joins_runs_across_a_short_gap() -> None:
    # Hand-worked: two runs of 1 s with a gap of 0.5 s count 2 s when held for 0.5 s, 1 s when reset at once.
    severity = np.array([300.0, 230.0, 300.0])[None, :, None]
    seconds = np.array([[1.0, 0.5, 1.0]])
    own = runs(severity, seconds, 230.0)
    level, release = np.array([280.0]), np.array([270.0])
    assert run_lengths(own, level, release)[0, 0] == pytest.approx(1.0)
    assert run_lengths(own, level, release, hold_s=0.5)[0, 0] == pytest.approx(2.0)


@settings(max_examples=100, deadline=None)
@given(courses(), st.integers(206, 310), st.integers(0, 40), st.booleans())
def test_courses_left_out_never_stand_behind_r(
    drawn: tuple[np.ndarray, np.ndarray], pickup: int, hysteresis: int, shared: bool
) -> None:
    own = runs(*drawn, standing=205.0, shared=shared, window=0.02)
    level, release = np.array([float(pickup)]), np.array([float(pickup - hysteresis)])
    every = run_lengths(own, level, release).max()
    assert ride_through(own, level, release).seconds[0] == every


def test_a_milder_and_shorter_course_is_left_out() -> None:
    severity = np.array([[[300.0, 230.0]], [[290.0, 230.0]], [[290.0, 230.0]]])
    own = runs(severity, np.array([[1.0], [0.5], [2.0]]), 205.0)
    assert own.front.tolist() == [0, 2]
