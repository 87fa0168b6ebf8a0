"""A sweep's map, its joint equation and Newton's step on it, against plain complex arithmetic and differences."""

from dataclasses import replace

import numpy as np
import pytest

from relaycfg.network.loadlaw import Law, flow
from relaycfg.network.sweeps import LARGEST_CAP_V, Iterate, Problem, Sweeper

BRANCHES, ACTED, STATES = 4, 3, 5


def problem(middle: bool = False) -> Problem:
    """Branches on a network of some tenths of an ohm; the joint acts on the first three."""
    rng = np.random.default_rng(8)

    def draw(size: float, *shape: int) -> np.ndarray:
        return size * (rng.uniform(-1, 1, shape) + 1j * rng.uniform(-1, 1, shape))

    h, back = draw(0.5, BRANCHES) + 1, draw(0.5, BRANCHES) + 1
    h[ACTED:] = back[ACTED:] = 0
    u_open = 230 * np.exp(1j * rng.uniform(0, 6, (BRANCHES, 1)))
    plain = Problem(
        u_open,
        draw(0.3, BRANCHES, BRANCHES),
        h,
        back,
        3 - 2j,
        -0.02 - 0.01j,
        0.05,
        True,
        ACTED,
        np.zeros(BRANCHES, complex),
    )
    return plain.about(draw(0.05, BRANCHES)) if middle else plain


def law() -> Law:
    """Loads of some kilowatts with all three parts, inside their bands at every voltage of these tests."""
    rng = np.random.default_rng(9)
    z, i, p = ([s * rng.uniform(0.2, 1, (BRANCHES, STATES)) for _ in range(2)] for s in (0.05, 10.0, 2e3))
    return Law(*z, *i, *p, np.full((BRANCHES, 1), 50.0), np.full((BRANCHES, 1), 500.0))


def iterate(cap_v: float = 1e3, last: complex = 0j) -> Iterate:
    """Voltages near 230 V and joint EMFs of some ten volts."""
    rng = np.random.default_rng(10)
    u = rng.uniform(200, 260, (BRANCHES, STATES)) * np.exp(1j * rng.uniform(0, 6, (BRANCHES, STATES)))
    ends = np.broadcast_to(np.array([[last.real], [last.imag]]), (2, STATES)).copy()
    return Iterate(u.real.copy(), u.imag.copy(), rng.uniform(-20, 20, (2, STATES)), np.full(STATES, cap_v), ends)


LEAK_S = np.linspace(0.0, 0.01, STATES)[None, :]


def branch_currents(of: Law, u: np.ndarray) -> np.ndarray:
    """Currents [A] of the branches at voltages u."""
    now = flow(of, u.real, u.imag)
    return (now.g_re + 1j * now.g_im) * u


def joint_equation(of: Problem, u: np.ndarray, w: np.ndarray) -> np.ndarray:
    """F(w): joint current less what joint and leak take at w. Source: own algebra, the module's docstring."""
    return of.c0 - of.back @ branch_currents(law(), u) + of.y * w - (of.joint_s + LEAK_S[0]) * w


@pytest.mark.parametrize("middle", [False, True])
def test_target_is_the_intact_network_and_the_joint_equation(middle: bool) -> None:
    """Source: own algebra in complex numbers: U* = u_open - z (i - m U) + h w and F with the whole currents."""
    of, at = problem(middle), iterate()
    u, w = at.u_re + 1j * at.u_im, at.w[0] + 1j * at.w[1]
    target, residual, _ = Sweeper(of, law(), LEAK_S, np.float64).target(at)
    beyond = branch_currents(law(), u) - of.middle[:, None] * u
    expected = of.u_open - of.z @ beyond + of.h[:, None] * w
    assert target[:BRANCHES] + 1j * target[BRANCHES:] == pytest.approx(expected, abs=1e-9)
    assert residual[0] + 1j * residual[1] == pytest.approx(joint_equation(of, u, w), abs=1e-9)


def test_moving_a_middle_into_the_network_leaves_the_state_where_it_is() -> None:
    """Source: own algebra: a fixed point of U = u_open - z i + h w is one whatever middle is inside."""
    of, inside = problem(), problem(middle=True)
    w = 12 - 5j
    u = np.broadcast_to(of.u_open, (BRANCHES, STATES))
    for _ in range(200):
        u = of.u_open - of.z @ (0.1 * branch_currents(law(), u)) + of.h[:, None] * w
    tenth = replace(
        law(), **{name: 0.1 * getattr(law(), name) for name in ("z_re", "z_im", "i_re", "i_im", "p_re", "p_im")}
    )
    at = Iterate(u.real, u.imag, np.full((2, STATES), [[w.real], [w.imag]]), np.ones(STATES), np.zeros((2, STATES)))
    target, _, _ = Sweeper(inside, tenth, LEAK_S, np.float64).target(at)
    assert target[:BRANCHES] + 1j * target[BRANCHES:] == pytest.approx(u, abs=1e-9)


@pytest.mark.parametrize("direction", [1.0, 1j, np.exp(2.2j)])
def test_jacobian_is_the_derivative_of_the_joint_equation(direction: complex) -> None:
    """Source: own arithmetic: central differences of F along w with U moving by h dw."""
    of, at = problem(), iterate()
    u, w, step = at.u_re + 1j * at.u_im, at.w[0] + 1j * at.w[1], 1e-3 * direction
    sweeper = Sweeper(of, law(), LEAK_S, np.float64)
    jac = sweeper.jacobian(at.u_re, at.u_im, flow(law(), at.u_re, at.u_im))
    moved = (joint_equation(of, u + sign * of.h[:, None] * step, w + sign * step) for sign in (1, -1))
    expected = -np.subtract(*moved) / 2e-3
    alpha, beta = jac.alpha[0] + 1j * jac.alpha[1], jac.beta[0] + 1j * jac.beta[1]
    assert alpha * direction + beta * np.conj(direction) == pytest.approx(expected, abs=1e-6)


def test_newton_step_solves_the_linear_joint_equation() -> None:
    """Source: own algebra: alpha dw + beta conj(dw) = F - back (a D + b conj D), D the move of the voltages."""
    of, at = problem(), iterate()
    sweeper = Sweeper(of, law(), LEAK_S, np.float64)
    jac = sweeper.jacobian(at.u_re, at.u_im, flow(law(), at.u_re, at.u_im))
    assert not jac.shift.any()
    rng = np.random.default_rng(11)
    moves = rng.uniform(-5, 5, (2, ACTED, STATES))
    residual = rng.uniform(-9, 9, (2, STATES))
    dw = np.array([1, 1j]) @ sweeper.joint_step(residual, *moves, jac)
    d = moves[0] + 1j * moves[1]
    a, b = jac.a_re + 1j * jac.a_im, jac.b_re + 1j * jac.b_im
    right = residual[0] + 1j * residual[1] - of.back[:ACTED] @ (a * d + b * d.conj())
    alpha, beta = jac.alpha[0] + 1j * jac.alpha[1], jac.beta[0] + 1j * jac.beta[1]
    assert alpha * dw + beta * dw.conj() == pytest.approx(right, abs=1e-9)


def test_guard_keeps_the_joint_equation_solvable_and_is_zero_where_nothing_needs_it() -> None:
    """Source: own arithmetic: alpha dw + beta conj(dw) = r is positive definite where Re alpha > |beta|."""
    nothing, at = np.zeros((BRANCHES, STATES)), iterate()
    impedances = replace(law(), i_re=nothing, i_im=nothing, p_re=nothing, p_im=nothing, z_im=nothing)
    power = replace(law(), z_re=nothing, z_im=nothing, i_re=nothing, i_im=nothing)
    stiff = np.where(problem().h == 0, 0j, 1 + 0j)
    for of, guarded in ((impedances, False), (power, True)):
        bare = replace(problem(), h=stiff, back=stiff, joint_s=0.0, y=0j)
        sweeper = Sweeper(bare, of, 0 * LEAK_S, np.float64)
        jac = sweeper.jacobian(at.u_re, at.u_im, flow(of, at.u_re, at.u_im))
        needed = jac.alpha[0] < 1.05 * np.hypot(*jac.beta)
        assert needed.any() == guarded
        assert (jac.alpha[0] + jac.shift > np.hypot(*jac.beta)).all()
        assert (jac.shift > 0).tolist() == needed.tolist()


def swept(last: complex | None, cap_v: float) -> tuple[Iterate, np.ndarray]:
    """The iterate after one sweep at that cap, and how far its joint EMFs moved [V]; ``last`` in free steps."""
    free = iterate()
    Sweeper(problem(), law(), LEAK_S, np.float64).sweep(free)
    step = np.array([1, 1j]) @ free.last
    at = iterate(cap_v)
    if last is not None:
        at.last = np.array([(last * step).real, (last * step).imag])
    before = np.array([1, 1j]) @ at.w
    Sweeper(problem(), law(), LEAK_S, np.float64).sweep(at)
    return at, (np.array([1, 1j]) @ at.w - before) / step


def test_sweep_moves_voltages_to_the_target_and_along_the_step() -> None:
    """Source: own algebra: U = U* + h dw; the size is the largest move of a branch or of the joint."""
    at, before = iterate(), iterate()
    sweeper = Sweeper(problem(), law(), LEAK_S, np.float64)
    target, _, _ = sweeper.target(before)
    size, _ = sweeper.sweep(at)
    dw = np.array([1, 1j]) @ (at.w - before.w)
    whole = target[:BRANCHES] + 1j * target[BRANCHES:]
    assert at.u_re + 1j * at.u_im == pytest.approx(whole + problem().h[:, None] * dw, abs=1e-9)
    moved = np.abs(whole - before.u_re - 1j * before.u_im).max(axis=0)
    assert size == pytest.approx(np.maximum(moved, np.abs(dw)))
    still, unmoved = replace(problem(), joint=False), iterate()
    size, jac = Sweeper(still, law(), LEAK_S, np.float64).sweep(unmoved)
    assert jac is None
    assert size == pytest.approx(moved)
    assert np.array_equal(unmoved.w, before.w)


def test_a_step_longer_than_its_cap_is_cut_to_it_and_keeps_its_direction() -> None:
    """Source: contract: the cap, first widened by 1.3, bounds the step."""
    at, share = swept(None, 0.5)
    assert np.hypot(*at.last) == pytest.approx(0.65)
    assert share.imag == pytest.approx(0, abs=1e-12)
    assert (share.real < 1).all()
    assert at.cap == pytest.approx(0.65)
    assert swept(None, 0.999 * LARGEST_CAP_V)[0].cap == pytest.approx(LARGEST_CAP_V)


@pytest.mark.parametrize(
    ("last", "turned"),
    [
        (-1.0, True),
        (-1.9, True),
        (-4.8, True),
        (-5.2, False),  # too short beside the last one
        (1.0, False),
        (np.exp(1j * np.deg2rad(110)), True),
        (np.exp(1j * np.deg2rad(250)), True),
        (np.exp(1j * np.deg2rad(105)), False),  # across rather than back
    ],
)
def test_a_step_back_on_the_last_one_halves_the_cap(last: complex, turned: bool) -> None:
    """Source: contract: an overshoot is answered by half of what led to it, anything else by a wider cap."""
    at, share = swept(last, 1e3)
    free = np.hypot(*at.last) / np.abs(share)
    cap = 0.5 * np.minimum(1e3, abs(last) * free) if turned else np.full(STATES, 1300.0)
    assert at.cap == pytest.approx(cap)
    assert share == pytest.approx(np.minimum(1.0, cap / free))
