"""Whole networks drawn by hypothesis: trees of boards, every earthing, loads of every kind, places and joints."""

from dataclasses import dataclass, replace

import numpy as np
from hypothesis import HealthCheck, settings
from hypothesis import strategies as st

from relaycfg.model.geometry import ComplexArray
from relaycfg.model.site import NONE, Board, Load, Motor, Site
from relaycfg.network import Network, Solved, connected, healthy_emf
from tests.network.sites import board, cable, load, motor, site

IMPEDANCE = (1.0, 0.0, 0.0)
ZIPS = (IMPEDANCE, (0.4, 0.4, 0.2), (0.3, 0.3, 0.4), (0.0, 1.0, 0.0), (0.6, 0.0, 0.4))
TO_NEUTRAL = ("L1", "L2", "L3")
BETWEEN = ("L1-L2", "L2-L3", "L3-L1", "all")
MOST_BOARDS = 5


def law(examples: int) -> settings:
    """How a law is tried: the same examples every time, however slow or busy the machine."""
    return settings(
        max_examples=examples,
        deadline=None,
        derandomize=True,
        database=None,
        suppress_health_check=[HealthCheck.too_slow],
    )


@dataclass(frozen=True)
class Broken:
    """A site with one broken or loose neutral, every load on."""

    site: Site
    place: str
    joint_ohm: float | None

    def solve(self, emf: ComplexArray | None = None) -> Solved:
        """The state at the source's own EMF, or at the given one."""
        made = self.site
        given = healthy_emf(made) if emf is None else emf
        return Network(made).solve(self.place, connected(made), given, self.joint_ohm)


def ohms(low: float, high: float) -> st.SearchStrategy[float]:
    """Ohms in steps of a tenth of a milliohm: zero or something, never so little that rounding rules."""
    return st.integers(round(low * 1e4), round(high * 1e4)).map(lambda n: n * 1e-4)


def impedances(least: float, most: float, reactance: float) -> st.SearchStrategy[complex]:
    """Resistance from least to most and reactance from 0 to the given one [ohm]."""
    return st.builds(complex, ohms(least, most), ohms(0.0, reactance))


@st.composite
def zips(draw: st.DrawFn, linear: bool) -> tuple[float, float, float]:
    """ZIP shares of a load: a known law, or any of sum 1."""
    if linear:
        return IMPEDANCE
    if draw(st.booleans()):
        return draw(st.sampled_from(ZIPS))
    first, second = sorted(draw(st.tuples(st.integers(0, 10), st.integers(0, 10))))
    return first / 10, (second - first) / 10, (10 - second) / 10


@st.composite
def loads_at(draw: st.DrawFn, name: str, places: tuple[str, ...], linear: bool) -> Load:
    """A load of 50 W to 6 kW, lagging or leading."""
    place = draw(st.sampled_from(places))
    power = draw(st.floats(50.0, 6e3))
    return load(
        name,
        place,
        power,
        power * draw(st.floats(-0.4, 0.8)),
        to_neutral=draw(st.booleans()) if place == "all" and len(places) > len(BETWEEN) else None,
        zip_p=draw(zips(linear)),
        zip_q=draw(zips(linear)),
        band=(draw(st.sampled_from([0.5, 0.7, 0.85])), draw(st.sampled_from([1.1, 1.2, 1.4]))),
    )


@st.composite
def motors_at(draw: st.DrawFn, name: str, places: tuple[str, ...]) -> Motor:
    """A running motor of up to some 4 kVA; started it takes six times as much."""
    running = complex(draw(st.floats(300.0, 3e3)), draw(st.floats(200.0, 2500.0)))
    return motor(name, running, 6 * abs(running) * (0.3 + 0.95j), draw(st.sampled_from(places)))


@st.composite
def trees(draw: st.DrawFn, earthing: str, stiff: bool) -> list[Board]:
    """One to five boards; ``stiff`` leaves the lines without ohms, the neutrals keep theirs."""
    boards: list[Board] = []
    for k in range(draw(st.integers(1, MOST_BOARDS))):
        up = draw(st.sampled_from([b.name for b in boards])) if boards else "source"
        ohm = draw(impedances(0.01, 0.2, 0.1))
        neutral = draw(st.floats(1.0, 3.0)) * ohm
        with_pe = earthing == "TN-S" or (k > 0 and draw(st.booleans()))
        wire = cable(0j if stiff else ohm, neutral, pe=1.5 * ohm if with_pe else None)
        if k > 0 and draw(st.integers(0, 3)) == 0:
            boards.append(board(f"B{k}", up))
            continue
        electrode = draw(st.one_of(st.none(), st.floats(2.0, 200.0)))
        split = earthing == "TN-C-S" and k == 0
        boards.append(board(f"B{k}", up, wire, link=split, electrode=electrode))
    return boards


@st.composite
def networks(draw: st.DrawFn, linear: bool = False, stiff: bool = False) -> Site:
    """A site with an electrode at its source; ``linear``: constant impedances only."""
    earthing = draw(st.sampled_from(["TN-S", "TN-C-S", "TT"]))
    boards = draw(trees(earthing, stiff))
    names = st.sampled_from([b.name for b in boards])
    places = TO_NEUTRAL * 2 + BETWEEN
    loads = draw(st.lists(names.flatmap(lambda n: loads_at(n, places, linear)), min_size=1, max_size=8))
    machines = draw(st.lists(names.flatmap(lambda n: motors_at(n, ("L2", "all"))), max_size=2))
    return site(
        boards,
        [replace(x, name=f"load {k}") for k, x in enumerate(loads)],
        [replace(x, name=f"motor {k}") for k, x in enumerate(machines)],
        emf_v=draw(st.floats(215.0, 250.0)),
        line_ohm=0j if stiff else draw(impedances(0.002, 0.05, 0.05)),
        neutral_ohm=complex(draw(ohms(0.0, 0.02)), draw(ohms(-0.01, 0.02))),
        star_link_ohm=draw(st.sampled_from([0.0, 1e-3])),
        electrode_ohm=draw(st.floats(1.0, 50.0)),
        earth_at=draw(st.sampled_from(["neutral-bar", "star-point"])),
        earthing=earthing,
        phase_order=draw(st.sampled_from(["L1-L2-L3", "L1-L3-L2"])),
    )


@st.composite
def broken(draw: st.DrawFn, linear: bool = False, stiff: bool = False) -> Broken:
    """A drawn network, its neutral sound, open or loose at any place."""
    made = draw(networks(linear, stiff))
    place = draw(st.sampled_from((*made.places, NONE)))
    ohm = draw(st.one_of(st.none(), st.just(0.0), st.floats(0.01, 1e3)))
    return Broken(made, place, ohm)


def emfs() -> st.SearchStrategy[ComplexArray]:
    """Any three phasors of up to 300 V a part."""
    part = st.floats(-300.0, 300.0)
    return st.lists(st.builds(complex, part, part), min_size=3, max_size=3).map(np.array)
