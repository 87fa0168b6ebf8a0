"""Rectifiers on a star in time: against an adaptive solver, Kirchhoff, symmetry and what is known of the open star."""

from dataclasses import replace

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from relaycfg.network.rectifier import Star, rectifier_waves

EMF_V, HERTZ, WATTS, FARAD, OHM = 230.0, 50.0, 300.0, 1e-3, 1.0


def star(power=(WATTS,) * 3, linear_s=(0.0,) * 3, sound=False, cutout_v=0.0):
    power_w = np.array([power], float)
    return Star(
        power_w, FARAD + 0 * power_w, OHM + 0 * power_w, cutout_v + 0 * power_w, np.array([linear_s]), np.array([sound])
    )


def adaptive():
    """RMS, fundamental and third harmonic of one rectifier on a stiff source [A], by scipy's DOP853."""
    peak, omega = EMF_V * np.sqrt(2), 2 * np.pi * HERTZ

    def slope(t, v):
        return [(max(abs(peak * np.sin(omega * t)) - v[0], 0.0) / OHM - WATTS / v[0]) / FARAD]

    cycle = 1 / HERTZ
    start = solve_ivp(slope, (0, 30 * cycle), [299.0], method="DOP853", rtol=1e-10, atol=1e-9, max_step=2e-5).y[0, -1]
    t = np.arange(60000) / 60000 * cycle
    volts = solve_ivp(slope, (0, cycle), [start], method="DOP853", rtol=1e-11, atol=1e-10, max_step=1e-5, t_eval=t).y[0]
    emf = peak * np.sin(omega * t)
    amperes = np.sign(emf) * np.maximum(np.abs(emf) - volts, 0) / OHM
    orders = [np.sqrt(2) * abs((amperes * np.exp(-1j * k * omega * t)).mean()) for k in (1, 3)]
    neutral = amperes + np.roll(amperes, 20000) + np.roll(amperes, 40000)
    return np.sqrt((amperes**2).mean()), *orders, np.sqrt((neutral**2).mean())


def test_a_sound_neutral_gives_the_currents_of_an_adaptive_solver():
    """Source: scipy DOP853 on one phase; with a sound neutral the phases do not know of each other."""
    waves = rectifier_waves(star(sound=True), EMF_V, HERTZ, 1200)
    found = waves.line_a[0, 0], waves.line_fundamental_a[0, 0], waves.line_third_a[0, 0], waves.neutral_a[0]
    assert found == pytest.approx(adaptive(), abs=0.001)
    assert waves.settled[0]


def test_the_coarse_steps_of_a_study_are_near_enough_for_a_printed_volt():
    coarse, fine = (rectifier_waves(star(), EMF_V, HERTZ, steps) for steps in (120, 1500))
    assert coarse.star_v == pytest.approx(fine.star_v, abs=0.05)


def test_an_open_balanced_star_moves_at_the_third_harmonic_and_not_at_the_fundamental():
    """Source: symmetry: equal phases a third of a cycle apart leave orders divisible by three only."""
    waves = rectifier_waves(star(), EMF_V, HERTZ)
    assert waves.star_fundamental_v[0] < 0.01
    assert waves.star_third_v[0] > 30
    assert waves.neutral_a[0] == pytest.approx(0.0, abs=1e-9)
    # Mean square of the phases: EMF and star point are of different orders, so their squares add.
    assert (waves.phase_v[0] ** 2).mean() == pytest.approx(EMF_V**2 + waves.star_v[0] ** 2, rel=1e-9)
    assert waves.phase_fundamental_v[0] == pytest.approx([EMF_V] * 3, abs=0.01)


def test_a_sound_neutral_holds_the_star_point_and_carries_three_times_the_third_harmonic():
    """Source: physics: the third harmonics of the lines are in phase, orders 9 and above add the rest."""
    waves = rectifier_waves(star(sound=True), EMF_V, HERTZ)
    assert waves.star_v[0] == 0
    assert waves.phase_v[0] == pytest.approx([EMF_V] * 3)
    assert waves.neutral_a[0] >= 3 * waves.line_third_a[0, 0]


def test_linear_loads_alone_follow_millman():
    """Source: Millman's theorem: 1:2:3 on an open star, Vn = |sum E Y| / sum Y = 230 sqrt(3) / 6 V."""
    without = replace(star(linear_s=(0.01, 0.02, 0.03)), series_ohm=np.full((1, 3), 1e9))
    waves = rectifier_waves(without, EMF_V, HERTZ, 300, 2)
    assert waves.star_fundamental_v[0] == pytest.approx(EMF_V * np.sqrt(3) / 6, rel=1e-3)


def test_stars_alike_in_per_unit_have_the_same_volts_whatever_their_power():
    """Source: scaling: the same star at a tenth and at ten times the power."""
    power = np.array([[30.0] * 3, [300.0] * 3, [3000.0] * 3])
    waves = rectifier_waves(Star.usual(power, power / 300 * 1e-3, np.zeros(3, bool)), EMF_V, HERTZ)
    assert waves.star_v == pytest.approx(waves.star_v[1], rel=1e-3)
    assert waves.line_a[2] == pytest.approx(10 * waves.line_a[1], rel=1e-3)


def test_more_linear_load_holds_the_star_point_better():
    power = np.full((4, 3), 300.0)
    linear = np.array([[0.0], [1.0], [4.0], [16.0]]) * 300 / EMF_V**2 + 0 * power
    waves = rectifier_waves(Star.usual(power, linear, np.zeros(4, bool)), EMF_V, HERTZ)
    assert (np.diff(waves.star_third_v) < 0).all()


def test_unequal_rectifiers_run_away_from_each_other_and_do_not_pass_for_settled():
    """Source: constant power on a floating star has no stable point; the heaviest phase gives way."""
    waves = rectifier_waves(star((600.0, 300.0, 150.0), cutout_v=100.0), EMF_V, HERTZ, 150, 40)
    assert int(np.argmin(waves.phase_v[0])) == 0
    assert waves.phase_v[0, 0] < EMF_V / 2
    assert not waves.settled[0]
