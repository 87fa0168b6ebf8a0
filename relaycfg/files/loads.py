"""Loads from a CSV file or a spreadsheet: one line a load, columns named as the keys of [[load]]."""

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
from relaycfg.files.text import choose, decode, near, read_bytes

COLUMNS = (*LoadForm.model_fields, "evidence")
TAGS = ("measured", "nameplate", "letter", "assumed")
WHOLE = ("count",)
YES_NO = ("minds_low_v",)
LISTS = ("ohm", "zip_p", "zip_q", "band_pu")
WORDS = ("board", "name", "between", "reactive", "kind", "group", "evidence")


@dataclass(frozen=True)
class LoadRow:
    """A load read from a table, its evidence tag and where its cells stand."""

    form: LoadForm
    evidence: str
    at: Callable[[str], Cell]


def read_loads(path: Path, shown: str, sheet: str | None, problems: list[Problem]) -> list[LoadRow]:
    """All loads of a file; what is wrong is added to ``problems``, the sound lines are returned."""
    try:
        data = read_bytes(path, shown, "give the path of a CSV or .xlsx file, from the folder of the site")
        if path.suffix.lower() in (".xlsx", ".xlsm"):
            lines = sheet_lines(data, shown, sheet)
        else:
            lines = csv_lines(decode(data, shown), shown)
    except InputError as reason:
        problems.extend(reason.problems)
        return []
    if not lines:
        problems.append(Problem(shown, None, None, "", "empty", "", "give a line of column names, then a line a load"))
        return []
    header = [str(c).strip() if c is not None else "" for c in lines[0][1]]
    if not _header_sound(header, lines[0], problems):
        return []
    if len(lines) == 1:
        problems.append(Problem(shown, lines[0][0], None, "", "without loads", "", "give a line a load"))
    rows = [_row(header, line, problems) for line in lines[1 : MOST_ROWS + 1]]
    if len(lines) > MOST_ROWS + 1:
        given = f"longer than {MOST_ROWS} loads"
        problems.append(Problem(shown, None, None, "", given, "", "merge alike ones by count"))
    return [row for row in rows if row is not None]


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


def _row(header: list[str], line: Line, problems: list[Problem]) -> LoadRow | None:
    _, cells, place = line
    before = len(problems)
    while len(cells) > len(header) and cells[-1] in (None, ""):
        cells = cells[:-1]
    if len(cells) > len(header):
        comma = next((i for i, c in enumerate(cells) if header[min(i, len(header) - 1)] in _numbers()), 0)
        remedy = "write decimals with a point and put text with commas in quotes"
        extra = place(comma + 1, header[min(comma, len(header) - 1)])
        problems.append(extra.problem(f"in a line of {len(cells)} cells under {len(header)} column names", remedy))
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
        parts = str(content).replace("[", " ").replace("]", " ").replace(";", " ").split()
        return [_number(column, part) for part in parts]
    number = _number(column, content)
    return int(number) if column in WHOLE and number == int(number) else number


def _number(column: str, content: Any) -> float:
    if isinstance(content, (int, float)) and not isinstance(content, bool):
        return float(content)
    text = str(content).strip()
    if re.fullmatch(r"[+-]?\d+,\d+", text):
        raise _CellError(f'"{text}"', f"write {text.replace(',', '.')} with a decimal point")
    if not re.fullmatch(r"[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d{1,3})?", text):
        unit = extras(field_at(LoadForm, (column,))).get("unit")
        raise _CellError(f'"{text[:40]}"', f"write a number{' in ' + unit if unit else ''}")
    return float(text)
