"""Small sites for the network's tests: plain builders with every default spelled once."""

from collections.abc import Sequence

from relaycfg.model.geometry import three_phase
from relaycfg.model.site import (
    Board,
    Cable,
    Document,
    Equipment,
    Load,
    Motor,
    ReferenceCases,
    Site,
    Source,
    Supply,
)

PLACES = {"L1": (0,), "L2": (1,), "L3": (2,), "L1-L2": (0, 1), "L2-L3": (1, 2), "L3-L1": (2, 0), "all": (0, 1, 2)}


def cable(line: complex, neutral: complex | None = None, pe: complex | None = None, cold: float = 1.0) -> Cable:
    """A cable in ohms; ``cold`` is the ratio of the ohms at 20 C to those at load temperature."""
    neutral = line if neutral is None else neutral
    return Cable(line, neutral, pe, cold * line, cold * neutral, None if pe is None else cold * pe)


def board(
    name: str, fed_from: str = "source", cable: Cable | None = None, link: bool = False, electrode: float | None = None
) -> Board:
    """A board; without a cable it sits on its feeder's node."""
    return Board(name, fed_from, cable, link, electrode)


def load(
    at: str,
    place: str,
    p_w: float,
    q_var: float = 0.0,
    *,
    name: str = "",
    to_neutral: bool | None = None,
    zip_p: tuple[float, float, float] = (1.0, 0.0, 0.0),
    zip_q: tuple[float, float, float] | None = None,
    band: tuple[float, float] = (0.7, 1.2),
    usage: float = 1.0,
    demand: float = 1.0,
    group: str = "",
) -> Load:
    """A load at board ``at``; ``place`` L1, L1-L2, or all (a three-wire load unless ``to_neutral``)."""
    lines = PLACES[place]
    return Load(
        name or f"{at} {place}",
        at,
        place,
        lines,
        len(lines) == 1 if to_neutral is None else to_neutral,
        p_w,
        q_var,
        zip_p,
        zip_p if zip_q is None else zip_q,
        *band,
        usage,
        demand,
        group,
        False,
        0.0,
        "test",
    )


def impedance(at: str, place: str, ohm: complex, nominal_v: float = 230.0) -> Load:
    """A line-to-neutral load of that constant impedance [ohm]."""
    power = abs(nominal_v) ** 2 / ohm.conjugate()
    return load(at, place, power.real, power.imag)


def motor(
    at: str,
    running_va: complex,
    starting_va: complex,
    place: str = "all",
    to_neutral: bool | None = None,
    usage: float = 1.0,
) -> Motor:
    """A motor from its apparent powers running and starting."""
    lines = PLACES[place]
    neutral = len(lines) == 1 if to_neutral is None else to_neutral
    return Motor(f"{at} motor", at, place, lines, neutral, 0.0, running_va, starting_va, 2.0, usage)


def site(
    boards: Sequence[Board],
    loads: Sequence[Load] = (),
    motors: Sequence[Motor] = (),
    *,
    emf_v: float = 230.0,
    nominal_v: float = 230.0,
    line_ohm: complex = 0j,
    neutral_ohm: complex = 0j,
    star_link_ohm: float = 0.0,
    electrode_ohm: float | None = None,
    earth_at: str = "neutral-bar",
    earthing: str = "TN-S",
    phase_order: str = "L1-L2-L3",
) -> Site:
    """A site with only what the network reads filled in."""
    supply = Supply(
        three_phase(phase_order),
        nominal_v,
        50.0,
        earthing,
        207.0,
        253.0,
        "",
        "",
        "",
        "source",
        0.0,
        0.0,  # type: ignore[arg-type]
    )
    source = Source(
        "source",
        "impedance",
        emf_v,
        line_ohm,
        neutral_ohm,
        star_link_ohm,
        electrode_ohm,
        earth_at,  # type: ignore[arg-type]
    )
    return Site(
        Document("", "", "", "draft", "", "", "A4", ""),
        supply,
        source,
        tuple(boards),
        tuple(loads),
        tuple(motors),
        (),
        None,
        Equipment(264.5, 5.0, ((264.5, 5.0),), None, 0.0, (), "", "", "own"),
        ReferenceCases((), (), 0.0, "", ""),
        (),
        (),
        (),
        "",
    )
