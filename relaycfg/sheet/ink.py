"""Paragraphs, tables and headings in one grid; every text is escaped and checked here before it is laid out."""

import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from typing import Any, Literal

from markupsafe import Markup, escape
from reportlab.lib.colors import Color, black
from reportlab.lib.styles import ParagraphStyle
from reportlab.platypus import CondPageBreak, Flowable, Paragraph, Spacer, Table

from relaycfg.errors import InputError
from relaycfg.model.results import Study
from relaycfg.sheet import fonts
from relaycfg.sheet.later import Later
from relaycfg.sheet.wording import Wording

Flow = list[Any]
Draw = Callable[[Any, float, float], None]
HAIR, RULE, HEAVY = 0.3, 0.7, 1.6
GREY = Color(0.45, 0.45, 0.45)
"""Of hairlines only: nothing is lost where a printer drops them."""
_PAD = 3.0


def _style(
    name: str, size: float, leading: float, before: float = 0, after: float = 0, indent: float = 0
) -> ParagraphStyle:
    return ParagraphStyle(
        name,
        fontName=fonts.SANS,
        bulletFontName=fonts.SANS,
        fontSize=size,
        leading=leading,
        textColor=black,
        spaceBefore=before,
        spaceAfter=after,
        leftIndent=indent,
        bulletIndent=1,
    )


STYLES: dict[str, ParagraphStyle] = {
    s.name: s
    for s in (
        _style("body", 8.4, 11.2, after=3),
        _style("small", 7.2, 9.2, before=3, after=2),
        _style("item", 8.4, 11.2, indent=11, after=2),
        _style("tight", 7.6, 9.6, indent=11, after=0.5),
        _style("below", 8.4, 10.4),
        _style("big", 11, 14.5, after=3),
        _style("bigitem", 10, 13, indent=13, after=2.5),
        _style("title", 17, 20.5, after=4),
        _style("section", 13, 16, before=14, after=5),
        _style("sub", 9.4, 12, before=9, after=3.5),
        _style("cell", 7.3, 9.1),
        _style("cardcell", 8.6, 11),
        _style("figure", 14, 17),
    )
}
_ALIGN: dict[str, Literal[0, 1, 2]] = {"l": 0, "c": 1, "r": 2}
_TABLE_ALIGN = {"l": "LEFT", "c": "CENTER", "r": "RIGHT"}
_CELLS = {
    (name, align): ParagraphStyle(f"{name}-{align}", STYLES[name], alignment=_ALIGN[align])
    for name in ("cell", "cardcell", "figure")
    for align in _ALIGN
}


class Sketch(Flowable):
    """A drawing of a given size among the paragraphs; one without size, such as a bookmark, is drawn too."""

    _ZEROSIZE = True

    def __init__(self, width: float, height: float, draw: Draw) -> None:
        super().__init__()
        self.width, self.height, self._draw = width, height, draw

    def draw(self) -> None:
        """Called by the layout with the origin at the lower left corner."""
        self.canv.saveState()
        self._draw(self.canv, self.width, self.height)
        self.canv.restoreState()


class Rows(Table):
    """A table that breaks between its rows; a row is split only where a whole page (``splitInRow`` high) is too low."""

    def split(self, availWidth: float, availHeight: float) -> Flow:
        """Called by the layout with what is left of the page; nothing returned: on to the next page."""
        page = self.splitInRow
        self.splitInRow = 0
        parts: Flow = super().split(availWidth, availHeight)
        if not parts and availHeight >= page - 1:
            self.splitInRow = 1
            parts = super().split(availWidth, availHeight)
        for part in (self, *parts):
            part.splitInRow = page
        return parts


@dataclass
class Ink:
    """What every section writes with: the study, the wording, the width to fill and the pages to refer to."""

    study: Study
    wording: Wording
    version: str
    width: float
    height: float
    later: Later = field(default_factory=Later)

    def markup(self, text: str) -> Markup:
        """Choke point: escape what is not markup yet, and refuse characters that cannot be printed."""
        if isinstance(text, Markup):
            return text
        if not text.isascii() and (absent := fonts.missing(text)):
            raise InputError([fonts.problem("text", text, c) for c in absent])
        return escape(" ".join(text.splitlines()))

    def p(self, text: str, style: str = "body", bullet: str | None = None) -> Any:
        """A paragraph."""
        return Paragraph(str(self.markup(text)), STYLES[style], bulletText=bullet)

    def say(self, key: str, style: str = "body", **context: object) -> Any:
        """A paragraph from the wording."""
        return self.p(self.wording.text(key, **context), style)

    def items(self, key: str, style: str = "item", **context: object) -> Flow:
        """A list from the wording, one paragraph an item; a text that comes out empty is no item."""
        return [self.p(text, style, bullet="–") for text in self.wording.lines(key, **context) if text]

    def gap(self, height: float = 6) -> Any:
        """White space."""
        return Spacer(self.width, height)

    def heading(self, key: str, level: int = 0, text: str | None = None, room: float = 110) -> Flow:
        """A heading with its bookmark, on a new page where less than ``room`` is left; other pages refer to ``key``."""
        marked = self.markup(self.wording.text(f"{key}.title") if text is None else text)
        plain = marked.striptags()

        def mark(canvas: Any, _width: float, _height: float) -> None:
            canvas.bookmarkPage(key)
            canvas.addOutlineEntry(plain, key, level=level, closed=level > 0)
            self.later.seen(key, canvas.getPageNumber())

        style = "section" if level == 0 else "sub"
        return [CondPageBreak(room), Sketch(0, 0, mark), Paragraph(f"<b>{marked}</b>", STYLES[style])]

    def cell(self, content: Any, width: float, align: str, style: str) -> Any:
        """A cell: text that fits on its line stays a string (drawn as it stands), longer text wraps."""
        if not isinstance(content, str):
            return content
        face = _CELLS[style, align]
        marked = self.markup(content)
        if not isinstance(content, Markup) and fonts.width(content, face.fontSize) <= width:
            return content
        return Paragraph(str(marked), face)

    def table(
        self,
        heads: Sequence[str],
        rows: Sequence[Sequence[Any]],
        shares: Sequence[float],
        align: str,
        style: str = "cell",
        width: float | None = None,
        extra: Sequence[tuple[Any, ...]] = (),
    ) -> Flow:
        """A table of the given column shares that wraps in its cells and repeats its head on every page."""
        total = self.width if width is None else width
        widths = [total * s / sum(shares) for s in shares]
        face = STYLES[style]
        bare = [w - 2 * _PAD for w in widths]
        bold = [Markup(f"<b>{self.markup(h)}</b>") for h in heads]
        head = [self.cell(h, w, a, style) for h, w, a in zip(bold, bare, align, strict=False)]
        body = [[self.cell(c, w, a, style) for c, w, a in zip(row, bare, align, strict=True)] for row in rows]
        look: list[tuple[Any, ...]] = [
            ("FONT", (0, 0), (-1, -1), fonts.SANS, face.fontSize, face.leading),
            ("VALIGN", (0, 0), (-1, -1), "TOP"),
            ("LEFTPADDING", (0, 0), (-1, -1), _PAD),
            ("RIGHTPADDING", (0, 0), (-1, -1), _PAD),
            ("TOPPADDING", (0, 0), (-1, -1), 1.8),
            ("BOTTOMPADDING", (0, 0), (-1, -1), 2.4),
            ("LINEBELOW", (0, 0), (-1, -1), HAIR, GREY),
            *(("ALIGN", (k, 0), (k, -1), _TABLE_ALIGN[a]) for k, a in enumerate(align)),
        ]
        if heads:
            look += [("LINEABOVE", (0, 0), (-1, 0), RULE, black), ("LINEBELOW", (0, 0), (-1, 0), RULE, black)]
        look += extra
        data = ([head] if heads else []) + body
        if not data:
            return []
        repeat = 1 if heads else 0
        return [Rows(data, colWidths=widths, repeatRows=repeat, style=look, hAlign="LEFT", splitInRow=int(self.height))]

    def broken(self, name: str, width: float, style: str = "cell") -> Markup:
        """A long name for a cell ``width`` wide: its lines end at dots, underscores and spaces, never within a word."""
        lines, size = [""], STYLES[style].fontSize
        for part in re.findall(r"[^._ ]*[._ ]?", name):
            if lines[-1] and fonts.width(lines[-1] + part.rstrip(), size) > width - 2 * _PAD:
                lines.append("")
            lines[-1] += part
        return Markup("<br/>").join(self.markup(line.strip()) for line in lines)

    def boxed(self, content: Flow, bar: float = HEAVY, width: float | None = None) -> Any:
        """Content behind a heavy bar at its left, for what must be read first."""
        return Table(
            [[content]],
            colWidths=[self.width if width is None else width],
            hAlign="LEFT",
            style=[
                ("FONT", (0, 0), (-1, -1), fonts.SANS, 8),
                ("LINEBEFORE", (0, 0), (0, -1), 2 * bar, black),
                ("BOX", (0, 0), (-1, -1), RULE, black),
                ("LEFTPADDING", (0, 0), (-1, -1), 9),
                ("RIGHTPADDING", (0, 0), (-1, -1), 6),
                ("TOPPADDING", (0, 0), (-1, -1), 5),
                ("BOTTOMPADDING", (0, 0), (-1, -1), 4),
            ],
        )

    def framed(self, content: Flow, line: float, inset: float) -> Any:
        """Content within a heavy frame, for what must not be taken for an order."""
        return Table(
            [[content]],
            colWidths=[self.width],
            hAlign="LEFT",
            style=[
                ("FONT", (0, 0), (-1, -1), fonts.SANS, 8),
                ("BOX", (0, 0), (-1, -1), line, black),
                *((f"{side}PADDING", (0, 0), (-1, -1), inset) for side in ("LEFT", "RIGHT", "TOP", "BOTTOM")),
            ],
        )

    def beside(self, left: Flow, right: Flow, share: float = 0.5, gutter: float = 14) -> Any:
        """Two columns that start at the same height."""
        first = (self.width - gutter) * share
        return Table(
            [[left, "", right]],
            colWidths=[first, gutter, self.width - gutter - first],
            hAlign="LEFT",
            style=[
                ("FONT", (0, 0), (-1, -1), fonts.SANS, 8),
                ("VALIGN", (0, 0), (-1, -1), "TOP"),
                ("LEFTPADDING", (0, 0), (-1, -1), 0),
                ("RIGHTPADDING", (0, 0), (-1, -1), 0),
                ("TOPPADDING", (0, 0), (-1, -1), 0),
                ("BOTTOMPADDING", (0, 0), (-1, -1), 0),
            ],
        )
