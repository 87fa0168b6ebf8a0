"""Lines that a site speaks of, held against those its system has: split phase and two lines of a star have no L3."""

from typing import get_args

from relaycfg.files.draft import Draft, PlacedLoad
from relaycfg.files.ledger import printed
from relaycfg.files.load_form import Between
from relaycfg.files.relay_form import FeedForm, FeedFrom
from relaycfg.model.geometry import Geometry, geometry_of

NEUTRAL, AUXILIARY = "N", "auxiliary"


def check_lines(draft: Draft, loads: list[PlacedLoad]) -> None:
    """Loads, motors, feeds and own cases on lines that exist, and no key that means nothing in the system."""
    if draft.supply is None:
        return
    system = draft.supply.system
    geometry = geometry_of(system)
    places = on_lines(geometry, get_args(Between))
    give = f"lines are {', '.join(geometry.names)}; give one of {', '.join(places)}"
    for load in loads:
        if load.form.between not in places:
            load.add(draft, "between", f'"{load.form.between}" in a {system} system', give)
    for motor in draft.motors:
        if motor.form.between not in places:
            stated = "between" in motor.form.model_fields_set
            given = f'"{motor.form.between}" in a {system} system' if stated else f"missing in a {system} system"
            draft.add((*motor.loc, "between"), given, give)
    _feeds(draft, geometry, system)
    _cases(draft, geometry)
    if not geometry.of_star:
        _one_winding(draft, system)


def on_lines(geometry: Geometry, texts: tuple[str, ...]) -> tuple[str, ...]:
    """Those of the texts, such as L1-N or L2-L3, that name nothing but lines of the system and N."""
    known = {*geometry.names, NEUTRAL, AUXILIARY}
    return tuple(text for text in texts if set(text.split("-")) <= known)


def _feeds(draft: Draft, geometry: Geometry, system: str) -> None:
    feeds = on_lines(geometry, get_args(FeedFrom))
    for entry in draft.relays:
        for name in ("supply", "trip_coil"):
            feed: FeedForm = getattr(entry.form, name)
            if feed.from_ is not None and feed.from_ not in feeds:
                given = f'"{feed.from_}" in a {system} system'
                draft.add((*entry.loc, name, "from"), given, f"give one of {', '.join(feeds)}")


def _cases(draft: Draft, geometry: Geometry) -> None:
    each = f"[{', '.join(geometry.names)}]"
    for entry in draft.cases:
        for index, segment in enumerate(entry.form.segment):
            for name, unit in (("l_n_v", "volts"), ("angle_deg", "degrees")):
                values = getattr(segment, name)
                if values is not None and len(values) != len(geometry.names):
                    draft.add((*entry.loc, "segment", index, name), printed(values), f"give {each} in {unit}")


def _one_winding(draft: Draft, system: str) -> None:
    """Keys of a star that the legs of one winding do not have, and figures that the tables hold for a star only."""
    assert draft.supply is not None
    unused = f'not used by system = "{system}"'
    if draft.supply.phase_order is not None:
        draft.add(("supply", "phase_order"), unused, "remove it: two legs of one winding have no order")
    if draft.supply.unbalance_percent is not None:
        draft.add(("supply", "unbalance_percent"), unused, "remove it: legs that differ are displacement_percent")
    for entry in draft.sources[:1]:
        if entry.form.vector_group is not None:
            draft.add((*entry.loc, "vector_group"), unused, "remove it, or give zero_sequence_ratio")
        for name in ("impedance_percent", "x_over_r"):
            if entry.form.kind == "transformer" and getattr(entry.form, name) is None:
                remedy = "give it from the nameplate: the tables know three-phase transformers only"
                draft.add((*entry.loc, name), f'missing for system = "{system}"', remedy)
