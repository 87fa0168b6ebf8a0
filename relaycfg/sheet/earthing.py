"""Touch voltage place by place, and the earth that a relay measures N against; information, never shock protection."""

from typing import Any

from markupsafe import Markup

from relaycfg.model.touch_results import EarthChoice, PlaceTouch
from relaycfg.sheet import figures
from relaycfg.sheet.ink import Flow, Ink
from relaycfg.sheet.inputs import status
from relaycfg.sheet.sight import some

GROUPS_SHOWN = 4
"""Groups of boards with the same volts that are listed a place, the highest first."""


def earthing(ink: Ink) -> Flow:
    """Metalwork against remote earth, the highest boards of each place; what the relay leaves; the measuring choice."""
    study, words = ink.study, ink.wording
    if not study.touch:
        return [*ink.heading("earthing"), ink.say("earthing.empty")]
    rows = [row for t in study.touch for row in _boards(ink, t)]
    bare = sorted({b for t in study.touch for b in t.without_pe})
    return [
        *ink.heading("earthing"),
        ink.boxed([ink.say("earthing.rule")]),
        ink.gap(4),
        ink.say("earthing.lead", study=study),
        *ink.table(words.lines("earthing.heads"), rows, (17, 41, 10, 10, 22), "llrrl"),
        *([ink.say("earthing.bare", "small", boards=", ".join(bare))] if bare else []),
        *_relay(ink),
        *([] if study.earth_choice is None else _choice(ink, study.earth_choice)),
    ]


def _boards(ink: Ink, t: PlaceTouch) -> list[list[Any]]:
    """The highest volts of a place with the boards that share them; groups below the first GROUPS_SHOWN are counted."""
    place = Markup("<b>{}</b> ({})").format(t.at, t.conductor)
    groups: dict[tuple[str, ...], list[str]] = {}
    for b in t.boards:
        alike = (figures.by_unit(b.largest_v, "V"), figures.by_unit(b.limit_v, "V"), figures.share(b.above))
        groups.setdefault(alike, []).append(b.board)
    rows: list[list[Any]] = [
        [place if k == 0 else "", some(tuple(names)), *alike]
        for k, (alike, names) in enumerate(list(groups.items())[:GROUPS_SHOWN])
    ]
    more = sum(len(names) for names in list(groups.values())[GROUPS_SHOWN:])
    if more:
        rows.append(["", ink.wording.text("earthing.more", n=more), "", "", ""])
    if t.unresolved:
        rows.append(["", ink.wording.text("earthing.unresolved", n=t.unresolved), "", "", ""])
    return rows


def _relay(ink: Ink) -> Flow:
    """What the relay does about metalwork above a limit, at the places it sees."""
    study, none = ink.study, ink.wording.text("earthing.not_modelled")
    rows = [
        [
            Markup("<b>{}</b>").format(t.at),
            figures.share(t.above),
            *(figures.by_unit(s.percent, "%") for s in (t.relay.never, t.relay.late, t.relay.within)),
            none if t.relay.left_v is None else figures.by_unit(t.relay.left_v, "V"),
            t.relay.left_board or figures.ABSENT,
        ]
        for t in study.touch
        if t.relay is not None and t.above.count
    ]
    if not rows:
        return []
    words = ink.wording
    return [
        *ink.heading("earthing_relay", 1, words.text("earthing.relay_title")),
        *ink.table(words.lines("earthing.relay_heads"), rows, (18, 24, 10, 10, 12, 10, 16), "llrrrrl"),
        ink.say(
            "earthing.times",
            "small",
            times=study.site.touch,
            steps=", ".join(f"{v:g} V {s:g} s" for v, s in study.site.touch.points),
            status=status(ink, study.site.touch.status),
            alone=any(t.above.count and t.relay is not None and t.relay.left_v is None for t in study.touch),
        ),
    ]


def _choice(ink: Ink, choice: EarthChoice) -> Flow:
    rows = [
        [
            Markup("<b>{}</b> ({})").format(p.at, p.conductor),
            figures.by_unit(p.local_v, "V"),
            figures.share(p.local),
            figures.by_unit(p.own_v, "V"),
            figures.share(p.own),
        ]
        for p in choice.places
    ]
    words = ink.wording
    return [
        *ink.heading("earthing_choice", 1, words.text("earthing.choice_title", choice=choice)),
        *ink.table(words.lines("earthing.choice_heads"), rows, (22, 14, 25, 14, 25), "lrlrl"),
        ink.say("earthing.choice", choice=choice),
        *(ink.items("earthing.provide", "tight") if choice.chosen == "own electrode" else []),
    ]
