"""Figures measured in one run, as one plain table."""

import statistics
import time
from collections.abc import Callable, Sequence
from dataclasses import dataclass

REPEATS = 5


@dataclass(frozen=True)
class Row:
    """One measure: its repeats, how to print one of them, and what is asked of their median."""

    measure: str
    figures: Sequence[float]
    form: str = "{:.3g}"
    most: float | None = None
    least: float | None = None
    worst: bool = False
    """The figure is the greatest of the repeats, not their median: an error, a share that must never be passed."""

    @property
    def figure(self) -> float:
        """What counts."""
        return max(self.figures) if self.worst else statistics.median(self.figures)

    def cells(self) -> tuple[str, ...]:
        """Measure, figure, spread, asked, verdict."""
        asked, verdict = "-", "-"
        if self.most is not None:
            asked, verdict = f"<= {self.most:g}", "met" if self.figure <= self.most else "missed"
        if self.least is not None:
            asked, verdict = f">= {self.least:g}", "met" if self.figure >= self.least else "missed"
        spread = f"{self.form.format(min(self.figures))} to {self.form.format(max(self.figures))}"
        return self.measure, self.form.format(self.figure), spread if len(self.figures) > 1 else "-", asked, verdict


def table(rows: Sequence[Row]) -> str:
    """All rows under one head, columns as wide as they need."""
    lines = [("measure", "figure", "spread", "asked", "")] + [row.cells() for row in rows]
    widths = [max(len(line[k]) for line in lines) for k in range(5)]
    return "\n".join("  ".join(c.ljust(w) for c, w in zip(line, widths, strict=True)).rstrip() for line in lines)


def seconds(work: Callable[[], object]) -> float:
    """How long one call takes."""
    start = time.perf_counter()
    work()
    return time.perf_counter() - start


def ratios(above: Callable[[], object], below: Callable[[], object], passes: int = 10) -> list[float]:
    """Seconds of one over seconds of the other, taken in turns; of the other the mean of some passes."""
    above(), below()
    return [seconds(above) / (seconds(lambda: [below() for _ in range(passes)]) / passes) for _ in range(REPEATS)]
