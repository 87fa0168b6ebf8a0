"""What active stages do on taps that are no break scenario: which of them pick up there for good, and how soon."""

from dataclasses import replace

import numpy as np

from relaycfg.model.geometry import BoolArray, ComplexArray, FloatArray
from relaycfg.relay import severities
from relaycfg.study.evidence import Evidence
from relaycfg.study.scenarios import Scenarios
from relaycfg.study.stages import ActiveStage

NOTHING = np.inf


def opening_s(evidence: Evidence, active: tuple[ActiveStage, ...], taps: ComplexArray) -> FloatArray:
    """Longest time [stages, states] from the beginning of lasting taps [states, lines + 1] to the open switch."""
    found = np.full((len(active), len(taps)), NOTHING)
    for row, stage in zip(found, active, strict=True):
        row[severity(evidence, stage, taps) >= stage.insensitive.pickup] = stage.clearing_s
    return found


def dropped_out(evidence: Evidence, active: tuple[ActiveStage, ...], taps: ComplexArray) -> BoolArray:
    """States in which every stage has dropped out, at its least sensitive: to the relay the volts look healthy."""
    healthy = np.ones(len(taps), bool)
    for stage in active:
        healthy &= severity(evidence, stage, taps) < stage.insensitive.dropout
    return healthy


def severity(evidence: Evidence, stage: ActiveStage, taps: ComplexArray) -> FloatArray:
    """Severity [states] that decides for a stage: the worst channel, or the least where all phases are asked for."""
    channels = severities(
        stage.ladder.element, evidence.site.supply.geometry, taps, evidence.relay.device.displacement_from
    )
    deciding: FloatArray = channels.min(axis=-1) if stage.stage.phases == "all" else channels.max(axis=-1)
    return deciding


def as_read(evidence: Evidence, scenario: Scenarios, taps: ComplexArray) -> Scenarios:
    """The same states with other volts at the relay's terminals; what is harmed, and until when, stays."""
    geometry, device = evidence.site.supply.geometry, evidence.relay.device
    found = {e.function: severities(e, geometry, taps, device.displacement_from).max(axis=-1) for e in device.elements}
    return replace(scenario, severity=found, taps=taps, v0=-geometry.neutral_shift(taps[:, :-1]))


def first_of(active: tuple[ActiveStage, ...], seconds: FloatArray) -> str:
    """Label of the stage that opens first in one state [stages]; empty where none does."""
    if not len(seconds) or not np.isfinite(seconds).any():
        return ""
    return active[int(np.argmin(seconds))].stage.label
