"""The relay with its feeds and times, and what connected equipment stands."""

from relaycfg.files.device import resolve_device
from relaycfg.files.device_form import DeviceForm
from relaycfg.files.ledger import Ledger
from relaycfg.files.relay_form import EquipmentForm, FeedForm, RelayForm
from relaycfg.files.tables import Row, Tables
from relaycfg.model.site import EarthReference, Equipment, Feed, Relay, Supply

Steps = tuple[tuple[float, float], ...]
SMALL_NOMINAL_V = 150.0
"""Above it a supply is none of the 120 V kind that some curves are made for."""


def resolve_relay(form: RelayForm, device: DeviceForm, supply: Supply, ledger: Ledger, warnings: list[str]) -> Relay:
    """The relay; feeds without a range are not judged."""
    at = f"relay.{form.name}."
    ledger.given(at + "measures_at", form.measures_at)
    if form.trips is None:
        ledger.default(at + "trips", form.measures_at, "", "taken as measures_at", "own")
    else:
        ledger.given(at + "trips", form.trips)
    return Relay(
        name=form.name,
        measures_at=form.measures_at,
        trips=form.trips or form.measures_at,
        poles=ledger.pick(at + "poles", form.poles, "default-relay-poles"),
        device=resolve_device(device, supply, at + "device.", ledger, warnings),
        supply=_feed(form.supply, at + "supply.", ledger),
        trip_coil_kind=ledger.pick(at + "trip_coil.kind", form.trip_coil.kind, "default-relay-trip-coil"),
        trip_coil=_feed(form.trip_coil, at + "trip_coil.", ledger),
        output_s=ledger.pick(at + "output_s", form.output_s, "default-relay-output", "s"),
        coil_and_breaker_s=ledger.pick(
            at + "coil_and_breaker_s", form.coil_and_breaker_s, "default-relay-breaker", "s"
        ),
        dead_bus_pu=ledger.tables.row("own-dead-bus").value,
        earth_reference=_earth_reference(form, device, at, ledger, warnings),
    )


def _earth_reference(
    form: RelayForm, device: DeviceForm, at: str, ledger: Ledger, warnings: list[str]
) -> EarthReference:
    """The earth N is measured against; a device that forms displacement from its lines has no use for one."""
    row = "default-relay-earth-reference"
    if device.displacement_from == "n-to-earth":
        chosen: EarthReference = ledger.pick(at + "earth_reference", form.earth_reference, row)
        return chosen
    if form.earth_reference is not None:
        warnings.append(
            f"Relay {form.name}: earth_reference has no effect, its device takes displacement from the lines."
        )
    return "local PE"


def _feed(form: FeedForm, at: str, ledger: Ledger) -> Feed:
    between = ledger.pick(at + "from", form.from_, "default-relay-feed")
    if form.range_v is None:
        return Feed(between, None, None)
    ledger.given(at + "range_v", form.range_v, "V")
    return Feed(between, form.range_v[0], form.range_v[1])


def resolve_equipment(form: EquipmentForm, nominal_v: float, ledger: Ledger, warnings: list[str]) -> Equipment:
    """The withstand steps in volts, line to neutral."""
    at = "equipment."
    if form.points is not None:
        high: Steps = tuple((v, s) for v, s in form.points)
        ledger.given(at + "points", form.points, "V, s")
        name, source, status, sustained = "own steps", "user", "user", high[0][0]
    else:
        row = _curve(form, ledger.tables)
        scale = _scale(row, nominal_v, ledger.tables)
        high, sustained = _in_volts(row, nominal_v, scale)
        name, source, status = row.name, row.source, row.status
        if scale != 1:
            base = ledger.tables.row("default-equipment-nominal").value
            source, status = f"{source}, scaled by U0/{base:g}", "memory" if status == "memory" else "own"
            warnings.append(
                f"Equipment: the {row.name} is given for {base:g} V; its volts are scaled to {nominal_v:g} V, "
                "which no source states. Give [equipment] points of your own."
            )
        if row.family == "withstand-curves" and "120 V" in row.name and nominal_v > SMALL_NOMINAL_V:
            warnings.append(
                f'Equipment: the curve "{row.name}" says what works through on 120 V; at {nominal_v:g} V it is no '
                "limit of damage. Give [equipment] points of your own."
            )
        if form.overvoltage is not None:
            ledger.given(at + "overvoltage", name, note=source, status=status)
        else:
            ledger.default(at + "overvoltage", name, "", source, status)
        if scale != 1:
            ledger.default(at + "scale", scale, "", f"volts of {name} scaled by U0/{base:g}", "own")
    if form.sustained_high_v is not None:
        ledger.given(at + "sustained_high_v", form.sustained_high_v, "V")
    else:
        note = "taken as the first point" if status == "user" else f"of {name}: {source}"
        ledger.default(at + "sustained_high_v", sustained, "V", note, "own" if status == "user" else status)
    if form.sustained_high_s is not None:
        ledger.given(at + "sustained_high_s", form.sustained_high_s, "s")
    else:
        known = "own" if status == "user" else status
        ledger.default(at + "sustained_high_s", high[0][1], "s", "taken as that of the first point", known)
    low: Steps = tuple((v, s) for v, s in form.points_low or ())
    if low:
        ledger.given(at + "points_low", form.points_low, "V, s")
    return Equipment(
        sustained_high_v=form.sustained_high_v if form.sustained_high_v is not None else sustained,
        sustained_high_s=form.sustained_high_s if form.sustained_high_s is not None else high[0][1],
        high_points=high,
        sustained_low_v=form.sustained_low_v,
        sustained_low_s=_low_seconds(form, low, ledger),
        low_points=low,
        name=name,
        source=source,
        status=status,
    )


def _curve(form: EquipmentForm, tables: Tables) -> Row:
    row = tables.named("withstand-curves", form.overvoltage or tables.row("default-equipment").value)
    assert row is not None
    return row


def _scale(row: Row, nominal_v: float, tables: Tables) -> float:
    """Factor for a curve in volts: 1 near the voltage it is made for, else nominal over that voltage."""
    low, high = tables.row("default-equipment-nominal-range").value
    if "sustained_percent" in row.content or low <= nominal_v <= high:
        return 1.0
    return float(nominal_v / tables.row("default-equipment-nominal").value)


def _in_volts(row: Row, nominal_v: float, scale: float) -> tuple[Steps, float]:
    """Points of a curve and its sustained level in volts, whether it is given in volts or in percent of nominal."""
    if "sustained_percent" in row.content:
        scale, sustained = nominal_v / 100, float(row.content["sustained_percent"])
    else:
        sustained = float(row.content["sustained_v"])
    steps = tuple(sorted((round(v * scale, 6), s) for v, s in row.points))
    return steps, round(sustained * scale, 6)


def _low_seconds(form: EquipmentForm, low: Steps, ledger: Ledger) -> float:
    if form.sustained_low_v is None:
        return 0.0
    ledger.given("equipment.sustained_low_v", form.sustained_low_v, "V")
    if form.sustained_low_s is not None:
        ledger.given("equipment.sustained_low_s", form.sustained_low_s, "s")
        return form.sustained_low_s
    if low:
        ledger.default("equipment.sustained_low_s", low[0][1], "s", "taken as that of the first low point", "own")
        return low[0][1]
    row = ledger.tables.row("iti-lower")
    percent, seconds = row.points[-1]
    ledger.default("equipment.sustained_low_s", seconds, "s", f"{percent:g} % of {row.source}, for 120 V", row.status)
    return seconds
