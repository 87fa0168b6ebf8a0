"""The committed list of every row of the tables: what it says, where it is from, and what to do when the two part.

``standard-rows.toml`` has one table a row with its figures in the clear and a seal over all of it. A figure that
changes while its source stays is refused; one that changes with its source needs the new entry, which the complaint
spells out, to be put there by hand.
"""

import hashlib
import json
import tomllib
from dataclasses import astuple, dataclass
from pathlib import Path

from relaycfg.files.tables import Row

LIST = Path(__file__).parent / "standard-rows.toml"
APART = ("id", "name", "also", "unit", "applies_to", "source", "clause", "status", "note")
"""Keys of a row that are no figures."""


@dataclass(frozen=True)
class Entry:
    """One row as listed; ``reason`` is the note of a row of our own, which has no other source, else empty."""

    value: str
    unit: str
    source: str
    clause: str
    status: str
    reason: str

    @property
    def origin(self) -> tuple[str, ...]:
        """Where the figures are from."""
        return astuple(self)[2:]

    @property
    def seal(self) -> str:
        """Short digest of the whole entry."""
        return hashlib.sha256("\n".join(astuple(self)).encode()).hexdigest()[:12]

    def lines(self, row_id: str) -> str:
        """The entry as it stands in the list."""
        pairs = (*zip(self.__dataclass_fields__, astuple(self), strict=True), ("seal", self.seal))
        text = "".join(f"{key} = {json.dumps(value, ensure_ascii=False)}\n" for key, value in pairs if value)
        return f"[{row_id}]\n{text}"


def entry(row: Row) -> Entry:
    """A row of the tables as it has to be listed: every figure it holds, in the clear."""
    figures = {key: value for key, value in row.content.items() if key not in APART}
    said = figures.pop("value", None)
    parts = [] if said is None else [str(said)]
    parts += [f"{key} {value}" for key, value in figures.pop("values", {}).items()]
    parts += [f"{key} {value}" for key, value in figures.items()]
    content = row.content
    return Entry(
        "; ".join(parts), content["unit"], content["source"], content["clause"], content["status"],
        content["note"] if content["status"] == "own" else "",
    )  # fmt: skip


def listed(text: str) -> dict[str, tuple[Entry, str]]:
    """Entries and seals of a list by row."""
    tables = tomllib.loads(text)
    names = Entry.__dataclass_fields__
    return {i: (Entry(*(str(t.get(name, "")) for name in names)), str(t.get("seal", ""))) for i, t in tables.items()}


def complaints(rows: dict[str, Row], text: str) -> list[str]:
    """What parts the rows of the tables from the list, one sentence each."""
    known = listed(text)
    found = [f"{i}: in the list and not in the tables; take it out" for i in known if i not in rows]
    for row_id, row in rows.items():
        now = entry(row)
        if row_id not in known:
            found.append(f"{row_id}: not in the list; check it against its source, then add\n{now.lines(row_id)}")
            continue
        before, seal = known[row_id]
        if before.seal != seal:
            found.append(f"{row_id}: the list was edited without its seal; put back what stood there")
        elif now == before:
            continue
        elif now.origin == before.origin:
            found.append(
                f"{row_id}: value changed from {before.value} {before.unit} to {now.value} {now.unit}, but its source "
                "did not (for a row of our own: nor its note); take it back, or say where the new one is from"
            )
        elif (now.value, now.unit) == (before.value, before.unit):
            found.append(f"{row_id}: source changed; see that it says {now.value}, then enter\n{now.lines(row_id)}")
        else:
            found.append(f"{row_id}: value and source changed; the list needs the new value\n{now.lines(row_id)}")
    return found
