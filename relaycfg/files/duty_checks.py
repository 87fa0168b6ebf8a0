"""Motors, short circuits, relay, equipment and own cases held against the boards and against themselves."""

from relaycfg.files.draft import Draft
from relaycfg.files.ledger import printed
from relaycfg.files.name_checks import check_board, check_unique
from relaycfg.files.relay_form import FeedForm
from relaycfg.files.tables import is_high_curve, names
from relaycfg.files.text import choose

LATER = "not yet available"


def check_motors_and_faults(draft: Draft) -> None:
    """Motors have names of their own; they and faults stand at known boards."""
    check_unique(draft, [((*e.loc, "name"), e.form.name) for e in draft.motors if e.form.name])
    for motor in draft.motors:
        check_board(draft, (*motor.loc, "board"), motor.form.board)
    for fault in draft.faults:
        check_board(draft, (*fault.loc, "board"), fault.form.board)
        if min(fault.form.circuit_ohm) < 0:
            draft.add((*fault.loc, "circuit_ohm"), printed(fault.form.circuit_ohm), "give ohms of 0 or more")


def check_relay(draft: Draft, need_relay: bool) -> None:
    """Relays with names of their own at known boards, their feeds with the range they work in."""
    if need_relay and draft.lacks("relay"):
        draft.add(("relay",), "missing", "write a [[relay]] table with name, measures_at and device")
    check_unique(draft, [((*e.loc, "name"), e.form.name) for e in draft.relays])
    for entry in draft.relays:
        check_board(draft, (*entry.loc, "measures_at"), entry.form.measures_at)
        if entry.form.trips is not None:
            check_board(draft, (*entry.loc, "trips"), entry.form.trips)
        for name in ("supply", "trip_coil"):
            feed: FeedForm = getattr(entry.form, name)
            loc = (*entry.loc, name, "range_v")
            if feed.from_ not in (None, "auxiliary") and feed.range_v is None:
                draft.add(loc, "missing", "give [low, high] in volts for a feed from the lines")
            if feed.range_v is not None and not 0 <= feed.range_v[0] < feed.range_v[1]:
                draft.add(loc, printed(feed.range_v), "give [low, high] in volts, low below high")


def check_equipment(draft: Draft) -> None:
    """A known curve or own steps, which fall in time as they move away from nominal."""
    form = draft.equipment
    if form is None:
        return
    if form.overvoltage is not None and form.points is not None:
        draft.add(("equipment", "points"), "given beside overvoltage", "keep one of them")
    high = names("withstand-curves", is_high_curve)
    if form.overvoltage is not None and form.overvoltage not in high:
        draft.add(("equipment", "overvoltage"), f'"{form.overvoltage}"', choose(form.overvoltage, high))
    for name, rising in (("points", True), ("points_low", False)):
        steps: list[list[float]] = getattr(form, name) or []
        for index in range(1, len(steps)):
            volts, seconds = steps[index][0] - steps[index - 1][0], steps[index][1] - steps[index - 1][1]
            if (volts > 0) != rising or volts == 0 or seconds > 0:
                order = "rising" if rising else "falling"
                remedy = f"give {order} volts with falling seconds"
                draft.add(
                    ("equipment", name, index), f"{printed(steps[index])} after {printed(steps[index - 1])}", remedy
                )
        for index, step in enumerate(steps):
            if step[0] <= 0 or step[1] <= 0:
                draft.add(("equipment", name, index), printed(step), "give volts and seconds above 0")
    if form.points and form.sustained_high_v is not None and form.sustained_high_v > form.points[0][0]:
        draft.add(("equipment", "sustained_high_v"), f"{form.sustained_high_v:g}, above the first point",
                  f"give volts, at most {form.points[0][0]:g}")  # fmt: skip
    if form.points_low and form.sustained_low_v is None:
        draft.add(("equipment", "sustained_low_v"), "missing", "give the volts that may stay for ever")
    elif form.sustained_low_s is not None and form.sustained_low_v is None:
        draft.add(("equipment", "sustained_low_s"), "not used without sustained_low_v", "give sustained_low_v too")


def check_cases(draft: Draft) -> None:
    """Own cases have names of their own and magnitudes of voltage."""
    check_unique(draft, [((*e.loc, "name"), e.form.name) for e in draft.cases])
    for entry in draft.cases:
        for index, segment in enumerate(entry.form.segment):
            if min(segment.l_n_v) < 0 or max(segment.l_n_v) > 5000:
                loc = (*entry.loc, "segment", index, "l_n_v")
                draft.add(loc, printed(segment.l_n_v), "give magnitudes in volts", "0 to 5000")
