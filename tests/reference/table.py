"""The table of all references: one row a case, its worst difference against its tolerance."""

import math
from collections import Counter
from collections.abc import Iterable
from dataclasses import dataclass

SKIPPED = "skipped: "
"""How the note of a row begins that compares nothing."""


@dataclass(frozen=True)
class Row:
    """One reference, measured: the worst difference and the tolerance, both in ``unit``."""

    case: str
    source: str
    worst: float
    tolerance: float
    unit: str
    note: str = ""

    @property
    def holds(self) -> bool:
        """Whether the worst difference is a number within the tolerance."""
        return math.isfinite(self.worst) and self.worst <= self.tolerance

    @property
    def skipped(self) -> bool:
        """Whether nothing was compared, as the note says with its reason."""
        return self.note.startswith(SKIPPED)


def print_rows(rows: Iterable[Row]) -> Counter[str]:
    """Print every row as it comes, aligned; how many hold, FAIL or are skipped."""
    _print("case", "source", "worst", "tolerance", "unit", "verdict", "figures")
    verdicts: Counter[str] = Counter()
    for row in rows:
        verdict = "skipped" if row.skipped else "holds" if row.holds else "FAILS"
        worst = "" if row.skipped else f"{row.worst:.2g}"
        _print(row.case, row.source, worst, f"{row.tolerance:.2g}", row.unit, verdict, row.note)
        verdicts[verdict] += 1
    return verdicts


def _print(case: str, source: str, worst: str, tolerance: str, unit: str, verdict: str, note: str) -> None:
    line = f"{case:<64.64} {source:<52.52} {worst:>8} {tolerance:>9} {unit:<7} {verdict:<7} {note}"
    print(line.rstrip(), flush=True)
