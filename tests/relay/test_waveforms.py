"""Sampled voltages through a one-cycle RMS, refreshed every half cycle, into the plain machine: declared bands hold.

The detector is written here from its description (true RMS of the last nominal cycle, a new value every half cycle)
and shares nothing with the program; what is checked are the bands the program declares for a device: pickup between
its most and its least sensitive end, time between the shortest delay and the longest one plus window and refresh.

EN 50160 as quoted limits: third harmonic up to 5 %, fifth up to 6 % of nominal, 50 Hz +/- 1 % in normal operation;
49 to 51 Hz is wider, on purpose.
"""

import math

import numpy as np
import pytest

from relaycfg.model.device import Function
from relaycfg.model.settings import Stage
from relaycfg.relay import least_sensitive, longest_delay, most_sensitive, refresh_s, run, severities, shortest_delay
from relaycfg.relay import window_s as declared_window_s
from relaycfg.study.third_harmonic import ThirdHarmonic, with_harmonic

NOMINAL_V, NOMINAL_HZ = 230.0, 50.0
CYCLE = 128
"""Samples a nominal cycle, and in the measuring window."""
RATE_HZ = CYCLE * NOMINAL_HZ
WINDOW_S, REFRESH_S = 1 / NOMINAL_HZ, 0.5 / NOMINAL_HZ
THIRD, FIFTH = 0.05, 0.06
RAMP_V_PER_S = 2.0
SLACK_V = RAMP_V_PER_S * (WINDOW_S + REFRESH_S)
"""What a ramp moves while the window fills and the next value is awaited (own arithmetic)."""
SUPPLIES = [(50.0, False), (50.0, True), (49.0, False), (49.0, True), (51.0, True), (50.37, True)]
"""Frequency [Hz], and whether the harmonics stand at their limits."""
STAGES = {
    "59": Stage(Function.OVERVOLTAGE, 1, True, 265.0, 0.12, 0.97),
    "27": Stage(Function.UNDERVOLTAGE, 1, True, 177.0, 0.12, 1.03),
    "59N": Stage(Function.DISPLACEMENT, 1, True, 40.0, 0.12, 0.9),
}


def instants(seconds):
    return np.arange(round(seconds * RATE_HZ)) / RATE_HZ


def sine(volts, time, hertz, angle, order=1):
    """Samples of one component of ``volts`` RMS; ``angle`` [rad] is that of the fundamental, any shape before time."""
    return math.sqrt(2) * volts * np.cos(order * (2 * math.pi * hertz * time + angle))


def line(volts, time, hertz, angle, dirty):
    """A line to neutral: fundamental of ``volts`` RMS, third and fifth harmonic at their limits where ``dirty``."""
    clean = sine(volts, time, hertz, angle)
    if not dirty:
        return clean
    return clean + sine(THIRD * volts, time, hertz, angle, 3) - sine(FIFTH * volts, time, hertz, angle, 5)


def detect(samples):
    """RMS [..., values] of the cycle before every half cycle, the first when the first window is full."""
    total = np.cumsum(samples**2, axis=-1)
    total = np.concatenate([np.zeros((*total.shape[:-1], 1)), total], axis=-1)
    ends = np.arange(CYCLE, total.shape[-1], CYCLE // 2)
    return np.sqrt((total[..., ends] - total[..., ends - CYCLE]) / CYCLE)


def rms_range(components, hertz):
    """Least and greatest RMS over all angles that a window of one nominal cycle can give.

    ``components`` order to volts RMS. Own arithmetic: the mean of a product of two cosines over the window is half
    that of cosines at sum and difference of their frequencies, each at most sin(N x) / (N sin x) with x half the
    step of angle from sample to sample; both vanish where the window holds whole cycles.
    """

    def left(order):
        x = math.pi * order * hertz / RATE_HZ
        return abs(math.sin(CYCLE * x) / (CYCLE * math.sin(x)))

    square = sum(v * v for v in components.values())
    spread = sum(v * v * left(2 * k) for k, v in components.items())
    for j, a in components.items():
        spread += sum(2 * a * b * (left(j + k) + left(k - j)) for k, b in components.items() if k > j)
    return math.sqrt(max(square - spread, 0.0)), math.sqrt(square + spread)


def series(samples):
    """Severity [events, values, channels] and duration of the machine's segments from samples [events, samples]."""
    values = detect(samples)[..., np.newaxis]
    return values, np.full(values.shape[:2], REFRESH_S)


def components(name, volts, dirty):
    """What an element's window holds at a fundamental of ``volts`` (59N: of V0), by order."""
    if not dirty:
        return {1: volts}
    # The third of balanced lines is a zero sequence, the fifth a negative one; V0 holds the third of the whole line.
    return {1: volts, 3: THIRD * NOMINAL_V} if name == "59N" else {1: volts, 3: THIRD * volts, 5: FIFTH * volts}


def measured(name, volts, time, hertz, angle, dirty):
    """Samples that an element's detector takes, at ``volts`` of line to neutral (59N: of a shifted neutral)."""
    if name != "59N":
        return line(volts, time, hertz, angle, dirty)
    lines = [line(NOMINAL_V, time, hertz, angle + turn, dirty) for turn in np.deg2rad([0.0, -120.0, 120.0])]
    shift = sine(volts, time, hertz, angle + 0.7)
    return sum(v - shift for v in lines) / 3


def sign(name):
    return -1.0 if name == "27" else 1.0


def real(element, stage, pickup_error, time_error):
    """A device somewhere inside its declared errors, -1 to 1 of each: pickup, drop-out (severities) and delay."""
    pickup = stage.pickup + pickup_error * float(element.accuracy.pickup_error(stage.pickup))
    delay_s = stage.delay_s + time_error * float(element.accuracy.time_error(stage.delay_s))
    return pickup, stage.dropout_ratio * pickup, max(delay_s, 0.0)


def test_this_detector_is_the_one_the_device_declares(device):
    """Source: definition."""
    assert declared_window_s(device, NOMINAL_HZ) == pytest.approx(WINDOW_S)
    assert refresh_s(device, NOMINAL_HZ) == pytest.approx(REFRESH_S)
    assert CYCLE >= 64


@pytest.mark.parametrize("name", ["59", "27", "59N"])
def test_rms_of_clean_samples_is_what_the_element_compares(elements, geometry, tap, name):
    """Source: own arithmetic (RMS of a sine over whole cycles is the magnitude of its phasor)."""
    time = instants(0.1)
    phasors = tap(231.0, 40.0 * np.exp(0.3j))
    waves = np.array([sine(abs(v), time, NOMINAL_HZ, np.angle(v)) for v in phasors[:-1]])
    seen = detect(waves.mean(axis=0, keepdims=True) if name == "59N" else waves)
    expected = sign(name) * severities(elements[name], geometry, phasors, "l-n")
    np.testing.assert_allclose(seen, np.broadcast_to(expected[:, np.newaxis], seen.shape), rtol=1e-9)


@pytest.mark.parametrize(("hertz", "dirty"), SUPPLIES)
def test_the_error_of_the_window_itself_stays_within_its_closed_form(hertz, dirty):
    """Source: own arithmetic; 1.0 percent at 49 and 51 Hz without harmonics, as much as the device's own error."""
    angles = np.linspace(0, 2 * math.pi, 50, endpoint=False)[:, np.newaxis]
    seen = detect(line(NOMINAL_V, instants(0.5), hertz, angles, dirty))
    low, high = rms_range(components("59", NOMINAL_V, dirty), hertz)
    assert low - 1e-9 <= seen.min() <= seen.max() <= high + 1e-9
    if not dirty:
        assert (seen.min(), seen.max()) == pytest.approx((low, high), rel=1e-4)
    if hertz == NOMINAL_HZ:
        assert high == pytest.approx(NOMINAL_V * (math.sqrt(1 + THIRD**2 + FIFTH**2) if dirty else 1.0))
    if (hertz, dirty) == (49.0, False):
        assert high / NOMINAL_V - 1 == pytest.approx(0.0101, abs=1e-4)


@pytest.mark.parametrize("pickup_error", [-1.0, 0.0, 1.0])
@pytest.mark.parametrize(("hertz", "dirty"), SUPPLIES)
@pytest.mark.parametrize("name", ["59", "27", "59N"])
def test_slow_ramps_pick_up_between_the_ends_of_the_band(elements, name, hertz, dirty, pickup_error):
    """Source: own arithmetic: at the fundamental where it picks up, the window's range meets the declared band."""
    element, stage = elements[name], STAGES[name]
    pickup, dropout, _ = real(element, stage, pickup_error, 0.0)
    time, slope = instants(12.0), sign(name) * RAMP_V_PER_S
    volts = stage.pickup - 6 * slope + slope * time
    angles = np.random.default_rng(7).uniform(0, 2 * math.pi, (6, 1))
    severity, lengths = series(measured(name, volts, time, hertz, angles, dirty))
    trip_s = run(sign(name) * severity, lengths, sign(name) * pickup, sign(name) * dropout, 0.0)
    assert np.isfinite(trip_s).all()
    most, least = (abs(side(element, stage).pickup) for side in (most_sensitive, least_sensitive))
    lowest, highest = min(most, least), max(most, least)
    for v in stage.pickup - 6 * slope + slope * (trip_s + WINDOW_S):
        low, high = rms_range(components(name, v, dirty), hertz)
        assert high + SLACK_V >= lowest
        assert low - SLACK_V <= highest
        if hertz == NOMINAL_HZ and not dirty:
            assert lowest - SLACK_V <= v <= highest + SLACK_V


@pytest.mark.parametrize(("hertz", "dirty"), SUPPLIES)
@pytest.mark.parametrize("name", ["59", "27", "59N"])
def test_nothing_operates_short_of_the_band_and_everything_beyond_it(elements, name, hertz, dirty):
    """Source: own arithmetic, by the window's closed form; 59N with its third harmonic takes root sum of squares."""
    element, stage = elements[name], STAGES[name]
    short, beyond = edges(element, stage, name, hertz, dirty)
    time = instants(0.6)
    angles = np.linspace(0, 2 * math.pi, 40, endpoint=False)[:, np.newaxis]
    for volts, side, operates in ((short, -1.0, False), (beyond, 1.0, True)):
        pickup, dropout, delay_s = real(element, stage, side * sign(name), side)
        severity, lengths = series(measured(name, np.full(time.shape, volts), time, hertz, angles, dirty))
        trip_s = run(sign(name) * severity, lengths, sign(name) * pickup, sign(name) * dropout, delay_s)
        assert (np.isfinite(trip_s) == operates).all()


@pytest.mark.parametrize("errors", [(-1.0, -1.0), (0.0, 0.0), (1.0, 1.0)])
@pytest.mark.parametrize(("hertz", "dirty"), SUPPLIES)
@pytest.mark.parametrize("name", ["59", "27", "59N"])
def test_steps_operate_within_the_declared_times(elements, name, hertz, dirty, errors):
    """Steps just beyond the least sensitive end and far beyond, at any point on wave and of the refresh.

    Source: own definition (shortest delay; longest delay, a whole window and a refresh); one sample of slack.
    """
    element, stage = elements[name], STAGES[name]
    pickup, dropout, delay_s = real(element, stage, *errors)
    shortest_s = float(shortest_delay(element, np.array(stage.delay_s)))
    latest_s = float(longest_delay(element, np.array(stage.delay_s))) + WINDOW_S + REFRESH_S
    _, beyond = edges(element, stage, name, hertz, dirty)
    before = 0.0 if name == "59N" else NOMINAL_V
    time, rng = instants(0.5), np.random.default_rng(11)
    angles, start_s = rng.uniform(0, 2 * math.pi, (60, 1)), 0.05 + rng.uniform(0, 2 * WINDOW_S, (60, 1))
    for after in (beyond, 0.0 if name == "27" else 2 * beyond):
        volts = np.where(time < start_s, before, after)
        severity, lengths = series(measured(name, volts, time, hertz, angles, dirty))
        trip_s = run(sign(name) * severity, lengths, sign(name) * pickup, sign(name) * dropout, delay_s)
        took_s = trip_s + WINDOW_S - start_s[:, 0]
        assert took_s.min() >= shortest_s
        assert took_s.max() <= latest_s + 1 / RATE_HZ


def edges(element, stage, name, hertz, dirty):
    """Fundamentals just short of the most sensitive end and just beyond the least sensitive, for any angle."""
    most, least = abs(most_sensitive(element, stage).pickup), abs(least_sensitive(element, stage).pickup)
    scan = np.arange(0.5, 1.5, 1e-3) * stage.pickup
    low, high = np.array([rms_range(components(name, v, dirty), hertz) for v in scan]).T
    if name == "27":
        return float(scan[low > most + 1e-3][0]), float(scan[high < least - 1e-3][-1])
    return float(scan[high < most - 1e-3][-1]), float(scan[low > least + 1e-3][0])


@pytest.mark.parametrize("lasting_s", [0.004, 0.0137, 0.02, 0.045, 0.1])
@pytest.mark.parametrize(
    ("name", "before", "volts"), [("59", 230.0, 275.0), ("59", 230.0, 398.0), ("27", 230.0, 0.0), ("59N", 0.0, 133.0)]
)
def test_an_excursion_keeps_the_timer_running_no_longer_than_itself_a_window_and_a_refresh(
    elements, name, before, volts, lasting_s
):
    """Source: own arithmetic: windows that touch it end within excursion and window, each value stands a refresh."""
    side = {"27": 1.0}.get(name, -1.0)
    pickup, dropout, _ = real(elements[name], STAGES[name], side, 0.0)
    time, rng = instants(0.3), np.random.default_rng(5)
    angles, start_s = rng.uniform(0, 2 * math.pi, (200, 1)), 0.05 + rng.uniform(0, WINDOW_S, (200, 1))
    there = (time >= start_s) & (time < start_s + lasting_s)
    severity, lengths = series(measured(name, np.where(there, volts, before), time, NOMINAL_HZ, angles, False))
    sure_s = lasting_s + WINDOW_S + REFRESH_S + 1 / RATE_HZ
    assert np.isinf(run(sign(name) * severity, lengths, sign(name) * pickup, sign(name) * dropout, sure_s)).all()


@pytest.mark.parametrize("third_v", [0.0, 4.0, THIRD * NOMINAL_V])
@pytest.mark.parametrize("shift_v", [0.0, 6.0, 40.0])
def test_rms_v0_is_the_root_sum_of_squares_of_fundamental_and_third(geometry, elements, tap, shift_v, third_v):
    """V0 of the fundamental does not see the third harmonic, an RMS device does; the program's tap says the same.

    Source: own arithmetic (Parseval): thirds of three lines 120 degrees apart are in phase.
    """
    time = instants(0.1)
    phasors = tap(NOMINAL_V, shift_v * np.exp(2.1j), n_pe=0.0)
    turns = np.deg2rad(geometry.angles_deg)
    fundamental = [sine(abs(v), time, NOMINAL_HZ, np.angle(v)) for v in phasors[:-1]]
    lines = np.array([v + sine(third_v, time, NOMINAL_HZ, 0.4 + t, 3) for v, t in zip(fundamental, turns, strict=True)])
    v0 = lines.mean(axis=0)
    cycle = slice(0, CYCLE)
    phasor = math.sqrt(2) * (v0[cycle] * np.exp(-2j * math.pi * NOMINAL_HZ * time[cycle])).mean()
    assert abs(phasor) == pytest.approx(shift_v, abs=1e-9)
    assert detect(v0) == pytest.approx(math.hypot(shift_v, third_v), abs=1e-9)
    seen = severities(elements["59N"], geometry, with_harmonic(phasors, ThirdHarmonic(third_v, 0.0)), "l-n")
    assert seen == pytest.approx(math.hypot(shift_v, third_v), abs=1e-9)
