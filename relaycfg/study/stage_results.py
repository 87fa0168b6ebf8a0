"""Each stage as printed: figures on every scale, bounds with their arithmetic, margins, and the reason."""

from relaycfg.model.device import Function
from relaycfg.model.geometry import BoolArray
from relaycfg.model.results import Bound, Margins, StageResult
from relaycfg.model.settings import Settings, Stage
from relaycfg.study.coverage import cover_of
from relaycfg.study.evidence import Evidence
from relaycfg.study.margins import Dependability, Security, dependability
from relaycfg.study.stages import ActiveStage

SAME = 1e-6


def stage_results(
    evidence: Evidence,
    settings: Settings,
    active: tuple[ActiveStage, ...],
    securities: dict[str, Security],
    wanted: tuple[BoolArray, ...],
    off_reason: dict[Function, str],
) -> tuple[StageResult, ...]:
    """One result a stage in the order of the settings; ``off_reason`` says why an element's other stages are off."""
    by_label = {a.stage.label: a for a in active}
    return tuple(
        _on(evidence, by_label[s.label], active, securities[s.label], wanted)
        if s.label in by_label
        else _off(evidence, s, off_reason.get(s.function, "as set"))
        for s in settings.stages
    )


def _off(evidence: Evidence, stage: Stage, reason: str) -> StageResult:
    unit = "%" if stage.function is Function.UNBALANCE else "V"
    if stage.on and stage.action == "alarm":
        reason = "signals only, disconnects nothing"
    elif stage.on:
        reason = evidence.relay.device.why_off(stage.function) or "the device does not have this element"
    return StageResult(stage, None, _base(evidence), None, unit, 0.0, 0.0, 0.0, True, (), None, None, reason)


def _on(
    evidence: Evidence,
    active: ActiveStage,
    all_active: tuple[ActiveStage, ...],
    secure: Security,
    wanted: tuple[BoolArray, ...],
) -> StageResult:
    stage, element = active.stage, active.ladder.element
    others = tuple(a for a in all_active if a is not active)
    depend = dependability(active, others, evidence, wanted)
    percent = cover_of(evidence, "", (active,)).cleared_percent
    unbalance = stage.function is Function.UNBALANCE
    error = float(element.accuracy.pickup_error(stage.pickup))
    return StageResult(
        stage,
        None if unbalance else 100 * stage.pickup / evidence.site.supply.nominal_v,
        _base(evidence),
        element.marked(stage.pickup),
        "%" if unbalance or element.unit == "percent" else "V",
        stage.pickup - error,
        stage.pickup + error,
        active.clearing_s,
        secure.secure,
        _bounds(active, secure, depend),
        Margins(
            secure.volts,
            secure.seconds,
            secure.units,
            secure.volts_case,
            depend.volts,
            depend.seconds,
            depend.units,
            depend.state,
        ),
        percent,
        _reason(active, secure, percent),
    )


def _base(evidence: Evidence) -> str:
    return f"{evidence.site.supply.nominal_v:g} V line to neutral"


def _bounds(active: ActiveStage, secure: Security, depend: Dependability) -> tuple[Bound, ...]:
    stage, element, runs = active.stage, active.ladder.element, active.ladder.runs
    mirrored = stage.function is Function.UNDERVOLTAGE
    unit = "%" if stage.function is Function.UNBALANCE else "V"
    sign = -1.0 if mirrored else 1.0
    error = float(element.accuracy.pickup_error(stage.pickup))
    timing = float(element.accuracy.time_error(stage.delay_s))
    bounds = []
    if secure.volts is not None and secure.limit is not None:
        limit = sign * secure.limit
        standing = sign * runs.standing
        if abs(limit - standing) < SAME:
            origin = f"standing {standing:.1f} {unit}"
        elif abs(limit - standing / stage.dropout_ratio) < SAME:
            origin = f"standing {standing:.1f} {unit} / drop-out {stage.dropout_ratio:g} = {limit:.1f} {unit}"
        else:
            origin = f"the case reaches {limit:.1f} {unit} for longer than the delay"
        side = "+" if mirrored else "-"
        at = f"{stage.pickup:.1f} {side} error {error:.1f} = {sign * active.sensitive.pickup:.1f} {unit}"
        bounds.append(
            Bound(
                "pickup",
                "not above" if mirrored else "not below",
                stage.pickup - sign * secure.volts,
                unit,
                secure.volts_case,
                f"{origin}; most sensitive {at}",
                _source(secure.volts_case),
            )
        )
    if secure.seconds is not None:
        reach = active.sensitive.delay_s - secure.seconds
        bounds.append(
            Bound(
                "delay",
                "not below",
                reach + timing,
                "s",
                secure.seconds_case,
                f"stays picked up {reach:.3f} s with {runs.lag_s:.3f} s of window and refresh, "
                f"+ timing error {timing:.3f} s",
                _source(secure.seconds_case),
            )
        )
    if depend.volts is not None and depend.seconds is not None:
        surely = sign * active.insensitive.pickup
        side = "-" if mirrored else "+"
        bounds.append(
            Bound(
                "pickup",
                "not below" if mirrored else "not above",
                stage.pickup + sign * depend.volts,
                unit,
                depend.state,
                f"least sensitive {stage.pickup:.1f} {side} error {error:.1f} = {surely:.1f} {unit}; "
                f"the state shows {surely + sign * depend.room:.1f} {unit}",
                "network",
            )
        )
        deadline = depend.seconds + active.clearing_s
        lag = active.clearing_s - stage.delay_s - timing
        bounds.append(
            Bound(
                "delay",
                "not above",
                deadline - lag - timing,
                "s",
                depend.state,
                f"deadline {deadline:.3f} s - measuring, output, coil and breaker {lag:.3f} s "
                f"- timing error {timing:.3f} s",
                "equipment withstand",
            )
        )
    return tuple(bounds)


def _source(case: str) -> str:
    return "no case" if case.startswith("no case") else f"table of cases, {case.split(',')[0]}"


def _reason(active: ActiveStage, secure: Security, percent: float | None) -> str:
    stage = active.stage
    unit = "%" if stage.function is Function.UNBALANCE else "V"
    parts = []
    if not secure.secure:
        parts.append(f"trips in {secure.seconds_case}")
    else:
        if secure.volts is not None:
            parts.append(f"{stage.pickup:.1f} {unit} is {secure.volts:.1f} {unit} clear of {secure.volts_case}")
        if secure.seconds is not None:
            parts.append(f"{stage.delay_s:g} s outlasts {secure.seconds_case} by {secure.seconds:.3f} s")
    if percent is not None:
        parts.append(f"alone it clears {percent:.1f} % of the harmful states in time")
    return "; ".join(parts) or "no case limits it and no modelled state harms anything"
