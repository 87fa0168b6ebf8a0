"""What charts are drawn with: a volts-over-time frame, hatching, line styles, labels that keep clear of each other."""

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field
from itertools import pairwise
from typing import Any

from relaycfg.sheet import figures, fonts

Point = tuple[float, float]
SIZE = 6.6
EVEN_ODD = 0
NEAR = 4.0
"""A label so near to its mark needs no line to it."""
DASHED, DOTTED = (5, 2.2), (1, 2)


@dataclass(frozen=True)
class Axes:
    """Maps seconds (logarithmic, to the right) and volts (upward) into a box on the page; None seconds: for ever."""

    x: float
    y: float
    width: float
    height: float
    first_s: float
    last_s: float
    low: float
    high: float
    ever: float = 26.0
    """Width of the strip at the right that stands for "for ever"."""

    @classmethod
    def around(
        cls, box: tuple[float, float, float, float], seconds: Iterable[float | None], levels: Iterable[float]
    ) -> "Axes":
        """Axes that hold all the points, whole decades wide."""
        finite = [s for s in seconds if s is not None and math.isfinite(s) and s > 0] or [0.1, 10.0]
        heights = list(levels)
        room = 0.08 * max(max(heights) - min(heights), 1.0)
        first = math.floor(math.log10(min(finite)) - 0.05)
        last = max(math.ceil(math.log10(max(finite)) + 0.05), first + 2)
        return cls(*box, 10.0**first, 10.0**last, min(heights) - room, max(heights) + room)

    def across(self, seconds: float | None) -> float:
        """Horizontal position."""
        if seconds is None or math.isinf(seconds):
            return self.x + self.width - self.ever / 2
        share = math.log10(max(seconds, self.first_s) / self.first_s) / math.log10(self.last_s / self.first_s)
        return self.x + share * (self.width - self.ever)

    def up(self, level: float) -> float:
        """Vertical position, kept within the box."""
        share = (level - self.low) / (self.high - self.low)
        return self.y + min(max(share, 0.0), 1.0) * self.height

    def holds(self, level: float) -> bool:
        """Whether a level lies on the axis."""
        return self.low <= level <= self.high

    @property
    def ever_edge(self) -> list[Point]:
        """The upright line before the strip that stands for "for ever"."""
        edge = self.x + self.width - self.ever
        return [(edge, self.y), (edge, self.y + self.height)]

    @property
    def ticks(self) -> list[float]:
        """Round levels, at most nine."""
        span = self.high - self.low
        rough = span / 7
        unit = 10.0 ** math.floor(math.log10(rough))
        step = next(unit * k for k in (1, 2, 5, 10) if unit * k >= rough)
        start = math.ceil(self.low / step)
        return [step * k for k in range(start, math.floor(self.high / step) + 1)]

    def draw(self, canvas: Any, level_name: str, time_name: str, ever_name: str) -> None:
        """Box, ticks and their figures."""
        canvas.setLineWidth(0.3)
        for level in self.ticks:
            y = self.up(level)
            canvas.line(self.x - 3, y, self.x, y)
            text(canvas, self.x - 5, y - 2.3, figures.plain(level), "end")
        decade = self.first_s
        while decade <= self.last_s * 1.001:
            x = self.across(decade)
            canvas.line(x, self.y - 4, x, self.y)
            text(canvas, x, self.y - 11, figures.plain(decade), "middle")
            for k in range(2, 10):
                if decade * k < self.last_s:
                    minor = self.across(decade * k)
                    canvas.line(minor, self.y - 2, minor, self.y)
            decade *= 10
        stroke(canvas, self.ever_edge, 0.3, DOTTED)
        text(canvas, self.x + self.width, self.y - 20, ever_name, "end")
        text(canvas, self.x - 5, self.y + self.height + 5, level_name, "start")
        text(canvas, self.x + (self.width - self.ever) / 2, self.y - 20, time_name, "middle")
        canvas.setLineWidth(0.6)
        canvas.rect(self.x, self.y, self.width, self.height)


@dataclass
class Labels:
    """Labels placed so far; a new one takes the first free spot round its mark, or stays out."""

    box: tuple[float, float, float, float]
    taken: list[tuple[float, float, float, float]] = field(default_factory=list)
    written: list[tuple[float, float, float, float]] = field(default_factory=list)

    def block(self, x: float, y: float, half: float = 2.6) -> None:
        """Keep a mark's own spot free of labels."""
        self.taken.append((x - half, y - half, x + half, y + half))

    def block_line(self, points: Sequence[Point]) -> None:
        """Keep level and upright pieces of a line free of labels."""
        for (x0, y0), (x1, y1) in pairwise(points):
            self.taken.append((min(x0, x1) - 1.2, min(y0, y1) - 1.2, max(x0, x1) + 1.2, max(y0, y1) + 1.2))

    def place(self, canvas: Any, x: float, y: float, label: str, font: str = fonts.SANS) -> bool:
        """Write ``label`` near (x, y) on a white ground; False where no spot is free."""
        wide, tall = fonts.width(label, SIZE, font) + 2, SIZE + 0.6
        left, bottom, width, height = self.box
        for radius in (NEAR, 10.0, 17.0, 25.0):
            spots = (
                (x + radius, y - tall / 2),
                (x - radius - wide, y - tall / 2),
                (x - wide / 2, y + radius),
                (x - wide / 2, y - radius - tall),
                (x + radius, y + radius / 2),
                (x - radius - wide, y + radius / 2),
                (x + radius, y - radius / 2 - tall),
                (x - radius - wide, y - radius / 2 - tall),
            )
            for px, py in spots:
                spot = (px, py, px + wide, py + tall)
                inside = left < px and bottom < py and spot[2] < left + width and spot[3] < bottom + height
                if not inside or any(_meet(spot, other) for other in self.taken):
                    continue
                leader = _leader((x, y), spot) if radius > NEAR else []
                if not any(_meet(bead, other) for bead in leader for other in self.written):
                    self._write(canvas, spot, (x, y) if radius > NEAR else None, label, font)
                    self.taken += leader
                    return True
        return False

    def _write(
        self, canvas: Any, spot: tuple[float, float, float, float], mark: Point | None, label: str, font: str
    ) -> None:
        px, py, right, top = spot
        if mark is not None:
            stroke(canvas, [mark, _nearest(mark, spot)], 0.3)
        canvas.setFillGray(1)
        canvas.rect(px, py, right - px, top - py, stroke=0, fill=1)
        canvas.setFillGray(0)
        text(canvas, px + 1, py + 1.4, label, "start", font)
        self.taken.append(spot)
        self.written.append(spot)


def _nearest(mark: Point, spot: tuple[float, float, float, float]) -> Point:
    """The point of a label's box that is nearest to its mark."""
    return min(max(mark[0], spot[0]), spot[2]), min(max(mark[1], spot[1]), spot[3])


def _leader(mark: Point, spot: tuple[float, float, float, float]) -> list[tuple[float, float, float, float]]:
    """Small boxes along the line from a mark to its label, both ends left out."""
    end = _nearest(mark, spot)
    beads = [(mark[0] + (end[0] - mark[0]) * k / 12, mark[1] + (end[1] - mark[1]) * k / 12) for k in range(3, 12)]
    return [(x - 0.4, y - 0.4, x + 0.4, y + 0.4) for x, y in beads]


def _meet(a: tuple[float, float, float, float], b: tuple[float, float, float, float]) -> bool:
    return a[0] < b[2] and b[0] < a[2] and a[1] < b[3] and b[1] < a[3]


def text(canvas: Any, x: float, y: float, words: str, anchor: str, font: str = fonts.SANS, size: float = SIZE) -> None:
    """A short label, its start, middle or end at (x, y)."""
    canvas.setFont(font, size)
    {"start": canvas.drawString, "middle": canvas.drawCentredString, "end": canvas.drawRightString}[anchor](x, y, words)


def stroke(canvas: Any, points: Sequence[Point], weight: float, dash: tuple[float, ...] = ()) -> None:
    """A line through points."""
    path = canvas.beginPath()
    path.moveTo(*points[0])
    for point in points[1:]:
        path.lineTo(*point)
    canvas.setLineWidth(weight)
    canvas.setDash(*([list(dash)] if dash else []))
    canvas.drawPath(path, stroke=1, fill=0)
    canvas.setDash()


def arrow(canvas: Any, x: float, y: float, by: float) -> None:
    """An upright arrow from (x, y), ``by`` long, downward where that is negative."""
    stroke(canvas, [(x, y), (x, y + by)], 0.8)
    head = by / abs(by) * 3.6
    canvas.drawPath(polygon(canvas, [(x, y + by), (x - 2, y + by - head), (x + 2, y + by - head)]), stroke=0, fill=1)


def polygon(canvas: Any, points: Sequence[Point]) -> Any:
    """A closed path."""
    path = canvas.beginPath()
    path.moveTo(*points[0])
    for point in points[1:]:
        path.lineTo(*point)
    path.close()
    return path


def hatch(canvas: Any, region: Any, box: tuple[float, float, float, float], angle: int, gap: float = 5.0) -> None:
    """Fill ``region`` (a path, even-odd) with parallel lines: 45, -45 or 0 degrees, on one grid for the whole box."""
    x, y, width, height = box
    canvas.saveState()
    canvas.clipPath(region, stroke=0, fill=0, fillMode=EVEN_ODD)
    lines = canvas.beginPath()
    reach = height if angle else 0.0
    for k in range(int((width + reach if angle else height) / gap) + 2):
        if angle == 0:
            lines.moveTo(x, y + k * gap)
            lines.lineTo(x + width, y + k * gap)
        else:
            start = x - reach + k * gap
            lines.moveTo(start, y if angle > 0 else y + height)
            lines.lineTo(start + reach, y + height if angle > 0 else y)
    canvas.setLineWidth(0.3)
    canvas.setDash()
    canvas.drawPath(lines, stroke=1, fill=0)
    canvas.restoreState()
