"""Loads from a CSV file or a spreadsheet: one line a load, columns named as the keys of [[load]]."""

import math
import re
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from pydantic import ValidationError

from relaycfg.errors import InputError, Problem
from relaycfg.files.cells import MOST_ROWS, Cell, Line, csv_lines, is_formula, sheet_lines
from relaycfg.files.checks import explain, extras, field_at
from relaycfg.files.load_form import LoadForm
from relaycfg.files.positions import Loc
from relaycfg.files.text import Trace, choose, decode, near, read_bytes

COLUMNS = (*LoadForm.model_fields, "evidence")
TAGS = ("measured", "nameplate", "letter", "assumed")
WHOLE = ("count",)
YES_NO = ("minds_low_v",)
LISTS = {
    "ohm": ("two", "10 2"),
    "zip_p": ("three", "0.5 0.3 0.2"),
    "zip_q": ("three", "0.5 0.3 0.2"),
    "band_pu": ("two", "0.7 1.2"),
}
"""Columns that take several numbers: how many, and how they are written."""
NUMBER = re.compile(r"[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d{1,3})?")
WORDS = ("board", "name", "between", "reactive", "kind", "group", "evidence")


@dataclass(frozen=True)
class LoadRow:
    """A load read from a table, its evidence tag and where its cells stand."""

    form: LoadForm
    evidence: str
    at: Callable[[str], Cell]


def is_workbook(name: str) -> bool:
    """Whether a file of that name is read as a spreadsheet; every other one is read as CSV."""
    return Path(name).suffix.lower() in (".xlsx", ".xlsm")


def read_loads(
    path: Path,
    shown: str,
    sheet: str | None,
    problems: list[Problem],
    named: tuple[str, Callable[[Loc, str, str], Problem]] | None = None,
) -> list[LoadRow]:
    """All loads of a file; what is wrong is added to ``problems``, the sound lines are returned.

    ``named``: where a site names the file, its name as written there and a way to make problems of the site's keys.
    """

    def of_site(key: str) -> Trace | None:
        return None if named is None else lambda given, remedy: named[1](("loads", key), given, remedy)

    try:
        advice = "give the path of a CSV or .xlsx file, from the folder of the site"
        data = read_bytes(path, named[0] if named else shown, advice, of_site("file"))
        page: str | None = None
        if is_workbook(path.name):
            page, lines = sheet_lines(data, shown, sheet, of_site("sheet"))
        else:
            lines = csv_lines(_text(data, shown, path), shown)
    except InputError as reason:
        problems.extend(reason.problems)
        return []

    def add(given: str, remedy: str, line: int | None = None) -> None:
        problems.append(Problem(shown, None if page else line, None, "", given, "", remedy, cell=page))

    if not lines:
        add("empty", "give a line of column names, then a line a load")
        return []
    header = [str(c).strip() if c is not None else "" for c in lines[0][1]]
    if not _header_sound(header, lines[0], problems):
        return []
    if len(lines) == 1:
        add("without loads", "give a line a load", lines[0][0])
    rows = [_row(header, lines[0][0], line, problems) for line in lines[1 : MOST_ROWS + 1]]
    if len(lines) > MOST_ROWS + 1:
        add(f"longer than {MOST_ROWS} loads", "merge alike ones by count")
    return [row for row in rows if row is not None]


def _text(data: bytes, shown: str, path: Path) -> str:
    """The text of a CSV file; a spreadsheet under a wrong name is said to be one."""
    if data.startswith(b"PK\x03\x04"):
        remedy = f"name it {path.with_suffix('.xlsx').name}, or save it as CSV"
        raise InputError([Problem(shown, None, None, "", "a spreadsheet (.xlsx), not a CSV file", "", remedy)])
    if data.startswith(b"\xd0\xcf\x11\xe0"):
        given = "a spreadsheet of the old kind (.xls), not a CSV file"
        raise InputError([Problem(shown, None, None, "", given, "", "save it as .xlsx or CSV")])
    return decode(data, shown)


def _header_sound(header: list[str], line: Line, problems: list[Problem]) -> bool:
    before = len(problems)
    if len(header) == 1 and ";" in header[0]:
        cell = line[2](1, header[0].split(";")[0])
        problems.append(cell.problem("followed by semicolons", "separate cells by commas, decimals by points"))
        return False
    for number, column in enumerate(header, 1):
        cell = line[2](number, column or "no name")
        if column not in COLUMNS:
            match = near(column, COLUMNS)
            given = "not a known column" if column else "an empty column name"
            problems.append(
                cell.problem(given, f"did you mean {match}?" if match else f"columns are {', '.join(COLUMNS)}")
            )
        elif header.index(column) != number - 1:
            problems.append(cell.problem("a column given twice", "remove one"))
    for column in ("board", "between"):
        if column not in header and before == len(problems):
            problems.append(line[2](1, column).problem("missing", "add this column"))
    return before == len(problems)


def _row(header: list[str], header_line: int, line: Line, problems: list[Problem]) -> LoadRow | None:
    _, cells, place = line
    before = len(problems)
    while len(cells) > len(header) and cells[-1] in (None, ""):
        cells = cells[:-1]
    if len(cells) > len(header):
        problems.append(_extra_cell(header, header_line, line))
        return None
    given: dict[str, Any] = {}
    for index, (column, content) in enumerate(zip(header, cells, strict=False), 1):
        if content is None or content == "":
            continue
        try:
            if place(index, column).sheet is not None and is_formula(content):
                raise _CellError("a formula", "write its value")
            given[column] = _convert(column, content)
        except _CellError as reason:
            problems.append(place(index, column).problem(reason.given, reason.remedy))
    if before != len(problems):
        return None

    def at(column: str) -> Cell:
        return place(header.index(column) + 1 if column in header else 1, column)

    evidence = str(given.pop("evidence", ""))
    if evidence and evidence not in TAGS:
        problems.append(at("evidence").problem(f'"{evidence}"', choose(evidence, TAGS)))
    try:
        return LoadRow(LoadForm.model_validate(given), evidence, at)
    except ValidationError as reason:
        for error in reason.errors(include_url=False):
            column = str(error["loc"][0])
            problems.append(at(column).problem(*explain(LoadForm, error)))
        return None


def _extra_cell(header: list[str], header_line: int, line: Line) -> Problem:
    """A line with more cells than columns: in a spreadsheet the cell itself, in a CSV what probably split."""
    _, cells, place = line
    beyond = place(next(i for i, c in enumerate(cells, 1) if i > len(header) and c not in (None, "")), "")
    if beyond.sheet is not None:
        return beyond.problem(
            "a cell without a column name", f"name its column in line {header_line}, or remove the cell"
        )
    last = len(header) - 1
    listed = next((i for i, c in enumerate(cells[: last + 1]) if header[i] in LISTS and str(c).startswith("[")), None)
    comma = next((i for i in range(len(cells)) if header[min(i, last)] in _numbers()), 0)
    split = comma if listed is None else listed
    given = f"in a line of {len(cells)} cells under {len(header)} column names"
    remedy = "write decimals with a point and put text with commas in quotes"
    column = header[min(split, last)]
    return place(split + 1, column).problem(given, remedy if listed is None else f"write {_several(column)}")


def _numbers() -> tuple[str, ...]:
    return tuple(c for c in COLUMNS if c not in (*WORDS, *YES_NO, *LISTS))


class _CellError(Exception):
    def __init__(self, given: str, remedy: str) -> None:
        super().__init__(given)
        self.given, self.remedy = given, remedy


def _convert(column: str, content: Any) -> Any:
    """A cell as its key wants it; raises _CellError with what to write."""
    if column in WORDS:
        if isinstance(content, int) and not isinstance(content, bool):
            return str(content)
        if not isinstance(content, str):
            raise _CellError(str(content), "write text")
        return content
    if column in YES_NO:
        if str(content).strip().lower() not in ("true", "false", "yes", "no"):
            raise _CellError(f'"{content}"', "write true or false")
        return str(content).strip().lower() in ("true", "yes")
    if column in LISTS:
        return _list(column, content)
    number = _number(column, content)
    return int(number) if column in WHOLE and number == int(number) else number


def _several(column: str) -> str:
    how_many, example = LISTS[column]
    return f"{how_many} numbers, such as {example}"


def _list(column: str, content: Any) -> list[float]:
    """Numbers apart by blanks, or a list as TOML writes it; a comma between bare numbers might be a decimal one."""
    text = str(content).strip()
    inner = re.fullmatch(r"\[(.*)\]", text)
    parts = re.split(r"\s*[,;]\s*|\s+", inner[1].strip()) if inner else re.split(r"\s*;\s*|\s+", text)
    if len(parts) != len(LISTS[column][1].split()) or not all(NUMBER.fullmatch(part) for part in parts):
        raise _CellError(f'"{text[:40]}"', f"write {_several(column)}")
    return [float(part) for part in parts]


def _number(column: str, content: Any) -> float:
    if isinstance(content, (int, float)) and not isinstance(content, bool):
        return float(content)
    text = str(content).strip()
    if re.fullmatch(r"[+-]?\d+,\d+", text):
        raise _CellError(f'"{text}"', f"write {text.replace(',', '.')} with a decimal point")
    if not NUMBER.fullmatch(text) or math.isinf(float(text)):
        unit = extras(field_at(LoadForm, (column,))).get("unit")
        raise _CellError(f'"{text[:40]}"', f"write a number{' in ' + unit if unit else ''}")
    return float(text)
