"""Page 3: which broken neutral the relay sees, with which element and how soon, and which it does not see."""

from typing import Any

from markupsafe import Markup

from relaycfg.model.device import Function
from relaycfg.model.results import PlaceSummary
from relaycfg.sheet import figures
from relaycfg.sheet.ink import Flow, Ink
from relaycfg.sheet.settings_table import on


def sight(ink: Ink) -> Flow:
    """The places as a table, their boards as text, then asymmetry and coverage."""
    study, wording = ink.study, ink.wording
    functions = [f for f in Function if any(r.stage.function is f for r in on(study))]
    summaries = study.breaks.summaries
    heads = [
        *wording.lines("sight.heads_left"),
        *(wording.text("sight.head_element", element=f.value) for f in functions),
        *wording.lines("sight.heads_right"),
    ]
    shares = (19, 5.5, 12, *[12.5] * len(functions), 11.5, 8)
    rows = [_row(ink, s, functions) for s in summaries]
    return [
        *ink.heading("sight"),
        ink.say("sight.lead", study=study),
        *ink.table(heads, rows, shares, "l" * len(shares)),
        ink.say("sight.reading", "small"),
        *ink.heading("sight_boards", 1, wording.text("sight.boards_title")),
        *(paragraph for s in summaries for paragraph in _boards(ink, s)),
        *ink.heading("sight_limits", 1, wording.text("sight.limits_title")),
        ink.beside(_asymmetry(ink), _coverage(ink)),
        ink.gap(4),
        ink.say("sight.touch", "small"),
        *(ink.p(note, "small") for note in study.breaks.notes),
    ]


def _row(ink: Ink, summary: PlaceSummary, functions: list[Function]) -> list[Any]:
    by_function = {e.function: e for e in summary.elements}
    place = [Markup("<b>{}</b>").format(summary.at), summary.conductor]
    touch = figures.by_unit(summary.touch_v, "V")
    if not summary.seen:
        unseen = ink.wording.text("sight.unseen")
        return [
            *place,
            Markup("<b>{}</b>").format(unseen),
            *[unseen] * len(functions),
            figures.share(summary.harmful),
            touch,
        ]
    cells = []
    for function in functions:
        element = by_function.get(function)
        if element is None:
            cells.append(figures.ABSENT)
        elif element.fastest_s is None:
            cells.append(figures.share(element.share))
        else:
            cells.append(f"{figures.share(element.share)}; from\u00a0{figures.seconds(element.fastest_s)}\u00a0s")
    return [
        *place,
        Markup("<b>{}</b>").format(figures.share(summary.undetected)),
        *cells,
        figures.share(summary.harmful),
        touch,
    ]


def _boards(ink: Ink, summary: PlaceSummary) -> Flow:
    return [
        ink.say(
            "sight.boards",
            "small",
            s=summary,
            harmed=", ".join(summary.boards_harmed),
            healthy=", ".join(summary.boards_healthy),
            left=", ".join(summary.not_disconnected),
        )
    ]


def _asymmetry(ink: Ink) -> Flow:
    width = (ink.width - 14) / 2
    never = ink.wording.text("sight.never")
    rows = [
        [elements, never if k is None else f"{k:.2f} : 1 : 1"] for elements, k in ink.study.smallest_asymmetry.items()
    ]
    return ink.table(ink.wording.lines("sight.asymmetry_heads"), rows, (50, 50), "lr", width=width)


def _coverage(ink: Ink) -> Flow:
    width = (ink.width - 14) / 2
    rows = [[elements, figures.share(share)] for elements, share in ink.study.coverage.items()]
    return ink.table(ink.wording.lines("sight.coverage_heads"), rows, (45, 55), "lr", width=width)
