"""The settings as a table: every stage the device has, the unused ones listed as OFF."""

from typing import Any

from markupsafe import Markup

from relaycfg.model.device import Function
from relaycfg.model.results import StageResult, Study
from relaycfg.sheet import figures
from relaycfg.sheet.ink import Flow, Ink

Row = tuple[Function, int, StageResult | None]


def rows(study: Study) -> list[Row]:
    """Function, stage number and result (None: a stage the device has and the study leaves unused)."""
    judged = {(r.stage.function, r.stage.number): r for r in study.stages}
    owned = [(e.function, n) for e in study.device.owned for n in range(1, e.stages + 1)]
    keys = owned + [key for key in judged if key not in owned]
    keys.sort(key=lambda key: (list(Function).index(key[0]), key[1]))
    return [(function, number, judged.get((function, number))) for function, number in keys]


def on(study: Study) -> list[StageResult]:
    """Stages that are on, in the order of the table."""
    return [r for _, _, r in rows(study) if r is not None and r.stage.on]


def off(study: Study) -> list[str]:
    """Labels of the stages to be turned off."""
    return [f"{f.value} stage {n}" for f, n, r in rows(study) if r is None or not r.stage.on]


def reset(result: StageResult) -> str:
    """Reset mode, with the hold time where there is one."""
    stage = result.stage
    return f"held {figures.seconds(stage.hold_s)} s" if stage.reset == "held" else stage.reset


def of_base(result: StageResult) -> str:
    """The pickup in percent of its named base; points need no base."""
    if result.pickup_percent is None:
        return figures.ABSENT
    return f"{figures.percent(result.pickup_percent)} % of {result.base}"


def settings_table(ink: Ink) -> Flow:
    """The settings table; a function the device lacks has a row that says so."""
    study, wording = ink.study, ink.wording
    lines: list[list[Any]] = []
    for function, number, result in rows(study):
        name = Markup("<b>{}</b>").format(function.value)
        if result is None or not result.stage.on:
            lines.append([name, str(number), Markup("<b>OFF</b>"), *[figures.ABSENT] * 7])
            continue
        stage = result.stage
        lines.append(
            [
                name,
                str(number),
                "on",
                quantity(result, study),
                Markup("<b>{}</b>").format(figures.pickup(result)),
                of_base(result),
                Markup("<b>{} s</b>").format(figures.seconds(stage.delay_s)),
                figures.ratio(stage.dropout_ratio),
                reset(result),
                stage.action,
            ]
        )
    lines += [
        [Markup("<b>{}</b>").format(f.value), figures.ABSENT, wording.text("decision.not_owned"), *[figures.ABSENT] * 7]
        for f in Function
        if all(e.function is not f for e in study.device.owned) and all(r.stage.function is not f for r in study.stages)
    ]
    heads = wording.lines("decision.settings_heads")
    return ink.table(heads, lines, (8.5, 6.5, 9, 13, 9.5, 16.5, 8.5, 9.5, 13, 6), "lcllrlrrll")


def measured(result: StageResult, study: Study) -> str:
    """What the stage measures, by its short name; the element's own where the stage does not say."""
    element = study.device.element(result.stage.function)
    return result.stage.quantity or (element.quantity if element else "")


def quantity(result: StageResult, study: Study) -> str:
    """What the stage measures, in words; "any" or "all" of the lines where it is a quantity a line."""
    stage, name = result.stage, measured(result, study)
    names = {"l-n": "L-N", "l-l": "L-L", "v0": "V0", "3v0": "3V0"}
    lines = f", {stage.phases} line" if stage.function in (Function.OVERVOLTAGE, Function.UNDERVOLTAGE) else ""
    return names.get(name, name) + (f"{lines}s" if lines and stage.phases == "all" else lines)
