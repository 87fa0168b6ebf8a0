"""What only shows when tables of a site are held against each other: names, feeds, earthing, readings."""

from relaycfg.files.draft import Draft, PlacedLoad
from relaycfg.files.duty_checks import LATER, check_cases, check_equipment, check_motors_and_faults, check_relay
from relaycfg.files.electrode_checks import check_electrodes
from relaycfg.files.ledger import printed
from relaycfg.files.limits import LINE_TO_LINE_NEAR
from relaycfg.files.line_checks import check_lines
from relaycfg.files.load_checks import check_loads
from relaycfg.files.loads import is_workbook
from relaycfg.files.name_checks import check_board, check_unique
from relaycfg.files.site_form import CableForm
from relaycfg.files.tables import Tables, names
from relaycfg.files.text import choose
from relaycfg.files.unused import SOURCE_KEYS, quoted, unused
from relaycfg.model.geometry import Geometry, geometry_of, three_phase
from relaycfg.model.site import SOURCE

OHM_KEYS = ("line_ohm", "neutral_ohm", "pe_ohm")
SECTION_KEYS = ("length_m", "line_mm2", "neutral_mm2", "pe_mm2", "metal", "temperature_c", "reactance_ohm_per_km")


def cross_check(draft: Draft, loads: list[PlacedLoad], tables: Tables, need_relay: bool) -> None:
    """Adds to the draft every problem that takes more than one table to see."""
    _supply(draft, tables)
    _source(draft, tables)
    if draft.loads_file is not None and draft.loads_file.sheet is not None and not is_workbook(draft.loads_file.file):
        draft.add(("loads", "sheet"), "not used by a CSV file", "remove it, or give an .xlsx file")
    check_unique(draft, [((*e.loc, "name"), e.form.name) for e in draft.boards])
    _feeds(draft)
    _cables(draft)
    _earthing(draft)
    check_electrodes(draft)
    check_lines(draft, loads)
    check_loads(draft, loads)
    check_motors_and_faults(draft)
    check_relay(draft, need_relay)
    check_equipment(draft)
    check_cases(draft)


def meant_star_voltage(volts: float, tables: Tables, geometry: Geometry | None = None) -> float | None:
    """The line-to-neutral voltage that is meant where ``volts`` looks like one between lines, else None."""
    star = star_voltage(volts / (geometry or three_phase()).line_to_line_ratio, tables)
    return star if star_voltage(volts, tables) is None else None


def star_voltage(volts: float, tables: Tables) -> float | None:
    """The common line-to-neutral voltage nearest to ``volts``; None where none is near."""
    near_percent = tables.row("default-star-voltage-tolerance").value
    common = tables.row("default-star-voltages").value
    nearest = min(common, key=lambda v: abs(volts / v - 1))
    return float(nearest) if abs(volts / nearest - 1) <= near_percent / 100 else None


def _supply(draft: Draft, tables: Tables) -> None:
    supply = draft.supply
    if supply is None:
        return
    star = meant_star_voltage(supply.nominal_v, tables, geometry_of(supply.system))
    if star is not None:
        draft.add(
            ("supply", "nominal_v"),
            f"{supply.nominal_v:g}, which looks like a line-to-line voltage",
            f"give volts from line to neutral, {star:g}",
        )
    if supply.band is not None and (supply.low_percent is not None or supply.high_percent is not None):
        draft.add(("supply", "band"), "given beside low_percent or high_percent", "give a band or both limits")
    elif (supply.low_percent is None) != (supply.high_percent is None):
        missing = "low_percent" if supply.low_percent is None else "high_percent"
        draft.add(("supply", missing), "missing", "give both low_percent and high_percent")
    if supply.band is not None and tables.named("supply-bands", supply.band) is None:
        draft.add(("supply", "band"), f'"{supply.band}"', choose(supply.band, names("supply-bands")))
    if supply.band_at is not None:
        check_board(draft, ("supply", "band_at"), supply.band_at, (SOURCE,))


def _source(draft: Draft, tables: Tables) -> None:
    if len(draft.sources) > 1:
        draft.add(draft.sources[1].loc, f"a second source, {LATER}", "keep one [[source]]")
    nominal = draft.supply.nominal_v if draft.supply else None
    geometry = geometry_of(draft.supply.system) if draft.supply else three_phase()
    if nominal is not None:
        nominal = meant_star_voltage(nominal, tables, geometry) or nominal
    for entry in draft.sources[:1]:
        form = entry.form
        needs = {"transformer": ("rating_kva",), "generator": ("rating_kva",), "impedance": ("line_ohm",)}[form.kind]
        for name in needs:
            if getattr(form, name) is None:
                draft.add((*entry.loc, name), "missing", f'give it for kind = "{form.kind}"')
        for name, kinds in unused(form, SOURCE_KEYS, form.kind):
            remedy = f"remove it, or give kind = {quoted(kinds)}"
            draft.add((*entry.loc, name), f'not used by kind = "{form.kind}"', remedy)
        low, high = tables.row("default-no-load-range").value
        if form.no_load_v is not None and nominal is not None and not low <= form.no_load_v / nominal <= high:
            line = abs(form.no_load_v / nominal / geometry.line_to_line_ratio - 1) < LINE_TO_LINE_NEAR
            looks = ", which looks like a line-to-line voltage" if line else ""
            draft.add(
                (*entry.loc, "no_load_v"),
                f"{form.no_load_v:g}{looks}",
                "give volts from line to neutral",
                f"{low * nominal:g} to {high * nominal:g}",
            )
        if form.vector_group is not None and vector_family(form.vector_group) is None:
            draft.add((*entry.loc, "vector_group"), f'"{form.vector_group}"', "give one such as Dyn11, Yzn5 or Yyn0")
        for name in ("line_ohm", "neutral_ohm"):
            pair = getattr(form, name)
            if pair is not None and pair[0] < 0:
                draft.add((*entry.loc, name), printed(pair), "give a resistance of 0 or more")


def vector_family(group: str) -> str | None:
    """dyn, yzn or yyn by the letters of a vector group; None where it has no star-side neutral."""
    letters = "".join(c for c in group.casefold() if c.isalpha())
    if letters in ("dyn", "yzn", "yyn", "dzn", "ynyn", "ynzn"):
        return {"dyn": "dyn", "yyn": "yyn", "ynyn": "yyn"}.get(letters, "yzn")
    return None


def _feeds(draft: Draft) -> None:
    feeder = draft.feeders
    reported: set[str] = set()
    for entry in draft.boards:
        loc = (*entry.loc, "fed_from")
        if not check_board(draft, loc, entry.form.fed_from, (SOURCE,)):
            continue
        if feeder[entry.form.name] != entry.form.fed_from:
            continue  # a name used twice, reported as such
        chain = [entry.form.name]
        while chain[-1] in feeder and feeder[chain[-1]] not in chain:
            chain.append(feeder[chain[-1]])
        if feeder.get(chain[-1]) == entry.form.name and entry.form.name not in reported:
            reported.update(chain)
            loop = " from ".join([*chain, entry.form.name])
            remedy = 'feed one of them from "source" or another board'
            draft.add(loc, f'"{entry.form.fed_from}", a loop ({loop})', remedy)


def _cables(draft: Draft) -> None:
    for entry in draft.boards:
        cable = entry.form.cable
        loc = (*entry.loc, "cable")
        if cable is None:
            continue
        if _given(cable, OHM_KEYS) and _given(cable, SECTION_KEYS):
            draft.add(loc, "given both in ohms and by section", "keep line_ohm, neutral_ohm, pe_ohm or the sections")
        elif _given(cable, OHM_KEYS):
            if cable.line_ohm is None:
                draft.add((*loc, "line_ohm"), "missing", "give [r, x] in ohms")
            for name in OHM_KEYS:
                pair = getattr(cable, name)
                if pair is not None and (pair[0] < 0 or pair[1] < 0):
                    draft.add((*loc, name), printed(pair), "give ohms of 0 or more")
                elif pair is not None and pair[0] == pair[1] == 0:
                    draft.add((*loc, name), "zero", "leave [board.cable] out for a board beside its feeder")
        else:
            for name in ("length_m", "line_mm2"):
                if getattr(cable, name) is None:
                    draft.add((*loc, name), "missing", "give length_m and line_mm2, or line_ohm")


def _given(cable: CableForm, names_: tuple[str, ...]) -> bool:
    return any(getattr(cable, name) is not None for name in names_)


def _earthing(draft: Draft) -> None:
    if draft.supply is None:
        return
    linked = [e for e in draft.boards if e.form.neutral_earth_link]
    if draft.supply.earthing == "TT":
        for entry in linked:
            remedy = "remove it, or give another earthing"
            draft.add((*entry.loc, "neutral_earth_link"), "true in a TT system", remedy)
    if draft.supply.earthing == "TN-C-S" and not linked and len(draft.boards) == len(draft.raw_boards) > 0:
        remedy = "write neutral_earth_link = true in the board where the PEN ends"
        draft.add(("supply", "earthing"), '"TN-C-S" without a board that links N and PE', remedy)
