"""The embedded typeface: registered once, and every text is checked against its glyphs before it is drawn."""

from dataclasses import fields, is_dataclass
from functools import cache
from pathlib import Path

from reportlab.pdfbase import pdfmetrics
from reportlab.pdfbase.ttfonts import TTFont

from relaycfg.errors import InputError, Problem

SANS = "DejaVuSansCondensed"
BOLD = "DejaVuSansCondensed-Bold"
_FOLDER = Path(__file__).parent / "fonts"


@cache
def register() -> frozenset[str]:
    """Register both weights as one family and return the characters that both can print."""
    glyphs: list[set[int]] = []
    for name in (SANS, BOLD):
        font = TTFont(name, str(_FOLDER / f"{name}.ttf"))
        pdfmetrics.registerFont(font)
        glyphs.append({code for code, glyph in font.face.charToGlyph.items() if glyph})
    pdfmetrics.registerFontFamily(SANS, normal=SANS, bold=BOLD, italic=SANS, boldItalic=BOLD)
    return frozenset(chr(code) for code in glyphs[0] & glyphs[1] if code >= 32)


def width(text: str, size: float, font: str = SANS) -> float:
    """Printed width of one line [points]."""
    return float(pdfmetrics.stringWidth(text, font, size))


def missing(text: str) -> list[str]:
    """Characters of ``text`` that the typeface cannot print, each once, in order; line ends count as spaces."""
    return [c for c in dict.fromkeys(text) if c not in register() and c not in "\n\t\r"]


def problem(field: str, text: str, character: str) -> Problem:
    """The problem of one character without a glyph."""
    return Problem(
        file="sheet",
        line=None,
        column=None,
        field=field,
        given=f"{text[:60]!r} with {character!r} (U+{ord(character):04X}), which the sheet's typeface cannot print",
        allowed="such as Latin, Greek or Cyrillic letters",
        remedy="use characters of DejaVu Sans",
    )


def check(parts: dict[str, object]) -> None:
    """Raise InputError naming every field of ``parts`` (dataclasses, tuples, dicts, strings) that cannot be printed."""
    problems: list[Problem] = []
    for name, part in parts.items():
        _walk(part, name, problems)
    if problems:
        raise InputError(problems)


def _walk(value: object, name: str, problems: list[Problem]) -> None:
    if isinstance(value, str):
        if not value.isascii() or not value.isprintable():
            problems.extend(problem(name, value, c) for c in missing(value))
    elif is_dataclass(value):
        for field in fields(value):
            _walk(getattr(value, field.name), f"{name}.{field.name}".lstrip("."), problems)
    elif isinstance(value, tuple):
        for k, item in enumerate(value):
            if not isinstance(item, (int, float, complex)):
                _walk(item, f"{name}[{k}]", problems)
    elif isinstance(value, dict):
        for key, item in value.items():
            _walk(str(key), f"{name} key", problems)
            _walk(item, f"{name}.{key}", problems)
