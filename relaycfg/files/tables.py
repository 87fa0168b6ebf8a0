"""Published values: rows with a source and a status, found by id or by the name a user may write."""

import re
import tomllib
import unicodedata
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from types import MappingProxyType
from typing import Any

from relaycfg.files.places import tables_dir

STATUSES = ("read", "quoted", "memory", "own")
ENDINGS = {"read": "read", "quoted": "as quoted", "memory": "from memory, verify", "own": "ours"}
"""How a status reads behind its source."""
CLAUSE_FROM_MEMORY = re.compile(r" \([^()]*from memory\)$")


class TableError(ValueError):
    """A shipped row that does not say where it is from."""


def tidy(name: str) -> str:
    """A name as compared: without blanks around it, in Unicode composed form."""
    return unicodedata.normalize("NFC", name.strip())


@dataclass(frozen=True)
class Row:
    """One published value or small table. ``status`` is read, quoted, memory or own."""

    id: str
    family: str
    content: Mapping[str, Any]

    @property
    def status(self) -> str:
        """How well the value is known."""
        return str(self.content["status"])

    @property
    def name(self) -> str:
        """The name a user may write; the id where the row has none."""
        return str(self.content.get("name", self.id))

    @property
    def source(self) -> str:
        """Source and clause, for print beside the status.

        A clause known from memory only is left out where the value itself was seen: one text says one thing.
        """
        clause, named = str(self.content["clause"]), str(self.content["source"])
        known = CLAUSE_FROM_MEMORY.sub("", clause)
        if clause in ("none", "not known") or (known != clause and self.status != "memory"):
            return named
        return named if named.endswith(known) else f"{named}, {known}"

    @property
    def cited(self) -> str:
        """Source and how it is known in one, for print where no status stands beside."""
        return f"{self.source}, {ENDINGS[self.status]}"

    @property
    def value(self) -> Any:
        """The single value of a row that has one."""
        return self.content["value"]

    @property
    def values(self) -> Mapping[str, Any]:
        """Named values of a row that has several."""
        values: Mapping[str, Any] = self.content["values"]
        return values

    @property
    def points(self) -> tuple[tuple[float, ...], ...]:
        """Lines of a row that is a small table, in the order of its columns."""
        return tuple(tuple(point) for point in self.content["points"])


def load_rows(folder: Path) -> dict[str, Row]:
    """All rows of all tables in ``folder``; raises TableError for one without source, clause or a known status."""
    rows: dict[str, Row] = {}
    for path in sorted(folder.glob("*.toml")):
        table = tomllib.loads(path.read_text(encoding="utf-8"))
        if not table.get("family") or not table.get("row"):
            raise TableError(f"{path.name}: lacks a family or rows")
        for content in table["row"]:
            row = Row(str(content.get("id", "")), str(table["family"]), MappingProxyType(content))
            lacking = [k for k in ("id", "unit", "applies_to", "source", "clause", "status") if not content.get(k)]
            if lacking or row.status not in STATUSES or row.id in rows:
                lacks = ", ".join(lacking) or "a known status or an id of its own"
                raise TableError(f"{path.name}: row {row.id!r} lacks {lacks}")
            rows[row.id] = row
    return rows


@cache
def shipped() -> dict[str, Row]:
    """The rows that come with the program, read once."""
    return load_rows(tables_dir())


class Tables:
    """The rows as one reading of a site uses them; remembers which ones it used."""

    def __init__(self) -> None:
        self.used: dict[str, Row] = {}

    def row(self, row_id: str) -> Row:
        """The row of that id, marked as used."""
        row = shipped()[row_id]
        self.used[row_id] = row
        return row

    def named(self, family: str, name: str) -> Row | None:
        """The row of a family by a name the user wrote (or its id), marked as used; None where there is none."""
        for row in shipped().values():
            if row.family == family and tidy(name) in (row.id, row.name, *row.content.get("also", ())):
                return self.row(row.id)
        return None


def names(family: str, keep: Callable[[Row], bool] = lambda _: True) -> tuple[str, ...]:
    """Names a user may write for a family, of the rows to keep."""
    found: list[str] = []
    for row in shipped().values():
        if row.family == family and "name" in row.content and keep(row):
            found.extend((row.name, *row.content.get("also", ())))
    return tuple(found)


def is_high_curve(row: Row) -> bool:
    """Whether a withstand curve tells of overvoltage: a sustained level above nominal stands in it."""
    return "sustained_v" in row.content or row.content.get("sustained_percent", 0) > 100


def is_50_hz(frequency_hz: float, tables: Tables) -> bool:
    """Whether a frequency is that of a 50 Hz system rather than of a 60 Hz one."""
    return bool(frequency_hz < tables.row("default-frequency-split").value)
