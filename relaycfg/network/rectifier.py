"""Peak rectifiers on a three-phase star in the time domain: what balanced electronics do to a lost neutral."""

from dataclasses import dataclass

import numpy as np

from relaycfg.model.geometry import BoolArray, FloatArray

LEAK_S = 1e-6
"""Holds the star point where every bridge blocks and nothing linear is connected."""
USUAL_F_PER_W = 1e-3 / 300
USUAL_OHM_W = 300.0
"""The rectifier taken as usual: 1 mF behind 1 ohm at 300 W, that of the reference simulation (own); at other powers
the same in per unit, so that its waveform is the same."""
OPEN, HELD = 1.2, 1.3
"""Capacitor volts at the start, over the RMS of the EMF: about where an open and a held star point come to rest."""
STILL_V = 0.01
"""A capacitor that comes back so near after a cycle has settled."""
LEAST_V = 1.0
"""Divisor of the power of a capacitor that is all but empty."""


@dataclass(frozen=True)
class Star:
    """Stars, one a case, all arrays [cases, 3]: constant power behind a bridge with capacitor and resistor.

    Below ``cutout_v`` on its capacitor a rectifier takes no power. ``linear_s`` are conductances from line to star
    point. ``sound`` [cases]: the neutral is whole.
    """

    power_w: FloatArray
    capacitor_f: FloatArray
    series_ohm: FloatArray
    cutout_v: FloatArray
    linear_s: FloatArray
    sound: BoolArray

    @classmethod
    def usual(cls, power_w: FloatArray, linear_s: FloatArray, sound: BoolArray) -> "Star":
        """Usual rectifiers of these powers (each above zero) that never cut out."""
        return cls(power_w, power_w * USUAL_F_PER_W, USUAL_OHM_W / power_w, 0 * power_w, linear_s, sound)


@dataclass(frozen=True)
class Waves:
    """Volts and amperes over the last cycle, RMS where nothing else is said; [cases, 3] of the lines, else [cases]."""

    phase_v: FloatArray
    phase_fundamental_v: FloatArray
    phase_peak_v: FloatArray
    star_v: FloatArray
    """Star point against the source's: the displacement as an RMS device reads it."""
    star_fundamental_v: FloatArray
    star_third_v: FloatArray
    line_a: FloatArray
    line_fundamental_a: FloatArray
    line_third_a: FloatArray
    neutral_a: FloatArray
    settled: BoolArray
    """[cases] whether the last cycle ends as it began: only then it is a periodic state."""


def rectifier_waves(star: Star, emf_v: float, frequency_hz: float, steps: int = 120, cycles: int = 8) -> Waves:
    """All cases at once on three stiff balanced EMFs [V RMS], from charged capacitors to the last cycle.

    Each bridge carries i = sign(u) max(|u| - v, 0) / R, its capacitor follows C dv/dt = |i| - P / v (two-step
    Adams-Bashforth, ``steps`` a cycle); the star point lies where all currents add up to nothing, exact between the
    kinks of their sum. Unequal powers on an open star run away from each other until one cuts out, so the course in
    time decides, not a fixed point. Valid without inductance and without correction of the power factor. Source: own
    algebra.
    """
    angles = 2 * np.pi * (np.arange(steps)[:, None] / steps - np.arange(3) / 3)
    emf = emf_v * np.sqrt(2) * np.sin(angles)
    step_s = 1 / steps / frequency_hz
    linear_w = star.linear_s * emf_v**2
    held = np.where(star.sound[:, None], 1.0, linear_w / (linear_w + star.power_w))
    volts: FloatArray = (OPEN + (HELD - OPEN) * held) * emf_v
    slope = _slope(star, _instant(star, emf[0], volts)[2], volts)
    for _ in range(cycles):
        before = volts
        volts, slope, star_v, amperes = _cycle(star, emf, volts, slope, step_s)
    across = emf[:, None, :] - star_v[..., None]
    return Waves(
        _rms(across), _order(across, 1), np.abs(across).max(axis=0), _rms(star_v), _order(star_v, 1), _order(star_v, 3),
        _rms(amperes), _order(amperes, 1), _order(amperes, 3), _rms(amperes.sum(axis=-1)),
        np.abs(volts - before).max(axis=1) < STILL_V,
    )  # fmt: skip


def _cycle(
    star: Star, emf: FloatArray, volts: FloatArray, before: FloatArray, step_s: float
) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """Capacitor volts after one cycle and their slope before its end; star point [instants, cases] and line currents.

    ``before`` is the slope one step before the cycle begins.
    """
    points, currents = [], []
    for now in emf:
        point, amperes, rectified = _instant(star, now, volts)
        points.append(point)
        currents.append(amperes)
        slope = _slope(star, rectified, volts)
        volts = np.maximum(volts + step_s * (1.5 * slope - 0.5 * before), 0.0)
        before = slope
    return volts, before, np.array(points), np.array(currents)


def _slope(star: Star, rectified: FloatArray, volts: FloatArray) -> FloatArray:
    drawn = np.where(volts >= star.cutout_v, star.power_w / np.maximum(volts, LEAST_V), 0.0)
    slope: FloatArray = (rectified - drawn) / star.capacitor_f
    return slope


def _instant(star: Star, emf: FloatArray, volts: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Star point [cases], line currents and rectified currents [cases, 3] at one instant.

    The sum of currents falls with the star point, straight between the six points at which a bridge begins to conduct.
    """
    kinks = np.sort(np.concatenate([emf - volts, emf + volts], axis=1), axis=1)
    beyond = 10 * np.abs(emf).max()
    ends = np.concatenate([kinks[:, :1] - beyond, kinks, kinks[:, -1:] + beyond], axis=1)
    across = emf - ends[..., None]
    conductance = (star.linear_s + LEAK_S)[:, None]
    bridges = np.sign(across) * np.maximum(np.abs(across) - volts[:, None], 0) / star.series_ohm[:, None]
    sums = (bridges + conductance * across).sum(axis=-1)
    last = np.clip((sums > 0).sum(axis=1) - 1, 0, ends.shape[1] - 2)
    rows = np.arange(len(volts))
    left, high, low = ends[rows, last], sums[rows, last], sums[rows, last + 1]
    point = np.where(star.sound, 0.0, left + (ends[rows, last + 1] - left) * high / (high - low))
    at = emf - point[:, None]
    rectified = np.maximum(np.abs(at) - volts, 0) / star.series_ohm
    return point, np.sign(at) * rectified + conductance[:, 0] * at, rectified


def _rms(wave: FloatArray) -> FloatArray:
    root: FloatArray = np.sqrt((wave**2).mean(axis=0))
    return root


def _order(wave: FloatArray, order: int) -> FloatArray:
    """RMS of one harmonic of a wave over one cycle, instants first."""
    turning = np.exp(-2j * np.pi * order * np.arange(len(wave)) / len(wave))
    size: FloatArray = np.sqrt(2) * np.abs(np.tensordot(turning, wave, axes=1)) / len(wave)
    return size
