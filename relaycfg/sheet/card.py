"""Page 2, the installer's card: what to set, wire and never do, large enough to work from."""

from typing import Any

from markupsafe import Markup
from reportlab.platypus import KeepInFrame

from relaycfg.model.device import Function
from relaycfg.model.results import StageResult, Study
from relaycfg.sheet import figures
from relaycfg.sheet.ink import Flow, Ink
from relaycfg.sheet.settings_table import measured, off, on, reset

_FRAME, _INSET = 4.5, 10.0


def held_back(study: Study) -> bool:
    """Whether the figures are no order to set: existing settings as found, or any with exceptions."""
    return study.kind == "check" or study.exceptions > 0


def card(ink: Ink) -> Flow:
    """One page, always; figures that are not to be set stand in a heavy frame under a title that says so."""
    study, wording = ink.study, ink.wording
    context = {"study": study, "relay": study.site.relay, "device": study.device, "held": held_back(study)}
    functions = list(dict.fromkeys(r.stage.function for r in on(study)))
    page = [
        *ink.heading("card", text=wording.text("card.title", **context))[1:],
        *_figures(ink, context),
        ink.gap(3),
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


def _figures(ink: Ink, context: dict[str, Any]) -> Flow:
    """The lead, the stages that are on and the list of those that are off."""
    study, held = ink.study, context["held"]
    width = ink.width - 2 * _INSET if held else ink.width
    rows = [_row(ink, result) for result in on(study)]
    heads = ink.wording.lines("card.heads", **context)
    middle = [("VALIGN", (0, 1), (-1, -1), "MIDDLE")]
    off_labels = off(study)
    content = [
        ink.say("card.lead", "big", **context),
        *ink.table(heads, rows, (13, 15, 36, 13, 10, 13), "lllrrl", "cardcell", width, middle),
        ink.gap(3),
        *([ink.say("card.off", "big", off=", ".join(off_labels), **context)] if off_labels else []),
    ]
    return [ink.framed(content, _FRAME, _INSET)] if held else content


def _row(ink: Ink, result: StageResult) -> list[Any]:
    stage = result.stage
    element = ink.study.device.element(stage.function)
    knob = " · ".join(t for t in (element.knob, element.terminal) if t) if element else ""
    name = Markup("<b>{} / {}</b>").format(stage.function.value, stage.number)
    figure = _figure(figures.dial(result.marked), result.marked_unit)
    return [
        [_large(ink, name, "l"), ink.p(ink.wording.text(f"card.{stage.action}"), "below")],
        knob or figures.ABSENT,
        [_large(ink, figure, "l"), ink.p(_below(ink, result), "below")],
        _large(ink, _figure(figures.seconds(stage.delay_s), "s"), "r"),
        figures.ratio(stage.dropout_ratio),
        reset(result),
    ]


def _below(ink: Ink, result: StageResult) -> Markup:
    """What stands below the figure on the device's own scale: its base, the volts, and of which lines it speaks."""
    stage, study = result.stage, ink.study
    element = study.device.element(stage.function)
    nominal = study.site.supply.nominal_v
    of_base = element is not None and element.unit == "percent" and stage.function is not Function.UNBALANCE
    base = element.base_v if element is not None and element.base_v is not None else nominal
    return ink.wording.text(
        "card.below",
        base=(base if of_base else None),
        to_neutral=abs(base - nominal) < 1e-6,
        volts=stage.pickup,
        quantity=measured(result, study),
        two=_two_lines(study),
        lines=stage.phases if stage.function in (Function.OVERVOLTAGE, Function.UNDERVOLTAGE) else "",
    )


def _two_lines(study: Study) -> bool:
    """Whether the system has two lines: one voltage between them, and V0 is half their difference."""
    return not study.site.supply.geometry.has_sequences


def _figure(figure: str, unit: str) -> Markup:
    """A figure with its unit smaller behind it."""
    return Markup('<b>{}</b><font size="8.6">\u00a0{}</font>').format(figure, unit)


def _large(ink: Ink, text: Markup, align: str) -> Any:
    return ink.cell(text, 0, align, "figure")


def _wiring(ink: Ink) -> Flow:
    study = ink.study
    relay = study.site.relay
    pen = relay is not None and relay.poles == "lines and neutral" and study.site.conductor(relay.trips) == "PEN"
    context: dict[str, Any] = {"relay": relay, "settings": study.settings, "device": study.device, "pen": pen}
    rows = [
        [Markup("<b>{}</b>").format(name), ink.wording.text(f"card.wiring_texts.{key}", **context)]
        for key, name in ink.wording.pairs("card.wiring")
        if relay is not None or key == "inhibit"
    ]
    return ink.table((), rows, (16, 84), "ll", "cardcell")


def _meanings(ink: Ink, functions: list[Function]) -> Flow:
    two = _two_lines(ink.study)
    rows = [
        [Markup("<b>{}</b>").format(f.value), ink.wording.text(f"card.meaning.{f.name.lower()}", two=two)]
        for f in functions
    ]
    return [*ink.table((), rows, (8, 92), "ll", "cardcell"), ink.gap(6)] if rows else []
