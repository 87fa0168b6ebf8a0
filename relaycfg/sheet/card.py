"""Page 2, the installer's card: what to set, wire and never do, large enough to work from."""

from typing import Any

from markupsafe import Markup
from reportlab.platypus import KeepInFrame

from relaycfg.model.device import Function
from relaycfg.model.results import StageResult
from relaycfg.sheet import figures
from relaycfg.sheet.ink import Flow, Ink
from relaycfg.sheet.settings_table import off, on, reset


def card(ink: Ink) -> Flow:
    """One page, always."""
    study, wording = ink.study, ink.wording
    relay = study.site.relay
    functions = list(dict.fromkeys(r.stage.function for r in on(study)))
    off_labels = off(study)
    rows = [_row(ink, result) for result in on(study)]
    middle = [("VALIGN", (0, 1), (-1, -1), "MIDDLE")]
    page = [
        *ink.heading("card")[1:],
        ink.say("card.lead", "big", relay=relay, device=study.device, document=study.site.document),
        *ink.table(wording.lines("card.heads"), rows, (15, 22, 23, 14, 10, 16), "llrrrl", "cardcell", extra=middle),
        ink.gap(3),
        ink.say("card.off", "big", off=", ".join(off_labels)) if off_labels else ink.gap(0),
        ink.gap(2),
        *_wiring(ink),
        ink.gap(4),
        ink.say("card.meaning_title", "big"),
        *_meanings(ink, functions),
        ink.boxed(
            [ink.say("card.reenergise_title", "big"), *ink.items("card.reenergise", "bigitem", settings=study.settings)]
        ),
        ink.gap(5),
        ink.boxed([ink.say("card.never_title", "big"), *ink.items("card.never", "bigitem")]),
        ink.gap(4),
        ink.say("card.contact", "big", contact=study.site.document.fault_contact),
    ]
    return [KeepInFrame(ink.width, ink.height - 1, page, mode="shrink")]


def _row(ink: Ink, result: StageResult) -> list[Any]:
    stage = result.stage
    element = ink.study.device.element(stage.function)
    knob = " · ".join(t for t in (element.knob, element.terminal) if t) if element else ""
    name = Markup("<b>{} / {}</b>").format(stage.function.value, stage.number)
    if stage.action == "alarm":
        name += ink.wording.text("card.alarm")
    return [
        _large(ink, name, "l"),
        knob or figures.ABSENT,
        _large(ink, _figure(figures.dial(result.marked), result.marked_unit), "r"),
        _large(ink, _figure(figures.seconds(stage.delay_s), "s"), "r"),
        figures.ratio(stage.dropout_ratio),
        reset(result),
    ]


def _figure(figure: str, unit: str) -> Markup:
    """A figure with its unit smaller behind it."""
    return Markup('<b>{}</b><font size="8.6">\u00a0{}</font>').format(figure, unit)


def _large(ink: Ink, text: Markup, align: str) -> Any:
    return ink.cell(text, 0, align, "figure")


def _wiring(ink: Ink) -> Flow:
    study = ink.study
    context: dict[str, Any] = {"relay": study.site.relay, "settings": study.settings, "device": study.device}
    rows = [
        [Markup("<b>{}</b>").format(name), ink.wording.text(f"card.wiring_texts.{key}", **context)]
        for key, name in ink.wording.pairs("card.wiring")
        if context["relay"] is not None or key == "inhibit"
    ]
    return ink.table((), rows, (19, 81), "ll", "cardcell")


def _meanings(ink: Ink, functions: list[Function]) -> Flow:
    rows = [
        [Markup("<b>{}</b>").format(f.value), ink.wording.text(f"card.meaning.{f.name.lower()}")] for f in functions
    ]
    return [*ink.table((), rows, (8, 92), "ll", "cardcell"), ink.gap(6)] if rows else []
