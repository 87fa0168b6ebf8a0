"""Reads a site with its loads and device, and resolves it into the frozen model."""

import datetime
import hashlib
import json
import sys
from dataclasses import replace
from pathlib import Path
from typing import Any

from relaycfg.errors import InputError, Problem
from relaycfg.files.cross_checks import cross_check, star_voltage
from relaycfg.files.device import read_device
from relaycfg.files.device_form import DeviceForm
from relaycfg.files.draft import Draft, Entry, PlacedLoad, draft_site, placed_loads
from relaycfg.files.ledger import Ledger
from relaycfg.files.limits import CONNECTED_TIMES
from relaycfg.files.relay_form import EquipmentForm, MustHoldForm, RelayForm
from relaycfg.files.resolve_boards import resolve_board, resolve_touch
from relaycfg.files.resolve_cases import resolve_case, resolve_faults, resolve_reference
from relaycfg.files.resolve_judgement import resolve_judgement
from relaycfg.files.resolve_loads import LoadResolver, resolve_motors
from relaycfg.files.resolve_relay import resolve_equipment, resolve_relay
from relaycfg.files.resolve_supply import resolve_source, resolve_supply
from relaycfg.files.site_form import DocumentForm, PersonForm
from relaycfg.files.tables import Tables
from relaycfg.files.text import TomlFile, decode, read_bytes
from relaycfg.model.site import SOURCE, Document, Equipment, Load, Motor, Person, Site, Supply


def read_site(path: Path | None, *, text: str | None = None, need_relay: bool = False) -> Site:
    """The site of a file, or of ``text`` (standard input; paths in it then start from the current folder).

    Raises InputError with all problems of site, loads file and device file. ``need_relay``: a missing [[relay]] is
    one of them.
    """
    shown = str(path) if path is not None else "standard input"
    if text is None:
        assert path is not None
        advice = "give the path of a site file, or begin one with: relaycfg new DIR"
        text = decode(read_bytes(path, shown, advice), shown)
    else:
        text = decode(text.encode("utf-8", errors="surrogatepass"), shown)
    file = TomlFile.parse(shown, text)
    draft = draft_site(file, path.parent if path is not None else Path())
    loads = placed_loads(draft)
    tables = Tables()
    cross_check(draft, loads, tables, need_relay)
    devices = [_device(draft, relay) for relay in draft.relays]
    if draft.problems:
        raise InputError(_ordered(draft.problems, shown))
    site = _resolve(draft, loads, [device for device in devices if device is not None], tables)
    if draft.problems:
        raise InputError(_ordered(draft.problems, shown))
    own = () if path is None else (str(path),)
    return replace(site, files=(*own, *_named(draft)))


def _device(draft: Draft, relay: Entry[RelayForm]) -> tuple[TomlFile, DeviceForm] | None:
    """The device file of one relay; what is wrong with naming it is a problem of the site."""
    key = (*relay.loc, "device")
    return read_device(
        draft.folder, relay.form.device, draft.problems, lambda given, remedy: draft.problem(key, given, remedy)
    )


def _named(draft: Draft) -> tuple[str, ...]:
    """The loads and device files that the site names."""
    loads = [draft.loads_file.file] if draft.loads_file is not None else []
    return tuple(str(draft.folder / name) for name in (*loads, *(r.form.device for r in draft.relays)))


def _ordered(problems: list[Problem], first_file: str) -> list[Problem]:
    """Problems by file, the site first, then by line; each once."""
    unique = list(dict.fromkeys(problems))
    return sorted(unique, key=lambda p: (p.file != first_file, p.file, p.line or sys.maxsize, p.column or 0))


def _resolve(draft: Draft, loads: list[PlacedLoad], devices: list[tuple[TomlFile, DeviceForm]], tables: Tables) -> Site:
    assert draft.supply is not None
    ledger = Ledger(tables)
    warnings: list[str] = []
    supply = resolve_supply(draft.supply, ledger)
    source = resolve_source(draft.sources[0].form, supply, ledger)
    boards = tuple(resolve_board(e.form, supply.frequency_hz, ledger) for e in draft.boards)
    touch = resolve_touch([e.form for e in draft.boards], ledger)
    resolved_loads = LoadResolver(supply, ledger, loads).loads
    motors = resolve_motors(draft.motors, supply, ledger)
    faults = resolve_faults(draft, boards, supply, ledger)
    relays = tuple(
        resolve_relay(entry.form, device, supply, ledger, warnings)
        for entry, (_, device) in zip(draft.relays, devices, strict=True)
    )
    equipment = resolve_equipment(draft.equipment or EquipmentForm(), supply.nominal_v, ledger, warnings)
    reference = resolve_reference(draft.must_hold or MustHoldForm(), supply, ledger)
    cases = tuple(resolve_case(e.form, supply, ledger, warnings) for e in draft.cases)
    inputs, stray = ledger.tagged((e.loc, e.form) for e in draft.evidence)
    for loc, given, remedy in stray:
        draft.add((*loc, "of"), f"{given}, no given input", remedy)
    warnings.extend(_warnings(draft, supply))
    warnings.extend(_low_side(resolved_loads, equipment))
    warnings.extend(_amounts(draft, loads, resolved_loads, motors))
    if not _unbalances(resolved_loads, motors, supply):
        warnings.append("Loads: the load list models no unbalance: nothing about a lost neutral is proved.")
    return Site(
        document=_document(draft.document or DocumentForm()),
        supply=supply,
        source=source,
        boards=boards,
        loads=resolved_loads,
        motors=motors,
        faults=faults,
        relay=relays[0] if relays else None,
        relays=relays,
        equipment=equipment,
        reference=reference,
        user_cases=cases,
        inputs=tuple(inputs),
        warnings=tuple(warnings),
        judgement=resolve_judgement(tables),
        touch=touch,
        digest=_digest(draft, loads, [dict(file.data) for file, _ in devices], tables),
    )


def _document(form: DocumentForm) -> Document:
    def person(p: PersonForm) -> Person:
        return Person(p.name, p.role)

    return Document(
        title=form.title, number=form.number, revision=form.revision, status=form.status,
        date=form.date.isoformat() if form.date else "", site=form.site, paper=form.paper,
        fault_contact=form.fault_contact, prepared=person(form.prepared), checked=person(form.checked),
        approved=person(form.approved), accepted=person(form.accepted),
    )  # fmt: skip


def _warnings(draft: Draft, supply: Supply) -> list[str]:
    """What is computed as written but deserves a look."""
    found = _between_legs(supply)
    if "95 percent" in supply.band_name:
        found.append(
            f"Supply: {supply.band_name} holds for 95 percent of the ten-minute means of a week, not for ever; a sound "
            "supply may leave it. The band of all means is the one to ride through."
        )
    earthing = draft.supply.earthing if draft.supply else ""
    for entry in draft.boards:
        cable = entry.form.cable
        has_pe = cable is not None and (cable.pe_mm2 is not None or cable.pe_ohm is not None)
        name = entry.form.name
        if entry.form.neutral_earth_link and has_pe:
            found.append(
                f"Board {name}: its N-PE link and the PE in its cable are a second bond; the PE carries current."
            )
        if entry.form.neutral_earth_link and earthing == "TN-S":
            found.append(f"Board {name}: an N-PE link in a TN-S system joins N and PE a second time.")
        if earthing == "TT" and has_pe and entry.form.fed_from == SOURCE:
            found.append(f"Board {name}: its cable carries the PE of the source, so the system is not TT.")
    if earthing == "TT" and not any(e.form.electrode_ohm or e.form.electrode for e in draft.boards):
        found.append("TT system without an electrode at any board: metalwork has no path to earth in the model.")
    for relay in draft.relays:
        trips, name = relay.form.trips or relay.form.measures_at, relay.form.measures_at
        feeder = {e.form.name: e.form.fed_from for e in draft.boards}
        chain = {name}
        while name in feeder:
            name = feeder[name]
            chain.add(name)
        if trips not in chain:
            at = relay.form.measures_at
            found.append(f"Relay {relay.form.name}: it measures at {at}, which {trips} does not feed.")
    return found


def _between_legs(supply: Supply) -> list[str]:
    """A split-phase supply whose nominal volts would be the usual ones between its legs."""
    geometry, tables = supply.geometry, Tables()
    leg_v = star_voltage(supply.nominal_v / geometry.line_to_line_ratio, tables)
    if geometry.of_star or leg_v is None:
        return []
    between_v = supply.nominal_v * geometry.line_to_line_ratio
    return [
        f"Supply: {supply.nominal_v:g} V from line to neutral is {between_v:g} V between the legs; if "
        f"{supply.nominal_v:g} V is read between them, nominal_v is {leg_v:g}."
    ]


def _low_side(loads: tuple[Load, ...], equipment: Equipment) -> list[str]:
    """Loads that mind low volts and the volts they mind have an effect only together."""
    minding = [load.name for load in loads if load.minds_low_v]
    if minding and equipment.sustained_low_v is None:
        return [f"Load {minding[0]}: minds_low_v has no effect without [equipment] sustained_low_v."]
    if not minding and equipment.sustained_low_v is not None:
        return ["Equipment: sustained_low_v has no effect, for no load states minds_low_v."]
    return []


def _amounts(draft: Draft, placed: list[PlacedLoad], loads: tuple[Load, ...], motors: tuple[Motor, ...]) -> list[str]:
    """Loads that the source could not carry by far: most often watts given for kilowatts."""
    rating = draft.sources[0].form.rating_kva
    if rating is None:
        return []
    found = []
    taken = sum(complex(load.p_w, load.q_var) for load in loads if load.p_w > 0) + sum(m.running_va for m in motors)
    times = abs(taken) / 1000 / rating
    if times > CONNECTED_TIMES:
        found.append(f"Loads: the connected load is {times:.3g} times the rating of the source; kW written as W?")
    single = [
        (load.name, abs(complex(load.p_w, load.q_var)) / p.form.count) for load, p in zip(loads, placed, strict=True)
    ]
    single += [(motor.name, abs(motor.running_va)) for motor in motors]
    above = [(name, va / 1000) for name, va in single if va / 1000 > rating]
    if above:
        name, kva = above[0]
        others = f" So are {len(above) - 1} more." if len(above) > 2 else " So is one more." if len(above) == 2 else ""
        found.append(
            f"Load {name}: its {kva:.4g} kVA is above the {rating:g} kVA of the source; kW written as W?{others}"
        )
    return found


def _unbalances(loads: tuple[Load, ...], motors: tuple[Motor, ...], supply: Supply) -> bool:
    """Whether anything that is ever on lies between the neutral and some, not all, of the lines."""
    takers: tuple[Load | Motor, ...] = (*loads, *motors)
    every = len(supply.geometry.names)
    return any(x.to_neutral and len(x.lines) < every and x.usage > 0 for x in takers)


def _digest(draft: Draft, loads: list[PlacedLoad], devices: list[dict[str, Any]], tables: Tables) -> str:
    """sha256 over parsed content, so that line ends, comments and platforms do not matter; [document] is left out."""
    content: dict[str, Any] = {
        "site": {name: table for name, table in draft.file.data.items() if name != "document"},
        "loads": [{**p.form.model_dump(), "name": p.name, "evidence": p.evidence} for p in loads],
        "device": devices[0] if devices else None,
        "tables": {row_id: dict(tables.used[row_id].content) for row_id in sorted(tables.used)},
    }
    if len(devices) > 1:
        content["further_devices"] = devices[1:]
    return "sha256:" + hashlib.sha256(json.dumps(content, sort_keys=True, default=_plain).encode()).hexdigest()


def _plain(value: Any) -> str:
    if isinstance(value, (datetime.date, datetime.time)):
        return value.isoformat()
    raise TypeError(type(value).__name__)
