"""The ledger of inputs: every figure a study rests on, how well it is known, and which ones are defaults."""

from collections.abc import Iterable, Sequence
from dataclasses import replace
from typing import Any

from relaycfg.files.positions import Loc
from relaycfg.files.site_form import EvidenceForm
from relaycfg.files.tables import Row, Tables
from relaycfg.files.text import near
from relaycfg.model.site import Input, Tag


def figure(value: float) -> str:
    """A number without digits nobody can measure: two decimals from 1 on, four below, three digits of tiny ones."""
    size = abs(value)
    if size >= 1 or value == 0:
        return f"{round(value, 2):.9g}"
    return f"{round(value, 4):g}" if size >= 0.001 else f"{value:.3g}"


def printed(value: Any) -> str:
    """A value as the ledger prints it."""
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, (int, float)):
        return figure(value)
    if isinstance(value, complex):
        return f"{value.real:.4g} {'-' if value.imag < 0 else '+'} j{abs(value.imag):.4g}"
    if isinstance(value, (list, tuple)):
        return "[" + ", ".join(printed(v) for v in value) + "]"
    return str(value)


class Ledger:
    """Inputs in the order they are met."""

    def __init__(self, tables: Tables) -> None:
        self.tables = tables
        self.entries: list[Input] = []

    def given(
        self, field: str, value: Any, unit: str = "", note: str = "", tag: Tag = "assumed", status: str = ""
    ) -> None:
        """An input of the user's, assumed until evidence says better; ``status`` of the row where it names one."""
        self.entries.append(Input(field, printed(value), unit, tag, note, status))

    def default(self, field: str, value: Any, unit: str, note: str, status: str) -> None:
        """An input the user left out, with the source of what stands in for it."""
        self.entries.append(Input(field, printed(value), unit, "default", note, status))

    def pick(self, field: str, value: Any, row: str | Row, unit: str = "") -> Any:
        """The given value, or that of the table row, entered as a default."""
        if value is not None:
            self.given(field, value, unit)
            return value
        source = self.tables.row(row) if isinstance(row, str) else row
        self.default(field, source.value, unit, source.source, source.status)
        return source.value

    def shared_default(self, field: str, value: Any, unit: str, owners: Sequence[str], note: str, status: str) -> None:
        """One entry for a default that several loads or motors share; none where nobody does."""
        if owners:
            names = ", ".join(owners[:4]) + (f" and {len(owners) - 4} more" if len(owners) > 4 else "")
            self.default(field, value, unit, f"{note}; for {names}", status)

    def tagged(self, evidence: Iterable[tuple[Loc, EvidenceForm]]) -> tuple[list[Input], list[tuple[Loc, str, str]]]:
        """The entries with the user's evidence, and evidence that speaks of no given input: place, given, remedy.

        Evidence for a table or board holds for all its given figures; evidence for one figure goes first.
        """
        tags: dict[str, EvidenceForm] = {}
        stray: list[tuple[Loc, str, str]] = []
        given = [e.field for e in self.entries if e.tag != "default"]
        for loc, form in sorted(evidence, key=lambda pair: len(pair[1].of)):
            hit = [f for f in given if f == form.of or f.startswith(form.of + ".")]
            if not hit:
                stray.append((loc, f'"{form.of}"', self._about_stray(form.of, given)))
            tags.update(dict.fromkeys(hit, form))
        entries = [
            replace(e, tag=tags[e.field].tag, note="; ".join(n for n in (tags[e.field].note, e.note) if n))
            if e.tag != "default" and e.field in tags
            else e
            for e in self.entries
        ]
        return entries, stray

    def _about_stray(self, of: str, given: list[str]) -> str:
        if any(e.field == of for e in self.entries):
            return "it is a default here; give the value itself, then its evidence"
        match = near(of, given)
        return f'did you mean "{match}"?' if match else "name an input such as supply.nominal_v or board.MB.cable"
