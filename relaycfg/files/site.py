"""Reads a site with its loads and device, and resolves it into the frozen model."""

import datetime
import hashlib
import json
import sys
from pathlib import Path
from typing import Any

from relaycfg.errors import InputError, Problem
from relaycfg.files.cross_checks import cross_check
from relaycfg.files.device import read_device
from relaycfg.files.device_form import DeviceForm
from relaycfg.files.draft import Draft, PlacedLoad, draft_site, placed_loads
from relaycfg.files.ledger import Ledger
from relaycfg.files.relay_form import EquipmentForm, MustHoldForm
from relaycfg.files.resolve_boards import resolve_board
from relaycfg.files.resolve_cases import resolve_case, resolve_faults, resolve_reference
from relaycfg.files.resolve_loads import LoadResolver, resolve_motors
from relaycfg.files.resolve_relay import resolve_equipment, resolve_relay
from relaycfg.files.resolve_supply import resolve_source, resolve_supply
from relaycfg.files.site_form import DocumentForm, PersonForm
from relaycfg.files.tables import Tables
from relaycfg.files.text import TomlFile, decode, read_bytes
from relaycfg.model.site import SOURCE, Document, Person, Site


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
    device = None
    if draft.relays:
        device = read_device(draft.folder / draft.relays[0].form.device, draft.problems)
    if draft.problems:
        raise InputError(_ordered(draft.problems, shown))
    site = _resolve(draft, loads, device, tables)
    if draft.problems:
        raise InputError(_ordered(draft.problems, shown))
    return site


def _ordered(problems: list[Problem], first_file: str) -> list[Problem]:
    """Problems by file, the site first, then by line; each once."""
    unique = list(dict.fromkeys(problems))
    return sorted(unique, key=lambda p: (p.file != first_file, p.file, p.line or sys.maxsize, p.column or 0))


def _resolve(draft: Draft, loads: list[PlacedLoad], device: tuple[TomlFile, DeviceForm] | None, tables: Tables) -> Site:
    assert draft.supply is not None
    ledger = Ledger(tables)
    warnings: list[str] = []
    supply = resolve_supply(draft.supply, ledger)
    source = resolve_source(draft.sources[0].form, supply, ledger)
    boards = tuple(resolve_board(e.form, supply.frequency_hz, ledger) for e in draft.boards)
    resolved_loads = LoadResolver(supply, ledger, loads).loads
    motors = resolve_motors(draft.motors, supply, ledger)
    faults = resolve_faults(draft, boards, supply, ledger)
    relay = None
    if device is not None:
        relay = resolve_relay(draft.relays[0].form, device[1], ledger)
    equipment = resolve_equipment(draft.equipment or EquipmentForm(), supply.nominal_v, ledger, warnings)
    reference = resolve_reference(draft.must_hold or MustHoldForm(), supply.frequency_hz, ledger)
    cases = tuple(resolve_case(e.form, supply, ledger, warnings) for e in draft.cases)
    inputs, stray = ledger.tagged((e.loc, e.form) for e in draft.evidence)
    for loc, given, remedy in stray:
        draft.add((*loc, "of"), f"{given}, no given input", remedy)
    warnings.extend(_warnings(draft))
    return Site(
        document=_document(draft.document or DocumentForm()),
        supply=supply,
        source=source,
        boards=boards,
        loads=resolved_loads,
        motors=motors,
        faults=faults,
        relay=relay,
        equipment=equipment,
        reference=reference,
        user_cases=cases,
        inputs=tuple(inputs),
        warnings=tuple(warnings),
        digest=_digest(draft, loads, device[0] if device else None, tables),
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


def _warnings(draft: Draft) -> list[str]:
    """What is computed as written but deserves a look."""
    found = []
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
    if earthing == "TT" and not any(e.form.electrode_ohm for e in draft.boards):
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


def _digest(draft: Draft, loads: list[PlacedLoad], device: TomlFile | None, tables: Tables) -> str:
    """sha256 over parsed content, so that line ends, comments and platforms do not matter; [document] is left out."""
    content: dict[str, Any] = {
        "site": {name: table for name, table in draft.file.data.items() if name != "document"},
        "loads": [{**p.form.model_dump(), "name": p.name, "evidence": p.evidence} for p in loads],
        "device": device.data if device is not None else None,
        "tables": {row_id: dict(tables.used[row_id].content) for row_id in sorted(tables.used)},
    }
    return "sha256:" + hashlib.sha256(json.dumps(content, sort_keys=True, default=_plain).encode()).hexdigest()


def _plain(value: Any) -> str:
    if isinstance(value, (datetime.date, datetime.time)):
        return value.isoformat()
    raise TypeError(type(value).__name__)
