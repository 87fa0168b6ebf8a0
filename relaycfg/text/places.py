"""Place by place as terminal text: which element sees a break, which boards it harms, what several relays cover."""

from relaycfg import units
from relaycfg.model.results import Study
from relaycfg.text.figures import counted, place, share
from relaycfg.text.layout import heading, shown, table, wrapped

PLACES = 7
"""Places shown; the sheet and the JSON have them all."""
BOARDS = 5


def seen_by(study: Study) -> list[str]:
    """Each seen place: in which share of load states every element operates, how soon, from which asymmetry on."""
    summaries = [s for s in study.breaks.summaries if s.seen and s.elements]
    ratios = {a.at: a.ratios for a in study.place_asymmetry}
    lines_of = len(study.site.supply.geometry.names)
    rows = []
    for s in summaries[:PLACES]:
        for k, element in enumerate(s.elements):
            known = ratios.get(s.at, {})
            name = element.function.value
            least = known.get(name)
            ratio = "never" if name in known and least is None else units.ABSENT
            rows.append(
                [
                    place(s.at) if k == 0 else "",
                    name,
                    share(element.share),
                    units.with_unit(element.fastest_s, "s"),
                    ratio if least is None else units.load_ratio(least, lines_of),
                ]
            )
    lines: list[str] = []
    if rows:
        heads = ["Break at", "By", "Load states in which it operates", "Soonest", "Least unequal load"]
        lines += [*heading("Seen by"), *table(heads, rows, 2, among=[place(s.at) for s in summaries])]
        lines += [f"and {counted(len(summaries) - PLACES, 'more place')}"] if len(summaries) > PLACES else []
        lines += wrapped(
            "Least unequal load: resistive, of the average load behind the break, seen whichever line is heavy."
        )
    return lines + _boards(study)


def _boards(study: Study) -> list[str]:
    """Boards harmed and healthy, places that do the same in one line."""
    same: dict[tuple[tuple[str, ...], tuple[str, ...]], list[str]] = {}
    for s in study.breaks.summaries:
        same.setdefault((s.boards_harmed, s.boards_healthy), []).append(place(s.at))
    lines = [*heading("Boards in a break")] if same else []
    for (harmed, healthy), places in same.items():
        harm = f"harm at {shown(harmed, BOARDS)}" if harmed else "no harm in the modelled states"
        sound = f"; {shown(healthy, BOARDS)} {'stays' if len(healthy) == 1 else 'stay'} healthy" if healthy else ""
        lines += wrapped(f"{shown(places, BOARDS)}: {harm}{sound}")
    return lines


def together(study: Study) -> list[str]:
    """What the relays of the site cover between them, place by place."""
    if not study.together:
        return []
    names = [relay.name for relay in study.site.every_relay]
    rows = [
        [
            place(t.at),
            *(share(t.alone[name]) if name in t.alone else "not seen" for name in names),
            share(t.cleared),
        ]
        for t in study.together
    ]
    given = "given" if study.kind == "check" else "derived"
    lines = heading("Relays together, harmful load states in which every harmed board is disconnected in time")
    lines += table(["Break at", *names, "Together"], rows, among=[place(t.at) for t in study.together])
    return lines + wrapped(
        f"{names[0]} at its {given} settings, {shown(names[1:], 4)} at derived ones; volts as before any switch opens."
    )
