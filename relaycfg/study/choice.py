"""Choice of stages: greatest cover of what must be cleared, then fewest stages, then security margin, then speed."""

from collections.abc import Iterator
from dataclasses import dataclass, replace
from itertools import combinations

import numpy as np
from numpy.typing import NDArray

from relaycfg.model.device import Function
from relaycfg.model.geometry import BoolArray, FloatArray
from relaycfg.study.ladder import UNIT_TIME, Ladder
from relaycfg.study.scenarios import Scenarios

MARGIN_STEP_UNITS = 0.25
"""Security margins are tried from the cap down in this step."""


@dataclass(frozen=True)
class Rung:
    """One chosen stage: its rung and delay on the ladder, and the security margin it was chosen at."""

    pickup: int
    delay: int
    margin_units: float


@dataclass(frozen=True)
class Demand:
    """States to be cleared, counted by what matters to one element.

    ``deadlines`` [classes] are the distinct seconds; ``at_or_beyond`` [classes, rungs + 1] counts the states whose
    severity reaches a rung even at its least sensitive.
    """

    deadlines: FloatArray
    at_or_beyond: NDArray[np.int64]

    @property
    def reachable(self) -> int:
        """States that reach the first rung."""
        return int(self.at_or_beyond[:, 0].sum())


def demand(ladder: Ladder, scenarios: tuple[Scenarios, ...], wanted: tuple[BoolArray, ...]) -> Demand:
    """Count the wanted states of every scenario set; ``wanted`` [states] one a set, harmful states only."""
    function = ladder.element.function
    seconds = [s.deadline_s[w] for s, w in zip(scenarios, wanted, strict=True)]
    deadlines = np.unique(np.concatenate(seconds)) if seconds else np.array([])
    counts = np.zeros((len(deadlines), len(ladder.pickups) + 1), np.int64)
    for scenario, want, limit in zip(scenarios, wanted, seconds, strict=True):
        last = np.searchsorted(ladder.insensitive, scenario.severity[function][want], side="right") - 1
        reached = last >= 0
        np.add.at(counts, (np.searchsorted(deadlines, limit)[reached], last[reached]), 1)
    beyond: NDArray[np.int64] = counts[:, ::-1].cumsum(axis=1)[:, ::-1]
    return Demand(deadlines, beyond)


def choose(ladder: Ladder, own: Demand, need: Demand, stages: int) -> tuple[Rung, ...]:
    """At most ``stages`` stages in order of rising severity; empty where nothing is covered.

    ``own`` counts all states to be cleared (redundancy), ``need`` those of the core that depend on this element. In
    order: all of ``need`` that any secure stages can cover, the share to be kept (98 percent) of the greatest cover
    of ``own``, fewest stages, security margin (to the cap), speed, low pickup.
    """
    goal = _score(ladder, own, need, best_cover(ladder, own, need, stages))
    if goal[1] == 0:
        return ()
    fewest = next(
        count
        for count in range(1, stages + 1)
        if _reaches(ladder, _score(ladder, own, need, best_cover(ladder, own, need, count)), goal)
    )
    for hard, units in _hardest_first(ladder, need):
        rungs = best_cover(ladder, own, hard, fewest, units)
        if _reaches(ladder, _score(ladder, own, hard, rungs), goal):
            break
    return raise_margins(ladder, own, need, rungs, goal)


def best_cover(ladder: Ladder, own: Demand, need: Demand, stages: int, units: float = 0.0) -> tuple[Rung, ...]:
    """The stages that cover most of ``need``, then of ``own``, with every stage secure at ``units`` of margin.

    The fastest secure delay never rises over the rungs, so a state of deadline D is covered by a rung iff its
    severity reaches it and the rung is at or beyond the first that is fast enough for D. Lowering a stage to that
    first rung of its tightest deadline loses nothing: the distinct first rungs are the only candidates, and the
    search over their subsets is exact.
    """
    pool = candidates(ladder, np.union1d(own.deadlines, need.deadlines), units)
    best: tuple[Rung, ...] = ()
    score = (0, 0)
    for count in range(1, min(stages, len(pool)) + 1):
        for subset in combinations(pool, count):
            covered = _score(ladder, own, need, subset)
            if covered > score:
                best, score = subset, covered
    return best


def candidates(ladder: Ladder, deadlines: FloatArray, units: float = 0.0) -> list[Rung]:
    """The first rung that is fast enough for each deadline, secure at ``units`` of margin."""
    fastest = ladder.fastest(units)
    clearing = ladder.clearing[fastest]
    first = {_first(clearing <= limit) for limit in deadlines}
    return [Rung(k, int(fastest[k]), units) for k in sorted(first) if k < len(clearing)]


def raise_margins(
    ladder: Ladder, own: Demand, need: Demand, rungs: tuple[Rung, ...], goal: tuple[int, int] | None = None
) -> tuple[Rung, ...]:
    """Each stage in turn at the greatest security margin (to the cap) that still reaches the goal.

    The goal is all of the needed core and the kept share of the cover that the stages have now, or as given. Among the
    rungs that do, the fastest, then the lowest pickup.
    """
    now = _score(ladder, own, need, rungs)
    target = goal if goal is not None else (now[0], max(now[1], _kept_of(ladder, own, need, now)))
    moved = list(rungs)
    for position in range(len(moved)):
        moved[position] = _with_margin(ladder, own, need, moved, position, target)
    return tuple(sorted(moved, key=lambda r: r.pickup))


def detection_rung(ladder: Ladder, floor: float) -> Rung | None:
    """The lowest pickup beyond ``floor`` that is secure with the full margin, at its shortest secure delay.

    None where none is secure. ``floor`` is a severity that may stand without being among the cases.
    """
    for units in _margins(ladder):
        fastest = ladder.fastest(units)
        rung = _first((fastest < len(ladder.delays)) & (ladder.sensitive > floor))
        if rung < len(fastest):
            return Rung(rung, int(fastest[rung]), units)
    return None


def covered_by(ladder: Ladder, rungs: tuple[Rung, ...], scenario: Scenarios) -> BoolArray:
    """States [states] that the stages clear before their deadline."""
    severity = scenario.severity[ladder.element.function]
    cleared = np.zeros(severity.shape, bool)
    for rung in rungs:
        within = ladder.clearing[rung.delay] <= scenario.deadline_s
        cleared |= (severity >= ladder.insensitive[rung.pickup]) & within
    return cleared


def _score(ladder: Ladder, own: Demand, need: Demand, rungs: tuple[Rung, ...]) -> tuple[int, int]:
    """States of ``need`` and of ``own`` that the stages cover."""
    pairs = [(r.pickup, float(ladder.clearing[r.delay])) for r in rungs]
    return _cover(need, pairs), _cover(own, pairs)


def _kept_of(ladder: Ladder, own: Demand, need: Demand, now: tuple[int, int]) -> int:
    """Greatest cover of ``own`` whose kept share the stages have: what was given up before is not given up twice."""
    greatest = _score(ladder, own, need, best_cover(ladder, own, need, ladder.element.stages))[1]
    return min(greatest, int(now[1] / ladder.judgement.cover_kept)) if ladder.judgement.cover_kept else now[1]


def _cover(wanted: Demand, stages: list[tuple[int, float]]) -> int:
    """States covered by stages given as (rung, clearing time)."""
    total = 0
    for k, limit in enumerate(wanted.deadlines):
        usable = [rung for rung, clearing in stages if clearing <= limit]
        if usable:
            total += int(wanted.at_or_beyond[k, min(usable)])
    return total


def _reaches(ladder: Ladder, score: tuple[int, int], goal: tuple[int, int]) -> bool:
    return score[0] >= goal[0] and score[1] >= ladder.judgement.cover_kept * goal[1]


def _hardest_first(ladder: Ladder, need: Demand) -> Iterator[tuple[Demand, float]]:
    """What is needed with time kept towards its deadlines, and the security margin to try it with.

    The time kept goes first, down to none, and no less margin is tried than time is kept.
    """
    for share in (1.0, 0.5, 0.0):
        kept_units = share * ladder.judgement.deadline_kept_units
        hard = replace(need, deadlines=need.deadlines / UNIT_TIME**kept_units)
        yield from ((hard, units) for units in _margins(ladder) if units >= kept_units)


def _margins(ladder: Ladder) -> list[float]:
    """Security margins to try, from the cap down to none."""
    steps = round(ladder.judgement.margin_cap_units / MARGIN_STEP_UNITS)
    return [k * MARGIN_STEP_UNITS for k in range(steps, -1, -1)]


def _with_margin(
    ladder: Ladder, own: Demand, need: Demand, rungs: list[Rung], position: int, goal: tuple[int, int]
) -> Rung:
    """One stage at the greatest margin; what is kept in time towards the deadlines of the needed core goes first.

    A security margin bought with all of the time left would leave a core state one step from being missed.
    """
    others = [(r.pickup, float(ladder.clearing[r.delay])) for k, r in enumerate(rungs) if k != position]
    for hard, units in _hardest_first(ladder, need):
        if units < rungs[position].margin_units:
            continue
        fastest = ladder.fastest(units)
        clearing = ladder.clearing[fastest]
        kept = (_cover_of_each(hard, others, clearing) >= goal[0]) & (fastest < len(ladder.delays))
        kept &= _cover_of_each(own, others, clearing) >= ladder.judgement.cover_kept * goal[1]
        if kept.any():
            quickest = int(fastest[kept].min())
            return Rung(_first(kept & (fastest == quickest)), quickest, units)
    return rungs[position]


def _cover_of_each(wanted: Demand, others: list[tuple[int, float]], clearing: FloatArray) -> NDArray[np.int64]:
    """States covered [rungs] when each rung in turn joins the other stages."""
    rungs = np.arange(len(clearing))
    total = np.zeros(len(rungs), np.int64)
    for k, limit in enumerate(wanted.deadlines):
        fixed = min((rung for rung, seconds in others if seconds <= limit), default=len(rungs))
        lowest = np.minimum(np.where(clearing <= limit, rungs, len(rungs)), fixed)
        total += wanted.at_or_beyond[k, lowest]
    return total


def _first(flags: BoolArray) -> int:
    """Index of the first true entry, len(flags) where there is none."""
    return int(np.argmax(flags)) if flags.any() else len(flags)


def harmful_states(scenarios: tuple[Scenarios, ...]) -> tuple[BoolArray, ...]:
    """The states that have to be cleared: harm behind the switch, and resolved."""
    return tuple(s.harmful & s.resolved for s in scenarios)


ORDER = (Function.OVERVOLTAGE, Function.UNDERVOLTAGE, Function.DISPLACEMENT, Function.UNBALANCE)
"""Order of choice: 59 and 27 on their own, 59N for detection and what they leave, 47 only for what is left."""
