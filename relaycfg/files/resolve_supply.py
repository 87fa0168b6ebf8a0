"""Supply and source in volts and ohms at low voltage."""

import math

from relaycfg.files.cross_checks import vector_family
from relaycfg.files.ledger import Ledger
from relaycfg.files.resolve_electrode import electrode
from relaycfg.files.site_form import SourceForm, SupplyForm
from relaycfg.files.tables import Row, Tables, is_50_hz
from relaycfg.model.geometry import Geometry, geometry_of, split_phase
from relaycfg.model.site import Source, Supply


def resolve_supply(form: SupplyForm, ledger: Ledger) -> Supply:
    """The supply with its band in volts, line to neutral."""
    ledger.given("supply.system", form.system)
    ledger.given("supply.nominal_v", form.nominal_v, "V")
    ledger.given("supply.earthing", form.earthing)
    frequency = ledger.pick("supply.frequency_hz", form.frequency_hz, "default-supply-frequency", "Hz")
    geometry = _geometry(form, ledger)
    low, high, name, source, status = _band(form, frequency, ledger)
    return Supply(
        geometry=geometry,
        nominal_v=form.nominal_v,
        frequency_hz=frequency,
        earthing=form.earthing,
        low_v=form.nominal_v * (1 + low / 100),
        high_v=form.nominal_v * (1 + high / 100),
        band_name=name,
        band_source=source,
        band_status=status,
        band_at=ledger.pick("supply.band_at", form.band_at, "default-supply-band-at"),
        unbalance_percent=_unbalance(form, geometry, ledger),
        displacement_percent=ledger.pick(
            "supply.displacement_percent", form.displacement_percent, "default-supply-displacement", "%"
        ),
    )


def _geometry(form: SupplyForm, ledger: Ledger) -> Geometry:
    """The lines; the legs of one winding have no order that could be given."""
    if form.system == "1ph-3w":
        return split_phase()
    return geometry_of(form.system, ledger.pick("supply.phase_order", form.phase_order, "default-supply-phase-order"))


def _unbalance(form: SupplyForm, geometry: Geometry, ledger: Ledger) -> float:
    """V2/V1 of the network [%]; none behind one winding, whose legs differ by displacement alone."""
    if not geometry.of_star:
        return 0.0
    row = "en-50160-unbalance"
    return float(ledger.pick("supply.unbalance_percent", form.unbalance_percent, row, "%"))


def band_percent(row: Row) -> tuple[float, float]:
    """Lower and upper limit of a band in percent of its own nominal voltage."""
    values = row.values
    nominal = values["nominal_v"]
    low = values["low_percent"] if "low_percent" in values else 100 * (values["low_v"] / nominal - 1)
    high = values["high_percent"] if "high_percent" in values else 100 * (values["high_v"] / nominal - 1)
    return float(low), float(high)


def _band(form: SupplyForm, frequency: float, ledger: Ledger) -> tuple[float, float, str, str, str]:
    """Lower and upper limit in percent, name, source and status of the band."""
    if form.low_percent is not None and form.high_percent is not None:
        ledger.given("supply.low_percent", form.low_percent, "%")
        ledger.given("supply.high_percent", form.high_percent, "%")
        return form.low_percent, form.high_percent, f"{form.low_percent:g} to +{form.high_percent:g} %", "user", "user"
    if form.band is not None:
        row = ledger.tables.named("supply-bands", form.band)
        assert row is not None
        ledger.given("supply.band", form.band, note=row.source, status=row.status)
    else:
        slow = is_50_hz(frequency, ledger.tables)
        row = ledger.tables.row(ledger.tables.row("default-band-50-hz" if slow else "default-band-60-hz").value)
        ledger.default("supply.band", row.name, "", f"{row.source}; the choice is ours", row.status)
    return (*band_percent(row), form.band or row.name, row.source, row.status)


def resolve_source(form: SourceForm, supply: Supply, ledger: Ledger) -> Source:
    """The source as EMF behind impedance."""
    ledger.given("source." + form.name + ".kind", form.kind)
    at = f"source.{form.name}."
    if form.no_load_v is not None:
        ledger.given(at + "no_load_v", form.no_load_v, "V")
    else:
        ledger.default(at + "no_load_v", supply.nominal_v, "V", "taken as supply.nominal_v", "own")
    emf = form.no_load_v if form.no_load_v is not None else supply.nominal_v
    solve = {"transformer": _transformer, "generator": _generator, "impedance": _plain}[form.kind]
    line, neutral = solve(form, emf, supply.geometry, at, ledger)
    steps, recovered = (0.0, 0.0, 0.0, "", ""), 0.0
    if form.kind == "generator":
        steps, recovered = _steps(form, at, ledger), float(ledger.tables.row("own-generator-recovered").value)
    return Source(
        name=form.name,
        kind=form.kind,
        emf_v=emf,
        line_ohm=line,
        neutral_ohm=neutral,
        star_link_ohm=ledger.pick(at + "star_link_ohm", form.star_link_ohm, "default-source-star-link", "ohm"),
        electrode_ohm=_electrode(form, at, ledger),
        earth_at=ledger.pick(at + "earth_at", form.earth_at, "default-source-earth-at"),
        step_dip_percent=steps[0],
        step_rise_percent=steps[1],
        step_recovery_s=steps[2],
        step_recovered_percent=recovered,
        step_source=steps[3],
        step_status=steps[4],
    )


def _electrode(form: SourceForm, at: str, ledger: Ledger) -> float | None:
    """Ohms of the source's electrode: as given, of its rods, or the default."""
    if form.electrode is None and form.electrode_ohm is None:
        return float(ledger.pick(at + "electrode_ohm", None, "default-source-electrode", "ohm"))
    return electrode(form.electrode_ohm, form.electrode, at, ledger)


def series_ohm(percent: float, rating_kva: float, base_v: float, x_over_r: float) -> complex:
    """Series impedance of each line of a transformer or machine [ohm] at its base volts.

    Source: Z = u U^2 / S with X/R, own arithmetic; U is the line-to-line voltage for three lines, 120 sqrt 2 V for
    the two legs of 120/240 V (half of the whole winding's impedance each). Valid for x_over_r above 0.
    """
    ohm = percent / 100 * base_v**2 / (rating_kva * 1000)
    resistance = ohm / math.hypot(1, x_over_r)
    return complex(resistance, resistance * x_over_r)


def zero_sequence(line: complex, family: str, tables: Tables) -> tuple[complex, str, str]:
    """Z0 [ohm] of a transformer by vector group (dyn, yzn, yyn) with source and status; ranges at their middle."""
    if family == "dyn":
        row = tables.row("zero-sequence-dyn")
        x_ratio = (row.values["x0_low_ratio"] + row.values["x0_high_ratio"]) / 2
        return complex(line.real * row.values["r0_ratio"], line.imag * x_ratio), row.source, row.status
    if family == "yzn":
        row, resistance = tables.row("zero-sequence-yzn"), tables.row("zero-sequence-yzn-r")
        return complex(line.real * resistance.value, line.imag * row.value), row.source, resistance.status
    row, resistance = tables.row("zero-sequence-yyn"), tables.row("default-zero-sequence-yyn-r")
    x_ratio = (row.values["x0_low_ratio"] + row.values["x0_high_ratio"]) / 2
    return complex(line.real * resistance.value, line.imag * x_ratio), row.source, row.status


def star_neutral_ohm(line: complex, zero: complex, geometry: Geometry) -> complex:
    """Impedance from the star of the EMFs to the star point [ohm], of the sequence impedances Z1 and Z0.

    Source: symmetrical components, Z0 = Z1 + n Z_N for n windings that share the neutral. Valid for two legs of one
    winding too (own algebra): Z0 is what both legs meet with equal currents into the neutral.
    """
    return (zero - line) / geometry.windings


def centre_tap_zero(line: complex, tables: Tables) -> tuple[complex, str, str]:
    """Z0 [ohm] of a centre-tapped winding, of the impedance of one leg, with source and status."""
    row = tables.row("zero-sequence-centre-tap")
    zero = complex(line.real * row.values["r0_ratio"], line.imag * row.values["x0_ratio"])
    return zero, row.source, row.status


def _transformer(form: SourceForm, emf: float, geometry: Geometry, at: str, ledger: Ledger) -> tuple[complex, complex]:
    assert form.rating_kva is not None
    tables = ledger.tables
    ledger.given(at + "rating_kva", form.rating_kva, "kVA")
    percent = form.impedance_percent
    if percent is None:
        row = tables.row("iec-60076-5-minimum")
        percent = next((p for kva, p in row.points if form.rating_kva <= kva), row.points[-1][1])
        ledger.default(at + "impedance_percent", percent, "%", row.source, row.status)
    else:
        ledger.given(at + "impedance_percent", percent, "%")
    x_over_r = form.x_over_r
    if x_over_r is None:
        row = tables.row("catalogue-range")
        kva = form.rating_kva
        near = min(row.points, key=lambda p: abs(math.log(p[0] / kva)))
        x_over_r = (near[3] + near[4]) / 2
        note = f"middle of the range at {near[0]:g} kVA, {row.source}"
        ledger.default(at + "x_over_r", x_over_r, "", note, row.status)
    else:
        ledger.given(at + "x_over_r", x_over_r)
    line = series_ohm(percent, form.rating_kva, emf * geometry.base_ratio, x_over_r)
    if form.zero_sequence_ratio is not None:
        if form.vector_group is not None:
            ledger.given(at + "vector_group", form.vector_group, note="zero_sequence_ratio goes first")
        ledger.given(at + "zero_sequence_ratio", form.zero_sequence_ratio)
        zero = line * form.zero_sequence_ratio
    elif not geometry.of_star:
        zero, source, status = centre_tap_zero(line, tables)
        ledger.default(at + "zero_sequence_ratio", abs(zero / line), "", source, status)
    else:
        group = ledger.pick(at + "vector_group", form.vector_group, "default-source-vector-group")
        zero, source, status = zero_sequence(line, vector_family(group) or "dyn", tables)
        ledger.default(at + "zero_sequence_ratio", abs(zero / line), "", f"{group}: {source}", status)
    return line, star_neutral_ohm(line, zero, geometry)


def _generator(form: SourceForm, emf: float, geometry: Geometry, at: str, ledger: Ledger) -> tuple[complex, complex]:
    assert form.rating_kva is not None
    ledger.given(at + "rating_kva", form.rating_kva, "kVA")
    percent = ledger.pick(at + "reactance_percent", form.reactance_percent, "default-generator-reactance", "%")
    ratio = ledger.pick(at + "x_over_r", form.x_over_r, "default-generator-x-over-r")
    reactance = percent / 100 * (emf * geometry.base_ratio) ** 2 / (form.rating_kva * 1000)
    return complex(reactance / ratio, reactance), _neutral(form, at, ledger)


def _plain(form: SourceForm, _emf: float, _geometry: Geometry, at: str, ledger: Ledger) -> tuple[complex, complex]:
    assert form.line_ohm is not None
    line = complex(*form.line_ohm)
    ledger.given(at + "line_ohm", line, "ohm")
    return line, _neutral(form, at, ledger)


def _neutral(form: SourceForm, at: str, ledger: Ledger) -> complex:
    if form.neutral_ohm is None:
        ledger.default(at + "neutral_ohm", 0j, "ohm", "taken as none: Z0 = Z1", "own")
        return 0j
    ledger.given(at + "neutral_ohm", complex(*form.neutral_ohm), "ohm")
    return complex(*form.neutral_ohm)


def _steps(form: SourceForm, at: str, ledger: Ledger) -> tuple[float, float, float, str, str]:
    """Dip, rise [%] and recovery [s] of a generating set on load steps, with their source and its status."""
    usual = ledger.tables.row("default-generator-class").value
    choice = f"generating set class {form.class_}" if form.class_ else usual
    row = ledger.tables.named("generator", choice)
    assert row is not None
    if form.class_:
        ledger.given(at + "class", form.class_, note=row.source, status=row.status)
    else:
        ledger.default(at + "class", row.name, "", row.source, row.status)
    values = row.values
    return values["dip_percent"], values["rise_percent"], values["recovery_s"], row.source, row.status
