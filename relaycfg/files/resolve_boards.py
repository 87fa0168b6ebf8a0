"""Boards and their incoming cables in ohms, at load temperature and cold for short circuits."""

from collections.abc import Sequence

from relaycfg.files.ledger import Ledger
from relaycfg.files.resolve_electrode import electrode
from relaycfg.files.site_form import BoardForm, CableForm
from relaycfg.files.tables import Tables
from relaycfg.model.site import Board, Cable, TouchTimes


def resolve_board(form: BoardForm, frequency_hz: float, ledger: Ledger) -> Board:
    """A board with the ohms of its cable."""
    at = f"board.{form.name}."
    ledger.given(at + "fed_from", form.fed_from)
    if form.neutral_earth_link:
        ledger.given(at + "neutral_earth_link", True)
    electrode_ohm = electrode(form.electrode_ohm, form.electrode, at, ledger)
    cable = form.cable
    resolved = None
    if cable is not None:
        by_ohms = cable.line_ohm is not None
        resolved = (_in_ohms if by_ohms else _by_section)(cable, frequency_hz, at + "cable.", ledger)
    limit = form.touch_limit_v
    if limit is not None:
        ledger.given(at + "touch_limit_v", limit, "V")
    return Board(
        form.name,
        form.fed_from,
        resolved,
        form.neutral_earth_link,
        electrode_ohm,
        float(ledger.tables.row("touch-limit").value) if limit is None else limit,
    )


def resolve_touch(boards: Sequence[BoardForm], ledger: Ledger) -> TouchTimes:
    """Times by touch voltage, as information; the limit enters the ledger once for all boards that state none."""
    limit, times = ledger.tables.row("touch-limit"), ledger.tables.row("ev-annex-times")
    silent = [form.name for form in boards if form.touch_limit_v is None]
    ledger.shared_default("board.touch_limit_v", limit.value, "V", silent, limit.source, limit.status)
    return TouchTimes(
        tuple((v, s) for v, s in times.points), times.source, times.status, str(times.content["applies_to"])
    )


def resistance_20(section_mm2: float, metal: str, tables: Tables) -> tuple[float, str]:
    """Resistance at 20 C [ohm/km] of a conductor and where it is from.

    Source: IEC 60228 table for class 2 (as quoted); a section that is not in it by the resistivity of IEC 60287-1-1.
    """
    row = tables.row(f"iec-60228-class-2-{metal.lower()}")
    for section, ohm in row.points:
        if section == section_mm2:
            return ohm, row.cited
    resistivity = tables.row(f"resistivity-{metal.lower()}")
    return 1000 * resistivity.value / section_mm2, f"{section_mm2:g} mm2 not in IEC 60228, {resistivity.cited}"


def warm(resistance: float, metal: str, temperature_c: float, tables: Tables) -> float:
    """Resistance at a temperature from that at 20 C. Source: linear law; coefficients as in the tables."""
    row = tables.row("temperature-coefficient-cu" if metal == "Cu" else "temperature-coefficient-al-textbook")
    return float(resistance * (1 + row.value * (temperature_c - row.content["from_c"])))


def _by_section(cable: CableForm, frequency_hz: float, at: str, ledger: Ledger) -> Cable:
    assert cable.length_m is not None
    assert cable.line_mm2 is not None
    tables = ledger.tables
    km = cable.length_m / 1000
    ledger.given(at + "length_m", cable.length_m, "m")
    metal = ledger.pick(at + "metal", cable.metal, "default-cable-metal")
    hot_c = ledger.pick(at + "temperature_c", cable.temperature_c, "default-cable-temperature", "C")
    cold_c = tables.row("default-fault-temperature").value
    reactance = cable.reactance_ohm_per_km
    if reactance is None:
        row = tables.row("reactance-multicore")
        reactance = row.value * frequency_hz / row.content["at_hz"]
        ledger.default(at + "reactance_ohm_per_km", reactance, "ohm/km", row.source, row.status)
    else:
        ledger.given(at + "reactance_ohm_per_km", reactance, "ohm/km")

    def ohms(section: float, name: str, temperatures: Sequence[float]) -> list[complex]:
        per_km, source = resistance_20(section, metal, tables)
        if name != "neutral_mm2" or cable.neutral_mm2 is not None:
            ledger.given(at + name, section, "mm2", note=f"{per_km:.4g} ohm/km at 20 C, {source}")
        return [complex(warm(per_km, metal, t, tables) * km, reactance * km) for t in temperatures]

    line = ohms(cable.line_mm2, "line_mm2", (hot_c, cold_c))
    if cable.neutral_mm2 is None:
        ledger.default(at + "neutral_mm2", cable.line_mm2, "mm2", "taken as the section of the lines", "own")
    neutral = ohms(cable.neutral_mm2 or cable.line_mm2, "neutral_mm2", (hot_c, cold_c))
    pe = ohms(cable.pe_mm2, "pe_mm2", (hot_c, cold_c)) if cable.pe_mm2 is not None else [None, None]
    return Cable(line[0], neutral[0], pe[0], line[1], neutral[1], pe[1])


def _in_ohms(cable: CableForm, _frequency_hz: float, at: str, ledger: Ledger) -> Cable:
    """A cable given in ohms: the same ohms under load and in short circuits."""
    assert cable.line_ohm is not None
    line = complex(*cable.line_ohm)
    ledger.given(at + "line_ohm", line, "ohm")
    neutral = line if cable.neutral_ohm is None else complex(*cable.neutral_ohm)
    if cable.neutral_ohm is None:
        ledger.default(at + "neutral_ohm", neutral, "ohm", "taken as line_ohm", "own")
    else:
        ledger.given(at + "neutral_ohm", neutral, "ohm")
    pe = None if cable.pe_ohm is None else complex(*cable.pe_ohm)
    if pe is not None:
        ledger.given(at + "pe_ohm", pe, "ohm")
    return Cable(line, neutral, pe, line, neutral, pe)
