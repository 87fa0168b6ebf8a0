"""What is wrong with an input, where it stands and what to write instead."""

from collections.abc import Iterable
from dataclasses import dataclass

MOST_SHOWN = 20
WIDEST_LINE = 110


@dataclass(frozen=True)
class Problem:
    """One thing wrong in one file.

    ``given`` completes "<field> is ..." and stands alone where there is no field; ``remedy`` is what to do,
    ``allowed`` the range or choices that follow it. For text files ``line`` and ``column`` count from 1; in a CSV
    ``column`` is the number of the cell and ``caret`` its first character; ``cell`` is the address on a spreadsheet,
    such as Sheet1!C7.
    """

    file: str
    line: int | None
    column: int | None
    field: str
    given: str
    allowed: str
    remedy: str
    source_line: str | None = None
    caret: int | None = None
    cell: str | None = None

    @property
    def where(self) -> str:
        """File, line and column; the column's name too where the file is a table."""
        if self.cell is not None:
            return f"{self.file} {self.cell}"
        if self.line is None:
            return self.file
        place = f"{self.file}:{self.line}" if self.column is None else f"{self.file}:{self.line}:{self.column}"
        return place if self.caret is None else f"{place} ({self.field})"

    def sentence(self) -> str:
        """The problem in one line."""
        do = f"{self.remedy}, {self.allowed}" if self.allowed else self.remedy
        about = f"{self.field} is {self.given}" if self.field else self.given
        return _printable(f"{self.where}: {about}; {do}")

    def text(self) -> str:
        """The sentence, then the line it speaks of with a caret below the place."""
        if self.source_line is None:
            return self.sentence()
        caret = (self.caret or self.column or 1) - 1
        start = max(0, caret - WIDEST_LINE // 2) if len(self.source_line) > WIDEST_LINE else 0
        shown = _printable(self.source_line[start : start + WIDEST_LINE])
        return f"{self.sentence()}\n    {shown}\n    {' ' * (caret - start)}^"


def _printable(text: str) -> str:
    """Text without characters that would steer a terminal."""
    return "".join(c if c.isprintable() else " " for c in text)


class InputError(Exception):
    """Bad input, with every problem found; nothing has been written."""

    def __init__(self, problems: Iterable[Problem]) -> None:
        self.problems = tuple(problems)
        super().__init__(self.text())

    def text(self) -> str:
        """All problems, the first twenty in full and then how many more there are."""
        lines = [p.text() for p in self.problems[:MOST_SHOWN]]
        more = len(self.problems) - MOST_SHOWN
        if more > 0:
            lines.append(f"and {more} more")
        return "\n".join(lines)
