"""Ride-through and withstand curves as terminal text, with the case behind every step."""

from collections.abc import Sequence

from relaycfg import units
from relaycfg.model.device import Function
from relaycfg.model.results import Corridor, CurveStep, Study
from relaycfg.text.figures import unit_of, waiting
from relaycfg.text.layout import heading, listing, wrapped


def curves_text(study: Study) -> str:
    """Each element's corridor: it must wait longer than R and operate within W."""
    lines: list[str] = []
    for corridor in study.corridors:
        lines += _corridor(corridor)
    return "\n".join(lines) + "\n" if lines else ""


def _corridor(corridor: Corridor) -> list[str]:
    unit = unit_of(corridor.function)
    lines = heading(f"Corridor of {corridor.function.value}")
    if corridor.standing_case:
        standing = units.with_unit(abs(corridor.standing), unit)
        lines += wrapped(f"Worst standing value {standing}: {corridor.standing_case}")
    beyond = "down to" if corridor.function is Function.UNDERVOLTAGE else "from"
    heads = [f"{beyond} {unit}", "seconds", "behind it"]
    lines += _steps("Wait longer than (R), at the pickup as set", heads, corridor.ride_through)
    lines += _steps("Operate within (W), less measuring, output, coil and breaker", heads, corridor.withstand)
    return lines


def _steps(title: str, heads: Sequence[str], steps: Sequence[CurveStep]) -> list[str]:
    """A curve by its steps: neighbours with the same time and case are one line."""
    kept: list[CurveStep] = []
    for step in steps:
        if not kept or (step.seconds, step.behind) != (kept[-1].seconds, kept[-1].behind):
            kept.append(step)
    if not kept:
        return [f"{title}: nothing limits it"]
    rows = [[units.volts(abs(s.pickup)), waiting(s.seconds), s.behind] for s in kept]
    return [f"{title}:", *listing(heads, rows, 0)]
