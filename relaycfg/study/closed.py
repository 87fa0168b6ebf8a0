"""The closed corridor: harmful states that no secure setting clears, grouped by what blocks each element."""

from dataclasses import dataclass

import numpy as np

from relaycfg.model.device import Function
from relaycfg.model.geometry import BoolArray, FloatArray
from relaycfg.model.results import ClosedGroup
from relaycfg.study.evidence import Evidence
from relaycfg.study.ladder import Ladder
from relaycfg.study.ride_through import NOTHING, STANDING
from relaycfg.study.scenarios import Scenarios

OUT_OF_REACH = -3


@dataclass(frozen=True)
class _Blocking:
    """What keeps one element from clearing given states: a code a state, and the least overlap [s] and [units]."""

    code: FloatArray
    seconds: FloatArray
    severity: FloatArray


def blocked(evidence: Evidence, wanted: tuple[BoolArray, ...]) -> tuple[BoolArray, ...]:
    """The states of ``wanted`` that no secure setting of any element clears."""
    return tuple(w & ~_clearable(evidence, s) for w, s in zip(wanted, evidence.scenarios, strict=True))


def closed_groups(evidence: Evidence, left: tuple[BoolArray, ...]) -> tuple[ClosedGroup, ...]:
    """Groups of ``blocked`` states by place, core and the case that blocks each element; core first, then largest."""
    tallies: dict[tuple[str, bool, tuple[str, ...]], list[tuple[int, float, float, float]]] = {}
    for scenario, mask in zip(evidence.scenarios, left, strict=True):
        if not mask.any():
            continue
        blocks = {f: _blocking(ladder, scenario, mask) for f, ladder in evidence.ladders.items()}
        codes = np.stack([b.code for b in blocks.values()] + [scenario.core[mask].astype(float)])
        unique, member = np.unique(codes, axis=1, return_inverse=True)
        member = member.reshape(-1)
        for column in range(unique.shape[1]):
            mine = member == column
            names = tuple(
                _blocker(ladder, int(code))
                for ladder, code in zip(evidence.ladders.values(), unique[:-1, column], strict=True)
            )
            key = (scenario.place, bool(unique[-1, column]), names)
            seconds = min((float(b.seconds[mine].min()) for b in blocks.values()), default=np.inf)
            volts = min(
                (float(b.severity[mine].min()) for f, b in blocks.items() if f is not Function.UNBALANCE),
                default=np.inf,
            )
            worst = float(scenario.highest_v[mask][mine].max())
            tallies.setdefault(key, []).append((int(mine.sum()), worst, seconds, volts))
    groups = [_group(evidence, key, rows) for key, rows in tallies.items()]
    return tuple(sorted(groups, key=lambda g: (not g.core, -g.scenarios)))


def _clearable(evidence: Evidence, scenario: Scenarios) -> BoolArray:
    """States [states] that some secure setting clears: the last rung that sees a state is also the fastest."""
    found = np.zeros(scenario.deadline_s.shape, bool)
    for ladder in evidence.ladders.values():
        last = np.searchsorted(ladder.insensitive, scenario.severity[ladder.element.function], side="right") - 1
        clearing = ladder.clearing[ladder.fastest()]
        found |= (last >= 0) & (clearing[np.maximum(last, 0)] <= scenario.deadline_s)
    return found


def _blocking(ladder: Ladder, scenario: Scenarios, mask: BoolArray) -> _Blocking:
    """For each masked state: the case behind R at the last rung that sees it, and by how much it is missed."""
    severity = scenario.severity[ladder.element.function][mask]
    deadline = scenario.deadline_s[mask]
    last = np.searchsorted(ladder.insensitive, severity, side="right") - 1
    fastest = ladder.fastest()
    clearing = ladder.clearing[fastest]
    reach = ladder.ride_through()
    numbers = np.array([*ladder.runs.cases, NOTHING, STANDING], float)
    case = np.where(reach.behind < 0, reach.behind.astype(float), numbers[np.maximum(reach.behind, 0)])
    code = np.where(last < 0, OUT_OF_REACH, case[np.maximum(last, 0)])
    seconds = np.where(last < 0, np.inf, clearing[np.maximum(last, 0)] - deadline)
    enough = clearing[None, :] <= np.unique(deadline)[:, None]
    first = np.where(enough.any(axis=1), np.argmax(enough, axis=1), -1)
    rung = first[np.searchsorted(np.unique(deadline), deadline)]
    short = np.where(rung >= 0, ladder.insensitive[np.maximum(rung, 0)] - severity, np.inf)
    return _Blocking(code, seconds, short)


def _blocker(ladder: Ladder, code: int) -> str:
    if code == OUT_OF_REACH:
        return "out of its range"
    if code == STANDING:
        return ladder.runs.standing_name
    if code == NOTHING:
        return "its own shortest time"
    return ladder.runs.case_names[code]


def _short(blocker: str) -> str:
    """A blocking case by its number, anything else in its words."""
    return blocker.split(",")[0] if blocker.startswith("case ") else blocker


def _group(
    evidence: Evidence, key: tuple[str, bool, tuple[str, ...]], rows: list[tuple[int, float, float, float]]
) -> ClosedGroup:
    place, core, names = key
    states = sum(r[0] for r in rows)
    worst = max(r[1] for r in rows)
    seconds, volts = min(r[2] for r in rows), min(r[3] for r in rows)
    blockers = {f.value: name for f, name in zip(evidence.ladders, names, strict=True)}
    needs = []
    if np.isfinite(seconds):
        needs.append(f"{seconds:.2f} s faster")
    if np.isfinite(volts):
        needs.append(f"{volts:.1f} V more sensitive" if volts >= 0.1 else "less than 0.1 V more sensitive")
    short = f"; nearest setting would have to be {' or '.join(needs)}" if needs else ""
    blocked = "; ".join(f"{f}: {_short(name)}" for f, name in blockers.items())
    those = f"{states} scenarios" if states > 1 else "1 scenario"
    sentence = f"break at {place}: {those} up to {worst:.0f} V that no secure setting clears ({blocked}){short}"
    return ClosedGroup(
        blockers,
        states,
        core,
        place,
        worst,
        volts if np.isfinite(volts) else None,
        seconds if np.isfinite(seconds) else None,
        sentence,
    )
