"""The minutes after a break that nothing cleared: loads are switched by their usage, and the displacement drifts."""

from dataclasses import dataclass

import numpy as np

from relaycfg.model.after_break_results import Drift, Met
from relaycfg.model.geometry import BoolArray, ComplexArray, FloatArray
from relaycfg.model.site import Site
from relaycfg.network import LoadStates, Network, tap
from relaycfg.network.states import OFF, RUNNING
from relaycfg.study.course_trips import earliest, point, stage_instants
from relaycfg.study.evidence import Evidence
from relaycfg.study.shares import share
from relaycfg.study.stages import ActiveStage

DRIFT_S = 600.0
COURSES = 16
MOST = 40
"""Switchings drawn for one load: many more than a mean cycle leaves room for in ``DRIFT_S``; the rest is left out."""


@dataclass(frozen=True)
class Switched:
    """Load states one after the other: [states], course by course in the order of time."""

    states: LoadStates
    course: np.ndarray
    duration_s: FloatArray


def drift(evidence: Evidence, network: Network, place: str, stages: tuple[ActiveStage, ...], seed: int) -> Drift | None:
    """``COURSES`` seeded courses, solved as one batch; None where no mean switching time is stated."""
    site, relay = evidence.site, evidence.relay
    unsteady = site.judgement.unsteady
    if not np.isfinite(unsteady.switching_s):
        return None
    switched = switching(site, COURSES, seed, unsteady.switching_s, DRIFT_S)
    solved = network.solve(place, switched.states, evidence.levels.nominal)
    taps = tap(solved, network.boards.index(relay.measures_at), relay.earth_reference)
    lost = np.unique(switched.course[~solved.converged])
    sound = ~np.isin(switched.course, lost)
    v0 = np.abs(site.supply.geometry.displacement(taps[:, :-1]))
    every = _steps_percent(taps, switched.course, site.supply.nominal_v)
    steps = every[sound[1:]]
    largest = int(np.where(sound[1:], every, -1.0).argmax()) if len(every) else 0
    beside = switched.states.take([largest, min(largest + 1, len(every))])
    twice = network.solve(place, beside, evidence.levels.nominal, look_for_roots=True).several
    counted = int((steps >= unsteady.step_percent).sum())
    whole = COURSES - len(lost)
    order = np.argsort(v0[sound])
    median = _weighted_median(v0[sound][order], switched.duration_s[sound][order])
    return Drift(
        DRIFT_S / 60,
        COURSES,
        len(lost),
        float(v0[sound].min(initial=np.inf)) if whole else 0.0,
        median,
        float(v0[sound].max(initial=0.0)),
        counted / whole / (DRIFT_S / 60) if whole else 0.0,
        float(steps.max(initial=0.0)),
        bool(twice.any()),
        _met(evidence, stages, *_by_course(taps, switched), ~np.isin(np.arange(COURSES), lost)),
    )


def switching(site: Site, courses: int, seed: int, cycle_s: float, length_s: float) -> Switched:
    """Each load on for ``usage`` times the mean cycle and off for the rest of it, both exponential; groups as one.

    They start as random states do, on with the share ``usage``, so that every instant is such a state.
    """
    keys = [("group", load.group) if load.group else ("load", load.name) for load in site.loads]
    keys += [("motor", motor.name) for motor in site.motors]
    usages = [*(load.usage for load in site.loads), *(motor.usage for motor in site.motors)]
    usage_of = dict(zip(keys, usages, strict=True))
    listens = np.array([list(usage_of).index(key) for key in keys], int)
    usage = np.array(list(usage_of.values()))
    draw = np.random.default_rng(np.random.SeedSequence(seed, spawn_key=(courses, len(usage))))
    begins_on = draw.random((courses, len(usage))) < usage
    on_now = begins_on[..., None] ^ (np.arange(MOST) % 2 == 1)
    lasts = draw.exponential(1.0, on_now.shape) * cycle_s * np.where(on_now, usage[:, None], 1 - usage[:, None])
    never = (usage <= 0) | (usage >= 1)
    at = np.where(never[:, None], np.inf, lasts.cumsum(axis=-1))
    on, course, duration = [], [], []
    for k in range(courses):
        which, turn = np.nonzero(at[k] < length_s)
        order = np.argsort(at[k][which, turn], kind="stable")
        instants = np.concatenate([[0.0], at[k][which, turn][order], [length_s]])
        toggles = np.zeros((len(usage), len(order) + 1), int)
        toggles[which[order], np.arange(1, len(order) + 1)] = 1
        on.append(begins_on[k][:, None] ^ (toggles.cumsum(axis=1) % 2 == 1))
        course.append(np.full(len(order) + 1, k))
        duration.append(np.diff(instants))
    every = np.concatenate(on, axis=1)[listens]
    demand = np.array([load.demand for load in site.loads]).reshape(-1, 1)
    loads = np.where(every[: len(site.loads)], demand, 0.0)
    motors = np.where(every[len(site.loads) :], RUNNING, OFF).astype(np.int8)
    names = tuple(f"drift {k}" for k in range(loads.shape[1]))
    return Switched(LoadStates(loads, motors, names), np.concatenate(course), np.concatenate(duration))


def _steps_percent(taps: ComplexArray, course: np.ndarray, nominal_v: float) -> FloatArray:
    """Largest change of any line's volts [states - 1] in percent of nominal; none from one course to the next."""
    change: FloatArray = 100 * np.abs(np.diff(np.abs(taps[:, :-1]), axis=0)).max(axis=-1, initial=0.0) / nominal_v
    return np.where(course[1:] == course[:-1], change, 0.0)


def _weighted_median(values: FloatArray, weights: FloatArray) -> float:
    """The value (rising) below which half of the time lies; 0 of none."""
    if not len(values):
        return 0.0
    return float(values[int(np.searchsorted(weights.cumsum(), weights.sum() / 2))])


def _by_course(taps: ComplexArray, switched: Switched) -> tuple[ComplexArray, FloatArray]:
    """[courses, segments, lines + 1] and [courses, segments], padded with segments of no duration."""
    counts = np.bincount(switched.course)
    place = np.arange(len(taps)) - np.repeat(counts.cumsum() - counts, counts)
    padded = np.zeros((len(counts), counts.max(), taps.shape[1]), complex)
    duration_s = np.zeros(padded.shape[:2])
    padded[switched.course, place], duration_s[switched.course, place] = taps, switched.duration_s
    return padded, duration_s


def _met(
    evidence: Evidence, stages: tuple[ActiveStage, ...], taps: ComplexArray, duration_s: FloatArray, whole: BoolArray
) -> tuple[Met, ...]:
    """When each element first picks up and trips; courses that are not ``whole`` count as never."""
    picked, tripped = (np.where(whole, x, np.inf) for x in stage_instants(evidence, stages, taps, duration_s))
    found = []
    for function in dict.fromkeys(s.function for s in stages):
        mine = [k for k, s in enumerate(stages) if s.function is function]
        up, open_ = earliest(picked[mine]), earliest(tripped[mine])
        there, done = np.isfinite(up), np.isfinite(open_)
        found.append(
            Met(
                function,
                share(int(there.sum()), len(up)),
                point(up[there], 50),
                share(int(done.sum()), len(up)),
                point(open_[done], 50),
            )
        )
    return tuple(found)
