"""Aligned columns and wrapped sentences for a terminal of a hundred characters."""

import textwrap
from collections.abc import Sequence

WIDTH = 100
GAP = "  "


def table(heads: Sequence[str], rows: Sequence[Sequence[str]], left: int = 1) -> list[str]:
    """Lines of a table: the first ``left`` columns flush left, the others right, the last left if it is wider text.

    Only the last column is shortened (with "..") where a line would pass the width; the first ones are wrapped by
    the caller's choice of words.
    """
    cells = [list(map(str, heads)), *(list(map(str, row)) for row in rows)]
    widths = [max(len(row[k]) for row in cells) for k in range(len(heads))]
    lines = []
    for row in cells:
        parts = [c.ljust(w) if k < left else c.rjust(w) for k, (c, w) in enumerate(zip(row, widths, strict=True))]
        lines.append(_fit(GAP.join(parts).rstrip()))
    return lines


def listing(heads: Sequence[str], rows: Sequence[Sequence[str]], left: int) -> list[str]:
    """A table whose last column is text: wrapped under itself instead of shortened."""
    cells = [list(map(str, heads)), *(list(map(str, row)) for row in rows)]
    last = len(heads) - 1
    widths = [max(len(row[k]) for row in cells) for k in range(last)]
    lines: list[str] = []
    for row in cells:
        parts = [row[k].ljust(w) if k < left else row[k].rjust(w) for k, w in enumerate(widths)]
        start = GAP.join([*parts, ""])
        lines += [line.rstrip() for line in wrapped(row[last], start, " " * len(start))] or [start.rstrip()]
    return lines


def wrapped(sentence: str, first: str = "", rest: str | None = None) -> list[str]:
    """A sentence broken at words; ``first`` opens the first line, ``rest`` (default: as wide, blank) the others."""
    rest = " " * len(first) if rest is None else rest
    return textwrap.wrap(sentence, WIDTH, initial_indent=first, subsequent_indent=rest, break_on_hyphens=False)


def heading(title: str) -> list[str]:
    """A blank line and a title in capitals at its first letter only, so that it reads in any terminal."""
    return ["", title, "-" * len(title)]


def shown(names: Sequence[str], most: int) -> str:
    """Names joined by commas, the first ``most`` and how many more."""
    more = len(names) - most
    return ", ".join(names[:most]) + (f" and {more} more" if more > 0 else "")


def short(text: str, width: int) -> str:
    """Text cut to a width, marked where it was cut."""
    return text if len(text) <= width else text[: width - 2] + ".."


def _fit(line: str) -> str:
    return short(line, WIDTH)
