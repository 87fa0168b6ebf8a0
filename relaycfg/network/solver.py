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
FAST_SWEEPS = 6
EXACT_SWEEPS = 3
MORE_SWEEPS = (2, 2, 2, 3, 4)
PATIENT_SWEEPS = (20, 20, 40, 80, 160, 320)
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


def leak(problem: Problem, law: Law, each_s: FloatArray | None = None) -> FloatArray:
    """Leak [S] across an open joint, [1, states]: LEAK_S where the rest of the network holds the neutral by less.

    Elsewhere it is left out, since it would shift loaded islands in the fourth digit. ``each_s`` [states] is each
    state's own joint admittance, 0 where it is open: it comes on top of the problem's.
    """
    if each_s is not None:
        return np.where(each_s > 0, each_s, leak(problem, law))
    if problem.joint_s > 0 or not problem.joint:
        return np.zeros((1, law.z_re.shape[1]))
    part, h2 = law.rows(problem.acted_on), np.abs(problem.h[: problem.acted_on]) ** 2
    hold = flow(part, part.high_v + 0 * part.z_re, 0 * part.z_re)
    tie = h2 @ np.hypot(hold.g_re, hold.g_im) + abs(problem.y)
    across: FloatArray = np.where(tie < LEAK_S, LEAK_S, 0.0)[None, :]
    return across


def solve_block(
    problem: Problem, law: Law, about_s: ComplexArray, start_w: complex, each_s: FloatArray | None = None
) -> tuple[Solution, Iterate]:
    """The usual schedule for the states of one block: most have converged after it, the rest goes to ``chase``.

    ``about_s`` [branches] is what of the loads' admittances is moved into the network; it must not depend on the block,
    or a state with several solutions would come to rest by the company it is solved in. FAST_SWEEPS in single
    precision, then EXACT_SWEEPS in double with the last slopes. A state has converged when its
    last move times its rate is below TOLERANCE_V.
    """
    leak_s = leak(problem, law, each_s)
    problem = problem.about(about_s)
    at = _begin(problem, law.z_re.shape[1], start_w, FIRST_CAP_V, np.float32)
    single = Sweeper(problem, law, leak_s, np.float32)
    for _ in range(FAST_SWEEPS):
        size, jac = single.sweep(at)
    at = Iterate(*(getattr(at, name).astype(np.float64) for name in at.__dataclass_fields__))
    at.cap = np.maximum(at.cap, PATIENT_CAP_V)  # a cap shrunk by single-precision noise would hold the state back
    double = Sweeper(problem, law, leak_s, np.float64)
    for _ in range(EXACT_SWEEPS):
        before, (size, _) = size, double.sweep(at, jac)
    return _finish(problem, law, leak_s, at, _error(before, size) < TOLERANCE_V), at


def chase(
    problem: Problem,
    law: Law,
    about_s: ComplexArray,
    at: Iterate,
    start_w: complex,
    each_s: FloatArray | None = None,
) -> Solution:
    """States that ``solve_block`` left moving: fresh slopes from where they are, then small steps from the start.

    Without a stable state near the intact one a state may not converge.
    """
    leak_s = leak(problem, law, each_s)
    problem = problem.about(about_s)
    converged = _until_still(problem, law, leak_s, at, MORE_SWEEPS)
    rest = np.flatnonzero(~converged)
    if len(rest):
        again = _begin(problem, len(rest), start_w, PATIENT_CAP_V, np.float64)
        converged[rest] = _until_still(problem, law.states(rest), leak_s[:, rest], again, PATIENT_SWEEPS)
        _put(at, rest, again)
    return _finish(problem, law, leak_s, at, converged)


def middle(law: Law) -> ComplexArray:
    """The middle [branches] of the load admittances of some states at nominal voltage (geometric mean of the band)."""
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


def pick(at: Iterate, chosen: NDArray[np.intp]) -> Iterate:
    """Copies of some of the states."""
    return Iterate(*(getattr(at, name)[..., chosen] for name in at.__dataclass_fields__))


def joined(parts: list[Iterate]) -> Iterate:
    """The states of several iterates one after the other."""
    names = parts[0].__dataclass_fields__
    return Iterate(*(np.concatenate([getattr(part, name) for part in parts], axis=-1) for name in names))


def _put(at: Iterate, chosen: NDArray[np.intp], part: Iterate) -> None:
    for name in at.__dataclass_fields__:
        getattr(at, name)[..., chosen] = getattr(part, name)


def _error(before: FloatArray, last: FloatArray) -> FloatArray:
    """Estimate of the error left [V] from the sizes of the last two moves."""
    rate = np.clip(last / np.maximum(before, 1e-300), SLOWEST_RATE, 10)
    estimate: FloatArray = last * rate
    return estimate


def _until_still(problem: Problem, law: Law, leak_s: FloatArray, at: Iterate, rounds: tuple[int, ...]) -> BoolArray:
    """Rounds of sweeps, each on the states that still move; which states [states] have converged in the end."""
    done = np.zeros(leak_s.shape[1], bool)
    moving = np.arange(len(done))
    for sweeps in rounds:
        sweeper = Sweeper(problem, law.states(moving), leak_s[:, moving], np.float64)
        part = pick(at, moving)
        size, _ = sweeper.sweep(part)
        for _ in range(sweeps - 1):
            before, (size, _) = size, sweeper.sweep(part)
        _put(at, moving, part)
        done[moving] = _error(before, size) < TOLERANCE_V
        moving = np.flatnonzero(~done)
        if not len(moving):
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
