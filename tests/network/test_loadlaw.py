"""The load law's slope is its derivative, and a branch is out of its band only where its law changes there."""

import numpy as np
import pytest

from relaycfg.network.loadlaw import Law, flow, outside, slope

LOW_V, HIGH_V = 161.0, 276.0


def law(states: int = 4) -> Law:
    """Five branches with ZIP coefficients of a few kilowatts, other ones in every state."""
    rng = np.random.default_rng(4)
    shape = (5, states)
    z, i, p = ([size * rng.uniform(-1, 1, shape) for _ in range(2)] for size in (0.1, 20.0, 4e3))
    return Law(*z, *i, *p, np.full((5, 1), LOW_V), np.full((5, 1), HIGH_V))


def current(of: Law, u: np.ndarray) -> np.ndarray:
    """I = U (cz + ci r + cp r^2) written out in complex numbers. Source: load law, definition."""
    r = 1 / np.clip(np.abs(u), of.low_v, of.high_v)
    return u * (of.z_re + 1j * of.z_im + (of.i_re + 1j * of.i_im) * r + (of.p_re + 1j * of.p_im) * r**2)


def phasors(magnitude: float) -> np.ndarray:
    """Voltages of that magnitude at an angle of its own in every branch and state."""
    return magnitude * np.exp(1j * np.random.default_rng(5).uniform(0, 2 * np.pi, (5, 4)))


@pytest.mark.parametrize("magnitude", [90.0, 170.0, 230.0, 270.0, 330.0])
def test_admittance_times_voltage_is_the_current_of_the_law(magnitude: float) -> None:
    """Source: load law, definition."""
    u = phasors(magnitude)
    now = flow(law(), u.real, u.imag)
    assert (now.g_re + 1j * now.g_im) * u == pytest.approx(current(law(), u), rel=1e-12)


@pytest.mark.parametrize("magnitude", [90.0, 170.0, 230.0, 270.0, 330.0])
@pytest.mark.parametrize("direction", [1.0, 1j, np.exp(0.7j)])
def test_slope_is_the_derivative_of_the_current_in_every_direction(magnitude: float, direction: complex) -> None:
    """Source: own arithmetic: central differences of the written-out law; inside the band and on both sides of it."""
    u, step = phasors(magnitude), 1e-3 * direction
    a_re, a_im, b_re, b_im = slope(law(), flow(law(), u.real, u.imag), u.real, u.imag)
    expected = (current(law(), u + step) - current(law(), u - step)) / 2e-3
    found = (a_re + 1j * a_im) * direction + (b_re + 1j * b_im) * np.conj(direction)
    assert found == pytest.approx(expected, abs=1e-6)  # slopes here are some 0.3 S


def test_outside_the_band_a_branch_is_a_constant_admittance() -> None:
    """Source: load law, definition: I = g U, so a = g and b = 0."""
    for magnitude in (LOW_V - 1, HIGH_V + 1):
        u = phasors(magnitude)
        now = flow(law(), u.real, u.imag)
        a_re, a_im, b_re, b_im = slope(law(), now, u.real, u.imag)
        assert np.array_equal(a_re, now.g_re)
        assert np.array_equal(a_im, now.g_im)
        assert not b_re.any()
        assert not b_im.any()


@pytest.mark.parametrize("part", ["i_re", "i_im", "p_re", "p_im"])
def test_any_part_of_the_law_that_is_no_impedance_has_a_band_to_leave(part: str) -> None:
    """Source: contract: a state is below (above) its band where one such branch is, edges themselves inside."""
    nothing = np.zeros((2, 3))
    parts = dict.fromkeys(("z_im", "i_re", "i_im", "p_re", "p_im"), nothing)
    parts[part] = np.array([[-2.0] * 3, [0.0] * 3])
    of = Law(**parts, z_re=nothing + 1, low_v=np.array([[LOW_V], [LOW_V]]), high_v=np.array([[HIGH_V], [HIGH_V]]))
    magnitude = np.array([[LOW_V - 1, 230.0, HIGH_V + 1], [HIGH_V + 1, LOW_V - 1, LOW_V - 1]])
    below, above = outside(of, magnitude)  # the second branch is an impedance: its volts say nothing
    assert below.tolist() == [True, False, False]
    assert above.tolist() == [False, False, True]
    edges = np.array([[LOW_V, HIGH_V, 230.0], [0.0, 0.0, 0.0]])
    assert not np.any(outside(of, edges))


def test_parts_of_a_law_are_the_law_of_the_parts() -> None:
    """Source: definition."""
    whole, u = law(), phasors(230.0)
    first, some = whole.rows(2), whole.states(np.array([3, 0]))
    assert current(first, u[:2]) == pytest.approx(current(whole, u)[:2])
    assert current(some, u[:, [3, 0]]) == pytest.approx(current(whole, u)[:, [3, 0]])
    assert whole.cast(np.float32).p_im.dtype == np.float32
    assert whole.cast(np.float32).low_v == pytest.approx(whole.low_v)
