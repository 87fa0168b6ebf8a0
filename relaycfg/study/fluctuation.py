"""The seconds after a break: loads drop out and start again, lamps go out, motors stall, each at its own volts."""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from relaycfg.model.geometry import BoolArray, ComplexArray, FloatArray
from relaycfg.model.site import Load, Motor, Site
from relaycfg.network import LoadStates, Network, tap
from relaycfg.network.states import OFF, RUNNING, STARTING
from relaycfg.study.load_volts import load_volts

COURSE_S, LONGEST_S, STEP_S = 5.0, 12.0, 0.02
"""Least and greatest length of a course, and its grain; a load answers one step (a cycle at 50 Hz) after its volts."""
SPREAD = 0.2
"""Restart times of single loads lie so far about theirs, each course its own draw (own choice)."""
ON, OUT, STALLED, GONE = range(4)
WORDS = {OUT: "drops out", ON: "starts again", STALLED: "stalls", GONE: "is taken off by its own protection"}


@dataclass(frozen=True)
class Courses:
    """Seeded courses after one break; segments of no duration pad the shorter ones."""

    taps: ComplexArray
    """[courses, segments, lines + 1] what the relay's terminals carry."""
    duration_s: FloatArray
    """[courses, segments]."""
    happened: tuple[tuple[int, float, str, str], ...]
    """Course, second, load and what it does."""
    unresolved: BoolArray
    """[courses] some state on the way has no solution: the course ends there."""
    several: BoolArray
    """[courses] the first state is not the only solution."""

    @property
    def fluctuating(self) -> BoolArray:
        """Courses in which anything happens."""
        found = np.zeros(len(self.taps), bool)
        found[[course for course, *_ in self.happened]] = True
        return found


def with_stalled(site: Site) -> Site:
    """The site with a second, linear load for each one that can stall: what it takes with its rotor locked."""
    stalled = tuple(
        replace(
            load, name=f"{load.name}, stalled", p_w=load.stalled_va.real, q_var=load.stalled_va.imag,
            zip_p=(1.0, 0.0, 0.0), zip_q=(1.0, 0.0, 0.0),
        )
        for load in site.loads if load.stall_pu is not None
    )  # fmt: skip
    return replace(site, loads=site.loads + stalled)


def fluctuation(
    site: Site,
    network: Network,
    place: str,
    states: LoadStates,
    emf: ComplexArray,
    seed: int,
    course_s: float = COURSE_S,
) -> Courses:
    """One course of ``course_s`` a state; all that changes at a step is solved together.

    The network is one of ``with_stalled(site)``.

    On below its cut-out a load drops out after a step; out, it starts again when its volts have been at or above its
    lower band edge (and cut-out) for its restart time. A motor below its stall volts stalls after the stall time and
    is taken off by its own protection, evenly drawn between the shortest and longest time. Each step is the state
    connected to the sound neutral for the loads then on. Usage does not change within the seconds of a course.
    """
    assert site.relay is not None
    play = _Play(site, states, seed)
    steps = round(course_s / STEP_S)
    board = network.boards.index(site.relay.measures_at)
    now = np.zeros(states.count, int)
    unresolved, several = np.zeros((2, states.count), bool)
    pieces: list[tuple[np.ndarray, ComplexArray, FloatArray]] = []
    going = np.arange(states.count)
    while len(going):
        solved = network.solve(place, play.states(going), emf, look_for_roots=not pieces)
        if not pieces:
            several = solved.several.copy()
        unresolved[going[~solved.converged]] = True
        kept = solved.converged
        following = play.due(going, now[going], load_volts(site, network, play.items, solved)[0])
        until = np.minimum(following.min(axis=0, initial=steps), steps)
        taps = tap(solved, board, site.relay.earth_reference)
        pieces.append((going[kept], taps[kept], (until - now[going])[kept] * STEP_S))
        now[going] = until
        goes_on = kept & (until < steps)
        play.fire(going[goes_on], until[goes_on], following[:, goes_on])
        going = going[goes_on]
    return Courses(*_padded(pieces, states.count), tuple(play.happened), unresolved, several)


class _Play:
    """Modes of the loads and motors that mind their volts, and when each is due to change."""

    def __init__(self, site: Site, states: LoadStates, seed: int) -> None:
        self.states_before = states
        self.loads = [k for k, load in enumerate(site.loads) if load.cutout_pu is not None or load.stall_pu is not None]
        self.motors = [k for k, motor in enumerate(site.motors) if motor.stall_pu is not None]
        self.items: Sequence[Load | Motor] = [site.loads[k] for k in self.loads] + [site.motors[k] for k in self.motors]
        self.ghosts = [k for k, load in enumerate(site.loads) if load.stall_pu is not None]
        shape = (len(self.items), states.count)
        self.on = np.vstack([states.loads[self.loads] != 0, states.motors[self.motors] == RUNNING])
        self.mode = np.full(shape, ON)
        self.at = np.full(shape, np.inf)
        self.happened: list[tuple[int, float, str, str]] = []
        draw = np.random.default_rng(np.random.SeedSequence(seed, spawn_key=(len(self.items),)))
        unsteady = site.judgement.unsteady
        restart_s = _column([getattr(i, "restart_s", None) for i in self.items], np.inf)
        self.restart = np.maximum(restart_s * draw.uniform(1 - SPREAD, 1 + SPREAD, shape) / STEP_S, 1)
        shortest, longest = unsteady.stall_trip_s
        between_s = longest - shortest if np.isfinite(longest) else 0.0
        self.off_after = (shortest + between_s * draw.random(shape)) / STEP_S
        self.stall_after = max(unsteady.stall_after_s / STEP_S, 1)
        self.cutout = _column([getattr(i, "cutout_pu", None) for i in self.items], -np.inf)
        # What has a cut-out of its own is off before it could stall.
        self.stall = np.where(np.isfinite(self.cutout), -np.inf, _column([i.stall_pu for i in self.items], -np.inf))
        self.back = np.maximum(self.cutout, _column([getattr(i, "band_low_pu", 0.0) for i in self.items], 0.0))

    def states(self, going: np.ndarray) -> LoadStates:
        """Load states of the courses ``going``, stalled loads in the places that ``with_stalled`` has for them."""
        before, mode = self.states_before, self.mode[:, going]
        loads, motors = before.loads[:, going].copy(), before.motors[:, going].copy()
        stalled = np.zeros((len(self.ghosts), len(going)))
        for row, k in enumerate(self.loads):
            if k in self.ghosts:
                stalled[self.ghosts.index(k)] = np.where(mode[row] == STALLED, loads[k], 0.0)
            loads[k] = np.where(mode[row] == ON, loads[k], 0.0)
        for row, k in enumerate(self.motors, len(self.loads)):
            changed = np.where(mode[row] == STALLED, STARTING, OFF)
            motors[k] = np.where((mode[row] == ON) | ~self.on[row, going], motors[k], changed)
        return LoadStates(np.vstack([loads, stalled]), motors, tuple(before.names[k] for k in going))

    def due(self, going: np.ndarray, now: np.ndarray, volts: FloatArray) -> FloatArray:
        """Step [items, going] at which each is due to change if its volts stay; inf where it is not."""
        mode, on = self.mode[:, going], self.on[:, going]
        # A stalled one is taken off whatever its volts; the others wait only while their condition lasts.
        waits: list[tuple[BoolArray, float | FloatArray]] = [
            (on & (mode == ON) & (volts < self.cutout), 1.0),
            (on & (mode == ON) & (volts < self.stall), self.stall_after),
            (on & (mode == OUT) & (volts >= self.back), self.restart[:, going]),
            (on & (mode == STALLED), self.off_after[:, going]),
        ]
        found = np.full(mode.shape, np.inf)
        for condition, wait in waits:
            found = np.where(condition, np.minimum(self.at[:, going], now + np.ceil(wait)), found)
        self.at[:, going] = found
        return found

    def fire(self, going: np.ndarray, step: np.ndarray, due: FloatArray) -> None:
        """Change the mode of all that are due at ``step`` [going]."""
        for item, column in np.argwhere(due <= step).tolist():
            course, mode = int(going[column]), int(self.mode[item, going[column]])
            to = {OUT: ON, STALLED: GONE}.get(mode)
            if to is None:
                to = STALLED if float(self.stall[item, 0]) > 0 else OUT
            self.mode[item, course], self.at[item, course] = to, np.inf
            name = self.items[item].name
            self.happened.append((course, float(step[column] * STEP_S), name, WORDS[to]))


def _column(values: Sequence[float | None], otherwise: float) -> FloatArray:
    return np.array([otherwise if v is None else v for v in values], float).reshape(-1, 1)


def _padded(pieces: list[tuple[np.ndarray, ComplexArray, FloatArray]], courses: int) -> tuple[ComplexArray, FloatArray]:
    """Taps [courses, segments, lines + 1] and durations [courses, segments] of pieces in the order of time."""
    width = pieces[0][1].shape[-1]
    taps, duration_s = np.zeros((courses, len(pieces), width), complex), np.zeros((courses, len(pieces)))
    for k, (which, what, length_s) in enumerate(pieces):
        taps[which, k], duration_s[which, k] = what, length_s
    return taps, duration_s
