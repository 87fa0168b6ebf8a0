"""The test schedule: what to inject for each active stage, what to expect, and the accept band."""

import numpy as np

from relaycfg.model.device import Function
from relaycfg.model.geometry import ComplexArray
from relaycfg.model.results import TestPoint
from relaycfg.relay import refresh_s, severities, window_s
from relaycfg.study.evidence import Evidence
from relaycfg.study.stages import ActiveStage

BEYOND = 1.1
"""Timing is tested with the quantity 10 percent beyond the pickup."""


def test_schedule(evidence: Evidence, stages: tuple[ActiveStage, ...]) -> tuple[TestPoint, ...]:
    """Two points a stage and line: the pickup, then the time; accept bands from the declared errors."""
    points: list[TestPoint] = []
    for active in stages:
        masking = _masking(evidence, active, stages)
        for line in _lines(evidence, active):
            points.append(_pickup_point(evidence, active, line, masking))
            points.append(_time_point(evidence, active, line, masking))
    return tuple(points)


def _masking(evidence: Evidence, active: ActiveStage, stages: tuple[ActiveStage, ...]) -> str:
    """The other stages that pick up at the injected volts: disabled for the test, and put back."""
    tap = _injected_tap(evidence, active)
    geometry, from_ = evidence.site.supply.geometry, evidence.relay.device.displacement_from
    others = [
        other.stage.label
        for other in stages
        if other is not active
        and severities(other.ladder.element, geometry, tap, from_).max() >= other.sensitive.pickup
    ]
    return f"disable {', '.join(others)}" if others else "none"


def _injected_tap(evidence: Evidence, active: ActiveStage) -> ComplexArray:
    """The tap [lines + 1] at which the stage under test just picks up on the first line."""
    geometry, nominal = evidence.site.supply.geometry, evidence.site.supply.nominal_v
    lines = len(geometry.names)
    tap: ComplexArray = np.append(nominal * geometry.phasors, 0.0)
    pickup, quantity = active.stage.pickup, active.ladder.element.quantity
    if quantity == "l-l":
        tap[:-1] *= pickup / (nominal * geometry.line_to_line_ratio)
    elif active.function is Function.UNBALANCE:
        low, high = 0.0, 1.0
        for _ in range(40):
            middle = (low + high) / 2
            tap[0] = middle * nominal * geometry.phasors[0]
            reached = severities(active.ladder.element, geometry, tap, "l-n").max() >= pickup
            low, high = (middle, high) if reached else (low, middle)
    elif active.function is Function.DISPLACEMENT:
        if evidence.relay.device.displacement_from == "n-to-earth":
            tap[-1] = pickup
            return tap
        change = lines * pickup / (3.0 if quantity == "3v0" else 1.0)
        if change <= nominal:
            tap[0] -= change * geometry.phasors[0]
        else:
            tap[:-1] = 0
            tap[0] = change
    else:
        tap[0] = pickup * geometry.phasors[0]
    return tap


def _lines(evidence: Evidence, active: ActiveStage) -> tuple[str, ...]:
    geometry = evidence.site.supply.geometry
    if active.function in (Function.DISPLACEMENT, Function.UNBALANCE):
        return (geometry.names[0],)
    return geometry.pair_names if active.ladder.element.quantity == "l-l" else geometry.names


def _pickup_point(evidence: Evidence, active: ActiveStage, line: str, masking: str) -> TestPoint:
    stage = active.stage
    error = float(active.ladder.element.accuracy.pickup_error(stage.pickup))
    inject, factor, unit = _injection(evidence, active, line)
    return TestPoint(
        stage.label,
        line,
        inject,
        f"picks up at {stage.pickup:.1f} {unit}{factor}",
        stage.pickup - error,
        stage.pickup + error,
        unit,
        masking,
    )


def _time_point(evidence: Evidence, active: ActiveStage, line: str, masking: str) -> TestPoint:
    stage, device = active.stage, evidence.relay.device
    element = active.ladder.element
    frequency = evidence.site.supply.frequency_hz
    measuring = window_s(device, frequency) + refresh_s(device, frequency) + evidence.relay.output_s
    timing = float(element.accuracy.time_error(stage.delay_s))
    level = stage.pickup / BEYOND if stage.function is Function.UNDERVOLTAGE else stage.pickup * BEYOND
    unit = "%" if stage.function is Function.UNBALANCE else "V"
    return TestPoint(
        stage.label,
        line,
        f"step from {evidence.site.supply.nominal_v:g} V to {level:.1f} {unit} of its own quantity",
        f"output after {stage.delay_s:g} s",
        max(0.0, stage.delay_s - timing),
        stage.delay_s + timing + measuring,
        "s",
        masking,
    )


def _injection(evidence: Evidence, active: ActiveStage, line: str) -> tuple[str, str, str]:
    nominal = evidence.site.supply.nominal_v
    stage, quantity = active.stage, active.ladder.element.quantity
    if stage.function is Function.UNBALANCE:
        return f"all lines {nominal:g} V, lower {line} slowly", f" of {quantity}", "%"
    if stage.function is Function.DISPLACEMENT:
        lines = len(evidence.site.supply.geometry.names)
        phasor = stage.pickup / (3.0 if quantity == "3v0" else 1.0)
        if evidence.relay.device.displacement_from == "n-to-earth":
            return "raise N against PE slowly from 0 V", "", "V"
        lowered = nominal - lines * phasor
        if lowered >= 0:
            how = f"all lines {nominal:g} V, lower {line} slowly; due at {lowered:.1f} V"
        else:
            how = f"other lines at 0 V, raise {line} slowly; due at {lines * phasor:.1f} V"
        return how, f" of {quantity.upper()}", "V"
    direction = "lower" if stage.function is Function.UNDERVOLTAGE else "raise"
    base = nominal * (active.ladder.line_to_line_ratio if quantity == "l-l" else 1.0)
    return f"all at {np.round(base, 1):g} V, {direction} {line} slowly", "", "V"
