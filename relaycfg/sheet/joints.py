"""A loose joint in the neutral: what burns unseen, where each stage speaks, as a chart with its figures beside it."""

import math
from typing import Any

from markupsafe import Markup

from relaycfg.model.joint_results import JointSight, JointState, JointSweep
from relaycfg.sheet import figures, fonts
from relaycfg.sheet.chart import DASHED, Axes, Labels, Point, stroke
from relaycfg.sheet.ink import Flow, Ink, Sketch

FIRST_OHM, LAST_OHM = 0.01, 1000.0
_HEIGHT, _ROOM = 150.0, 1.12
HEAVY, THIN = 2.2, 0.7
CHARTS = 2
"""Places drawn; all of them stand in the table."""


def joints(ink: Ink) -> Flow:
    """Places the relay sees with its stages, the others with their heat alone; then the advice on an alarm."""
    study, words = ink.study, ink.wording
    sweeps = study.breaks.joints
    if not sweeps:
        return [*ink.heading("joints"), ink.say("joints.empty")]
    seen = [s for s in sweeps if s.unseen is not None]
    warning = study.early_warning
    return [
        *ink.heading("joints", room=_HEIGHT + 120),
        ink.boxed([ink.say("joints.rule")]),
        ink.gap(4),
        ink.say("joints.lead"),
        *(
            ink.say("joints.share", s=s, unseen=_share(s.unseen), unheard=_share(s.unheard), hot=_hot(ink))
            for s in seen
        ),
        *(part for s in seen[:CHARTS] for part in _chart(ink, s)),
        *ink.table(words.lines("joints.heads"), _rows(ink, sweeps), (16, 13, 9, 17, 9, 9, 9, 9, 9), "llrlrrrrr"),
        *([] if warning is None else [ink.gap(3), ink.p(warning.sentence)]),
        *_stages(ink, seen),
    ]


def _hot(ink: Ink) -> float:
    return ink.study.site.judgement.hot_joint_w


def _share(share: Any) -> str:
    return "" if share is None else figures.share(share)


def _rows(ink: Ink, sweeps: tuple[JointSweep, ...]) -> list[list[Any]]:
    """One row a place and load state: unseen first, then the first stage to trip, then the hottest joint."""
    rows: list[list[Any]] = []
    for sweep in sweeps:
        for state in sweep.states:
            first, hot = first_trip(state), state.hottest
            blind = sweep.unseen is None
            rows.append(
                [
                    Markup("<b>{}</b>").format(sweep.at),
                    state.name,
                    Markup("<b>{}</b>").format(figures.by_unit(hot.joint_w if blind else state.unseen_w, "W")),
                    ink.wording.text("joints.none") if first is None else first.stage,
                    figures.ABSENT if first is None else ohms(ink, first.joint_ohm),
                    figures.ABSENT if first is None else figures.by_unit(first.before_w, "W"),
                    figures.by_unit(hot.joint_w, "W"),
                    ohms(ink, hot.joint_ohm),
                    figures.by_unit(hot.joint_v, "V"),
                ]
            )
    return rows


def first_trip(state: JointState) -> JointSight | None:
    """The tripping stage that picks up at the least ohms; None where none does."""
    trips = [s for s in state.sights if s.clearing_s is not None and s.joint_ohm is not None]
    return min(trips, key=lambda s: s.joint_ohm or 0.0, default=None)


def ohms(ink: Ink, value: float | None) -> str:
    """The ohms of a joint; an open one has none."""
    if value is not None and math.isinf(value):
        return str(ink.wording.text("joints.open").striptags())
    return figures.by_unit(value, "ohm")


def _stages(ink: Ink, seen: list[JointSweep]) -> Flow:
    """Every stage in the hottest sampled state: the joint it first sees and what burns by then."""
    rows = [
        [
            sweep.at,
            s.stage,
            ohms(ink, s.joint_ohm),
            figures.by_unit(s.joint_v, "V"),
            figures.by_unit(s.joint_w, "W"),
            figures.by_unit(s.before_w, "W"),
            figures.by_unit(s.clearing_s, "s"),
        ]
        for sweep in seen
        for s in sweep.states[-1].sights
    ]
    if not rows:
        return []
    return [
        *ink.heading("joints_stages", 1, ink.wording.text("joints.stages_title")),
        *ink.table(ink.wording.lines("joints.stages_heads"), rows, (22, 24, 11, 11, 11, 11, 10), "llrrrrr"),
    ]


def _chart(ink: Ink, sweep: JointSweep) -> Flow:
    def draw(canvas: Any, width: float, height: float) -> None:
        _draw(ink, canvas, (38, 34, width - 44, height - 50), sweep)

    return [
        *ink.heading(f"joint_{sweep.at}", 1, ink.wording.text("joints.chart_title", s=sweep), room=_HEIGHT + 30),
        Sketch(ink.width, _HEIGHT, draw),
    ]


def _draw(ink: Ink, canvas: Any, box: tuple[float, float, float, float], sweep: JointSweep) -> None:
    most = max(state.hottest.joint_w for state in sweep.states)
    axes = Axes(*box, FIRST_OHM, LAST_OHM, 0.0, _ROOM * max(most, 1.0))
    names = [str(ink.wording.text(f"joints.{key}").striptags()) for key in ("watts", "ohms", "open")]
    axes.draw(canvas, *names)
    labels = Labels(box)
    labels.block_line(axes.ever_edge)
    for number, state in enumerate(sweep.states):
        _curve(canvas, axes, labels, state, number + 1 < len(sweep.states))


def _curve(canvas: Any, axes: Axes, labels: Labels, state: JointState, dashed: bool) -> None:
    """The heat of one state: heavy until the first stage trips, thin beyond; its stages as squares."""
    points = {p.joint_ohm: p.joint_w for p in state.points if p.resolved and FIRST_OHM <= p.joint_ohm < math.inf}
    points[state.hottest.joint_ohm] = state.hottest.joint_w
    first = first_trip(state)
    until = LAST_OHM if first is None or first.joint_ohm is None else min(first.joint_ohm, LAST_OHM)
    if first is not None and first.joint_ohm is not None and first.joint_w is not None and until < LAST_OHM:
        points[first.joint_ohm] = first.joint_w
    line = sorted(points.items())
    before = [_at(axes, ohm, watts) for ohm, watts in line if ohm <= until]
    after = [_at(axes, ohm, watts) for ohm, watts in line if ohm >= until]
    for part, weight in ((before, HEAVY), (after, THIN)):
        if len(part) > 1:
            stroke(canvas, part, weight, DASHED if dashed else ())
            labels.block_line(part)
    marks = [
        (*_at(axes, s.joint_ohm, s.joint_w), s.stage)
        for s in (() if dashed else state.sights)
        if s.joint_ohm is not None and s.joint_w is not None and FIRST_OHM <= s.joint_ohm <= LAST_OHM
    ]
    for x, y, _ in marks:
        labels.block(x, y)
        canvas.setFillGray(1)
        canvas.setLineWidth(1.0)
        canvas.rect(x - 2.2, y - 2.2, 4.4, 4.4, stroke=1, fill=1)
        canvas.setFillGray(0)
    for x, y, stage in marks:
        labels.place(canvas, x, y, stage)
    labels.place(canvas, *_at(axes, state.hottest.joint_ohm, state.hottest.joint_w), state.name, fonts.BOLD)


def _at(axes: Axes, ohm: float, watts: float) -> Point:
    return axes.across(ohm), axes.up(watts)
