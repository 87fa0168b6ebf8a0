"""The network of one site: every break place, every load state, the voltages at every board."""

from dataclasses import dataclass, fields
from typing import Any

import numpy as np
from numpy.typing import NDArray

from relaycfg.model.geometry import BoolArray, ComplexArray, FloatArray
from relaycfg.model.site import NONE, EarthReference, Site
from relaycfg.network.branches import build_branches
from relaycfg.network.loadlaw import Law, outside
from relaycfg.network.reduction import Reduction, reduce_network
from relaycfg.network.solver import Solution, chase, joined, middle, pick, solve_block
from relaycfg.network.states import STARTING, LoadStates, connected, join, least
from relaycfg.network.sweeps import Iterate, Problem

BLOCK = 64_000
"""Branches times states solved at once: what stays in a core's own cache."""
LEAST_BLOCK = 1024
"""States solved at once however many the branches."""
SAME_ROOT_V = 0.1
FAR_START = 0.8
ACTS = 1e-9
"""Volts a branch sees per volt of joint EMF below which the joint does not act on it (rounding)."""


@dataclass(frozen=True)
class Solved:
    """Voltages [V] and currents [A] of all boards in all states; read-only arrays, states last."""

    l_n: ComplexArray
    """[boards, lines, states] line to that board's neutral."""
    n_earth: ComplexArray
    """[boards, states] neutral to remote earth; nan where no electrode ties the system to earth at all."""
    n_pe: ComplexArray
    """[boards, states] neutral to the board's own PE; nan where the board has no PE."""
    pe_earth: ComplexArray
    """[boards, states] local PE to remote earth; nan where the board has no PE or nothing is tied to earth."""
    neutral_a: ComplexArray
    """[boards, states] current of the incoming neutral, positive towards the source. A board without a cable:
    what its own loads and the neutrals of the boards fed from it bring."""
    joint_v: ComplexArray
    """[states] neutral on the board's side of the joint against the source's side; 0 without a break."""
    joint_a: ComplexArray
    """[states] current through the joint towards the source; 0 when open or without a break."""
    converged: BoolArray
    below_band: BoolArray
    above_band: BoolArray
    """[states] some branch lies outside its band, so that its constant-impedance part is active."""
    unstable: BoolArray
    """[states] the joint's equation has no positive slope: a state that loads would run away from."""
    several: BoolArray
    """[states] another solution exists; only looked for when asked."""


class Network:
    """A site reduced once for all its break places.

    Raises ValueError where conductors form a loop without any impedance.
    """

    def __init__(self, site: Site) -> None:
        self.boards = tuple(b.name for b in site.boards)
        self._lines = len(site.supply.geometry.names)
        self._extremes = join(least(site), connected(site))
        self._branches = build_branches(site)
        self._reduction = reduce_network(site, self._branches)

    def solve(
        self,
        place: str,
        states: LoadStates,
        emf: ComplexArray,
        joint_ohm: float | FloatArray | None = None,
        all_impedance: bool = False,
        look_for_roots: bool = False,
    ) -> Solved:
        """Solve all states with the neutral broken at ``place`` (``none``, ``source`` or a board's incoming cable).

        ``place`` may also be a cut of the lines, ``open_line`` or ``blown_fuse``: an open line's joint is that line at
        the source's terminals; the EMF behind a blown fuse is the caller's.

        ``emf`` [lines] are the source's EMF phasors [V], line to star. ``joint_ohm`` None is an open break, a number
        the resistance of the joint (0: sound), an array [states] of each state's own (above 0, inf: open).
        ``all_impedance`` takes every load as the constant impedance of its
        rating. ``look_for_roots`` starts again from a neutral shifted to 0.8 of each line's EMF; a state that comes
        to rest more than 0.1 V elsewhere has several solutions; what is returned is where the sweeps from the intact
        network end, whatever states are solved beside it: nearly always the one connected to the sound neutral.
        Raises KeyError for an unknown place, ValueError for a negative joint.

        Large samples are best handed over a few thousand states at a time: the result keeps every board's phasors.
        """
        finite, each_s = joint_ohm is not None, None
        if isinstance(joint_ohm, np.ndarray):
            if joint_ohm.shape != (states.count,) or not (joint_ohm > 0).all():
                raise ValueError("give each state's joint more than zero ohm")
            each_s, joint_ohm = 1 / joint_ohm, None
        elif joint_ohm is not None and joint_ohm < 0:
            raise ValueError(f"the joint has {joint_ohm} ohm; give zero or more")
        order, problem = self._problem(place, emf, joint_ohm)
        run = _Run(self._reduction, place, order, problem, states.count, finite, each_s)
        self._sweep(run, states, all_impedance, 0j)
        several = np.zeros(states.count, bool)
        if look_for_roots and problem.joint:
            for start in FAR_START * emf:
                other = _Run(self._reduction, place, order, problem, states.count, finite, each_s)
                self._sweep(other, states, all_impedance, complex(start))
                apart = np.abs(other.joint_v - run.joint_v) > SAME_ROOT_V
                several |= run.flags["converged"] & other.flags["converged"] & apart
        run.shown += (self._reduction.show_emf @ emf)[:, None]
        return self._solved(run, several)

    def _sweep(self, run: "_Run", states: LoadStates, all_impedance: bool, start: complex) -> None:
        """All states block by block, then those that still move, pooled over the blocks."""
        count = states.count
        block = max(LEAST_BLOCK, BLOCK // max(len(run.order), 1))
        about_s = middle(self._law(self._extremes, np.arange(2), run.order, all_impedance))
        left: list[NDArray[np.intp]] = []
        moving: list[Iterate] = []
        for first in range(0, count, block):
            part = np.arange(first, min(first + block, count))
            law = self._law(states, part, run.order, all_impedance)
            found, at = solve_block(run.problem, law, about_s, start, run.each(part))
            run.keep(part, law, found)
            rest = np.flatnonzero(~found.converged)
            if len(rest):
                left.append(part[rest])
                moving.append(pick(at, rest))
        if not left:
            return
        pool, iterate = np.concatenate(left), joined(moving)
        for first in range(0, len(pool), block):
            among = np.arange(first, min(first + block, len(pool)))
            law = self._law(states, pool[among], run.order, all_impedance)
            found = chase(run.problem, law, about_s, pick(iterate, among), start, run.each(pool[among]))
            run.keep(pool[among], law, found)

    def _problem(self, place: str, emf: ComplexArray, joint_ohm: float | None) -> tuple[NDArray[np.intp], Problem]:
        """The solver's problem, and the order of the branches in it: those the joint acts on first."""
        reduction = self._reduction
        u_open = reduction.by_emf @ emf
        if place == NONE:
            order, nothing = np.arange(len(u_open)), np.zeros(len(u_open), complex)
            still = Problem(u_open[:, None], reduction.z, nothing, nothing, 0j, 0j, 0.0, False, 0, nothing)
            return order, still
        h = reduction.joint[place]
        acts = np.abs(h) > ACTS
        order = np.argsort(~acts, kind="stable")
        return order, Problem(
            u_open[order, None],
            reduction.z[np.ix_(order, order)],
            h[order],
            reduction.back[place][order],
            complex(reduction.c0[place] @ emf),
            reduction.y[place],
            1 / joint_ohm if joint_ohm else 0.0,
            joint_ohm != 0,
            int(acts.sum()),
            np.zeros(len(h), complex),
        )

    def _law(self, states: LoadStates, part: NDArray[np.intp], order: NDArray[np.intp], all_impedance: bool) -> Law:
        """The load law of a block of states, branches in the problem's order."""
        branches = self._branches
        z_re, z_im, i_re, i_im, p_re, p_im = branches.coefficients(
            states.loads[:, part], states.motors[:, part], order, all_impedance
        )
        low_v, high_v = branches.low_v[order, None], branches.high_v[order, None]
        return Law(z_re, z_im, i_re, i_im, p_re, p_im, low_v, high_v)

    def _solved(self, run: "_Run", several: BoolArray) -> Solved:
        """Rows of the reduction's output by name, nan where there is nothing to measure."""
        reduction = self._reduction
        part = {name: run.shown[rows] for name, rows in reduction.rows.items()}
        without_pe = ~np.array(reduction.has_pe, bool)
        part["n_pe"][without_pe] = part["pe_earth"][without_pe] = np.nan
        if not reduction.tied:
            part["n_earth"][:] = part["pe_earth"][:] = np.nan
        part["l_n"] = part["l_n"].reshape(len(self.boards), self._lines, -1)
        solved = Solved(joint_v=run.joint_v, joint_a=run.joint_a, several=several, **part, **run.flags)
        for field in fields(solved):
            getattr(solved, field.name).setflags(write=False)
        return solved


class _Run:
    """What one solution of all states gathers: shown phasors without the EMF's part, the joint, the statuses."""

    def __init__(
        self,
        reduction: Reduction,
        place: str,
        order: NDArray[np.intp],
        problem: Problem,
        count: int,
        finite: bool,
        each_s: FloatArray | None,
    ) -> None:
        self.order, self.problem, self._each_s = order, problem, each_s
        self._show = reduction.show_current[:, order]
        self._show_joint = reduction.show_joint[place][:, None] if problem.joint else None
        self._finite = finite and place != NONE
        self.shown = np.empty((len(self._show), count), complex)
        self.joint_v, self.joint_a = np.zeros(count, complex), np.zeros(count, complex)
        names = ("converged", "below_band", "above_band", "unstable")
        self.flags: dict[str, Any] = {name: np.zeros(count, bool) for name in names}

    def each(self, part: NDArray[np.intp]) -> FloatArray | None:
        """The joint admittances [S] of the states ``part`` where each has its own."""
        return None if self._each_s is None else self._each_s[part]

    def keep(self, part: NDArray[np.intp], law: Law, found: Solution) -> None:
        """Write the solution of the states ``part``."""
        problem, flags = self.problem, self.flags
        self.shown[:, part] = self._show @ found.current
        if self._show_joint is not None:
            self.shown[:, part] += self._show_joint * found.joint_v
            self.joint_v[part] = found.joint_v
        if self._finite:
            self.joint_a[part] = problem.c0 - problem.back @ found.current + problem.y * found.joint_v
        flags["converged"][part], flags["unstable"][part] = found.converged, found.unstable
        flags["below_band"][part], flags["above_band"][part] = outside(law, found.magnitude)


def healthy_emf(site: Site, scale: float = 1.0) -> ComplexArray:
    """The source's balanced EMF phasors [lines] in volts, times ``scale``."""
    emf: ComplexArray = site.source.emf_v * scale * site.supply.geometry.phasors
    return emf


def motor_start(network: Network, site: Site, motor_index: int, states: LoadStates, emf: ComplexArray) -> Solved:
    """The sound network with that motor of the site at its starting admittance, everything else as in the states.

    Raises IndexError where the site has no such motor.
    """
    motors = states.motors.copy()
    motors[range(len(site.motors))[motor_index]] = STARTING
    return network.solve(NONE, LoadStates(states.loads, motors, states.names), emf)


def tap(solved: Solved, board_index: int, earth_reference: EarthReference = "local PE") -> ComplexArray:
    """What a relay's terminals at that board carry [states, lines + 1]: line to neutral, then neutral to earth.

    That earth is the board's own PE, or remote earth for a relay with an electrode of its own, which carries no
    current and lies outside the influence of all others; nan where there is none.
    """
    earth = solved.n_earth if earth_reference == "own electrode" else solved.n_pe
    return np.vstack([solved.l_n[board_index], earth[board_index]]).T
