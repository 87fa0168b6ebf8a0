"""A reference case as its folder holds it: what is given, which figures are expected of it, and where they are from."""

import tomllib
from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np

from tests.reference.table import Row

CASES = Path(__file__).parent / "cases"
STATUSES = ("read", "quoted", "own", "common practice, no source")
UNITS = ("v", "a", "w", "deg", "ohm", "percent", "pu", "ratio", "count")
SYMBOLS = {"v": "V", "a": "A", "w": "W", "percent": "%", "count": ""}
FLAG = "flag"
"""Unit of figures that are true or false: compared exactly."""


@dataclass(frozen=True)
class Line:
    """One solved state: what is given and the figures expected of it."""

    given: dict[str, Any]
    figures: dict[str, Any]
    name: str = ""
    """The row of the table, by what it gives."""


@dataclass(frozen=True)
class Check:
    """Figures of one source, with their tolerance a unit. Keys are those of a [[check]] in expected.toml.

    ``table`` has the given and the expected columns of several states; what ``given`` and ``figures`` say beside it
    holds in each. ``wrong_print`` is a published answer that is wrong and ``why_wrong`` says where it goes astray:
    nothing is compared with it. ``not_in_product`` says why nothing can be driven yet.
    """

    id: str
    shows: str
    status: str
    source: str
    clause: str
    tolerance: dict[str, float]
    tolerance_reason: str
    method: str = "state"
    given: dict[str, Any] = field(default_factory=dict)
    figures: dict[str, Any] = field(default_factory=dict)
    table: dict[str, Any] = field(default_factory=dict)
    printed: str = ""
    wrong_print: str = ""
    why_wrong: str = ""
    note: str = ""
    not_in_product: str = ""

    @property
    def lines(self) -> Iterator[Line]:
        """Every state with its figures; the table's rows, or the one state of ``given``."""
        if not self.table:
            yield Line(dict(self.given), dict(self.figures))
            return
        columns = [*self.table["given"], *self.table["figures"]]
        count = len(self.table["given"])
        for row in self.table["rows"]:
            cells = list(zip(columns, row, strict=True))
            name = ", ".join(f"{key} {value}" for key, value in cells[:count])
            yield Line(self.given | dict(cells[:count]), self.figures | dict(cells[count:]), name)


@dataclass(frozen=True)
class Case:
    """A folder of the cases."""

    folder: Path
    checks: tuple[Check, ...]


def folders() -> list[Path]:
    """All case folders by name."""
    return sorted(p for p in CASES.iterdir() if p.is_dir())


def read_case(folder: Path) -> Case:
    """The case of a folder. Raises TypeError for a key that no check has, and where one lacks a key."""
    return Case(folder, tuple(check_of(table) for table in _tables(folder)))


def check_of(table: dict[str, Any]) -> Check:
    """A check from its table; every figure's unit must have a tolerance."""
    check = Check(**table)
    if set(check.table) not in (set(), {"given", "figures", "rows"}):
        raise TypeError(f"{check.id}: a table has given, figures and rows")
    if check.status not in STATUSES:
        raise TypeError(f"{check.id}: status {check.status!r} is none of {', '.join(STATUSES)}")
    for key in (*check.figures, *check.table.get("figures", ())):
        if unit_of(key) not in (FLAG, *check.tolerance):
            raise TypeError(f"{check.id}: no tolerance for {key}")
    return check


def _tables(folder: Path) -> list[dict[str, Any]]:
    content = tomllib.loads((folder / "expected.toml").read_text())
    if set(content) != {"check"}:
        raise TypeError(f"{folder.name}: expected.toml holds [[check]] tables and nothing else")
    tables: list[dict[str, Any]] = content["check"]
    return tables


def unit_of(key: str) -> str:
    """The unit that a figure's key ends in."""
    unit = key.rsplit("_", 1)[-1]
    return unit if unit in UNITS else FLAG


def difference(key: str, found: Any, expected: Any) -> float:
    """Largest absolute difference of a figure or a list of them, angles modulo a turn; flags 0 or inf.

    Raises ValueError where there are not as many figures as expected.
    """
    if unit_of(key) == FLAG:
        return 0.0 if isinstance(expected, bool) and bool(found) is expected else np.inf
    if np.shape(found) != np.shape(expected):
        raise ValueError(f"{key}: {np.size(found)} figures found, {np.size(expected)} expected")
    apart = np.asarray(found, float) - np.asarray(expected, float)
    if unit_of(key) == "deg":
        apart = (apart + 180) % 360 - 180
    return float(np.abs(apart).max())


def row_of(check: Check, pairs: list[tuple[Line, dict[str, Any]]]) -> Row:
    """The row of a check: the figure nearest to its tolerance or farthest beyond it.

    ``pairs`` are the lines with what was found for each expected figure. Raises KeyError where one was not found.
    """
    compared = [
        (difference(key, found[key], expected), key, line.name)
        for line, found in pairs
        for key, expected in line.figures.items()
    ]
    if not compared:
        raise ValueError(f"{check.id}: no figure to compare")
    apart, key, name = max(compared, key=lambda c: _share(c[0], check.tolerance.get(unit_of(c[1]), 0.0)))
    count = sum(np.size(expected) for line, _ in pairs for expected in line.figures.values())
    return Row(
        check.id,
        check.source if check.status == "own" else f"{check.status}: {check.source}",
        apart,
        check.tolerance.get(unit_of(key), 0.0),
        SYMBOLS.get(unit_of(key), unit_of(key)),
        f"{count} figures; {key}{' at ' if name else ''}{name}{'; known wrong print' if check.wrong_print else ''}",
    )


def _share(apart: float, tolerance: float) -> float:
    """The difference in tolerances; what is no number is beyond any."""
    if np.isnan(apart):
        return np.inf
    return apart / tolerance if tolerance else (0.0 if apart == 0 else np.inf)
