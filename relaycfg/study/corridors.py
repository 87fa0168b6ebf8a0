"""The corridor of each element as curves: R below, W above, the cases as dots."""

import numpy as np

from relaycfg.model.device import Function
from relaycfg.model.results import Corridor, CurveStep
from relaycfg.study.choice import harmful_states
from relaycfg.study.evidence import Evidence
from relaycfg.study.ladder import Ladder
from relaycfg.study.ride_through import behind_name, run_lengths


def corridors(evidence: Evidence) -> tuple[Corridor, ...]:
    """One corridor an element of the device."""
    return tuple(_corridor(evidence, ladder) for ladder in evidence.ladders.values())


def _corridor(evidence: Evidence, ladder: Ladder) -> Corridor:
    function = ladder.element.function
    sign = -1.0 if function is Function.UNDERVOLTAGE else 1.0
    return Corridor(
        function,
        "%" if function is Function.UNBALANCE else "V",
        _ride_through(ladder),
        _withstand(evidence, ladder),
        _dots(ladder, sign),
        sign * ladder.runs.standing,
        ladder.runs.standing_name,
    )


def _ride_through(ladder: Ladder) -> tuple[CurveStep, ...]:
    """R at each settable pickup, one step wherever the seconds or the case behind them change."""
    reach = ladder.ride_through()
    steps: list[CurveStep] = []
    for pickup, seconds, behind in zip(ladder.pickups, reach.seconds, reach.behind, strict=True):
        value = float(seconds) if np.isfinite(seconds) else None
        name = behind_name(ladder.runs, int(behind))
        if not steps or (steps[-1].seconds, steps[-1].behind) != (value, name):
            steps.append(CurveStep(float(pickup), value, name))
    return tuple(steps)


def _withstand(evidence: Evidence, ladder: Ladder) -> tuple[CurveStep, ...]:
    """Time left for the delay at each pickup: least deadline of the reachable states at or below that severity.

    Reachable: some secure setting of this element alone clears the state. States that none reaches would close
    every corridor; they are counted among the never cleared.
    """
    clearing = ladder.clearing[ladder.fastest()]
    lag_s = float(ladder.clearing_of(np.array(0.0)))
    found: dict[float, tuple[int, str]] = {}
    for scenario, wanted in zip(evidence.scenarios, harmful_states(evidence.scenarios), strict=True):
        last = np.searchsorted(ladder.insensitive, scenario.severity[ladder.element.function], side="right") - 1
        reachable = wanted & (last >= 0) & (clearing[np.maximum(last, 0)] <= scenario.deadline_s)
        for limit in np.unique(scenario.deadline_s[reachable]):
            mine = reachable & (scenario.deadline_s == limit)
            state = int(np.argmin(np.where(mine, last, len(clearing))))
            if limit not in found or last[state] < found[limit][0]:
                board = evidence.network.boards[scenario.highest_board[state]]
                where = f"break at {scenario.place}, {scenario.highest_v[state]:.0f} V at {board}"
                found[limit] = (int(last[state]), f"{where}, supply {scenario.level}, {scenario.model}")
    steps: list[CurveStep] = []
    for limit, (rung, name) in sorted(found.items(), key=lambda item: (item[1][0], item[0])):
        if not steps or steps[-1].seconds is None or limit - lag_s < steps[-1].seconds:
            steps.append(CurveStep(float(ladder.pickups[rung]), float(limit) - lag_s, name))
    return tuple(steps)


def _dots(ladder: Ladder, sign: float) -> tuple[CurveStep, ...]:
    """Each passing case that goes beyond what stands, at its extreme, with the time it stays there (with window)."""
    runs = ladder.runs
    peak = runs.severity.max(axis=(1, 2))
    seconds = np.diagonal(run_lengths(runs, peak, peak * ladder.dropout_ratio))
    dots: dict[int, CurveStep] = {}
    for k, number in enumerate(runs.cases):
        best = dots.get(number)
        if peak[k] <= runs.standing:
            continue
        if best is None or peak[k] > sign * best.pickup:
            stays = float(seconds[k]) if np.isfinite(seconds[k]) else None
            dots[number] = CurveStep(sign * float(peak[k]), stays, runs.case_names[number], number)
    return tuple(dots.values())
