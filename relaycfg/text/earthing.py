"""Touch voltages, and the earth a relay measures against, as terminal text; information, never shock protection."""

from relaycfg import units
from relaycfg.model.results import Study
from relaycfg.model.touch_results import PlaceTouch
from relaycfg.text.figures import cited, counted, place, share
from relaycfg.text.layout import heading, table, wrapped

NOT_MODELLED = "not modelled"
"""Stands for volts with the switch open where the PEN has no other user in the model."""


def touch(study: Study) -> list[str]:
    """Places with metalwork above a limit, and what the relay does about it; how many others there are."""
    if not study.touch:
        return []
    above = [t for t in study.touch if t.above.count]
    heads = ["Place", "Wire", "Most V", "at", "Above its limit", "In time", "late", "never", "V with switch open"]
    rows = [_row(t) for t in above]
    lines = heading("Touch voltage, metalwork against remote earth")
    lines += table(heads, rows, 2, (0, 3)) if rows else []
    lines += wrapped(_others(study, len(above)))
    times = study.site.touch
    if rows and times.points:
        steps = ", ".join(f"{v:g} V {s:g} s" for v, s in times.points)
        lines += wrapped(
            f"In time: the switch open within {steps} ({times.applies_to}){cited(times.source, times.status)}."
        )
    return [*lines, *wrapped("Computed, indicative. This relay is no protection against electric shock.")]


def _row(t: PlaceTouch) -> list[str]:
    worst = t.boards[0]
    r = t.relay
    does = ["not seen", *[units.ABSENT] * 3]
    if r is not None:
        percents = [f"{units.percent(s.percent)} %" for s in (r.within, r.late, r.never)]
        does = [*percents, NOT_MODELLED if r.left_v is None else units.volts(r.left_v)]
    return [place(t.at), t.conductor, units.volts(worst.largest_v), worst.board, share(t.above), *does]


def _others(study: Study, above: int) -> str:
    """Places without anything above a limit, states without a solution, boards without PE."""
    rest = len(study.touch) - above
    parts = []
    if rest:
        limits = sorted({b.limit_v for t in study.touch for b in t.boards})
        told = " or ".join(f"{v:g}" for v in limits)
        parts.append(f"Breaks with no metalwork above its limit{f' ({told} V)' if told else ''}: {rest}.")
    lost = sum(t.unresolved for t in study.touch)
    if lost:
        parts.append(f"{counted(lost, 'state')} without a solution left out.")
    if any(t.above.count and t.relay is not None and t.relay.left_v is None for t in study.touch):
        parts.append(f"{NOT_MODELLED.capitalize()}: other users of this PEN are not in the model.")
    bare = sorted({b for t in study.touch for b in t.without_pe})
    if bare:
        parts.append(f"No PE in the model, so no figure: {', '.join(bare)}.")
    return " ".join(parts)


def earth_reference(study: Study) -> list[str]:
    """Both earths a relay may measure N against, where its device takes displacement from N to earth."""
    choice = study.earth_choice
    if choice is None:
        return []
    heads = ["Place", "Wire", "N-PE V", "seen", "N-own electrode V", "seen"]
    rows = [
        [place(p.at), p.conductor, units.volts(p.local_v), share(p.local), units.volts(p.own_v), share(p.own)]
        for p in choice.places
    ]
    lines = heading(f"Earth that N is measured against: {choice.chosen}")
    lines += table(heads, rows, 2)
    return lines + wrapped(
        f"Seen: {choice.stage} at {units.volts(choice.pickup_v)} V picks up. Standing with a sound neutral: N-PE "
        f"{units.volts(choice.standing_local_v)} V, N-own electrode {units.volts(choice.standing_own_v)} V. An "
        "electrode of its own has to stand outside the influence of all others and be tied to nothing else."
    )
