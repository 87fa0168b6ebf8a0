"""A site with one load state as named nodes and series conductors, each on its own: what another engine is told.

Every conductor, neutral and PE included, is an element between named nodes. Shared with the package are only the site
and two stated figures of its circuit: the leak, and the link at the source's own bar.
"""

from dataclasses import dataclass, replace

import numpy as np

from relaycfg.model.site import SOURCE, Board, Load, Motor, Site
from relaycfg.network.circuit import LEAK_S, LINK_OHM

STAR, EARTH = "star.1", "source.0"
NEUTRAL, PE = 4, 5


@dataclass(frozen=True)
class Wire:
    """A series element; ``tie`` is false for the stated leak, which holds nothing."""

    start: str
    end: str
    ohm: complex
    tie: bool = True


@dataclass(frozen=True)
class Neutral:
    """A neutral that may break: which wire it is, its ends (source's side first) and its own ohms."""

    wire: int
    above: str
    below: str
    ohm: complex


@dataclass(frozen=True)
class Consumer:
    """A load with its factor, or a motor with 1 (running) or 2 (starting).

    ``nodes`` are those of its lines, then the neutral's where it is tied to it.
    """

    item: Load | Motor
    factor: float
    bus: str
    nodes: tuple[str, ...]


class Drawing:
    """Nodes are ``bus.number``: 1 to 3 the lines, 4 the neutral, 5 PE, 0 remote earth.

    Bus ``star`` has the star of the EMFs (1) and the star point (4). Lines of the source stand in ``emf`` behind the
    source's line impedance.
    """

    def __init__(self, made: Site, emf: np.ndarray, factors: np.ndarray, motors: np.ndarray | None = None) -> None:
        self.site, self.emf = made, emf
        self.wires: list[Wire] = []
        self.neutrals: dict[str, Neutral] = {}
        self.with_pe: set[str] = set()
        self.consumers: list[Consumer] = []
        self._source()
        for item in sorted(made.boards, key=lambda b: len(made.path(b.name))):
            self._board(item)
        on = np.zeros(len(made.motors)) if motors is None else motors
        for drawn, factor in (*zip(made.loads, factors, strict=True), *zip(made.motors, on, strict=True)):
            if factor > 0:
                self._consumer(drawn, float(factor))

    @property
    def nodes(self) -> set[str]:
        """All nodes, remote earth among them."""
        return {node for wire in self.wires for node in (wire.start, wire.end)}

    def bus(self, name: str) -> str:
        """The bus a board sits on: its own, or without a cable its feeder's."""
        while name != SOURCE and self.site.board(name).cable is None:
            name = self.site.board(name).fed_from
        return name.lower()

    def held(self, place: str) -> bool:
        """Whether load, link or electrode holds the neutral behind an open break by the rest of the network."""
        neutral = self.neutrals[place]
        ties = [{w.start, w.end} for number, w in enumerate(self.wires) if w.tie and number != neutral.wire]
        ties += [{f"source.{k}", STAR} for k in (1, 2, 3)]
        ties += [set(consumer.nodes) for consumer in self.consumers]
        group = {neutral.below}
        while more := set().union(*(tie for tie in ties if tie & group)) - group:
            group |= more
        return STAR in group

    def broken_ohm(self, place: str, joint_ohm: float | None) -> complex | None:
        """Ohms of a broken neutral with its joint; None where it is open and something else holds it."""
        if joint_ohm is not None:
            return self.neutrals[place].ohm + joint_ohm
        return None if self.held(place) else complex(1 / LEAK_S)

    def broken(self, place: str, joint_ohm: float | None) -> list[Wire]:
        """All wires with the neutral at ``place`` broken; all as they stand where no neutral has that name."""
        if place not in self.neutrals:
            return self.wires
        number, ohm = self.neutrals[place].wire, self.broken_ohm(place, joint_ohm)
        put = [] if ohm is None else [replace(self.wires[number], ohm=ohm)]
        return [*self.wires[:number], *put, *self.wires[number + 1 :]]

    def _wire(self, start: str, end: str, ohm: complex, tie: bool = True) -> int:
        self.wires.append(Wire(start, end, complex(ohm), tie))
        return len(self.wires) - 1

    def _neutral(self, place: str, above: str, below: str, ohm: complex) -> None:
        self.neutrals[place] = Neutral(self._wire(above, below, ohm), above, below, complex(ohm))

    def _source(self) -> None:
        source = self.site.source
        self._wire(STAR, "star.4", source.neutral_ohm)
        self._neutral(SOURCE, "star.4", "source.4", source.star_link_ohm)
        earthed = "source.4" if source.earth_at == "neutral-bar" else "star.4"
        leak = source.electrode_ohm is None
        self._wire(earthed, EARTH, 1 / LEAK_S if source.electrode_ohm is None else source.electrode_ohm, not leak)
        if self.site.supply.earthing != "TT":
            self._wire(earthed, "source.5", 0)
            self.with_pe.add(SOURCE)

    def _board(self, item: Board) -> None:
        here, up = self.bus(item.name), self.bus(item.fed_from)
        if item.cable is not None:
            for k in (1, 2, 3):
                self._wire(f"{up}.{k}", f"{here}.{k}", item.cable.line_ohm)
            self._neutral(item.name, f"{up}.4", f"{here}.4", item.cable.neutral_ohm)
            if item.cable.pe_ohm is not None and self._has_pe(up):
                self._wire(f"{up}.5", f"{here}.5", item.cable.pe_ohm)
                self.with_pe.add(here)
        link = Wire(f"{here}.4", f"{here}.5", complex(LINK_OHM if here == SOURCE else 0))
        if item.neutral_earth_link and link not in self.wires:  # once a bus: two of zero ohms share no current
            self.wires.append(link)
        if item.electrode_ohm is not None:
            self._wire(f"{here}.5", EARTH, item.electrode_ohm)

    def _has_pe(self, bus: str) -> bool:
        """PE by a cable, or by link or electrode of any board on the bus."""
        own = (b for b in self.site.boards if self.bus(b.name) == bus)
        return bus in self.with_pe or any(b.neutral_earth_link or b.electrode_ohm is not None for b in own)

    def _consumer(self, item: Load | Motor, factor: float) -> None:
        here, numbers = self.bus(item.board), [k + 1 for k in item.lines] + [NEUTRAL] * item.to_neutral
        self.consumers.append(Consumer(item, factor, here, tuple(f"{here}.{number}" for number in numbers)))
