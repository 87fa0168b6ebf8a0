"""How far each stage is from failing a must-hold case, and from missing a state that depends on it."""

from dataclasses import dataclass

import numpy as np

from relaycfg.model.geometry import BoolArray, FloatArray
from relaycfg.study.evidence import Evidence
from relaycfg.study.ladder import UNIT_TIME
from relaycfg.study.ride_through import STANDING, behind_name, ride_through, run_lengths
from relaycfg.study.stages import ActiveStage, clears

MOST_UNITS = 20.0
UNIT_STEPS = 401
HAIR_V = 1e-9
SAME = 1e-6


@dataclass(frozen=True)
class Security:
    """Distance of one stage to its nearest failing must-hold case, None where no case limits.

    ``volts`` by which the pickup may move towards normal volts at the same delay (negative: by how much it is too
    sensitive), ``seconds`` by which the delay may shrink at the same pickup. ``by_case`` holds (volts, seconds) a
    case number.
    """

    secure: bool
    volts: float | None
    seconds: float | None
    units: float | None
    volts_case: str
    seconds_case: str
    by_case: dict[int, tuple[float | None, float | None]]


def security(active: ActiveStage) -> Security:
    """Security of a stage at its most sensitive, against every hold case."""
    runs, band, ratio = active.ladder.runs, active.sensitive, active.stage.dropout_ratio
    hold_s = active.stage.hold_s if active.stage.reset == "held" else 0.0
    here = run_lengths(runs, np.array([band.pickup]), np.array([band.dropout]), hold_s)[:, 0]
    shift = _failing_shift(active, hold_s)
    worst = int(np.argmin(shift)) if len(shift) else STANDING
    standing_shift = _standing_shift(active)
    volts = min(float(shift[worst]) if worst != STANDING else np.inf, standing_shift)
    volts_case = runs.standing_name if standing_shift <= volts else behind_name(runs, worst)
    if abs(volts - (band.pickup - runs.standing / ratio)) < SAME and ratio != 1:
        # The course itself only starts it; what fails is that the standing value lies inside the drop-out.
        volts_case = f"{runs.standing_name}: it would not drop out again"
    now = ride_through(runs, np.array([band.pickup]), np.array([band.pickup * ratio]), hold_s)
    reach = float(now.seconds[0])
    seconds = band.delay_s - reach
    by_case: dict[int, tuple[float | None, float | None]] = {}
    for number in dict.fromkeys(runs.cases):
        mine = np.array([c == number for c in runs.cases])
        stays = float(here[mine].max())
        by_case[number] = (_finite(float(shift[mine].min())), _finite(band.delay_s - stays) if stays > 0 else None)
    return Security(
        band.delay_s > reach,
        _finite(volts),
        _finite(seconds),
        _units(active, hold_s),
        volts_case if np.isfinite(volts) else "no case limits it",
        behind_name(runs, int(now.behind[0])),
        by_case,
    )


def _failing_shift(active: ActiveStage, hold_s: float) -> FloatArray:
    """By how much the pickup may move towards normal volts before each course trips it [courses], inf: never.

    Only severities of the course itself can change anything, so the shifts to try are exact: those that bring the
    pickup, or the drop-out, onto one of them.
    """
    runs, band, ratio = active.ladder.runs, active.sensitive, active.stage.dropout_ratio
    levels = np.unique(np.append(runs.severity, runs.standing))
    shifts = np.unique(np.concatenate([band.pickup - levels, band.pickup - levels / ratio]))
    pickup = band.pickup - shifts - HAIR_V
    fails = run_lengths(runs, pickup, pickup * ratio, hold_s) >= band.delay_s
    return np.where(fails.any(axis=1), shifts[np.argmax(fails, axis=1)], np.inf)


def _standing_shift(active: ActiveStage) -> float:
    """The shift at which the standing severity itself picks the stage up."""
    return float(active.sensitive.pickup - active.ladder.runs.standing)


def _units(active: ActiveStage, hold_s: float) -> float | None:
    units = np.linspace(0, MOST_UNITS, UNIT_STEPS)
    pickup = active.sensitive.pickup - units * active.ladder.unit
    reach = ride_through(active.ladder.runs, pickup, pickup * active.stage.dropout_ratio, hold_s).seconds
    fails = active.sensitive.delay_s / UNIT_TIME**units <= reach
    if not fails.any():
        return None
    first = int(np.argmax(fails))
    return float(units[first - 1]) if first else 0.0


@dataclass(frozen=True)
class Dependability:
    """Distance of one stage to the nearest core state that only it clears; None where no core state needs it."""

    volts: float | None
    seconds: float | None
    units: float | None
    state: str


def dependability(
    active: ActiveStage, others: tuple[ActiveStage, ...], evidence: Evidence, wanted: tuple[BoolArray, ...]
) -> Dependability:
    """Over the core states of ``wanted`` that this stage clears in time and no other stage does."""
    volts, seconds, name = np.inf, np.inf, ""
    for scenario, want in zip(evidence.scenarios, wanted, strict=True):
        alone = want & scenario.core & clears(active, scenario, evidence)
        for other in others:
            if not alone.any():
                break
            alone &= ~clears(other, scenario, evidence)
        if alone.any():
            over = np.where(alone, active.severity(scenario, evidence) - active.insensitive.pickup, np.inf)
            nearest = int(np.argmin(over))
            if over[nearest] < volts:
                volts = float(over[nearest])
                name = f"break at {scenario.place}, sample {nearest}, supply {scenario.level}, {scenario.model}"
            seconds = min(seconds, float((scenario.deadline_s[alone] - active.clearing_s).min()))
    if not name:
        return Dependability(None, None, None, "no core state depends on this stage alone")
    in_time = np.log((seconds + active.clearing_s) / active.clearing_s) / np.log(UNIT_TIME)
    return Dependability(volts, seconds, float(min(volts / active.ladder.unit, in_time)), name)


def _finite(value: float) -> float | None:
    return value if np.isfinite(value) else None
