"""The cases and the breaks as judged: one table each, margins included."""

from typing import Any

from markupsafe import Markup

from relaycfg.model.break_results import PlaceSummary
from relaycfg.model.results import CaseResult
from relaycfg.sheet import figures
from relaycfg.sheet.ink import Flow, Ink
from relaycfg.sheet.inputs import status

OPERATED_SHOWN = 2


def cases(ink: Ink) -> Flow:
    """Every case played through the relay, failed ones marked."""
    rows = [_case(ink, c) for c in ink.study.cases]
    return [
        *ink.heading("cases"),
        ink.say("cases.lead", standing=ink.study.displacement_standing_v),
        *ink.table(ink.wording.lines("cases.heads"), rows, (4, 33, 6.5, 16, 7, 7, 7, 11, 11), "rlllrrrrr"),
    ]


def _case(ink: Ink, c: CaseResult) -> list[Any]:
    what = ink.wording.text("cases.case", c=c, status=status(ink, c.status))
    outcome = c.outcome if c.passed else Markup("<b>! {}</b>").format(c.outcome)
    if c.outcome == "hold" and c.margin_v is not None and c.margin_v < 0:
        outcome = Markup("<b>! {}</b>").format(ink.wording.text("cases.no_reset"))
    if c.operated:
        first = "; ".join(ink.wording.text("cases.operated", o=o) for o in c.operated[:OPERATED_SHOWN])
        more = len(c.operated) - OPERATED_SHOWN
        outcome = Markup("{}: {}{}").format(outcome, first, f"; and {more} more" if more > 0 else "")
    return [
        str(c.number),
        what,
        c.expect,
        outcome,
        figures.volts(c.highest_l_n_v),
        figures.volts(c.lowest_l_n_v),
        figures.volts(c.highest_v0_v),
        _margin(figures.by_unit(c.margin_v, "V"), c.nearest_v),
        _margin(figures.by_unit(c.margin_s, "s"), c.nearest_s),
    ]


def _margin(figure: str, stage: str) -> Markup:
    """A margin with the stage it is of below it."""
    return Markup("{}<br/>{}").format(figure, stage) if stage else Markup(figure)


def breaks(ink: Ink) -> Flow:
    """Break places in classes of harm and operation, then the spread and the worst states of each."""
    study, wording = ink.study, ink.wording
    rows: list[list[Any]] = []
    for s in study.breaks.summaries:
        place = Markup("<b>{}</b> ({})").format(s.at, s.conductor)
        unresolved = f"{s.unresolved} of {s.samples}"
        names = list(s.classes) or [figures.ABSENT]
        for k, name in enumerate(names):
            share = figures.share(s.classes[name]) if s.classes else figures.ABSENT
            rows.append([place if k == 0 else "", name, share, unresolved if k == 0 else ""])
    return [
        *ink.heading("breaks"),
        ink.say("breaks.lead", study=study),
        *ink.table(wording.lines("breaks.heads"), rows, (34, 28, 24, 14), "lllr"),
        *ink.heading("breaks_spread", 1, wording.text("breaks.spread_title")),
        *ink.table(
            wording.lines("breaks.spread_heads"), _spread(study.breaks.summaries), (28, 30, 10, 10, 10, 12), "llrrrr"
        ),
        *ink.heading("breaks_worst", 1, wording.text("breaks.worst_title")),
        *ink.table(
            wording.lines("breaks.worst_heads"), _worst(study.breaks.summaries), (28, 12, 30, 8, 12, 10), "lrllrr"
        ),
    ]


def _spread(summaries: tuple[PlaceSummary, ...]) -> list[list[Any]]:
    return [
        [s.at, p.name, *(figures.by_unit(v, p.unit) for v in (p.p5, p.p50, p.p95, p.largest))]
        for s in summaries
        for p in s.percentiles
    ]


def _worst(summaries: tuple[PlaceSummary, ...]) -> list[list[Any]]:
    return [
        [s.at, str(w.index), w.board, w.line, figures.by_unit(w.volts, "V"), str(w.loads_on)]
        for s in summaries
        for w in s.worst
    ]
