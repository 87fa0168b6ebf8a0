"""How far each stage is from failing a must-hold case, and from missing a state that depends on it."""

from dataclasses import dataclass, replace

import numpy as np

from relaycfg.model.device import Function
from relaycfg.model.geometry import BoolArray, FloatArray
from relaycfg.relay import pickup_at_least_sensitive, pickup_at_most_sensitive
from relaycfg.relay.machine import GRAIN_S
from relaycfg.study.evidence import Evidence
from relaycfg.study.ladder import UNIT_TIME
from relaycfg.study.ride_through import STANDING, Runs, behind_name, ride_through, run_lengths
from relaycfg.study.stages import ActiveStage, clears

MOST_UNITS = 20.0
UNIT_STEPS = 401
HAIR_V = 1e-9
SAME = 1e-6


@dataclass(frozen=True)
class Security:
    """Distance of one stage to its nearest failing must-hold case, None where no case limits.

    ``volts``: by how much the pickup, as set, may move towards normal volts at the same delay (negative: by how much
    it is too sensitive). ``seconds``: by how much the delay may shrink at the same pickup (None also where a case
    never resets). ``limit`` is the severity [V or points] that the most sensitive end must stay beyond. ``by_case``
    holds each passing case's own volts and seconds.
    """

    secure: bool
    volts: float | None
    seconds: float | None
    units: float | None
    limit: float | None
    volts_case: str
    seconds_case: str
    by_case: dict[int, tuple[float | None, float | None]]


def security(active: ActiveStage) -> Security:
    """Security of a stage at its most sensitive, against every hold case."""
    runs, band = active.ladder.runs, active.sensitive
    shift = _failing_shift(active, runs.only(runs.front))
    worst = int(runs.front[np.argmin(shift)]) if len(shift) else STANDING
    standing_shift = band.pickup - runs.standing
    least = min(float(shift.min(initial=np.inf)), standing_shift)
    volts_case = runs.standing_name if standing_shift <= least else behind_name(runs, worst)
    ratio = active.stage.dropout_ratio
    if abs(least - (band.pickup - runs.standing / ratio)) < SAME and ratio != 1:
        # The course itself only starts it; what fails is that the standing value lies inside the drop-out.
        volts_case = f"{runs.standing_name}: it would not drop out again"
    now = ride_through(runs, np.array([band.pickup]), np.array([band.dropout]), active.hold_s)
    reach = float(now.seconds[0])
    found, holds = bool(np.isfinite(least)), band.delay_s > reach + GRAIN_S
    return Security(
        holds,
        as_set(active, least) if found else None,
        _finite(band.delay_s - reach) if reach > 0 else None,
        _units(active) if holds else None,
        band.pickup - least if found else None,
        volts_case if found else "no case limits it",
        behind_name(runs, int(now.behind[0])),
        _by_case(active),
    )


def as_set(active: ActiveStage, shift: float) -> float:
    """A shift of the most sensitive end as a shift of the pickup as set, whose error band moves with it."""
    stage, element = active.stage, active.ladder.element
    limit = pickup_at_most_sensitive(element, active.sensitive.pickup - shift)
    return limit - stage.pickup if stage.function is Function.UNDERVOLTAGE else stage.pickup - limit


def _by_case(active: ActiveStage) -> dict[int, tuple[float | None, float | None]]:
    """Each passing case on its own: what stands before and after it is another case's matter."""
    runs, band = replace(active.ladder.runs, standing=-np.inf), active.sensitive
    numbers = np.array(runs.cases)
    found: dict[int, tuple[float | None, float | None]] = {}
    for number in dict.fromkeys(runs.cases):
        mine = runs.only(np.flatnonzero(numbers == number))
        here = run_lengths(mine, np.array([band.pickup]), np.array([band.dropout]), active.hold_s)
        least, stays = float(_failing_shift(active, mine).min()), float(here.max())
        found[number] = (
            as_set(active, least) if np.isfinite(least) else None,
            band.delay_s - stays if stays > 0 else None,
        )
    return found


def _failing_shift(active: ActiveStage, runs: Runs) -> FloatArray:
    """By how much the most sensitive end may move towards normal volts before each course trips it, inf: never.

    Only severities of the course itself can change anything, so the shifts to try are exact: those that bring the
    pickup, or the drop-out, onto one of them.
    """
    band, ratio = active.sensitive, active.stage.dropout_ratio
    levels = np.unique(np.append(runs.severity, runs.standing))
    levels = levels[np.isfinite(levels)]
    shifts = np.unique(np.concatenate([band.pickup - levels, band.pickup - levels / ratio]))
    pickup = band.pickup - shifts - HAIR_V
    fails = run_lengths(runs, pickup, pickup * ratio, active.hold_s) + GRAIN_S >= band.delay_s
    return np.where(fails.any(axis=1), shifts[np.argmax(fails, axis=1)], np.inf)


def _units(active: ActiveStage) -> float | None:
    units = np.linspace(0, MOST_UNITS, UNIT_STEPS)
    pickup = active.sensitive.pickup - units * active.ladder.unit
    reach = ride_through(active.ladder.runs, pickup, pickup * active.stage.dropout_ratio, active.hold_s).seconds
    fails = active.sensitive.delay_s / UNIT_TIME**units <= reach + GRAIN_S
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
    room: float = 0.0
    """Severity between the least sensitive end and that state."""


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
    limit = pickup_at_least_sensitive(active.ladder.element, active.insensitive.pickup + volts)
    return Dependability(
        abs(limit - active.stage.pickup), seconds, float(min(volts / active.ladder.unit, in_time)), name, volts
    )


def _finite(value: float) -> float | None:
    return value if np.isfinite(value) else None
