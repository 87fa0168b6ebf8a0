"""Aligned columns and wrapped sentences for a terminal of a hundred characters."""

import textwrap
from collections.abc import Collection, Sequence

WIDTH = 100
GAP = "  "
CUT = ".."
LEAST = 8
"""Characters of a name that are always shown."""


def table(
    heads: Sequence[str],
    rows: Sequence[Sequence[str]],
    left: int = 1,
    names: Collection[int] = (0,),
    among: Sequence[str] = (),
) -> list[str]:
    """Lines of a table: the first ``left`` columns flush left, the others right.

    Where it is wider than the terminal, the columns ``names`` are cut, the widest first, so that no figure is lost,
    and so that names still differ from each other and from those ``among`` which they stand.
    """
    cells = [list(map(str, heads)), *(list(map(str, row)) for row in rows)]
    widths = [max(len(row[k]) for row in cells) for k in range(len(heads))]
    while sum(widths) + len(GAP) * (len(widths) - 1) > WIDTH:
        widest = max(names, key=lambda k: widths[k])
        if widths[widest] <= max(LEAST, len(heads[widest])):
            break
        widths[widest] -= 1
    cut = [k for k in names if widths[k] < max(len(row[k]) for row in cells)]
    for k in cut:
        widths[k] = min(widths[j] for j in cut)  # a name is cut the same way wherever it stands
        known = shortened([*(row[k] for row in cells), *among], widths[k])
        cells = [[*row[:k], known[row[k]], *row[k + 1 :]] for row in cells]
    cells = [[short(c, w) for c, w in zip(row, widths, strict=True)] for row in cells]
    lines = []
    for row in cells:
        parts = [c.ljust(w) if k < left else c.rjust(w) for k, (c, w) in enumerate(zip(row, widths, strict=True))]
        lines.append(short(GAP.join(parts).rstrip(), WIDTH))
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
    """A blank line, the title, and a line under it."""
    return ["", *wrapped(title), "-" * min(len(title), WIDTH)]


def shown(names: Sequence[str], most: int) -> str:
    """Names joined by commas, the first ``most`` and how many more."""
    more = len(names) - most
    return ", ".join(names[:most]) + (f" and {more} more" if more > 0 else "")


def shortened(names: Sequence[str], width: int) -> dict[str, str]:
    """Each name within a width, cut in the middle where that keeps the most of them apart, marked where it was cut."""
    long = [name for name in dict.fromkeys(names) if len(name) > width]
    room = max(width - len(CUT), 1)
    heads = [*range(room // 2, -1, -1), *range(room // 2 + 1, room + 1)]
    forms = [{name: _middle(name, head, room) for name in long} for head in heads]
    letters = enumerate(zip(*long, strict=False))
    common = next((k for k, column in letters if len(set(column)) > 1), 0)
    start = max(long[0][:common].rfind(" ") + 1 if long else 0, common - room // 2)
    forms.append({name: short(CUT + name[start:], width) for name in long})
    best = max(forms, key=lambda form: len(set(form.values())))
    return {name: best.get(name, name) for name in names}


def _middle(name: str, head: int, room: int) -> str:
    """The first ``head`` characters and as many of the last as there is room for."""
    return name[:head].rstrip() + CUT + name[len(name) - (room - head) :].lstrip()


def short(text: str, width: int) -> str:
    """Text cut to a width, marked where it was cut."""
    return text if len(text) <= width else text[: width - len(CUT)] + CUT
