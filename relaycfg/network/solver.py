"""Schedule of sweeps for one block of load states, and the status of every state."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from relaycfg.model.geometry import BoolArray, ComplexArray, FloatArray
from relaycfg.network.circuit import LEAK_S
from relaycfg.network.loadlaw import Law, flow
from relaycfg.network.sweeps import Iterate, Problem, Sweeper

TOLERANCE_V = 1e-7
SLOWEST_RATE = 0.1
"""Least contraction a sweep that the error estimate believes in; smaller measured ones may be luck."""
FAST_SWEEPS = 5
EXACT_SWEEPS = 2
MORE_SWEEPS = 12
PATIENT_SWEEPS = 120
FIRST_CAP_V = 80.0
PATIENT_CAP_V = 20.0


@dataclass(frozen=True)
class Solution:
    """Branch currents and joint EMF at the end, complex [branches, states] and [states], with the statuses."""

    current: ComplexArray
    joint_v: ComplexArray
    converged: BoolArray
    unstable: BoolArray
    magnitude: FloatArray


def leak(problem: Problem, law: Law) -> FloatArray:
    """Leak [S] across an open joint, [1, states]: LEAK_S where the rest of the network holds the neutral by less.

    Elsewhere it is left out, since it would shift loaded islands in the fourth digit.
    """
    if problem.joint_s > 0 or not problem.joint:
        return np.zeros((1, law.z_re.shape[1]))
    part, h2 = law.rows(problem.acted_on), np.abs(problem.h[: problem.acted_on]) ** 2
    hold = flow(part, part.high_v + 0 * part.z_re, 0 * part.z_re)
    tie = h2 @ np.hypot(hold.g_re, hold.g_im) + abs(problem.y)
    across: FloatArray = np.where(tie < LEAK_S, LEAK_S, 0.0)[None, :]
    return across


def solve_block(problem: Problem, law: Law, start_w: complex = 0j) -> Solution:
    """Solve the states of one block; those the usual schedule leaves restart from the intact network.

    Schedule: FAST_SWEEPS in single precision, EXACT_SWEEPS in double with the last slopes, MORE_SWEEPS with fresh ones
    for the states still moving, PATIENT_SWEEPS of small steps from the start for what is left. A state has converged
    when its last move times its rate is below TOLERANCE_V; without a stable state near the intact one it may not.
    """
    leak_s = leak(problem, law)
    problem = problem.about(middle(law))
    at = _begin(problem, law.z_re.shape[1], start_w, FIRST_CAP_V, np.float32)
    single = Sweeper(problem, law, leak_s, np.float32)
    for _ in range(FAST_SWEEPS):
        size, jac = single.sweep(at)
    at = Iterate(*(getattr(at, name).astype(np.float64) for name in at.__dataclass_fields__))
    at.cap = np.maximum(at.cap, PATIENT_CAP_V)  # a cap shrunk by single-precision noise would hold the state back
    double = Sweeper(problem, law, leak_s, np.float64)
    for _ in range(EXACT_SWEEPS):
        before, (size, _) = size, double.sweep(at, jac)
    converged = _error(before, size) < TOLERANCE_V
    for restart, sweeps in ((False, MORE_SWEEPS), (True, PATIENT_SWEEPS)):
        if converged.all():
            break
        rest = np.flatnonzero(~converged)
        part = _begin(problem, len(rest), start_w, PATIENT_CAP_V, np.float64) if restart else _pick(at, rest)
        converged[rest] = _until_still(Sweeper(problem, law.states(rest), leak_s[:, rest], np.float64), part, sweeps)
        for name in at.__dataclass_fields__:
            getattr(at, name)[..., rest] = getattr(part, name)
    return _finish(problem, law, leak_s, at, converged)


def middle(law: Law) -> ComplexArray:
    """The middle [branches] of the block's load admittances at nominal voltage (geometric mean of the band)."""
    nominal = np.sqrt(law.low_v * law.high_v)
    now = flow(law, nominal + 0 * law.z_re, 0 * law.z_re)
    re, im = ((g.max(axis=1) + g.min(axis=1)) / 2 for g in (now.g_re, now.g_im))
    between: ComplexArray = re + 1j * im
    return between


def _begin(problem: Problem, states: int, w: complex, cap: float, kind: type[np.floating]) -> Iterate:
    """The intact network without load, every joint EMF at ``w``."""
    volts = np.broadcast_to(problem.u_open + problem.h[:, None] * w, (len(problem.h), states))
    joint = np.broadcast_to(np.array([[w.real], [w.imag]]), (2, states))
    return Iterate(
        volts.real.astype(kind),
        volts.imag.astype(kind),
        joint.astype(kind),
        np.full(states, cap, kind),
        np.zeros((2, states), kind),
    )


def _pick(at: Iterate, chosen: NDArray[np.intp]) -> Iterate:
    """Copies of some of the states."""
    return Iterate(*(getattr(at, name)[..., chosen] for name in at.__dataclass_fields__))


def _error(before: FloatArray, last: FloatArray) -> FloatArray:
    """Estimate of the error left [V] from the sizes of the last two moves."""
    rate = np.clip(last / np.maximum(before, 1e-300), SLOWEST_RATE, 10)
    estimate: FloatArray = last * rate
    return estimate


def _until_still(sweeper: Sweeper, at: Iterate, sweeps: int) -> BoolArray:
    """Sweep until all states have converged or ``sweeps`` are spent; which have converged."""
    size, _ = sweeper.sweep(at)
    done = np.zeros(len(size), bool)
    for _ in range(sweeps):
        before, (size, _) = size, sweeper.sweep(at)
        done = _error(before, size) < TOLERANCE_V
        if done.all():
            break
    return done


def _finish(problem: Problem, law: Law, leak_s: FloatArray, at: Iterate, converged: BoolArray) -> Solution:
    """Branch currents, joint EMF and statuses at the last iterate."""
    now = flow(law, at.u_re, at.u_im)
    unstable = np.zeros(len(converged), bool)
    if problem.joint:
        jac = Sweeper(problem, law, leak_s, np.float64).jacobian(at.u_re, at.u_im, now)
        k = problem.acted_on
        rounding = 1e-9 * np.abs(problem.back * problem.h)[:k] @ np.hypot(now.g_re, now.g_im)[:k]
        unstable = jac.alpha[0] <= np.hypot(*jac.beta) + rounding
    current = (now.g_re + 1j * now.g_im) * (at.u_re + 1j * at.u_im)
    return Solution(current, at.w[0] + 1j * at.w[1], converged, unstable, now.magnitude)
