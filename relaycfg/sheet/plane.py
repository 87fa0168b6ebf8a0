"""The neutral-displacement plane: where the neutral stands in each break state, and where the relay is blind."""

import math
from typing import Any

from relaycfg.model.device import Function
from relaycfg.model.geometry import Geometry
from relaycfg.model.results import PlanePoint, StageResult, Study
from relaycfg.sheet import figures, fonts
from relaycfg.sheet.chart import DASHED, DOTTED, hatch, stroke, text
from relaycfg.sheet.ink import Flow, Ink, Sketch
from relaycfg.sheet.settings_table import measured, on

_SIDE = 330.0
_CLASSES = ("undetected", "early", "cleared", "left")
_DASH: dict[Function, tuple[float, ...]] = {
    Function.OVERVOLTAGE: (),
    Function.UNDERVOLTAGE: DASHED,
    Function.DISPLACEMENT: DOTTED,
}
Ring = tuple[Function, complex, float]


def plane(ink: Ink) -> Flow:
    """The plane with its legend, and the count of states in each class."""
    wording, points = ink.wording, ink.study.plane
    rows = [[wording.text(f"plane.classes.{name}"), str(sum(_class(p) == name for p in points))] for name in _CLASSES]

    def draw(canvas: Any, width: float, height: float) -> None:
        _draw(ink, canvas, width, height)

    return [
        *ink.heading("plane", room=_SIDE + 140),
        ink.say("plane.lead", source=ink.study.site.source, each=_each(ink.study), geometry=_geometry(ink.study)),
        Sketch(ink.width, _SIDE + 6, draw),
        ink.gap(4),
        *ink.table(wording.lines("plane.heads"), rows, (75, 25), "lr", width=0.6 * ink.width),
    ]


def _each(study: Study) -> int:
    """At most so many states of each place seen are shown."""
    return math.ceil(len(study.plane) / max(study.breaks.seen_places, 1))


def _class(point: PlanePoint) -> str:
    if point.harm == "none":
        return "undetected" if point.operation == "none" else "early"
    return "cleared" if point.operation == "in time" else "left"


def rings(study: Study) -> list[Ring]:
    """Pickup circles [V] of the most sensitive stages: round every line corner, 59N round the undisplaced neutral."""
    corners = _corners(study)
    found: list[Ring] = []
    for function in (Function.OVERVOLTAGE, Function.UNDERVOLTAGE, Function.DISPLACEMENT):
        stages = [r for r in on(study) if r.stage.function is function and r.stage.phases == "any"]
        radii = [_radius(r, study) for r in stages if measured(r, study) != "l-l"]
        if not radii:
            continue
        radius = max(radii) if function is Function.UNDERVOLTAGE else min(radii)
        centres = [0j] if function is Function.DISPLACEMENT else corners
        found += [(function, centre, radius) for centre in centres]
    return found


def _geometry(study: Study) -> Geometry:
    return study.site.supply.geometry


def upright(study: Study) -> complex:
    """Unit phasor that turns the plane: the first of three lines upward; two lines on one level, the first on the left.

    With two lines the sound neutral stands between them (split phase) or below the line from one to the other.
    """
    phasors = _geometry(study).phasors
    if _geometry(study).has_sequences:
        return 1j
    across = complex(phasors[1] - phasors[0])
    return across.conjugate() / abs(across)


def _corners(study: Study) -> list[complex]:
    """The lines at the source's no-load volts, as the plane is turned."""
    return [complex(c) * study.site.source.emf_v * upright(study) for c in _geometry(study).phasors]


def _radius(result: StageResult, study: Study) -> float:
    """The circle's radius [V]: a pickup in 3V0 counts a third, one in the sum of two lines half."""
    return result.stage.pickup / (len(_geometry(study).names) if measured(result, study) == "3v0" else 1)


def _draw(ink: Ink, canvas: Any, width: float, height: float) -> None:
    study = ink.study
    reach = 1.12 * max([study.site.source.emf_v, *(abs(p.v0) for p in study.plane)])
    box = (0.0, 3.0, _SIDE, _SIDE)
    scale = _SIDE / 2 / reach
    middle = complex(_SIDE / 2, 3 + _SIDE / 2)
    circles = rings(study)
    outline = canvas.beginPath()
    outline.rect(*box)
    canvas.saveState()
    canvas.clipPath(outline, stroke=0, fill=0)
    for function, centre, radius in circles:
        _shade(canvas, function, middle + scale * centre, scale * radius, box)
    canvas.setStrokeGray(0)
    for function, centre, radius in circles:
        at = middle + scale * centre
        canvas.setLineWidth(0.9)
        canvas.setDash(list(_DASH[function]))
        canvas.circle(at.real, at.imag, scale * radius, stroke=1, fill=0)
    canvas.setDash()
    corners = [middle + scale * corner for corner in _corners(study)]
    stroke(canvas, [(c.real, c.imag) for c in (*corners, corners[0])], 0.5)
    _points(canvas, study.plane, middle, scale * upright(study))
    canvas.restoreState()
    if not _geometry(study).has_sequences:
        _sound_neutral(canvas, middle)
    _names(ink, canvas, corners, middle)
    canvas.setLineWidth(0.6)
    canvas.rect(*box)
    _legend(ink, canvas, _SIDE + 14, width - _SIDE - 14, height, circles)


def _shade(canvas: Any, function: Function, at: complex, radius: float, box: tuple[float, float, float, float]) -> None:
    """Hatch where the element operates: beyond its circle, or for 27 within it."""
    region = canvas.beginPath()
    if function is not Function.UNDERVOLTAGE:
        region.rect(*box)
    region.circle(at.real, at.imag, radius)
    canvas.setStrokeGray(0.4)
    hatch(canvas, region, box, 45, 7)


def _points(canvas: Any, points: tuple[PlanePoint, ...], middle: complex, scale: complex) -> None:
    """Marks by class, one on top of each other only once; the weightiest class last."""
    for name in _CLASSES:
        spots = {}
        for point in points:
            if _class(point) == name:
                at = middle - scale * point.v0
                spots[round(at.real), round(at.imag)] = at
        for at in spots.values():
            mark(canvas, name, at.real, at.imag)


def _sound_neutral(canvas: Any, at: complex) -> None:
    """Where a sound neutral stands: three lines show it as the middle of their triangle, two lines do not."""
    canvas.setLineWidth(0.9)
    canvas.circle(at.real, at.imag, 5, stroke=1, fill=0)
    text(canvas, at.real, at.imag - 14, "N", "middle", fonts.BOLD, 8)


def mark(canvas: Any, name: str, x: float, y: float) -> None:
    """A state's mark: ring, upright cross, slanted cross or black triangle."""
    canvas.setLineWidth(0.8)
    if name == "undetected":
        canvas.setFillGray(1)
        canvas.circle(x, y, 2.1, stroke=1, fill=1)
        canvas.setFillGray(0)
    elif name == "left":
        path = canvas.beginPath()
        path.moveTo(x - 3.4, y - 2.5)
        path.lineTo(x + 3.4, y - 2.5)
        path.lineTo(x, y + 3.8)
        path.close()
        canvas.drawPath(path, stroke=0, fill=1)
    elif name == "early":
        canvas.line(x - 2.2, y, x + 2.2, y)
        canvas.line(x, y - 2.2, x, y + 2.2)
    else:
        canvas.line(x - 1.8, y - 1.8, x + 1.8, y + 1.8)
        canvas.line(x - 1.8, y + 1.8, x + 1.8, y - 1.8)


def _names(ink: Ink, canvas: Any, corners: list[complex], middle: complex) -> None:
    for name, corner in zip(ink.study.site.supply.geometry.names, corners, strict=True):
        outward = corner + 9 * (corner - middle) / abs(corner - middle)
        wide = fonts.width(name, 8, fonts.BOLD) + 2
        canvas.setFillGray(1)
        canvas.rect(outward.real - wide / 2, outward.imag - 4.5, wide, 9, stroke=0, fill=1)
        canvas.setFillGray(0)
        text(canvas, outward.real, outward.imag - 2.8, name, "middle", fonts.BOLD, 8)


def _legend(ink: Ink, canvas: Any, x: float, wide: float, height: float, circles: list[Ring]) -> None:
    """At the right of the plane: circles with their pickups, marks with their meaning."""
    y = height - 14
    radii = {function: radius for function, _, radius in circles}
    for function, radius in radii.items():
        stroke(canvas, [(x, y + 2.4), (x + 20, y + 2.4)], 0.9, _DASH[function])
        key = f"plane.circle_{function.name.lower()}"
        y = _lines(canvas, ink, key, x + 26, y, wide - 26, radius=figures.volts(radius)) - 6
    for name in _CLASSES:
        mark(canvas, name, x + 10, y + 2.4)
        y = _lines(canvas, ink, f"plane.classes.{name}", x + 26, y, wide - 26) - 6
    for key in ("plane.operates", "plane.blind"):
        sample = (x, y - 2, 20.0, 9.0)
        if key == "plane.operates":
            region = canvas.beginPath()
            region.rect(*sample)
            hatch(canvas, region, sample, 45, 4)
        canvas.setLineWidth(0.3)
        canvas.rect(*sample)
        y = _lines(canvas, ink, key, x + 26, y, wide - 26) - 6


def _lines(canvas: Any, ink: Ink, key: str, x: float, y: float, wide: float, **context: object) -> float:
    """A legend entry from the wording, wrapped; returns where the next one may start."""
    words = str(ink.wording.text(key, **context).striptags()).split()
    row: list[str] = []
    for word in words:
        if row and fonts.width(" ".join([*row, word]), 7.2) > wide:
            text(canvas, x, y, " ".join(row), "start", size=7.2)
            row, y = [], y - 9
        row.append(word)
    text(canvas, x, y, " ".join(row), "start", size=7.2)
    return y - math.ceil(9)
