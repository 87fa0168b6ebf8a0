"""What a lost neutral does, as terminal text: what the relay does not see first, then place by place."""

from collections.abc import Sequence

from relaycfg import units
from relaycfg.model.break_results import BreakRow, BreakStudy, PlaceSummary
from relaycfg.model.site import NONE, Site
from relaycfg.text.figures import FLAGS, UNBALANCES, counted, place, share, together
from relaycfg.text.highest import highest
from relaycfg.text.joints import every_joint, hottest_joints
from relaycfg.text.layout import heading, listing, shortened, shown, table, wrapped

SCREEN = 60
"""Lines without --all."""
SHOWN = ((7, 3), (6, 2), (5, 2), (4, 1), (3, 1), (2, 1), (1, 1))
"""Places shown without --all, and those with sentences (and notes): the first pair that fits; long names take more."""
NAME = 24
"""Characters of a place's name beside a sentence."""


def breaks_text(site: Site, study: BreakStudy, everything: bool = False) -> str:
    """At most sixty lines; ``everything`` lists every state and board."""
    if everything:
        most = len(study.rows) + len(study.summaries) + len(study.notes) + 1
        return "\n".join(_lines(site, study, most, most, True)) + "\n"
    lines: list[str] = []
    for most, few in SHOWN:
        lines = _lines(site, study, most, few, False)
        if len(lines) <= SCREEN:
            break
    return "\n".join(lines) + "\n"


def _lines(site: Site, study: BreakStudy, most: int, few: int, everything: bool) -> list[str]:
    """The text with the first ``most`` places, and the first ``few`` of what takes more than a line each."""
    lines = wrapped(_opening(site, study))
    lines += _unseen(study, most)
    states = list(dict.fromkeys(row.state for row in study.rows))
    if states:
        first = [row for row in study.rows if row.state == states[0]]
        lines += [*_state(site, first, most), *_legend(study.rows if everything else first[:most])]
    lines += _sampled(study.summaries, most, few)
    lines += highest(study.highest, most, named=states == ["worst"])
    lines += hottest_joints(study.joints, most)
    if study.notes:
        lines += heading("Notes")
        for note in study.notes[:few]:
            lines += wrapped(note, "* ")
        lines += _more(len(study.notes), few)
    if everything:
        for row in study.rows:
            lines += _boards(row)
        lines += every_joint(study.joints)
    elif len(states) > 1:
        lines += ["", f"{len(states)} load states computed, the first is shown; --all lists every state and board."]
    return lines


def unseen_rows(summaries: Sequence[PlaceSummary]) -> list[list[str]]:
    """Places whose break the relay cannot see, and why."""
    names = shortened([place(s.at) for s in summaries], NAME)
    return [[names[place(s.at)], s.conductor, s.why_not] for s in summaries if not s.seen]


def _opening(site: Site, study: BreakStudy) -> str:
    where = site.document.site or site.document.title or "This site"
    count = f"{counted(study.places, 'place')} where the neutral can break"
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
    """One load state at every place: the worst board, the relay's terminals, metalwork or the joint."""
    joint_ohm = rows[0].joint_ohm
    what = "neutral open" if joint_ohm is None else f"neutral joint of {units.ohms(joint_ohm)} ohm"
    names = site.supply.geometry.names
    relay = site.relay.name if site.relay is not None else ""
    heads = ["Place", "Wire", "Worst board", *names]
    heads += [*(f"relay {name}" for name in names), "V0"] if relay else []
    heads += ["PE-earth"] if joint_ohm is None else ["A", "W"]
    cells = []
    for row in rows[:most]:
        line = [place(row.at), row.conductor or units.ABSENT]
        if not row.boards:
            cells.append(line + [units.ABSENT] * (len(heads) - len(line)))
            continue
        board = max(row.boards, key=lambda b: max(row.boards[b].l_n_v))
        line += [board]
        line += [units.volts(v) for v in row.boards[board].l_n_v]
        if relay:
            line += [*(units.volts(v) for v in row.relays[relay].l_n_v), units.volts(row.relays[relay].v0_v)]
        joint = [units.amperes(row.joint_a), units.watts(row.joint_w)]
        line += [units.volts(touch_v(row))] if joint_ohm is None else joint
        cells.append(line)
    among = [board.name for board in site.boards]
    lines = heading(f"State {rows[0].state}, {what}, V")
    lines += [*table(heads, cells, 3, (0, 2), among), *_more(len(rows), most)]
    remarks: dict[str, list[str]] = {}
    for row in rows[:most]:
        remark = ", ".join(([row.status] if row.status != "converged" else []) + list(row.flags))
        remarks.setdefault(remark, []).append(place(row.at))
    for remark, at in remarks.items():
        lines += wrapped(f"{'; '.join(at)}: {remark}", "! ") if remark else []
    return lines


def _legend(rows: Sequence[BreakRow]) -> list[str]:
    """What the flags of these rows mean."""
    raised = {flag for row in rows for flag in row.flags}
    return [line for flag, words in FLAGS.items() if flag in raised for line in wrapped(f"{flag}: {words}")]


def touch_v(row: BreakRow) -> float | None:
    """Largest potential of any board's metalwork to remote earth in one state [V]."""
    known = [b.pe_earth_v for b in row.boards.values() if b.pe_earth_v is not None]
    return max(known) if known else None


def _sampled(summaries: Sequence[PlaceSummary], most: int, few: int) -> list[str]:
    if not summaries:
        return []
    heads = ["Place", "Harmful", "Undetected", "Median", "95 %", "Most V", "PE V", "not solved"]
    rows = []
    for s in summaries[:most]:
        highest = s.percentiles[0] if s.percentiles else None
        points = (highest.p50, highest.p95, highest.largest) if highest else (None, None, None)
        hidden = "not seen" if not s.seen else share(s.undetected) if s.classes else "depends on settings"
        touch, lost = units.volts(s.touch_v), units.count(s.unresolved)
        rows.append([place(s.at), share(s.harmful), hidden, *map(units.volts, points), touch, lost])
    many = units.count(summaries[0].samples)
    lines = heading(f"Over {many} sampled load states at nominal supply, highest line-to-neutral anywhere")
    lines += [*table(heads, rows, among=[s.at for s in summaries]), *_more(len(summaries), most)]
    lines += wrapped("Shares are of modelled load states with their 95 % interval, not probabilities of damage.")
    harmed = [s for s in summaries if s.boards_harmed]
    for s in harmed[:few]:
        elsewhere = f"; not disconnected by the relay: {shown(s.not_disconnected, 4)}" if s.not_disconnected else ""
        lines += wrapped(f"{place(s.at)}: harm at {shown(s.boards_harmed, 4)}{elsewhere}{_worst(s)}", "  ")
    again = next((s.worst[0].index for s in harmed if s.worst), None)
    if again is None:
        return lines
    return [*lines, f'A sampled state is shown again by its number and the same seed: --state "sample {again}"']


def _worst(summary: PlaceSummary) -> str:
    """Where and in which sampled state the volts are highest."""
    worst = summary.worst[0] if summary.worst else None
    return "" if worst is None else f"; highest at {worst.board} {worst.line} in sample {worst.index}"


def _boards(row: BreakRow) -> list[str]:
    wire = f" ({row.conductor})" if row.at != NONE else ""
    flags = f", {', '.join(row.flags)}" if row.flags else ""
    lines = heading(f"{place(row.at)}{wire}, state {row.state}, {row.status}{flags}")
    heads = ["Board", "L-N V", "L-L V", "V0", "N-earth", "PE-earth", "N A", "all-impedance L-N V"]
    companion = row.all_impedance.boards if row.all_impedance is not None else {}
    cells = [
        [
            name,
            together(b.l_n_v),
            together(b.l_l_v),
            units.volts(b.v0_v),
            units.volts(b.n_earth_v),
            units.volts(b.pe_earth_v),
            units.amperes(b.neutral_a),
            together(companion[name].l_n_v if name in companion else ()),
        ]
        for name, b in row.boards.items()
    ]
    lines += table(heads, cells)
    for name, at in row.relays.items():
        unbalance = ", ".join(
            f"{words} {units.with_unit(at.unbalance_percent.get(key), '%')}" for key, words in UNBALANCES.items()
        )
        own = (
            ""
            if at.n_reference_v in (None, at.n_pe_v)
            else f", N-own electrode {units.with_unit(at.n_reference_v, 'V')}"
        )
        lines += wrapped(f"At relay {name}: N-PE {units.with_unit(at.n_pe_v, 'V')}{own}; unbalance: {unbalance}")
    return lines


def _more(count: int, most: int) -> list[str]:
    return [f"and {count - most} more, --all shows them"] if count > most else []
