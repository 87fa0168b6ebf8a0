"""What a lost neutral does, as terminal text: what the relay does not see first, then place by place."""

from collections.abc import Sequence

from relaycfg import units
from relaycfg.model.results import BoardVolts, BreakRow, BreakStudy, PlaceSummary
from relaycfg.model.site import NONE, Site
from relaycfg.text.figures import place, share
from relaycfg.text.layout import heading, listing, short, shown, table, wrapped

MOST = 7
"""Places (and notes) shown without --all."""
NAME = 14
"""Characters of a name in a table of figures."""


def breaks_text(site: Site, study: BreakStudy, everything: bool = False) -> str:
    """At most sixty lines; ``everything`` lists every state and board."""
    most = len(study.rows) + len(study.summaries) + 1 if everything else MOST
    lines = wrapped(_opening(site, study))
    lines += _unseen(study, most)
    states = list(dict.fromkeys(row.state for row in study.rows))
    if states:
        lines += _state(site, [row for row in study.rows if row.state == states[0]], most)
    lines += _sampled(study.summaries, most)
    if study.notes:
        lines += heading("Notes")
        for note in study.notes[: most if everything else 3]:
            lines += wrapped(note, "* ")
        lines += _more(len(study.notes), most if everything else 3)
    if everything:
        for row in study.rows:
            lines += _boards(row)
    elif len(states) > 1:
        lines += ["", f"{len(states)} load states computed, the first is shown; --all lists every state and board."]
    return "\n".join(lines) + "\n"


def unseen_rows(summaries: Sequence[PlaceSummary]) -> list[list[str]]:
    """Places whose break the relay cannot see, and why."""
    return [[short(place(s.at), NAME), s.conductor, s.why_not] for s in summaries if not s.seen]


def _opening(site: Site, study: BreakStudy) -> str:
    where = site.document.site or site.document.title or "This site"
    count = f"{study.places} place{'s' if study.places != 1 else ''} where the neutral can break"
    if site.relay is None:
        return f"{where}: {count}; no relay is described, so nothing is seen."
    return f"{where}: relay {site.relay.name} at {site.relay.measures_at} sees {study.seen_places} of {count}."


def _unseen(study: BreakStudy, most: int) -> list[str]:
    rows = unseen_rows(study.summaries)
    if not rows:
        return []
    listed = listing(["Place", "Wire", "Why"], rows[:most], 2)
    return [*heading("Not seen by the relay"), *listed, *_more(len(rows), most)]


def _state(site: Site, rows: list[BreakRow], most: int) -> list[str]:
    """One load state at every place: the worst board, the relay's terminals, metalwork."""
    joint_ohm = rows[0].joint_ohm
    what = "neutral open" if joint_ohm is None else f"neutral joint of {units.ohms(joint_ohm)} ohm"
    names = site.supply.geometry.names
    relay = site.relay.name if site.relay is not None else ""
    heads = ["Place", "Wire", "Worst board", *names]
    heads += [*("at relay" if k == 0 else n for k, n in enumerate(names)), "V0"] if relay else []
    heads += ["PE-earth"] if joint_ohm is None else ["A", "W"]
    cells = []
    for row in rows[:most]:
        board = max(row.boards, key=lambda b: max(row.boards[b].l_n_v))
        line = [short(place(row.at), NAME), row.conductor, short(board, NAME)]
        line += [units.volts(v) for v in row.boards[board].l_n_v]
        if relay:
            line += [*(units.volts(v) for v in row.relays[relay].l_n_v), units.volts(row.relays[relay].v0_v)]
        line += (
            [units.volts(touch_v(row))] if joint_ohm is None else [units.amperes(row.joint_a), units.watts(row.joint_w)]
        )
        cells.append(line)
    lines = [*heading(f"State {rows[0].state}, {what}, V"), *table(heads, cells, 3), *_more(len(rows), most)]
    for row in rows[:most]:
        remarks = ([row.status] if row.status != "converged" else []) + list(row.flags)
        if remarks:
            lines += wrapped(f"{place(row.at)}: {', '.join(remarks)}", "! ")
    return lines


def touch_v(row: BreakRow) -> float | None:
    """Largest potential of any board's metalwork to remote earth in one state [V]."""
    known = [b.pe_earth_v for b in row.boards.values() if b.pe_earth_v is not None]
    return max(known) if known else None


def _sampled(summaries: Sequence[PlaceSummary], most: int) -> list[str]:
    if not summaries:
        return []
    heads = ["Place", "Harmful", "Undetected", "Median", "95 %", "Most V", "PE V", "Unres."]
    rows = []
    for s in summaries[:most]:
        highest = s.percentiles[0] if s.percentiles else None
        points = (highest.p50, highest.p95, highest.largest) if highest else (None, None, None)
        hidden = share(s.undetected) if s.undetected.count or not s.seen else units.ABSENT
        touch, lost = units.volts(s.touch_v), units.count(s.unresolved)
        rows.append([short(place(s.at), NAME), share(s.harmful), hidden, *map(units.volts, points), touch, lost])
    lines = heading(f"Over {units.count(summaries[0].samples)} sampled load states, highest line-to-neutral anywhere")
    lines += [*table(heads, rows), *_more(len(summaries), most)]
    lines += wrapped("Shares are of modelled load states with their 95 % interval, not probabilities of damage.")
    harmed = [s for s in summaries if s.boards_harmed][: most // 2]
    for s in harmed:
        elsewhere = f"; not disconnected by the relay: {shown(s.not_disconnected, 4)}" if s.not_disconnected else ""
        lines += wrapped(f"{place(s.at)}: harm at {shown(s.boards_harmed, 4)}{elsewhere}", "  ")
    return lines


def _boards(row: BreakRow) -> list[str]:
    wire = f" ({row.conductor})" if row.at != NONE else ""
    flags = f", {', '.join(row.flags)}" if row.flags else ""
    lines = heading(f"{place(row.at)}{wire}, state {row.state}, {row.status}{flags}")
    heads = ["Board", "L-N V", "L-L V", "V0", "N-earth", "PE-earth", "N A", "all-impedance L-N V"]
    companion = row.all_impedance.boards if row.all_impedance is not None else {}
    cells = [
        [
            short(name, NAME),
            _together(b.l_n_v),
            _together(b.l_l_v),
            units.volts(b.v0_v),
            units.volts(b.n_earth_v),
            units.volts(b.pe_earth_v),
            units.amperes(b.neutral_a),
            _together(_l_n(companion, name)),
        ]
        for name, b in row.boards.items()
    ]
    return lines + table(heads, cells)


def _l_n(boards: dict[str, BoardVolts], name: str) -> tuple[float, ...]:
    return boards[name].l_n_v if name in boards else ()


def _together(values: Sequence[float]) -> str:
    return "/".join(f"{v:.0f}" for v in values) if values else units.ABSENT


def _more(count: int, most: int) -> list[str]:
    return [f"and {count - most} more, --all shows them"] if count > most else []
