"""Texts that name a page known only when the whole sheet is laid out: reserved as stamps, filled in at the end."""

from collections.abc import Callable
from typing import Any

from relaycfg.sheet import fonts

TOTAL = "pages"
"""What the number of the last page is known by."""


class Later:
    """Page numbers by heading, and the stamps that wait for them."""

    def __init__(self) -> None:
        self._pages: dict[str, int] = {}
        self._stamps: dict[str, tuple[str, float, float, bool, Callable[[int], str]]] = {}

    def seen(self, key: str, page: int) -> None:
        """Note the page a heading came to stand on; the first one counts."""
        self._pages.setdefault(key, page)

    def stamp(
        self,
        canvas: Any,
        key: str,
        x: float,
        y: float,
        size: float,
        wide: float,
        write: Callable[[int], str],
        right: bool = False,
    ) -> None:
        """Reserve a line of text at (x, y), at most ``wide`` long, that will name the page of ``key``."""
        name = f"stamp-{len(self._stamps)}"
        self._stamps[name] = (key, size, wide, right, write)
        canvas.saveState()
        canvas.translate(x - wide if right else x, y)
        canvas.doForm(name)
        canvas.restoreState()

    def fill(self, canvas: Any) -> None:
        """Write all stamps; called on the last page."""
        self._pages[TOTAL] = canvas.getPageNumber()
        for name, (key, size, wide, right, write) in self._stamps.items():
            canvas.beginForm(name, 0, -0.4 * size, wide, 1.2 * size)
            line(canvas, write(self._pages[key]), 0, 0, wide, size, right=right)
            canvas.endForm()


def line(
    canvas: Any, text: str, x: float, y: float, wide: float, size: float, font: str = fonts.SANS, right: bool = False
) -> None:
    """One line of text at (x, y), set smaller where it would not fit into ``wide``."""
    natural = fonts.width(text, size, font)
    fitted = size if natural <= wide else size * wide / natural
    canvas.setFont(font, fitted)
    if right:
        canvas.drawRightString(x + wide, y, text)
    else:
        canvas.drawString(x, y, text)
