"""What only shows when tables of a site are held against each other: names, feeds, earthing, readings."""

import math

from relaycfg.files.draft import Draft, PlacedLoad
from relaycfg.files.duty_checks import LATER, check_cases, check_equipment, check_motors_and_faults, check_relay
from relaycfg.files.ledger import printed
from relaycfg.files.load_checks import check_loads
from relaycfg.files.name_checks import check_board, check_unique
from relaycfg.files.site_form import CableForm
from relaycfg.files.tables import Tables, names
from relaycfg.files.text import choose
from relaycfg.model.site import SOURCE

OHM_KEYS = ("line_ohm", "neutral_ohm", "pe_ohm")
SECTION_KEYS = ("length_m", "line_mm2", "neutral_mm2", "pe_mm2", "metal", "temperature_c", "reactance_ohm_per_km")


def cross_check(draft: Draft, loads: list[PlacedLoad], tables: Tables, need_relay: bool) -> None:
    """Adds to the draft every problem that takes more than one table to see."""
    _supply(draft, tables)
    _source(draft)
    check_unique(draft, [((*e.loc, "name"), e.form.name) for e in draft.boards])
    _feeds(draft)
    _cables(draft)
    _earthing(draft)
    check_loads(draft, loads)
    check_motors_and_faults(draft)
    check_relay(draft, need_relay)
    check_equipment(draft)
    check_cases(draft)


def star_voltage(volts: float, tables: Tables) -> float | None:
    """The common line-to-neutral voltage near ``volts``, or None."""
    near_percent = tables.row("default-star-voltage-tolerance").value
    common = tables.row("default-star-voltages").value
    return next((float(v) for v in common if abs(volts / v - 1) <= near_percent / 100), None)


def _supply(draft: Draft, tables: Tables) -> None:
    supply = draft.supply
    if supply is None:
        return
    if supply.system != "3ph-4w":
        draft.add(("supply", "system"), f'"{supply.system}", {LATER}', 'write "3ph-4w"')
    star = star_voltage(supply.nominal_v / math.sqrt(3), tables)
    if star_voltage(supply.nominal_v, tables) is None and star is not None:
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


def _source(draft: Draft) -> None:
    if len(draft.sources) > 1:
        draft.add(draft.sources[1].loc, f"a second source, {LATER}", "keep one [[source]]")
    nominal = draft.supply.nominal_v if draft.supply else None
    for entry in draft.sources[:1]:
        form = entry.form
        needs = {"transformer": ("rating_kva",), "generator": ("rating_kva",), "impedance": ("line_ohm",)}[form.kind]
        for name in needs:
            if getattr(form, name) is None:
                draft.add((*entry.loc, name), "missing", f'give it for kind = "{form.kind}"')
        if form.no_load_v is not None and nominal is not None and not 0.8 <= form.no_load_v / nominal <= 1.25:
            line = abs(form.no_load_v / nominal / math.sqrt(3) - 1) < 0.1
            looks = ", which looks like a line-to-line voltage" if line else ""
            draft.add(
                (*entry.loc, "no_load_v"),
                f"{form.no_load_v:g}{looks}",
                "give volts from line to neutral",
                f"{0.8 * nominal:g} to {1.25 * nominal:g}",
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
    feeder = {e.form.name: e.form.fed_from for e in reversed(draft.boards)}
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
    if draft.boards and not any(e.form.fed_from == SOURCE for e in draft.boards) and not reported:
        draft.add(("board",), 'without a board fed from "source"', 'write fed_from = "source" in the main board')


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
    if draft.supply.earthing == "TN-C-S" and not linked and len(draft.boards) == len(draft.board_names):
        remedy = "write neutral_earth_link = true in the board where the PEN ends"
        draft.add(("supply", "earthing"), '"TN-C-S" without a board that links N and PE', remedy)
