"""Page 3: which broken neutral the relay sees, with which element and how soon, and which it does not see."""

from typing import Any

from markupsafe import Markup

from relaycfg.model.break_results import PlaceSummary
from relaycfg.model.device import Function
from relaycfg.sheet import figures
from relaycfg.sheet.ink import Flow, Ink
from relaycfg.sheet.settings_table import on

_LEFT = 0.36

NAMES_SHOWN = 8


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
        ink.beside(_asymmetry(ink), _coverage(ink), _LEFT),
        ink.say("sight.basis", "small", site=study.site),
        *ink.heading("sight_unexamined", 1, wording.text("sight.unexamined_title")),
        ink.say("sight.unexamined_lead", "small"),
        *ink.items("sight.unexamined", "tight"),
        ink.gap(2),
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
            harmed=some(summary.boards_harmed),
            healthy=some(summary.boards_healthy),
            left=some(summary.not_disconnected),
        )
    ]


def some(boards: tuple[str, ...]) -> str:
    """The names, or their first ones and how many there are where a list would drown the page."""
    shown = ", ".join(boards[:NAMES_SHOWN])
    return shown if len(boards) <= NAMES_SHOWN else f"{shown} and {len(boards) - NAMES_SHOWN} more"


def _asymmetry(ink: Ink) -> Flow:
    width = (ink.width - 14) * _LEFT
    never, stiff = ink.wording.text("sight.never"), ink.study.smallest_asymmetry
    places = {ink.wording.text("sight.stiff"): stiff} | {a.at: a.ratios for a in ink.study.place_asymmetry}
    rows = [[at, *(_ratio(known.get(name, 0.0), never) for name in stiff)] for at, known in places.items()]
    shares = (34, *[66 / max(len(stiff), 1)] * len(stiff))
    heads = [ink.wording.text("sight.asymmetry_head"), *stiff]
    return ink.table(heads, rows, shares, "l" + "r" * len(stiff), width=width)


def _ratio(k: float | None, never: Any) -> Any:
    """The k of unequal loads; 0 where there is none to give."""
    return never if k is None else figures.ABSENT if k == 0.0 else f"{k:.2f}"


def _coverage(ink: Ink) -> Flow:
    width = (ink.width - 14) * (1 - _LEFT)
    rows = [
        [
            cover.elements,
            ink.wording.text("sight.no_harm")
            if cover.cleared_percent is None
            else figures.by_unit(cover.cleared_percent, "%"),
            figures.by_unit(cover.seen_percent, "%"),
        ]
        for cover in ink.study.coverage
    ]
    return ink.table(ink.wording.lines("sight.coverage_heads"), rows, (40, 30, 30), "lrr", width=width)
