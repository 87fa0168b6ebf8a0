"""The corridor of each element: what it has to ride through, what it has to clear, and the stages between the two."""

from typing import Any

from relaycfg import units
from relaycfg.model.device import Function
from relaycfg.model.results import Corridor, CurveStep, StageResult
from relaycfg.sheet import figures, fonts
from relaycfg.sheet.chart import DASHED, Axes, Labels, Point, arrow, hatch, polygon, stroke, text
from relaycfg.sheet.ink import Flow, Ink, Sketch
from relaycfg.sheet.settings_table import on

LOWEST_PU, HIGHEST_PU, BELOW_PU = 0.5, 1.1, 0.05
"""The volts axis of 27 in parts of the nominal volts: its ends, and the room below the lowest stage."""
ARROW = 8.0
"""Length of the arrow at a case beyond the axis."""
_HEIGHT = 232.0


def corridors(ink: Ink) -> Flow:
    """A chart and the same figures as a table for every element that is on."""
    blocks: Flow = [*ink.heading("corridors", room=_HEIGHT + 190), ink.say("corridors.lead")]
    for corridor in ink.study.corridors:
        stages = [r for r in on(ink.study) if r.stage.function is corridor.function]
        if stages:
            blocks += _corridor(ink, corridor, stages)
    return blocks


def _corridor(ink: Ink, corridor: Corridor, stages: list[StageResult]) -> Flow:
    wording = ink.wording
    element = corridor.function.value

    def draw(canvas: Any, width: float, height: float) -> None:
        _draw(ink, canvas, (34, 36, width - 40, height - 52), corridor, stages)

    rows = [
        *_rows(wording.text("corridors.ride_through"), corridor.ride_through, corridor, units.FOR_EVER),
        *_rows(wording.text("corridors.withstand"), corridor.withstand, corridor, units.FOR_EVER),
        *([r.stage.label, _level(corridor, r.stage.pickup), figures.by_unit(r.stage.delay_s, "s"), ""] for r in stages),
        *_rows(wording.text("corridors.case"), corridor.cases, corridor, wording.text("corridors.no_reset")),
    ]
    key = f"corridor_{element}"
    return [
        *ink.heading(key, 1, wording.text("corridors.element", element=element), room=_HEIGHT + 60),
        Sketch(ink.width, _HEIGHT, draw),
        ink.say("corridors.standing", "small", level=_level(corridor, corridor.standing), case=corridor.standing_case),
        *ink.table(wording.lines("corridors.heads"), rows, (20, 14, 14, 52), "lrrl"),
        ink.gap(8),
    ]


def _level(corridor: Corridor, value: float) -> str:
    return figures.by_unit(value, "%" if corridor.function is Function.UNBALANCE else "V")


def _rows(name: str, steps: tuple[CurveStep, ...], corridor: Corridor, endless: str) -> list[list[str]]:
    """Rows of a curve; ``endless`` stands where a step has no seconds."""
    return [
        [
            name,
            _level(corridor, s.pickup),
            endless if s.seconds is None else figures.by_unit(s.seconds, "s"),
            s.behind,
        ]
        for s in steps
    ]


def _draw(
    ink: Ink, canvas: Any, box: tuple[float, float, float, float], corridor: Corridor, stages: list[StageResult]
) -> None:
    axes = _axes(box, corridor, stages, ink.study.site.supply.nominal_v)
    severe = axes.low if corridor.function is Function.UNDERVOLTAGE else axes.high
    mild = axes.high if corridor.function is Function.UNDERVOLTAGE else axes.low
    ride = [(s.seconds, s.pickup) for s in corridor.ride_through if axes.holds(s.pickup)]
    left = [(s.seconds, s.pickup) for s in corridor.withstand if axes.holds(s.pickup)]
    if ride:
        hatch(canvas, polygon(canvas, _region(axes, ride, mild, severe)), box, 45)
    labels = Labels(box)
    labels.block_line(axes.ever_edge)
    if left:
        edge = _staircase(axes, left, severe)
        labels.block_line(edge)
        _double(canvas, edge)
    line = _staircase(axes, _operating(stages, corridor.function), severe)
    labels.block_line(line)
    stroke(canvas, line, 1.1, DASHED)
    words = ink.wording
    axes.draw(
        canvas,
        str(words.text("corridors.levels", unit=corridor.unit).striptags()),
        str(words.text("corridors.time").striptags()),
        str(words.text("corridors.ever").striptags()),
    )
    _marks(canvas, axes, labels, corridor, stages)
    _legend(ink, canvas, box, any(not axes.holds(c.pickup) for c in corridor.cases))


def _axes(
    box: tuple[float, float, float, float], corridor: Corridor, stages: list[StageResult], nominal_v: float
) -> Axes:
    """Axes round the curves and the stages; for 27 from half the nominal volts (or below the lowest stage) upward."""
    curves = (*corridor.ride_through, *corridor.withstand)
    times = [s.seconds for s in (*curves, *corridor.cases)] + [r.stage.delay_s for r in stages]
    pickups = [r.stage.pickup for r in stages]
    levels = [*(s.pickup for s in curves), *pickups, corridor.standing]
    if corridor.function is Function.UNDERVOLTAGE:
        floor = min(LOWEST_PU * nominal_v, *(p - BELOW_PU * nominal_v for p in pickups))
        levels = [floor, HIGHEST_PU * nominal_v, *(v for v in levels if v >= floor)]
    return Axes.around(box, times, levels)


def _double(canvas: Any, points: list[Point]) -> None:
    """A boundary as two thin lines, wide enough that a dashed line within it stays to be seen."""
    stroke(canvas, points, 3.8)
    canvas.setStrokeGray(1)
    stroke(canvas, points, 2.6)
    canvas.setStrokeGray(0)


def _operating(stages: list[StageResult], function: Function) -> list[tuple[float | None, float]]:
    """Delay over severity of all stages together: at each pickup the shortest delay of the stages reached."""
    rising = sorted(stages, key=lambda r: -r.stage.pickup if function is Function.UNDERVOLTAGE else r.stage.pickup)
    shortest = float("inf")
    steps: list[tuple[float | None, float]] = []
    for result in rising:
        shortest = min(shortest, result.stage.delay_s)
        steps.append((shortest, result.stage.pickup))
    return steps


def _staircase(axes: Axes, steps: list[tuple[float | None, float]], severe: float) -> list[Point]:
    """From the right edge in at the first level, then on towards the severe side."""
    points: list[Point] = [(axes.x + axes.width, axes.up(steps[0][1]))]
    for k, (seconds, level) in enumerate(steps):
        until = steps[k + 1][1] if k + 1 < len(steps) else severe
        points += [(axes.across(seconds), axes.up(level)), (axes.across(seconds), axes.up(until))]
    return points


def _region(axes: Axes, steps: list[tuple[float | None, float]], mild: float, severe: float) -> list[Point]:
    """Where no stage may stand: left of the staircase, and everything milder than its first step."""
    right = axes.x + axes.width
    first = right if steps[0][0] is None else axes.across(steps[0][0])
    points: list[Point] = [(axes.x, axes.up(mild)), (first, axes.up(mild))]
    for k, (seconds, level) in enumerate(steps):
        until = steps[k + 1][1] if k + 1 < len(steps) else severe
        x = right if seconds is None else axes.across(seconds)
        points += [(x, axes.up(level)), (x, axes.up(until))]
    return [*points, (axes.x, axes.up(severe))]


def _marks(canvas: Any, axes: Axes, labels: Labels, corridor: Corridor, stages: list[StageResult]) -> None:
    """Stages as squares, cases as dots with their numbers; dots that coincide share one label."""
    spots: dict[tuple[int, int], tuple[float, float, list[str]]] = {}
    for case in corridor.cases:
        x, y = axes.across(case.seconds), axes.up(case.pickup)
        if not axes.holds(case.pickup):
            y += ARROW if case.pickup < axes.low else -ARROW
        spot = spots.setdefault((round(x / 3), round(y / 3)), (x, y, []))
        spot[2].append(case.behind if case.case is None else str(case.case))
        if not axes.holds(case.pickup):
            arrow(canvas, x, y, -ARROW if case.pickup < axes.low else ARROW)
    squares = [(axes.across(r.stage.delay_s), axes.up(r.stage.pickup), r.stage.number) for r in stages]
    for x, y, _ in (*spots.values(), *squares):
        labels.block(x, y)
    for x, y, _ in squares:
        canvas.setFillGray(1)
        canvas.setLineWidth(1.1)
        canvas.rect(x - 2.8, y - 2.8, 5.6, 5.6, stroke=1, fill=1)
    canvas.setFillGray(0)
    for x, y, _ in spots.values():
        canvas.circle(x, y, 1.9, stroke=0, fill=1)
    for x, y, stage in squares:
        labels.place(canvas, x, y, f"{corridor.function.value} / {stage}", fonts.BOLD)
    for x, y, numbers in spots.values():
        labels.place(canvas, x, y, ", ".join(numbers))


def _legend(ink: Ink, canvas: Any, box: tuple[float, float, float, float], beyond: bool) -> None:
    """Samples of each line and mark in one row below the chart."""
    x, y = box[0], box[1] - 32
    names = dict(ink.wording.pairs("corridors.legend"))
    for key, name in names.items():
        if key == "beyond" and not beyond:
            continue
        plain = str(name.striptags())
        if key == "ride_through":
            sample = (x, y - 1, 16.0, 7.0)
            corners = [(x, y - 1), (x + 16, y - 1), (x + 16, y + 6), (x, y + 6)]
            hatch(canvas, polygon(canvas, corners), sample, 45, 3.5)
            canvas.setLineWidth(0.3)
            canvas.rect(*sample)
        elif key == "withstand":
            _double(canvas, [(x, y + 2.5), (x + 16, y + 2.5)])
        elif key == "stage":
            stroke(canvas, [(x, y + 2.5), (x + 16, y + 2.5)], 1.1, DASHED)
            canvas.setFillGray(1)
            canvas.rect(x + 5.4, y - 0.1, 5.2, 5.2, stroke=1, fill=1)
            canvas.setFillGray(0)
        elif key == "case":
            canvas.circle(x + 8, y + 2.5, 1.9, stroke=0, fill=1)
        else:
            canvas.circle(x + 8, y + 5, 1.9, stroke=0, fill=1)
            arrow(canvas, x + 8, y + 5, -ARROW)
        text(canvas, x + 20, y, plain, "start")
        x += 32 + fonts.width(plain, 6.6)
