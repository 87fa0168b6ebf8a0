"""A text file as read: its name, its text, its parsed TOML, and problems with the place they stand at."""

import re
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from difflib import get_close_matches
from pathlib import Path
from typing import Any

from relaycfg.errors import InputError, Problem
from relaycfg.files.positions import Loc, locate

LARGEST_BYTES = 5_000_000
LONGEST_LINE = 10_000
DEEPEST = 30


def read_bytes(path: Path, shown: str, advice: str) -> bytes:
    """The bytes of a file; ``shown`` is its name in messages, ``advice`` what to do when there is none."""
    try:
        if path.is_dir():
            raise _whole(shown, "a folder", "give the path of a file in it")
        with path.open("rb") as stream:
            data = stream.read(LARGEST_BYTES + 1)
    except FileNotFoundError:
        near = _near_file(path)
        raise _whole(shown, "not there", f"did you mean {near}?" if near else advice) from None
    except (OSError, ValueError) as reason:
        why = getattr(reason, "strerror", None) or "not a usable path"
        raise _whole(shown, f"not readable ({why.lower()})", "check path and permissions") from None
    if len(data) > LARGEST_BYTES:
        raise _whole(shown, "larger than 5 MB", "give a file of this kind only, or split it")
    return data


def decode(data: bytes, shown: str) -> str:
    """The text of UTF-8 bytes, with or without a byte order mark; refuses other encodings and endless lines."""
    try:
        text = data.decode("utf-8-sig")
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
    return near(path.name, present, alike=0.75)


def near(word: str, choices: "list[str] | tuple[str, ...]", alike: float = 0.6) -> str | None:
    """The choice that looks most like the word, or None; ``alike`` from 0 to 1 is how much it has to."""
    folded = {c.casefold(): c for c in reversed(choices)}
    found = get_close_matches(word.casefold(), list(folded), n=1, cutoff=alike)
    return folded[found[0]] if found else None


def choose(word: str, choices: "list[str] | tuple[str, ...]") -> str:
    """What to do about an unknown word: the near match, or the choices."""
    match = near(word, choices)
    if match is not None:
        return f'did you mean "{match}"?'
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
            data = tomllib.loads(text)
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
    said = re.sub(r" \(at .*\)$", "", reason)
    digits = re.search(r"\d{4300,}", text)
    if said.startswith("Exceeds the limit") and digits:
        said, before = "a number is too long", text[: digits.start()]
        line, column = before.count("\n") + 1, len(before) - before.rfind("\n")
    source = lines[min(line, len(lines)) - 1].rstrip("\r")
    return Problem(shown, line, column, "", f"not TOML ({said})", "", "correct the line", source)
