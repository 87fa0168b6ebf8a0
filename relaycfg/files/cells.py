"""The cells of a CSV text or a spreadsheet, and how to point at one of them."""

import csv
import io
import warnings
import zipfile
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

from relaycfg.errors import InputError, Problem
from relaycfg.files.text import Trace, choose

MOST_ROWS = 20_000
LARGEST_UNPACKED = 100_000_000


@dataclass(frozen=True)
class Cell:
    """Where a cell stands; makes problems of it."""

    file: str
    line: int
    number: int
    column: str
    sheet: str | None = None
    source_line: str | None = None
    caret: int = 1

    def problem(self, given: str, remedy: str, allowed: str = "") -> Problem:
        """A problem of this cell."""
        if self.sheet is None:
            return Problem(
                self.file, self.line, self.number, self.column, given, allowed, remedy, self.source_line, self.caret
            )
        from openpyxl.utils import get_column_letter

        address = f"{self.sheet}!{get_column_letter(self.number)}{self.line}"
        return Problem(self.file, None, None, self.column, given, allowed, remedy, cell=address)


Line = tuple[int, list[Any], Callable[[int, str], Cell]]
"""Number of the line, its cells, and the place of the cell of a number and column."""


def is_formula(content: Any) -> bool:
    """Whether a spreadsheet cell computes its content; array formulas are objects of their own."""
    return content.startswith("=") if isinstance(content, str) else hasattr(content, "ref")


def csv_lines(text: str, shown: str) -> list[Line]:
    """Lines of a CSV text without blank ones and comments (# first)."""
    text = text.replace("\r\n", "\n").replace("\r", "\n")
    raw = text.split("\n")
    lines: list[Line] = []
    reader = csv.reader(io.StringIO(text), skipinitialspace=True, strict=True)
    try:
        start = 1
        for cells in reader:
            number, start = start, reader.line_num + 1
            if any(c.strip() for c in cells) and not cells[0].startswith("#"):
                lines.append((number, [c.strip() for c in cells], _csv_place(shown, number, raw[number - 1])))
    except csv.Error as reason:
        closed = "expected after" in str(reason)
        said = f"not CSV ({'text behind a closing quote' if closed else 'a quote that is not closed'})"
        raise InputError([Problem(shown, reader.line_num, None, "", said, "", "correct the line")]) from None
    return lines


def _csv_place(shown: str, number: int, source: str) -> Callable[[int, str], Cell]:
    def place(cell: int, column: str) -> Cell:
        starts, quoted = [1], False
        for position, character in enumerate(source, 1):
            quoted ^= character == '"'
            if character == "," and not quoted:
                starts.append(position + 1)
        return Cell(shown, number, cell, column, None, source, starts[min(cell, len(starts)) - 1])

    return place


def sheet_lines(data: bytes, shown: str, sheet: str | None, trace: Trace | None = None) -> tuple[str, list[Line]]:
    """Name and lines of a sheet; formulas stay text that begins with an equals sign.

    ``trace``: where a site names the sheet, its key is what is wrong when there is none of that name.
    """
    import openpyxl

    given = "not a readable .xlsx file"
    broken = InputError([Problem(shown, None, None, "", given, "", "save it again as .xlsx or CSV")])
    try:
        with zipfile.ZipFile(io.BytesIO(data)) as packed:
            if sum(entry.file_size for entry in packed.infolist()) > LARGEST_UNPACKED:
                raise InputError([Problem(shown, None, None, "", "too large unpacked", "", "save it as CSV")])
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # parts that are not read, such as drop-down lists
            book = openpyxl.load_workbook(io.BytesIO(data), read_only=True)
        if sheet is not None and sheet not in book.sheetnames:
            said, remedy = f'"{sheet}", no sheet of {shown}', choose(sheet, book.sheetnames)
            raise InputError([trace(said, remedy) if trace else Problem(shown, None, None, "sheet", said, "", remedy)])
        page = book[sheet] if sheet is not None else book.worksheets[0]
        title = str(page.title)
        lines: list[Line] = []
        for number, row in enumerate(page.iter_rows(values_only=True), 1):
            cells = [c.strip() if isinstance(c, str) else c for c in row]
            while cells and cells[-1] in (None, ""):
                cells.pop()
            if cells and not str(cells[0] or "").startswith("#"):
                lines.append((number, cells, _sheet_place(shown, number, title)))
            if len(lines) > MOST_ROWS + 1:
                break
        book.close()
    except InputError:
        raise
    except Exception:  # a damaged workbook raises whatever the part that meets it happens to raise
        raise broken from None
    return title, lines


def _sheet_place(shown: str, number: int, title: str) -> Callable[[int, str], Cell]:
    return lambda cell, column: Cell(shown, number, cell, column, title)
