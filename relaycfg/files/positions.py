"""Exact line and column of a key in a TOML text; used only once something is wrong."""

from functools import lru_cache
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from tree_sitter import Node

Loc = tuple[str | int, ...]
Places = dict[Loc, tuple[int, int]]


def locate(text: str, loc: Loc) -> tuple[int, int] | None:
    """Line and column, from 1, of the key or array element at ``loc``, or of the nearest table around it.

    Parameters: ``loc`` keys and list positions (from 0) as in the parsed data. None for an empty text or an empty
    ``loc``.
    """
    places = _places(text)
    while loc:
        if loc in places:
            return places[loc]
        loc = loc[:-1]
    return None


@lru_cache(maxsize=4)
def _places(text: str) -> Places:
    import tree_sitter_toml
    from tree_sitter import Language, Parser

    places: Places = {}
    lines = text.encode("utf-8").split(b"\n")
    root = Parser(Language(tree_sitter_toml.language())).parse(text.encode("utf-8")).root_node
    arrays: dict[Loc, int] = {}
    for node in root.named_children:
        if node.type == "pair":
            _pair(node, (), places, lines)
        elif node.type in ("table", "table_array_element") and node.named_children:
            base = _resolved(_keys(node.named_children[0]), arrays, node.type == "table_array_element")
            places.setdefault(base, _point(node, lines))
            for depth in range(1, len(base)):
                places.setdefault(base[:depth], _point(node, lines))
            for child in node.named_children[1:]:
                if child.type == "pair":
                    _pair(child, base, places, lines)
    return places


def _resolved(keys: tuple[str, ...], arrays: dict[Loc, int], opens: bool) -> Loc:
    """Header keys with the position of the open element after every key that is an array of tables."""
    loc: Loc = ()
    for depth, key in enumerate(keys):
        loc = (*loc, key)
        if opens and depth == len(keys) - 1:
            arrays[loc] = arrays.get(loc, -1) + 1
        if loc in arrays:
            loc = (*loc, arrays[loc])
    return loc


def _pair(node: "Node", base: Loc, places: Places, lines: list[bytes]) -> None:
    if len(node.named_children) < 2:
        return
    loc: Loc = (*base, *_keys(node.named_children[0]))
    for depth in range(len(base) + 1, len(loc) + 1):
        places.setdefault(loc[:depth], _point(node, lines))
    _value(node.named_children[1], loc, places, lines)


def _value(node: "Node", loc: Loc, places: Places, lines: list[bytes]) -> None:
    if node.type == "inline_table":
        for child in node.named_children:
            if child.type == "pair":
                _pair(child, loc, places, lines)
    elif node.type == "array":
        for index, child in enumerate(c for c in node.named_children if c.type != "comment"):
            places[(*loc, index)] = _point(child, lines)
            _value(child, (*loc, index), places, lines)


def _keys(node: "Node") -> tuple[str, ...]:
    if node.type == "dotted_key":
        return tuple(part for child in node.named_children for part in _keys(child))
    text = (node.text or b"").decode("utf-8")
    return (text[1:-1] if node.type == "quoted_key" else text,)


def _point(node: "Node", lines: list[bytes]) -> tuple[int, int]:
    row, column = node.start_point.row, node.start_point.column
    return row + 1, len(lines[row][:column].decode("utf-8", errors="replace")) + 1
