"""Every case played through the step-by-step machine: what operates, what was expected, how far it is from failing."""

from dataclasses import dataclass
from typing import Literal

import numpy as np

from relaycfg.model.cases import Case
from relaycfg.model.device import Function
from relaycfg.model.geometry import FloatArray
from relaycfg.model.results import CaseResult, Operated
from relaycfg.model.settings import Settings
from relaycfg.relay import measuring_s, play, run
from relaycfg.study.evidence import Evidence
from relaycfg.study.margins import Security, as_set
from relaycfg.study.ride_through import stack
from relaycfg.study.stages import ActiveStage

BEFORE_S = 10.0


@dataclass(frozen=True)
class _Play:
    """Trip instants [courses] of one stage in one case, counted from the start of the case."""

    active: ActiveStage
    trip_s: FloatArray


def case_results(
    evidence: Evidence, settings: Settings, stages: tuple[ActiveStage, ...], securities: dict[str, Security]
) -> tuple[CaseResult, ...]:
    """One result a case; hold cases at the stages' most sensitive, cases that must trip at their least sensitive."""
    return tuple(_result(evidence, settings, case, stages, securities) for case in evidence.cases)


def _result(
    evidence: Evidence, settings: Settings, case: Case, stages: tuple[ActiveStage, ...], securities: dict[str, Security]
) -> CaseResult:
    plays = [_play(evidence, case, active, settings) for active in stages]
    tripped = sorted((p for p in plays if np.isfinite(p.trip_s).any()), key=lambda p: float(p.trip_s.min()))
    outcome: Literal["hold", "trip"] = "trip" if tripped else "hold"
    volts = np.concatenate([np.abs(s.tap[:-1])[None] for c in case.courses for s in c.segments])
    geometry = evidence.site.supply.geometry
    v0 = max(float(abs(geometry.displacement(s.tap[:-1]))) for c in case.courses for s in c.segments)
    by_volts, by_seconds = _margins(evidence, case, stages, securities)
    late = min((float(p.trip_s.min()) for p in plays), default=np.inf) > case.deadline_s
    return CaseResult(
        case.number,
        case.name,
        case.expect,
        outcome,
        case.expect == "either" or (case.expect == outcome and not late),
        case.figures,
        case.source,
        case.status,
        tuple(_operated(case, p) for p in tripped),
        float(volts.max()),
        float(volts.min()),
        v0,
        by_volts[0],
        by_seconds[0],
        by_volts[1],
        by_seconds[1],
    )


def _play(evidence: Evidence, case: Case, active: ActiveStage, settings: Settings) -> _Play:
    geometry, device = evidence.site.supply.geometry, evidence.relay.device
    frequency = evidence.site.supply.frequency_hz
    if case.expect == "trip":
        return _Play(active, _latest(evidence, case, active, settings))
    band = active.sensitive
    severity, seconds = stack(list(case.courses), active.ladder.element, geometry, device.displacement_from)
    lead_s = 0.0
    if not case.standing:
        severity, seconds = _embedded(active, severity, seconds)
        lead_s = BEFORE_S
    trip = run(
        severity,
        seconds,
        band.pickup,
        band.dropout,
        band.delay_s,
        active.stage.reset,
        active.stage.hold_s,
        device.timers,
        active.stage.phases,
        measuring_s(device, frequency),
    )
    return _Play(active, trip - lead_s)


def _latest(evidence: Evidence, case: Case, active: ActiveStage, settings: Settings) -> FloatArray:
    """Latest opening [courses] of one stage in a case that must trip, start-up inhibits included."""
    supply = evidence.site.supply
    found = []
    for course in case.courses:
        instants = play(
            np.stack([s.tap for s in course.segments]),
            np.array([s.duration_s for s in course.segments]),
            evidence.relay.device,
            settings,
            supply.frequency_hz,
            evidence.relay,
            "insensitive",
            supply.geometry,
            supply.nominal_v,
        )
        found.append(instants[active.stage.label] - case.begins_s)
    return np.array(found)


def _embedded(active: ActiveStage, severity: FloatArray, seconds: FloatArray) -> tuple[FloatArray, FloatArray]:
    """The courses between the worst standing severity, unless that alone picks the stage up (its own case says so)."""
    standing = active.ladder.runs.standing
    level = standing if standing < active.sensitive.pickup else -np.inf
    courses, _, channels = severity.shape
    around = np.full((courses, 1, channels), level)
    before = np.full((courses, 1), BEFORE_S)
    after = np.full((courses, 1), np.inf)
    return (
        np.concatenate([around, severity, around], axis=1),
        np.concatenate([before, seconds, after], axis=1),
    )


def _operated(case: Case, play: _Play) -> Operated:
    course = int(np.argmin(play.trip_s))
    variant = case.courses[course].label if len(case.courses) > 1 else ""
    return Operated(play.active.stage.label, float(play.trip_s[course]), variant)


def _margins(
    evidence: Evidence, case: Case, stages: tuple[ActiveStage, ...], securities: dict[str, Security]
) -> tuple[tuple[float | None, str], tuple[float | None, str]]:
    """Least margin of the case over the stages in volts and in seconds, each with its stage; 47 counts in points."""
    if case.expect != "hold":
        return (None, ""), (None, "")
    volts: list[tuple[float | None, str]] = []
    seconds: list[tuple[float | None, str]] = []
    for active in stages:
        if active.function is Function.UNBALANCE:
            continue
        label = active.stage.label
        if case.standing:
            volts.append((_standing_margin(evidence, case, active), label))
            continue
        by_volts, by_seconds = securities[label].by_case.get(case.number, (None, None))
        if by_volts is not None:
            volts.append((by_volts, label))
        if by_seconds is not None:
            seconds.append((by_seconds, label))
    least_v, least_s = _least(volts), _least(seconds)
    if least_s[0] is not None and not np.isfinite(least_s[0]):
        least_s = (None, f"{least_s[1]}, never resets")
    return least_v, least_s


def _least(margins: list[tuple[float | None, str]]) -> tuple[float | None, str]:
    return min(margins, key=lambda m: np.inf if m[0] is None else m[0], default=(None, ""))


def _standing_margin(evidence: Evidence, case: Case, active: ActiveStage) -> float:
    """Volts until the standing value picks the stage up, or keeps it from dropping out."""
    geometry, from_ = evidence.site.supply.geometry, evidence.relay.device.displacement_from
    worst = float(stack(list(case.courses), active.ladder.element, geometry, from_)[0].max())
    pickup = active.sensitive.pickup
    return as_set(active, min(pickup - worst, pickup - worst / active.stage.dropout_ratio))
