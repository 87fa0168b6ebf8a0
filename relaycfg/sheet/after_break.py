"""The seconds and minutes after a break: one course drawn, then the figures of every place the relay sees."""

from typing import Any

from markupsafe import Markup

from relaycfg.model.after_break_results import CoursePicture, PlaceAfterBreak
from relaycfg.sheet import figures, fonts
from relaycfg.sheet.chart import DASHED, DOTTED, Labels, Point, stroke, text
from relaycfg.sheet.ink import GREY, HAIR, Flow, Ink, Sketch

_HEIGHT = 190.0
LINES = ((1.4, ()), (1.1, DASHED), (1.4, DOTTED))
"""Weight and dash of each line, told apart without colour."""
EVENTS = 14
"""Happenings listed; more are counted."""
ROOM = 1.08


def after_break(ink: Ink) -> Flow:
    """What no stage trips in first, then the course, cascades, drift, band edge and balanced electronics."""
    result, words = ink.study.after_break, ink.wording
    if result is None or not result.places:
        return [*ink.heading("after_break"), ink.say("after_break.empty")]
    places = result.places
    return [
        *ink.heading("after_break", room=140),
        ink.say("after_break.lead", result=result, courses=places[0].courses),
        *ink.table(
            words.lines("after_break.heads"), [_row(p) for p in places], (17, 9, 11, 20, 8, 8, 13, 9, 8), "lrrrrrrrr"
        ),
        ink.say("after_break.reading", "small"),
        *([] if result.picture is None else _chart(ink, result.picture)),
        *_stages(ink, places, result.course_s),
        *_cascades(ink, places),
        *_drift(ink, places),
        *_edge(ink, places),
        *_balanced(ink, places),
    ]


def _row(p: PlaceAfterBreak) -> list[Any]:
    trips = p.any_stage
    return [
        Markup("<b>{}</b>").format(p.at),
        Markup("<b>{}</b>").format(trips.share.of - trips.share.count),
        figures.by_unit(p.electronic_percent, "%"),
        figures.share(trips.share),
        figures.by_unit(trips.median_s, "s"),
        figures.by_unit(trips.late_s, "s"),
        f"{p.fluctuating.count} ({p.silent})",
        str(p.several),
        str(p.unresolved),
    ]


def _stages(ink: Ink, places: tuple[PlaceAfterBreak, ...], course_s: float) -> Flow:
    late = ink.wording.text("after_break.cannot", course_s=course_s)
    rows = [
        [
            p.at,
            t.what,
            figures.share(t.share) if t.possible else late,
            figures.by_unit(t.median_s, "s"),
            figures.by_unit(t.late_s, "s"),
        ]
        for p in places
        for t in p.stages
    ]
    return _part(ink, "stages", rows, (26, 24, 26, 12, 12), "lllrr")


def _cascades(ink: Ink, places: tuple[PlaceAfterBreak, ...]) -> Flow:
    """What fails in each state; states in which nothing does are left out, and said once where that is all of them."""
    rows = []
    for p in places:
        for c in p.cascades:
            if not c.lost and c.resolved:
                continue
            rounds = "; ".join(f"{lost.load} at {figures.volts(lost.highest_v)} V" for lost in c.lost)
            ends = ink.wording.text("after_break.over" if c.resolved else "after_break.unresolved")
            none = ink.wording.text("after_break.none")
            rows.append([p.at, c.state, str(len(c.lost)), rounds or none, f"{figures.volts(c.highest_v)} V, {ends}"])
    if not rows and any(p.cascades for p in places):
        title = ink.wording.text("after_break.cascade_title")
        return [*ink.heading("after_break_cascade", 1, title), ink.say("after_break.no_cascade", "small")]
    return _part(ink, "cascade", rows, (16, 14, 8, 44, 18), "llrll")


def _drift(ink: Ink, places: tuple[PlaceAfterBreak, ...]) -> Flow:
    rows = []
    for p in places:
        d = p.drift
        if d is None:
            continue
        met = "; ".join(
            f"{m.function.value} {m.picked_up.count} / {m.tripped.count}, "
            f"{figures.by_unit(m.pickup_median_s, 's')} / {figures.by_unit(m.trip_median_s, 's')}"
            for m in d.elements
        )
        volts = " / ".join(figures.volts(v) for v in (d.lowest_v, d.median_v, d.highest_v))
        step = figures.by_unit(d.largest_step_percent, "%") + (" *" if d.step_several else "")
        rows.append([p.at, volts, f"{d.changes_per_minute:.1f}", step, met, f"{d.unresolved} of {d.courses}"])
    return _part(ink, "drift", rows, (16, 19, 11, 10, 34, 10), "lrrrlr")


def _edge(ink: Ink, places: tuple[PlaceAfterBreak, ...]) -> Flow:
    rows = []
    for p in places:
        e = p.edge
        if e is None:
            continue
        for k, edge in enumerate((None, *e.edges_pu)):
            name = ink.wording.text("after_break.stated") if edge is None else f"{figures.plain(edge)} x nominal"
            moved = figures.ABSENT if k == 0 else " / ".join(figures.volts(v) for v in e.moved_v[k - 1])
            shares = [figures.share(three[k]) for three in (e.harmful, e.core, e.seen)]
            rows.append([p.at, name, moved, *shares, str(e.unresolved[k])])
    return _part(ink, "edge", rows, (15, 12, 15, 17, 17, 17, 7), "llrlllr")


def _balanced(ink: Ink, places: tuple[PlaceAfterBreak, ...]) -> Flow:
    rows = []
    for p in places:
        b = p.balanced
        if b is None:
            continue
        rows.append(
            [
                p.at,
                figures.by_unit(b.rectifier_percent, "%"),
                figures.by_unit(b.rms_v, "V"),
                figures.by_unit(b.fundamental_v, "V"),
                b.detector,
                figures.by_unit(b.pickup_v, "V"),
                ink.wording.text(f"after_break.{b.verdict}"),
            ]
        )
    return _part(ink, "balanced", rows, (20, 13, 13, 15, 13, 13, 13), "lrrrlrl")


def _part(ink: Ink, key: str, rows: list[list[Any]], shares: tuple[float, ...], align: str) -> Flow:
    """A small table under its own title, with a sentence on how to read it; nothing without rows."""
    if not rows:
        return []
    words = ink.wording
    return [
        *ink.heading(f"after_break_{key}", 1, words.text(f"after_break.{key}_title")),
        *ink.table(words.lines(f"after_break.{key}_heads"), rows, shares, align),
        ink.say(f"after_break.{key}_reading", "small"),
    ]


def _chart(ink: Ink, picture: CoursePicture) -> Flow:
    def draw(canvas: Any, width: float, height: float) -> None:
        _draw(ink, canvas, (38, 30, width - 60, height - 70), picture)

    shown = "; ".join(f"{h.at_s:.2f} s {h.load} {h.does}" for h in picture.happenings[:EVENTS])
    more = len(picture.happenings) - EVENTS
    return [
        *ink.heading(
            "after_break_course", 1, ink.wording.text("after_break.course_title", p=picture), room=_HEIGHT + 40
        ),
        Sketch(ink.width, _HEIGHT, draw),
        ink.say("after_break.course", "small", shown=shown, more=max(more, 0)),
    ]


def _draw(ink: Ink, canvas: Any, box: tuple[float, float, float, float], picture: CoursePicture) -> None:
    """Volts of each line as steps, V0 thin, the nominal volts as a hair; trips as triangles over the frame."""
    x, y, width, height = box
    top = ROOM * max(max(row) for row in picture.l_n_v)
    names = ink.study.site.supply.geometry.names

    def at(seconds: float, volts: float) -> Point:
        return x + width * seconds / picture.ends_s, y + height * volts / top

    for volts in range(0, int(top) + 1, 100):
        text(canvas, x - 5, at(0, volts)[1] - 2.3, str(volts), "end")
        stroke(canvas, [at(0, volts), (x - 3, at(0, volts)[1])], 0.3)
    for second in range(int(picture.ends_s) + 1):
        text(canvas, at(second, 0)[0], y - 11, str(second), "middle")
        stroke(canvas, [at(second, 0), (at(second, 0)[0], y - 3)], 0.3)
    nominal = ink.study.site.supply.nominal_v
    canvas.setStrokeColor(GREY)
    stroke(canvas, [at(0, nominal), at(picture.ends_s, nominal)], HAIR)
    canvas.setStrokeGray(0)
    canvas.setLineWidth(0.6)
    canvas.rect(x, y, width, height)
    labels = Labels((x, y, width + 60, height + 1))
    ends = [*picture.begins_s[1:], picture.ends_s]
    curves = [(name, [row[k] for row in picture.l_n_v], LINES[k % 3]) for k, name in enumerate(names)]
    for name, levels, (weight, dash) in [*curves, ("V0", list(picture.v0_v), (0.5, ()))]:
        steps = [at(t, v) for b, e, v in zip(picture.begins_s, ends, levels, strict=True) for t in (b, e)]
        if all(v == v for v in levels):
            stroke(canvas, steps, weight, dash)
            labels.place(canvas, x + width + 2, steps[-1][1], name, fonts.BOLD)
    _trips(canvas, at, y + height, picture)
    words = [str(ink.wording.text(f"after_break.{key}").striptags()) for key in ("volts", "seconds")]
    text(canvas, x - 5, y + height + 33, words[0], "start")
    text(canvas, x + width / 2, y - 22, words[1], "middle")


def _trips(canvas: Any, at: Any, top: float, picture: CoursePicture) -> None:
    """A triangle and a hair down the frame for each stage that trips, labels in three rows so that they keep clear."""
    for k, (stage, seconds) in enumerate(sorted(picture.trips, key=lambda trip: trip[1])):
        if seconds > picture.ends_s:
            continue
        across = at(seconds, 0.0)[0]
        stroke(canvas, [(across, at(0, 0.0)[1]), (across, top)], 0.3, DASHED)
        path = canvas.beginPath()
        path.moveTo(across, top)
        path.lineTo(across - 3, top + 5)
        path.lineTo(across + 3, top + 5)
        path.close()
        canvas.drawPath(path, stroke=0, fill=1)
        text(canvas, across - 3, top + 8 + 7.5 * (k % 3), f"{stage} {seconds:.2f} s", "start")
