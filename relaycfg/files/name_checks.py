"""Names that stand for each other: used once, and known where they are spoken of."""

from collections.abc import Iterable

from relaycfg.files.draft import Draft
from relaycfg.files.positions import Loc
from relaycfg.files.text import choose


def check_unique(draft: Draft, named: Iterable[tuple[Loc, str]]) -> None:
    """Adds a problem for every name that was used before."""
    seen: set[str] = set()
    for loc, name in named:
        if name in seen:
            draft.add(loc, f'"{name}", used before', "give every one a name of its own")
        seen.add(name)


def check_board(draft: Draft, loc: Loc, name: str, also: tuple[str, ...] = ()) -> bool:
    """Whether a board of that name (or one of ``also``) exists; adds a problem where not.

    Where a board lacks a name of its own, that is the problem, and a name not found may be the one that it lacks.
    """
    choices = (*also, *draft.board_names)
    if name in choices:
        return True
    if draft.boards_known:
        draft.add(loc, f'"{name}", an unknown board', choose(name, choices))
    return False
