"""What the relay must hold through: short circuits, reference disturbances and the user's own cases."""

import cmath
import math

from relaycfg.files.draft import Draft
from relaycfg.files.ledger import Ledger, printed
from relaycfg.files.relay_form import CaseForm, MustHoldForm, SegmentForm
from relaycfg.files.tables import Row, Tables, is_50_hz
from relaycfg.model.geometry import Geometry
from relaycfg.model.site import SOURCE, Board, Fault, ReferenceCases, Supply, UserCase, UserSegment


def resolve_faults(draft: Draft, boards: tuple[Board, ...], supply: Supply, ledger: Ledger) -> tuple[Fault, ...]:
    """The user's short circuits, or assumed ones: a final circuit of every board, and every distribution cable."""
    faults = []
    for number, entry in enumerate(draft.faults, 1):
        form = entry.form
        ohm = complex(*form.circuit_ohm)
        ledger.given(f"fault.{number}.circuit_ohm", ohm, "ohm", note=f"behind {form.board}")
        ledger.given(f"fault.{number}.clearing_s", form.clearing_s, "s", note=f"behind {form.board}")
        faults.append(Fault(form.board, ohm, form.clearing_s, False, "site", "user"))
    if draft.faults:
        return tuple(faults)
    tables = ledger.tables
    seconds, row = final_clearing(supply.earthing, supply.nominal_v, tables)
    circuit = tables.row("default-fault-circuit")
    for board in boards:
        at = f"fault.final circuit of {board.name}."
        ledger.default(at + "clearing_s", seconds, "s", row.source, row.status)
        ledger.default(at + "circuit_ohm", complex(*circuit.value), "ohm", circuit.source, circuit.status)
        faults.append(Fault(board.name, complex(*circuit.value), seconds, True, row.source, row.status))
    row = tables.row("disconnection-distribution")
    bolted = complex(*tables.row("default-fault-at-board").value)
    seconds = row.values["tt_s" if supply.earthing == "TT" else "tn_s"]
    for board in boards:
        if board.cable is not None and board.fed_from != SOURCE:
            at = f"fault.cable to {board.name}.clearing_s"
            ledger.default(at, seconds, "s", f"bolted at the board; {row.source}", row.status)
            faults.append(Fault(board.name, bolted, seconds, True, row.source, row.status))
    return tuple(faults)


def final_clearing(earthing: str, nominal_v: float, tables: Tables) -> tuple[float, Row]:
    """Longest disconnection time [s] of a final circuit. Source: IEC 60364-4-41 Table 41.1, as the row says."""
    system = "tt" if earthing == "TT" else "tn"
    row = tables.row(f"disconnection-{system}")
    for up_to_v, seconds in row.points:
        if nominal_v <= up_to_v:
            return seconds, row
    row = tables.row(f"disconnection-{system}-above-400")
    return float(row.value), row


REFERENCE_DIPS = {
    "public supply": "iec-61000-4-11-class-3",
    "dips class 2": "iec-61000-4-11-class-2",
    "dips class 3": "iec-61000-4-11-class-3",
}
"""Row of the dips of each set."""
SWELL_SETS = ("public supply",)
"""Sets that have our swells too."""


def resolve_reference(form: MustHoldForm, supply: Supply, ledger: Ledger) -> ReferenceCases:
    """Dips and swells of the sets, in percent of nominal and seconds."""
    tables, frequency_hz = ledger.tables, supply.frequency_hz
    dips: dict[tuple[float, float], tuple[float, float, str, str]] = {}
    swells: tuple[tuple[float, float, str, str], ...] = ()
    notes, statuses = [], []
    for name in form.sets:
        row = tables.row(REFERENCE_DIPS[name])
        for percent, at_50, at_60 in row.points:
            seconds = (at_50 if is_50_hz(frequency_hz, tables) else at_60) / frequency_hz
            dips[percent, seconds] = (percent, seconds, row.source, row.status)
        notes.append(f"dips of {row.source}")
        statuses.append(row.status)
        if name in SWELL_SETS:
            swells = reference_swells(tables, supply.nominal_v)
            notes.append(swells[-1][2])
            statuses.extend(swell[3] for swell in swells)
    note, status = "; ".join(notes), "memory" if "memory" in statuses else "".join(statuses[:1])
    if "sets" in form.model_fields_set:
        ledger.given("must_hold.sets", form.sets, "", note, status=status)
    else:
        ledger.default("must_hold.sets", form.sets, "", note, status)
    interruption = ledger.pick("must_hold.interruption_s", form.interruption_s, "default-interruption", "s")
    row = tables.row("default-interruption")
    source, status = (row.source, row.status) if form.interruption_s is None else ("site", "user")
    pole = tables.row("own-pole-spread")
    return ReferenceCases(
        tuple(dips.values()), swells, float(interruption), source, status, float(pole.value), pole.source, pole.status
    )


def reference_swells(tables: Tables, nominal_v: float) -> tuple[tuple[float, float, str, str], ...]:
    """Swells as the times for which household overvoltage devices must not act, in percent of their 230 V.

    Nobody publishes a set of swells to hold through; this one is ours, with figures of EN 50550 (from memory, the
    275 V cell as quoted). At another nominal voltage they are scaled, which is ours too.
    """
    row, seen = tables.row("household-overvoltage-hold-times"), tables.row("household-overvoltage-275")
    base = tables.row("default-equipment-nominal").value
    scaled = "" if nominal_v == base else f", scaled by U0/{base:g}"
    swells = []
    for volts, seconds in row.points:
        quoted = (volts, seconds) == (seen.values["at_v"], seen.values["hold_s"])
        origin = seen if quoted else row
        status = "own" if scaled and quoted else origin.status
        swells.append(
            (100 * volts / base, seconds, f"our reference set: hold times of {origin.source}{scaled}", status)
        )
    return tuple(swells)


def resolve_case(form: CaseForm, supply: Supply, ledger: Ledger, warnings: list[str]) -> UserCase:
    """A user's case with phasors; magnitudes stay as given."""
    course = "; ".join(f"{printed(s.l_n_v)} V {s.duration_s:g} s" for s in form.segment)
    ledger.given(f"case.{form.name}", form.expect, "", f"{course}; {form.source}")
    segments = tuple(
        UserSegment(s.duration_s, _phasors(s, supply, form.name, ledger.tables, warnings)) for s in form.segment
    )
    return UserCase(form.name, form.expect, form.source, segments)


def _phasors(
    segment: SegmentForm, supply: Supply, name: str, tables: Tables, warnings: list[str]
) -> tuple[complex, ...]:
    if segment.angle_deg is not None:
        angles = [math.radians(a) for a in segment.angle_deg]
        return tuple(cmath.rect(v, a) for v, a in zip(segment.l_n_v, angles, strict=True))
    moved = moved_neutral(segment.l_n_v, supply.geometry)
    span = [limit * supply.nominal_v for limit in tables.row("own-case-level-range").value]
    if moved is not None and span[0] <= moved[0] <= span[1]:
        return moved[1]
    if max(segment.l_n_v) - min(segment.l_n_v) > tables.row("own-case-uneven").value / 100 * supply.nominal_v:
        warnings.append(
            f"Case {name}: {', '.join(f'{v:g}' for v in segment.l_n_v)} V do not fit a moved neutral behind sound "
            "line-to-line volts; the angles of the source are taken. Give angle_deg."
        )
    return tuple(cmath.rect(v, math.radians(a)) for v, a in zip(segment.l_n_v, supply.geometry.angles_deg, strict=True))


def moved_neutral(l_n_v: list[float], geometry: Geometry) -> tuple[float, tuple[complex, ...]] | None:
    """Line-to-neutral phasors of those magnitudes behind a balanced source whose neutral has moved.

    Returns the source's own line-to-neutral volts and the phasors, or None where no balanced source gives them.
    Source: own algebra; mean of the squares is EMF^2 + shift^2, differences of the squares give the shift. The legs of
    one winding share the volts between them where the neutral has moved along the line from one to the other, as it
    does with loads of one angle. Two lines of a star leave the source and the shift open: None.
    """
    units = [complex(u) for u in geometry.phasors]
    if not geometry.has_displacement:
        return None
    if not geometry.has_sequences:
        emf = sum(l_n_v) / len(units)
        return emf, tuple(v * u for v, u in zip(l_n_v, units, strict=True))
    mean = sum(v * v for v in l_n_v) / len(units)
    reach = sum(u * (mean - v * v) for u, v in zip(units, l_n_v, strict=True)) / len(units)
    root = mean * mean - 4 * abs(reach) ** 2
    if root < 0 or mean == 0:
        return None
    emf = math.sqrt((mean + math.sqrt(root)) / 2)
    shift = reach / emf
    return emf, tuple(emf * u - shift for u in units)
