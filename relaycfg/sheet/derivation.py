"""Why each stage stands where it stands: the reason, the bounds with their arithmetic, the margins both ways."""

from typing import Any

from reportlab.platypus import CondPageBreak

from relaycfg.model.results import Bound, Margins, StageResult
from relaycfg.sheet import figures
from relaycfg.sheet.ink import Flow, Ink
from relaycfg.sheet.settings_table import off, on

BREATH = 24


def derivation(ink: Ink) -> Flow:
    """One block a stage that is on, kept whole, then the reasons of those that are off."""
    wording = ink.wording
    blocks: Flow = []
    for number, result in enumerate(on(ink.study), 1):
        blocks += _stage(ink, number, result)
    reasons = [
        ink.say("derivation.off_reason", "item", label=r.stage.label, reason=r.reason)
        for r in ink.study.stages
        if not r.stage.on and r.reason
    ]
    rule = [ink.say("derivation.choice", study=ink.study)]
    rest = (
        []
        if not off(ink.study)
        else [*ink.heading("derivation_off", 1, wording.text("derivation.off_title")), *reasons]
    )
    return [*ink.heading("derivation", room=260), ink.say("derivation.lead"), *rule, *blocks, *rest]


def _stage(ink: Ink, number: int, result: StageResult) -> Flow:
    wording = ink.wording
    band = f"{figures.pickup(result, result.pickup_low)} to {figures.pickup(result, result.pickup_high)}"
    title = wording.text(
        "derivation.stage", label=result.stage.label, pickup=figures.pickup(result), delay=result.stage.delay_s
    )
    blocks: Flow = [
        *ink.heading(f"derivation_{number}", 1, title)[1:],
        ink.p(result.reason),
        ink.say("derivation.figures", "small", r=result, band=band),
    ]
    if result.bounds:
        blocks += ink.table(
            wording.lines("derivation.bound_heads"),
            [_bound(b) for b in result.bounds],
            (8, 10, 10, 20, 34, 18),
            "llrlll",
        )
        blocks.append(ink.gap(4))
    if result.margins is not None:
        unit = figures.unit_of(result.stage.function)
        blocks += ink.table(
            wording.lines("derivation.margin_heads"), _margins(ink, result.margins, unit), (20, 12, 12, 8, 48), "lrrrl"
        )
    # A stage is read as a whole: it starts on a new page where it would not end on this one.
    return [CondPageBreak(sum(block.wrap(ink.width, ink.height)[1] for block in blocks) + BREATH), *blocks]


def _bound(bound: Bound) -> list[Any]:
    return [bound.of, bound.side, figures.by_unit(bound.value, bound.unit), bound.case, bound.arithmetic, bound.source]


def _margins(ink: Ink, m: Margins, unit: str) -> list[list[Any]]:
    sides = (
        ("security", m.security_v, m.security_s, m.security_units, m.security_case),
        ("dependability", m.dependability_v, m.dependability_s, m.dependability_units, m.dependability_case),
    )
    return [
        [
            ink.wording.text(f"derivation.{side}"),
            figures.by_unit(v, unit),
            figures.by_unit(s, "s"),
            figures.percent(u),
            case,
        ]
        for side, v, s, u, case in sides
    ]
