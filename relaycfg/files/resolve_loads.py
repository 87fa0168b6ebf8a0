"""Loads and motors in watts and vars at their own nominal voltage."""

import math
from collections.abc import Callable, Iterable
from typing import Any, cast

from relaycfg.files.draft import Entry, PlacedLoad
from relaycfg.files.ledger import Ledger, printed
from relaycfg.files.load_form import LoadForm, MotorForm
from relaycfg.files.tables import Row
from relaycfg.model.geometry import Geometry
from relaycfg.model.site import Load, Motor, Supply, Tag

Three = tuple[float, float, float]
LIMITS = ("cutout_pu", "restart_s", "damage_pu")
"""Keys of a load, and of a row of its kind, that say what its volts do to it."""
STALLING = ("air conditioner", "refrigerator", "heat-pump water heater")
"""Kinds with a single-phase compressor inside, by the meaning of their names."""


def lines_of(between: str, geometry: Geometry) -> tuple[tuple[int, ...], bool]:
    """Line indices of a text such as L2-N or L1-L2-L3, and whether the neutral takes part."""
    parts = between.split("-")
    return tuple(geometry.names.index(p) for p in parts if p != "N"), "N" in parts


def own_voltage(lines: tuple[int, ...], to_neutral: bool, supply: Supply) -> float:
    """Nominal voltage of a load [V]: line to neutral for a star or one line, else between its lines."""
    if to_neutral or lines not in supply.geometry.pairs:
        return supply.nominal_v
    return supply.nominal_v * supply.geometry.line_to_line_ratio


class LoadResolver:
    """Turns load forms into loads and notes which of them leave what to a default."""

    def __init__(self, supply: Supply, ledger: Ledger, loads: list[PlacedLoad]) -> None:
        self.supply, self.ledger = supply, ledger
        self.omitted: dict[str, list[str]] = {}
        self.kinds: dict[str, Row] = {}
        self.of_kind: dict[tuple[str, str], Row] = {}
        self.group_usage = {p.form.group: p.form.usage for p in loads if p.form.group and p.form.usage is not None}
        self.loads = tuple(self._load(placed) for placed in loads)
        self._enter_kinds()
        self._enter_defaults()

    def _default(self, key: str, name: str, row_id: str) -> float:
        self.omitted.setdefault(f"{key} {row_id}", []).append(name)
        return float(self.ledger.tables.row(row_id).value)

    def _load(self, placed: PlacedLoad) -> Load:
        form, name = placed.form, placed.name
        lines, to_neutral = lines_of(form.between, self.supply.geometry)
        kind = self._kind(form, name)
        power, reading = self._power(form, name, lines, to_neutral, kind)
        usage = form.usage if form.usage is not None else self.group_usage.get(form.group)
        if usage is None:
            usage = self._default("usage", name, "default-load-usage")
        demand = form.demand if form.demand is not None else self._default("demand", name, "default-load-demand")
        third = form.third_harmonic_percent
        if third is None and form.ohm is not None:
            third = 0.0
        elif third is None:
            third = self._default("third_harmonic_percent", name, "default-load-third-harmonic")
        zip_p, zip_q, band = self._law(form, kind)
        kind_name = "zip" if kind is None and form.ohm is None else kind.name if kind else "constant impedance"
        key, value, unit = reading
        words = [f"{form.between} at {form.board}", kind_name, f"usage {usage:g}", f"demand {demand:g}"]
        words += [f"pf {form.pf:g} {form.reactive}"] if form.pf is not None else []
        words += [f"zip_p {printed(form.zip_p)}"] if form.zip_p is not None else []
        words += [f"zip_q {printed(form.zip_q)}"] if form.zip_q is not None else []
        words += [f"band {printed(form.band_pu)} pu"] if form.band_pu is not None else []
        words += [f"third harmonic {third:g} %"] if form.third_harmonic_percent is not None else []
        words += ["minds low volts"] if form.minds_low_v else []
        words += [f"{n.partition('_')[0]} {v:g} {n.partition('_')[2]}" for n in LIMITS if (v := getattr(form, n))]
        words += [f"{form.count} alike"] if form.count > 1 else []
        words += [f"group {form.group}"] if form.group else []
        tag = cast(Tag, placed.evidence or "assumed")
        self.ledger.given(f"load.{name}.{key}", value, unit, ", ".join(words), tag)
        return Load(
            name=name, board=form.board, between=form.between, lines=lines, to_neutral=to_neutral,
            p_w=power.real * form.count, q_var=power.imag * form.count, zip_p=zip_p, zip_q=zip_q,
            band_low_pu=band[0], band_high_pu=band[1], usage=usage, demand=demand, group=form.group,
            minds_low_v=form.minds_low_v, third_harmonic_percent=third, kind=kind_name,
            **self._limits(form, kind), **self._stall(kind, len(lines), abs(power) * form.count),
        )  # fmt: skip

    def _limits(self, form: LoadForm, kind: Row | None) -> dict[str, Any]:
        """Cut-out, restart and damage: the user's, else of the kind, else none."""
        found = {}
        for limit in LIMITS:
            found[limit] = getattr(form, limit)
            if found[limit] is None and kind is not None and limit in kind.content:
                found[limit] = float(kind.content[limit])
                self.of_kind[limit, kind.id] = kind
        return found

    def _stall(self, kind: Row | None, lines: int, rated_va: float) -> dict[str, Any]:
        """Single-phase loads of the kinds that stall: below which volts, and what they then take of their rating."""
        tables = self.ledger.tables
        if kind is None or lines > 2 or rated_va == 0 or kind.name not in STALLING:
            return {}
        ratios = tables.row("stall-after").values
        stalled = rated_va * complex(ratios["p_ratio"], ratios["q_ratio"])
        row = tables.row("stall")
        self.of_kind["stall", kind.id] = kind
        return {"stall_pu": float(row.values["usual_pu"]), "stalled_va": stalled}

    def _kind(self, form: LoadForm, name: str) -> Row | None:
        """The table row of the load's kind; None where it brings its own law."""
        if form.ohm is not None or form.zip_p is not None:
            return None
        tables = self.ledger.tables
        if form.kind is not None:
            row = tables.named("load-kinds", form.kind)
            assert row is not None
            self.kinds[row.id] = row
            return row
        self.omitted.setdefault("kind default-load-kind", []).append(name)
        return tables.named("load-kinds", tables.row("default-load-kind").value)

    def _power(
        self, form: LoadForm, name: str, lines: tuple[int, ...], to_neutral: bool, kind: Row | None
    ) -> tuple[complex, tuple[str, object, str]]:
        """P + jQ of one [VA], and the reading it was given by."""
        phases = 1 if lines in self.supply.geometry.pairs else len(lines)
        volts = own_voltage(lines, to_neutral, self.supply)
        if form.ohm is not None:
            ohm = complex(*form.ohm)
            return phases * volts**2 / ohm.conjugate(), ("ohm", ohm, "ohm")
        if form.pf is not None:
            pf = form.pf
        elif kind is not None and "pf" in kind.values:
            pf = float(kind.values["pf"])
            self.omitted.setdefault(f"pf {kind.id}", []).append(name)
        else:
            pf = self._default("pf", name, "default-load-pf")
        tangent = math.tan(math.acos(pf)) * (1 if form.reactive == "lagging" else -1)
        if form.kw is not None:
            return complex(form.kw, form.kw * tangent) * 1000, ("kw", form.kw, "kW")
        watts = phases * volts * (form.current_a or 0.0) * pf
        return complex(watts, watts * tangent), ("current_a", form.current_a, "A")

    def _law(self, form: LoadForm, kind: Row | None) -> tuple[Three, Three, tuple[float, float]]:
        tables = self.ledger.tables
        if kind is not None:
            zip_p, zip_q, band = kind.values["zip_p"], kind.values["zip_q"], kind.content["band_pu"]
        else:
            zip_p = form.zip_p or [1.0, 0.0, 0.0]
            zip_q, band = form.zip_q or zip_p, tables.row("default-load-band").value
        band = form.band_pu or band
        return _to_one(zip_p), _to_one(form.zip_q or zip_q), (float(band[0]), float(band[1]))

    def _enter_kinds(self) -> None:
        """What stands behind each kind that a load names: its coefficients have a source, the name has none."""
        for row in self.kinds.values():
            value = printed(_to_one(row.values["zip_p"]))
            self.ledger.given(f"load.*.zip_p of {row.name}", value, "", row.source, status=row.status)
        for (key, _), row in self.of_kind.items():
            behind = self.ledger.tables.row("stall") if key == "stall" else row
            value, unit = behind.values["usual_pu"] if key == "stall" else row.content[key], key.rpartition("_")[2]
            field = f"load.*.{key} of {row.name}"
            self.ledger.given(field, value, "pu" if key == "stall" else unit, behind.source, status=behind.status)

    def _enter_defaults(self) -> None:
        for key_row, owners in self.omitted.items():
            key, _, row_id = key_row.partition(" ")
            row = self.ledger.tables.row(row_id)
            value = row.values["pf"] if row.family == "load-kinds" else row.value
            unit = "%" if key.endswith("percent") else ""
            of_kind = f" of {row.name}" if row.family == "load-kinds" else ""
            note = f"{row.source}: {row.content['note']}" if key == "third_harmonic_percent" else row.source
            self.ledger.shared_default(f"load.*.{key}{of_kind}", value, unit, owners, note, row.status)


def _to_one(shares: Iterable[float]) -> Three:
    """Shares of Z, I, P rescaled to the sum 1."""
    z, i, p = shares
    return z / (z + i + p), i / (z + i + p), p / (z + i + p)


def resolve_motors(entries: list[Entry[MotorForm]], supply: Supply, ledger: Ledger) -> tuple[Motor, ...]:
    """Motors as running and starting apparent power; several alike become several motors."""
    motors: list[Motor] = []
    for number, entry in enumerate(entries, 1):
        form = entry.form
        name = form.name or f"motor {number}"
        at = f"motor.{name}."
        ledger.given(at + "shaft_kw", form.shaft_kw, "kW", note=f"{form.between} at {form.board}")
        pick: Callable[..., float] = ledger.pick
        pf = pick(at + "pf", form.pf, "default-motor-pf")
        efficiency = pick(at + "efficiency", form.efficiency, "default-motor-efficiency")
        usage = pick(at + "usage", form.usage, "default-motor-usage")
        ratio = pick(at + "start.current_ratio", form.start.current_ratio, "locked-rotor-ratio")
        start_pf = pick(at + "start.pf", form.start.pf, "default-motor-start-pf")
        seconds = form.start.duration_s
        if seconds is None:
            row = ledger.tables.row("start-time-light")
            seconds = (row.values["low_s"] + row.values["high_s"]) / 2
            ledger.default(at + "start.duration_s", seconds, "s", f"middle of {row.source}", row.status)
        else:
            ledger.given(at + "start.duration_s", seconds, "s")
        watts = form.shaft_kw * 1000 / efficiency
        running = complex(watts, watts * math.tan(math.acos(pf)))
        starting = abs(running) * ratio * complex(start_pf, math.sin(math.acos(start_pf)))
        lines, to_neutral = lines_of(form.between, supply.geometry)
        stall_pu = float(ledger.tables.row("stall").values["usual_pu"]) if len(lines) < 3 else None
        shaft_w = form.shaft_kw * 1000
        names = [name] if form.count == 1 else [f"{name} {i}" for i in range(1, form.count + 1)]
        motors.extend(
            Motor(n, form.board, form.between, lines, to_neutral, shaft_w, running, starting, seconds, usage, stall_pu)
            for n in names
        )
    return tuple(motors)
