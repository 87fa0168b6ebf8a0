"""The test schedule: what to inject for each active stage, what to expect, and the accept band."""

import numpy as np

from relaycfg.model.device import Function
from relaycfg.model.geometry import ComplexArray
from relaycfg.model.results import TestPoint
from relaycfg.relay import measuring_s, severities
from relaycfg.study.evidence import Evidence
from relaycfg.study.stages import ActiveStage


def test_schedule(evidence: Evidence, stages: tuple[ActiveStage, ...]) -> tuple[TestPoint, ...]:
    """Two points a stage and line: the pickup, then the time; accept bands from the declared errors.

    Timing is tested with the quantity beyond the pickup by the site's yardstick, and at least by twice its error.
    """
    return tuple(
        point
        for active in stages
        for line in _lines(evidence, active)
        for point in (_pickup_point(evidence, active, stages, line), _time_point(evidence, active, stages, line))
    )


def _lines(evidence: Evidence, active: ActiveStage) -> tuple[str, ...]:
    geometry = evidence.site.supply.geometry
    if active.function in (Function.DISPLACEMENT, Function.UNBALANCE):
        return (geometry.names[0],)
    return geometry.pair_names if active.ladder.element.quantity == "l-l" else geometry.names


def _pickup_point(evidence: Evidence, active: ActiveStage, stages: tuple[ActiveStage, ...], line: str) -> TestPoint:
    stage, element = active.stage, active.ladder.element
    error = float(element.accuracy.pickup_error(stage.pickup))
    unit = _unit(active)
    own = f" {element.quantity.upper()}" if active.function is Function.DISPLACEMENT else ""
    return TestPoint(
        stage.label,
        line,
        _injection(evidence, active, line, stage.pickup, "slowly"),
        f"picks up at {stage.pickup:.1f} {unit}{own}",
        stage.pickup - error,
        stage.pickup + error,
        unit,
        _masking(evidence, active, stages, stage.pickup),
    )


def _time_point(evidence: Evidence, active: ActiveStage, stages: tuple[ActiveStage, ...], line: str) -> TestPoint:
    stage, device = active.stage, evidence.relay.device
    frequency = evidence.site.supply.frequency_hz
    measuring = measuring_s(device, frequency) + evidence.relay.output_s
    timing = float(active.ladder.element.accuracy.time_error(stage.delay_s))
    beyond = evidence.site.judgement.test_beyond
    sure = 2 * float(active.ladder.element.accuracy.pickup_error(stage.pickup))
    if stage.function is Function.UNDERVOLTAGE:
        level = max(0.0, min(stage.pickup / beyond, stage.pickup - sure))
    else:
        level = max(stage.pickup * beyond, stage.pickup + sure)
    return TestPoint(
        stage.label,
        line,
        _injection(evidence, active, line, level, "in one step"),
        f"output after {stage.delay_s:g} s",
        max(0.0, stage.delay_s - timing),
        stage.delay_s + timing + measuring,
        "s",
        _masking(evidence, active, stages, level),
    )


def _unit(active: ActiveStage) -> str:
    return "%" if active.function is Function.UNBALANCE else "V"


def _masking(evidence: Evidence, active: ActiveStage, stages: tuple[ActiveStage, ...], level: float) -> str:
    """The other stages that pick up at the injected volts: disabled for the test, and put back."""
    tap = _tap_at(evidence, active, level)
    geometry, from_ = evidence.site.supply.geometry, evidence.relay.device.displacement_from
    others = [
        other.stage.label
        for other in stages
        if other is not active
        and severities(other.ladder.element, geometry, tap, from_).max() >= other.sensitive.pickup
    ]
    return f"disable {', '.join(others)}" if others else "none"


def _tap_at(evidence: Evidence, active: ActiveStage, level: float) -> ComplexArray:
    """The injected tap [lines + 1] at which the stage's own quantity stands at ``level``, on the first line."""
    geometry, nominal = evidence.site.supply.geometry, evidence.site.supply.nominal_v
    tap: ComplexArray = np.append(nominal * geometry.phasors, 0.0)
    quantity = active.ladder.element.quantity
    if quantity == "l-l":
        tap[:-1] *= level / (nominal * geometry.line_to_line_ratio)
    elif active.function is Function.UNBALANCE:
        low, high = 0.0, 1.0
        for _ in range(40):
            middle = (low + high) / 2
            tap[0] = middle * nominal * geometry.phasors[0]
            reached = severities(active.ladder.element, geometry, tap, "l-n").max() >= level
            low, high = (middle, high) if reached else (low, middle)
    elif active.function is Function.DISPLACEMENT:
        if evidence.relay.device.displacement_from == "n-to-earth":
            tap[-1] = level
            return tap
        change = level if quantity == "3v0" else len(geometry.names) * level
        if change <= nominal:
            tap[0] -= change * geometry.phasors[0]
        else:
            tap[:-1] = 0
            tap[0] = change
    else:
        tap[0] = level * geometry.phasors[0]
    return tap


def _injection(evidence: Evidence, active: ActiveStage, line: str, level: float, how: str) -> str:
    """What to do at the test set, in words; the volts are those of ``_tap_at``."""
    nominal, geometry = evidence.site.supply.nominal_v, evidence.site.supply.geometry
    tap = np.abs(_tap_at(evidence, active, level))
    if active.ladder.element.quantity == "l-l":
        return f"all lines from {nominal:g} V {how} to {tap[0]:.1f} V, {level:.1f} V between lines"
    if active.function is Function.DISPLACEMENT and evidence.relay.device.displacement_from == "n-to-earth":
        earth = "PE" if evidence.relay.earth_reference == "local PE" else "the terminal of its own electrode"
        return f"N against {earth} from 0 V {how} to {tap[-1]:.1f} V"
    if len(geometry.names) > 1 and tap[1] == 0:
        return f"other lines at 0 V, {line} from 0 V {how} to {tap[0]:.1f} V"
    return f"all lines {nominal:g} V, then {line} {how} to {tap[0]:.1f} V"
