"""A text file as read: its name, its text, its parsed TOML, and problems with the place they stand at."""

import math
import re
import tomllib
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from difflib import get_close_matches
from pathlib import Path
from typing import Any

from relaycfg.errors import InputError, Problem
from relaycfg.files.positions import Loc, locate

LARGEST_BYTES = 5_000_000
LONGEST_LINE = 10_000
DEEPEST = 30
ALIKE = 0.75
"""How much of a word has to agree, from 0 to 1, before it is taken for a slip: of four letters one may be wrong."""
SHORTEST_BEGINNING = 3


Trace = Callable[[str, str], Problem]
"""Makes a problem of what was given and what to do, at the key that names a file."""


class Overlong(float):
    """A number too large for the machine, as it was written."""

    written: str

    def __new__(cls, written: str) -> "Overlong":
        number = super().__new__(cls, written)
        number.written = written
        return number


def _number(written: str) -> float:
    number = float(written)
    return Overlong(written) if math.isinf(number) and any(c.isdigit() for c in written) else number


def read_bytes(path: Path, shown: str, advice: str, trace: Trace | None = None) -> bytes:
    """The bytes of a file; ``shown`` is its name in messages, ``advice`` what to do when there is none.

    ``trace``: where another file names this one, its key is what is wrong.
    """

    def refusal(given: str, remedy: str) -> InputError:
        if trace is not None:
            return InputError([trace(f'"{shown}", {given}', remedy)])
        return _whole(shown, given, remedy)

    try:
        if path.is_dir():
            raise refusal("a folder", "give the path of a file in it")
        with path.open("rb") as stream:
            data = stream.read(LARGEST_BYTES + 1)
    except FileNotFoundError:
        name = _near_file(path)
        instead = str(Path(shown).with_name(name)) if name else ""
        meant = f'did you mean "{instead}"?' if trace is not None else f"did you mean {instead}?"
        raise refusal("not there", meant if name else advice) from None
    except (OSError, ValueError) as reason:
        why = getattr(reason, "strerror", None) or "not a usable path"
        raise refusal(f"not readable ({why.lower()})", "check path and permissions") from None
    if len(data) > LARGEST_BYTES:
        raise refusal("larger than 5 MB", "give a file of this kind only, or split it")
    return data


def decode(data: bytes, shown: str) -> str:
    """The text of UTF-8 bytes, with or without a byte order mark; refuses other encodings and endless lines."""
    try:
        text = data.decode("utf-8-sig")
        if "\0" in text:
            raise UnicodeDecodeError("utf-8", data, data.index(b"\0"), data.index(b"\0") + 1, "NUL")
    except UnicodeDecodeError as reason:
        line = data[: reason.start].count(b"\n") + 1
        start = data.rfind(b"\n", 0, reason.start) + 1
        column = len(data[start : reason.start].decode("utf-8", errors="replace")) + 1
        raise InputError(
            [Problem(shown, line, column, "", "not UTF-8 text", "", "save the file as UTF-8")]
        ) from None  # fmt: skip
    for number, line_text in enumerate(text.splitlines(), 1):
        if len(line_text) > LONGEST_LINE:
            given = f"a line of {len(line_text)} characters"
            raise InputError([Problem(shown, number, 1, "", given, "", f"write at most {LONGEST_LINE} in a line")])
    return text


def _whole(shown: str, given: str, remedy: str) -> InputError:
    return InputError([Problem(shown, None, None, "", given, "", remedy)])


def _near_file(path: Path) -> str | None:
    try:
        present = [p.name for p in path.parent.iterdir()]
    except OSError:
        return None
    return near(path.name, [name for name in present if name != path.name])


def near(word: str, choices: "list[str] | tuple[str, ...]") -> str | None:
    """The choice that the word is a slip or the beginning of, or None: a wrong guess is worse than a list."""
    folded = {c.casefold(): c for c in reversed(choices)}
    found = get_close_matches(word.casefold(), list(folded), n=1, cutoff=ALIKE)
    begun = [c for c in folded if c.startswith(word.casefold())] if len(word) >= SHORTEST_BEGINNING else []
    if not found and len(begun) == 1:
        found = begun
    return folded[found[0]] if found else None


def choose(word: str, choices: "list[str] | tuple[str, ...]") -> str:
    """What to do about an unknown word: the near match, or the choices."""
    match = near(word, choices)
    if match is not None:
        return f'did you mean "{match}"?'
    choices = tuple(dict.fromkeys(choices))
    shown = ", ".join(f'"{c}"' for c in choices[:12]) + (", ..." if len(choices) > 12 else "")
    return f"give one of {shown}" if choices else "there is none to choose from"


@dataclass(frozen=True)
class TomlFile:
    """A parsed TOML file with what is needed to point into it."""

    shown: str
    text: str
    data: Mapping[str, Any]

    @classmethod
    def parse(cls, shown: str, text: str) -> "TomlFile":
        """The file of that text; raises InputError with line and column where it is no TOML."""
        try:
            data = tomllib.loads(text, parse_float=_number)
            if _too_deep(data):
                raise RecursionError
            return cls(shown, text, data)
        except RecursionError:
            raise _whole(shown, "nested too deeply", "write flat tables") from None
        except ValueError as reason:
            raise InputError([_toml_problem(shown, text, str(reason))]) from None

    def problem(self, loc: Loc, given: str, remedy: str, allowed: str = "") -> Problem:
        """A problem at ``loc``, with its line, column and field name."""
        place = locate(self.text, loc)
        line, column = place if place else (None, None)
        source = self.text.split("\n")[line - 1].rstrip("\r") if line else None
        return Problem(self.shown, line, column, dotted(self.data, loc), given, allowed, remedy, source)


def dotted(data: Any, loc: Loc) -> str:
    """The name of a field as people write it: elements of lists by their name, function or stage, else by number."""
    parts: list[str] = []
    for step in loc:
        try:
            data = data[step]
        except (KeyError, IndexError, TypeError):
            data = None
        if isinstance(step, str):
            parts.append(step)
        elif isinstance(data, Mapping):
            label = next((data[k] for k in ("name", "function", "stage") if k in data), None)
            named = isinstance(label, (str, int)) and str(label).strip()
            parts.append(str(label).strip() if named else str(step + 1))
        elif len(loc) == 2:
            parts.append(str(step + 1))
    return ".".join(parts)


def _too_deep(data: Any) -> bool:
    """Whether tables and arrays stand in each other more than ``DEEPEST`` times."""
    level = [data]
    for _ in range(DEEPEST):
        inner = [node.values() if isinstance(node, dict) else node for node in level]
        level = [child for children in inner for child in children if isinstance(child, (dict, list))]
        if not level:
            return False
    return True


def _toml_problem(shown: str, text: str, reason: str) -> Problem:
    found = re.search(r" \(at line (\d+), column (\d+)\)", reason)
    lines = text.split("\n")
    line, column = (int(found[1]), int(found[2])) if found else (len(lines), len(lines[-1]) + 1)
    said = _own_words(re.sub(r" \(at .*\)$", "", reason))
    digits = re.search(r"\d{4300,}", text)
    if reason.startswith("Exceeds the limit") and digits:
        said, before = "a number is too long", text[: digits.start()]
        line, column = before.count("\n") + 1, len(before) - before.rfind("\n")
    alone = re.search(r"\r(?!\n)", text)
    if alone:
        given, remedy = "a line that ends in CR alone", "save the file with line ends LF or CR LF"
        before = text[: alone.start()]
        return Problem(shown, before.count("\n") + 1, len(before) - before.rfind("\n"), "", given, "", remedy)
    source = lines[min(line, len(lines)) - 1].rstrip("\r")
    given = f"not TOML ({said})" if said else "not TOML"
    return Problem(shown, line, column, "", given, "", "correct the line", source)


SAID = {
    r"Expected '\]+' at the end of an? \w+ declaration": "a table header without its closing bracket",
    r"Expected '=' after a key.*": "a key without an equals sign",
    r"Expected newline or end of document after a statement": "more on the line than a key and its value",
    r"Expected .*|Unterminated string": "a text without its closing quotes",
    r"(Found invalid|Illegal) character '\\n'": "a text without its closing quotes",
    r"(Found invalid|Illegal) character .*": "a control character",
    r"Cannot declare \((.*?),?\) twice": "a table given twice",
    r"Cannot (overwrite a value|mutate .*|redefine .*)|Duplicate .*": "a key or table given twice",
    r"Unclosed array": "a list without its closing bracket",
    r"Unclosed inline table": "a table without its closing brace",
    r"Unescaped '\\' in a string|Invalid hex value|Escaped character .*": "a backslash in a text: write it twice",
    r"Invalid date or datetime": "no such date",
    r"Invalid value": "a value that is no number, text in quotes, list or table",
    r"Invalid (statement|initial character .*)": "no key and no table header",
}
"""What is said of a text that cannot be parsed, by what the parser says of it."""


def _own_words(reason: str) -> str:
    return next((said for pattern, said in SAID.items() if re.fullmatch(pattern, reason)), "")
