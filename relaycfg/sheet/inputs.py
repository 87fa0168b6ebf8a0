"""The evidence behind the figures: every input with its tag, the network as a tree, and the withstand curve's owner."""

from typing import Any

from markupsafe import Markup

from relaycfg.model.site import SOURCE, Equipment, Site
from relaycfg.sheet import figures
from relaycfg.sheet.ink import Flow, Ink

USER = "user"
"""Status of what the user gave; what the files leave empty is such."""


def inputs(ink: Ink) -> Flow:
    """All inputs in the order of the file; what is not the user's own stands in bold."""
    shares = (30, 17, 8, 11, 15, 26)
    rows: list[list[Any]] = [
        [
            ink.broken(i.field, ink.width * shares[0] / sum(shares)),
            figures.given(i.value),
            i.unit,
            Markup("<b>{}</b>").format(i.tag) if i.tag in ("default", "assumed") else i.tag,
            status(ink, i.status or USER),
            i.note,
        ]
        for i in ink.study.site.inputs
    ]
    equipment = ink.study.site.equipment
    return [
        *ink.heading("inputs"),
        ink.say("inputs.lead"),
        *ink.table(ink.wording.lines("inputs.heads"), rows, shares, "lrllll"),
        *ink.heading("inputs_withstand", 1, ink.wording.text("inputs.withstand_title")),
        ink.say("inputs.withstand", e=equipment, status=status(ink, equipment.status)),
        *ink.table(
            ink.wording.lines("inputs.withstand_heads"),
            _withstand(ink, equipment),
            (40, 30, 30),
            "lrr",
            width=0.6 * ink.width,
        ),
        *_feeds(ink),
    ]


def status(ink: Ink, code: str) -> str:
    """How well a figure is known, in words; a value from memory asks to be verified."""
    known = {str(name): text for name, text in ink.wording.pairs("inputs.status")}
    return known.get(code, code) or figures.ABSENT


def _withstand(ink: Ink, e: Equipment) -> list[list[Any]]:
    up, down = ink.wording.text("inputs.above"), ink.wording.text("inputs.below")
    high = [(e.sustained_high_v, e.sustained_high_s), *e.high_points]
    low = [] if e.sustained_low_v is None else [(e.sustained_low_v, e.sustained_low_s), *e.low_points]
    return [
        [word, figures.by_unit(v, "V"), figures.by_unit(s, "s")]
        for word, side in ((up, high), (down, low))
        for v, s in side
    ]


def _feeds(ink: Ink) -> Flow:
    feeds, relay = ink.study.feed_range_v, ink.study.site.relay
    if not feeds or relay is None:
        return []
    supply, coil = (ink.wording.text("inputs.feed_range", feed=f) for f in (relay.supply, relay.trip_coil))
    rows = [[what, figures.by_unit(low, "V"), figures.by_unit(high, "V")] for what, low, high in feeds]
    return [
        *ink.heading("inputs_feeds", 1, ink.wording.text("inputs.feeds_title")),
        *ink.table(ink.wording.lines("inputs.feeds_heads"), rows, (60, 20, 20), "lrr"),
        ink.say("inputs.ranges", "small", relay=relay, supply=supply, coil=coil),
        *_feed_life(ink),
    ]


def _feed_life(ink: Ink) -> Flow:
    """Of each feed how often, how long and how it fails, then what of the trip is left."""
    life = ink.study.own_life
    if life is None:
        return []
    flow: Flow = [
        ink.say(
            "inputs.feed_life",
            "small",
            feed=feed,
            below=figures.share(feed.below),
            above=figures.share(feed.above),
            held="; ".join(f"{h.case} {h.name}, {figures.by_unit(h.lowest_v, 'V')}" for h in feed.held_losses),
        )
        for feed in life.feeds
    ]
    fails, self_opening = figures.share(life.trip_fails), figures.share(life.self_opening_fails)
    return [*flow, ink.say("inputs.trip_fails", "small", fails=fails, self_opening=self_opening)]


def network(ink: Ink) -> Flow:
    """The network as a tree, with the places where a neutral can break and what the relay sees and opens."""
    site, wording = ink.study.site, ink.wording
    seen = {s.at: s.seen for s in ink.study.breaks.summaries}
    rows: list[list[Any]] = []
    for name, stem in _tree(site):
        relay = site.relay
        marks = []
        if relay is not None:
            marks += [wording.text("network.measures")] if relay.measures_at == name else []
            marks += [wording.text("network.opens")] if relay.trips == name else []
        place = (
            wording.text("network.place", place=name, conductor=site.conductor(name)) if name in site.places else "–"
        )
        sight = figures.ABSENT if name not in seen else wording.text("network.seen" if seen[name] else "network.unseen")
        link = name != SOURCE and site.board(name).neutral_earth_link
        rows.append([stem, place, sight, wording.text("network.link") if link else figures.ABSENT, ", ".join(marks)])
    return [
        *ink.heading("network"),
        ink.say("network.lead", source=site.source),
        *ink.table(wording.lines("network.heads"), rows, (40, 14, 11, 9, 26), "lllll"),
    ]


def _tree(site: Site) -> list[tuple[str, str]]:
    """Names with their branch drawn in front, the source first, each board below what feeds it."""
    lines: list[tuple[str, str]] = [(SOURCE, site.source.name or SOURCE)]

    def grow(parent: str, indent: str) -> None:
        children = [b.name for b in site.boards if b.fed_from == parent]
        for name in children:
            last = name == children[-1]
            lines.append((name, f"{indent}{'└─' if last else '├─'} {name}"))
            grow(name, indent + ("\u2003\u2002" if last else "│\u2002"))

    grow(SOURCE, "\u2002")
    return lines
