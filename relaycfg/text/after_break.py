"""The seconds and minutes after a break as a few lines of terminal text, what no stage trips in first."""

import math

from relaycfg import units
from relaycfg.model.after_break_results import AfterBreak, PlaceAfterBreak
from relaycfg.model.results import Study
from relaycfg.text.figures import counted, place, share
from relaycfg.text.layout import heading, table, wrapped

SHOWN = 2
"""Places shown, those with the most courses that nothing trips in first; the JSON and the sheet have all of them."""
HEADS = (
    ("", "", "", "", "", "Loads", "of these", "several", "not"),
    ("Break at", "No stage", "Some stage trips", "Median s", "95 % s", "drop out", "no trip", "solutions", "solved"),
)


def after_break(study: Study) -> list[str]:
    """A row a place, then a sentence each on cascade, drift, band edge and balanced electronics at the worst place."""
    result = study.after_break
    if result is None or not result.places:
        return []
    places = sorted(result.places, key=lambda p: p.any_stage.share.count - p.any_stage.share.of)
    lines = [*heading(_title(result)), *table(HEADS[0], [HEADS[1], *(_row(p) for p in places[:SHOWN])])]
    for sentence in (_cascade(places), _drift(places), _edge(places), _balanced(places)):
        lines += wrapped(sentence, "* ") if sentence else []
    more = len(places) - SHOWN
    return [*lines, f"and {counted(more, 'more place')}, in the JSON and on the sheet"] if more > 0 else lines


def _title(result: AfterBreak) -> str:
    courses = result.places[0].courses
    return (
        f"After a break: {counted(courses, 'course')} of {units.plain(result.course_s)} s a place, loads as they react"
    )


def _row(p: PlaceAfterBreak) -> list[str]:
    trips = p.any_stage
    return [
        place(p.at),
        units.count(trips.share.of - trips.share.count),
        share(trips.share),
        units.seconds(trips.median_s),
        units.seconds(trips.late_s),
        units.count(p.fluctuating.count),
        units.count(p.silent),
        units.count(p.several),
        units.count(p.unresolved),
    ]


def _cascade(places: list[PlaceAfterBreak]) -> str:
    found = [(len(c.lost), c.highest_v, p.at, c) for p in places for c in p.cascades if c.lost]
    if not found:
        return ""
    _, _, at, worst = max(found, key=lambda f: f[:2])
    open_end = "" if worst.resolved else ", then no solution"
    return (
        f"Break at {place(at)}, {worst.state}: {counted(len(worst.lost), 'load')} fail open one after another, "
        f"{units.whole_volts(worst.lost[0].highest_v)} to {units.whole_volts(worst.highest_v)} V{open_end}."
    )


def _drift(places: list[PlaceAfterBreak]) -> str:
    found = [(p.drift.highest_v, p.at, p.drift) for p in places if p.drift is not None]
    if not found:
        return ""
    _, at, d = max(found, key=lambda f: f[0])
    shift = f"V0 {units.whole_volts(d.lowest_v)} to {units.whole_volts(d.highest_v)} V, "
    other = " (one of several)" if d.step_several else ""
    return (
        f"Left {units.plain(d.minutes)} min at {place(at)}: {shift if math.isfinite(d.highest_v) else ''}"
        f"{units.parts(d.changes_per_minute)} steps/min up to "
        f"{units.percent(d.largest_step_percent)} % of nominal{other}."
    )


def _edge(places: list[PlaceAfterBreak]) -> str:
    found = [(p.edge.moved_v[0][1] + p.edge.moved_v[1][1], p.at, p.edge) for p in places if p.edge is not None]
    if not found:
        return ""
    _, at, e = max(found, key=lambda f: f[0])
    low, high = (units.plain(edge) for edge in e.edges_pu)
    volts = " / ".join(units.whole_volts(most) for _, most in e.moved_v)
    stated, *moved = (units.percent(s.percent) for s in e.core)
    core = f"core {stated} % is {' / '.join(moved)} %"
    return f"Band edge {low} / {high} x nominal at {place(at)} moves up to {volts} V, {core}."


def _balanced(places: list[PlaceAfterBreak]) -> str:
    found = [(p.balanced.rms_v, p.at, p.balanced) for p in places if p.balanced is not None]
    if not found:
        return ""
    _, at, b = max(found, key=lambda f: f[0])
    at_pickup = f"59N ({b.detector}, {units.volts(b.pickup_v)} V)"
    says = {"sees": "sees it", "borderline": "too near to say", "misses": "misses it"}
    return (
        f"Balanced load at {place(at)}, {units.percent(b.rectifier_percent)} % rectifiers: V0 {units.volts(b.rms_v)} V "
        f"RMS; {f'{at_pickup} {says[b.verdict]}' if b.verdict in says else '59N is off'}."
    )
