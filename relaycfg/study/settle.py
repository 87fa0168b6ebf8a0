"""From chosen rungs to settings: every element of the device in turn, unused stages written as off."""

from dataclasses import dataclass

import numpy as np

from relaycfg.model.device import Function
from relaycfg.model.geometry import BoolArray
from relaycfg.model.settings import Settings, Stage
from relaycfg.study.choice import (
    ORDER,
    Rung,
    best_cover,
    choose,
    covered_by,
    demand,
    detection_rung,
    harmful_states,
    raise_margins,
)
from relaycfg.study.evidence import Evidence
from relaycfg.study.joint import joint_core
from relaycfg.study.ladder import Ladder


@dataclass(frozen=True)
class Settled:
    """The chosen settings, and why each unused stage is off."""

    settings: Settings
    off_reason: dict[Function, str]


def settle(evidence: Evidence) -> Settled:
    """Choose every element's stages on the device's own steps.

    First the greatest core that 59, 27 and 59N can clear together; then each is chosen for all states it can reach
    (redundancy), keeping the core that depends on it; then each stage's margin is raised as far as that allows. A 59N
    stage left over becomes the detection stage. 47 is chosen last, with the full margin, and only where it adds core
    states or more than the share that may be given up (2 percent).
    """
    wanted = harmful_states(evidence.scenarios)
    chosen = _choose_each(evidence, wanted)
    chosen = _raise_each(evidence, wanted, chosen)
    displacement = evidence.ladders.get(Function.DISPLACEMENT)
    if displacement is not None:
        chosen[Function.DISPLACEMENT] = _with_detection(
            displacement, chosen[Function.DISPLACEMENT], _displacement_floor(evidence, displacement)
        )
    unbalance = evidence.ladders.get(Function.UNBALANCE)
    if unbalance is not None:
        left = _without(evidence, wanted, chosen, tuple(chosen))
        chosen[Function.UNBALANCE] = _addition(evidence, unbalance, wanted, left)
    reasons = {f: _why_off(evidence, f, chosen, wanted) for f in ORDER}
    settings = Settings(
        evidence.relay.name,
        evidence.relay.device.name,
        evidence.site.digest,
        tuple(s for f in ORDER for s in _element_stages(evidence, f, chosen)),
        evidence.site.judgement.inhibit_s,
        "by hand",
    )
    return Settled(settings, reasons)


def _choose_each(evidence: Evidence, wanted: tuple[BoolArray, ...]) -> dict[Function, tuple[Rung, ...]]:
    """From the greatest joint core, each element in turn: its own cover, never losing core the others leave to it."""
    ladders = {f: evidence.ladders[f] for f in ORDER[:-1] if f in evidence.ladders}
    chosen = joint_core(ladders, evidence.scenarios, _core(evidence, wanted))
    for function, ladder in ladders.items():
        others = tuple(f for f in ladders if f is not function)
        own = demand(ladder, evidence.scenarios, wanted)
        need = demand(ladder, evidence.scenarios, _core(evidence, _without(evidence, wanted, chosen, others)))
        chosen[function] = choose(ladder, own, need, ladder.element.stages)
    return chosen


def _raise_each(
    evidence: Evidence, wanted: tuple[BoolArray, ...], chosen: dict[Function, tuple[Rung, ...]]
) -> dict[Function, tuple[Rung, ...]]:
    """Each element's margins once more, now that the others' stages are known."""
    raised = dict(chosen)
    for function in chosen:
        ladder = evidence.ladders[function]
        others = tuple(f for f in chosen if f is not function)
        own = demand(ladder, evidence.scenarios, wanted)
        need = demand(ladder, evidence.scenarios, _core(evidence, _without(evidence, wanted, raised, others)))
        raised[function] = raise_margins(ladder, own, need, raised[function])
    return raised


def _addition(
    evidence: Evidence, ladder: Ladder, wanted: tuple[BoolArray, ...], left: tuple[BoolArray, ...]
) -> tuple[Rung, ...]:
    """Stages with the full margin for what is left, if that is worth a setting."""
    need = demand(ladder, evidence.scenarios, _core(evidence, left))
    own = demand(ladder, evidence.scenarios, left)
    rungs = best_cover(ladder, own, need, ladder.element.stages, ladder.judgement.margin_cap_units)
    mine = {ladder.element.function: rungs}
    still = _without(evidence, left, mine, tuple(mine))
    added = sum(int(a.sum() - b.sum()) for a, b in zip(left, still, strict=True))
    core = sum(int((a & ~b & s.core).sum()) for a, b, s in zip(left, still, evidence.scenarios, strict=True))
    total = sum(int(w.sum()) for w in wanted)
    return rungs if core or added > (1 - ladder.judgement.cover_kept) * total else ()


def _without(
    evidence: Evidence,
    states: tuple[BoolArray, ...],
    chosen: dict[Function, tuple[Rung, ...]],
    functions: tuple[Function, ...],
) -> tuple[BoolArray, ...]:
    """What is left of ``states`` after these elements' stages."""
    left = []
    for scenario, mask in zip(evidence.scenarios, states, strict=True):
        cleared = np.zeros(mask.shape, bool)
        for function in functions:
            cleared |= covered_by(evidence.ladders[function], chosen[function], scenario)
        left.append(mask & ~cleared)
    return tuple(left)


def _core(evidence: Evidence, states: tuple[BoolArray, ...]) -> tuple[BoolArray, ...]:
    return tuple(mask & s.core for mask, s in zip(states, evidence.scenarios, strict=True))


def _displacement_floor(evidence: Evidence, ladder: Ladder) -> float:
    """Displacement that may stand although no case shows it: what the band permits, until it has been measured.

    Lines anywhere inside the band displace the neutral by up to a third of its width (own arithmetic; 207/253/253 V
    is 15 V).
    """
    supply = evidence.site.supply
    known = any(
        i.field == "supply.displacement_percent" and i.tag in ("measured", "letter") for i in evidence.site.inputs
    )
    factor = len(supply.geometry.names) if ladder.element.quantity == "3v0" else 1
    return 0.0 if known else factor * (supply.high_v - supply.low_v) / len(supply.geometry.names)


def _with_detection(ladder: Ladder, rungs: tuple[Rung, ...], floor: float) -> tuple[Rung, ...]:
    """Add the detection stage where one is free and it would see less displacement than the stages chosen."""
    if len(rungs) >= ladder.element.stages:
        return rungs
    detection = detection_rung(ladder, floor)
    if detection is None:
        return rungs
    # A stage that its errors could not tell from the next one is not worth a setting.
    if rungs and ladder.insensitive[detection.pickup] >= ladder.sensitive[rungs[0].pickup]:
        return rungs
    return (detection, *rungs)


def _element_stages(evidence: Evidence, function: Function, chosen: dict[Function, tuple[Rung, ...]]) -> list[Stage]:
    """The stages of one element; all off where the site's system has no quantity for it."""
    if function in chosen:
        return _stages(evidence.ladders[function], chosen[function])
    left = [x.element for x in evidence.relay.device.left_out if x.element.function is function]
    return [Stage(function, n + 1, False, quantity=e.quantity) for e in left for n in range(e.stages)]


def _stages(ladder: Ladder, rungs: tuple[Rung, ...]) -> list[Stage]:
    element = ladder.element
    stages = []
    for number in range(1, element.stages + 1):
        if number > len(rungs):
            stages.append(Stage(element.function, number, False, quantity=element.quantity))
            continue
        rung = rungs[number - 1]
        stages.append(
            Stage(
                element.function,
                number,
                True,
                float(ladder.pickups[rung.pickup]),
                float(ladder.delays[rung.delay]),
                ladder.dropout_ratio,
                ladder.reset,
                ladder.hold_s,
                "any",
                "trip",
                element.quantity,
            )
        )
    return stages


def _why_off(
    evidence: Evidence, function: Function, chosen: dict[Function, tuple[Rung, ...]], wanted: tuple[BoolArray, ...]
) -> str:
    ladder = evidence.ladders.get(function)
    little = f"{100 * (1 - evidence.site.judgement.cover_kept):.3g} %"
    if ladder is None:
        return evidence.relay.device.why_off(function) or "the device does not have it"
    if chosen[function]:
        return f"a further stage would clear less than {little} more"
    if not any(w.any() for w in wanted):
        return "no modelled break state harms anything"
    if ladder.element.line_to_line_only:
        return "it measures line-to-line quantities only, which a lost neutral does not move"
    if demand(ladder, evidence.scenarios, wanted).reachable == 0:
        return "no harmful break state reaches its settable range"
    if not np.isfinite(ladder.clearing[ladder.fastest()]).any():
        return "none of its pickups has a secure delay"
    if function is Function.UNBALANCE:
        return f"it adds no core state and less than {little} of the others"
    return "no secure setting clears a harmful state in time"
