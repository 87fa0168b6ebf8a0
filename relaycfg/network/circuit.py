"""Nodes and series branches of a site, solved as they stand: every conductor on its own, zero ohms included."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from relaycfg.model.geometry import ComplexArray
from relaycfg.model.site import SOURCE, Site

STAR = -1
"""The star of the source's EMFs: reference of all node potentials."""
LEAK_S = 1e-6
"""Stated leak [S] that holds what nothing else holds: a source without electrode, an island without load."""
LINK_OHM = 1e-4
"""Neutral-to-earth link at the source's own bar, so that it never closes a loop without any impedance."""


def open_line(line: str) -> str:
    """What the cut of that line at the source's terminals is called; a board's name never begins with a blank."""
    return f" line {line} open"


def blown_fuse(line: str) -> str:
    """What the cut behind a blown fuse on the high-voltage side of a delta-star transformer is called.

    ``line`` keeps its volts; the windings of the two others lie in series, so that they carry one current.
    """
    return f" fuse blown, {line} whole"


class Circuit:
    """Potentials against STAR and branch currents of a linear circuit, both kept as unknowns.

    A branch from a to b obeys V_a - V_b - z i = e. Keeping the current as an unknown makes zero ohms exact and
    lets a break be an EMF in series with its conductor. The matrix is symmetric.
    """

    def __init__(self) -> None:
        self.nodes = 0
        self.branches: list[tuple[int, int, complex]] = []

    def node(self) -> int:
        """A new node."""
        self.nodes += 1
        return self.nodes - 1

    def branch(self, start: int, end: int, ohm: complex) -> int:
        """A new series branch; its current counts from ``start`` to ``end``."""
        self.branches.append((start, end, ohm))
        return len(self.branches) - 1

    @property
    def size(self) -> int:
        """Number of unknowns: node potentials first, then branch currents."""
        return self.nodes + len(self.branches)

    def current(self, branch: int) -> int:
        """Position of a branch's current (and of its equation) among the unknowns."""
        return self.nodes + branch

    def solve(self, right: ComplexArray) -> ComplexArray:
        """Unknowns [size, columns] for right-hand sides [size, columns].

        Raises ValueError where the circuit has no finite solution (a loop of zero ohms).
        """
        matrix = np.zeros((self.size, self.size), complex)
        for number, (start, end, ohm) in enumerate(self.branches):
            row = self.current(number)
            for node, sign in ((start, 1.0), (end, -1.0)):
                if node != STAR:
                    matrix[row, node] += sign
                    matrix[node, row] += sign
            matrix[row, row] = -ohm
        try:
            solution: ComplexArray = np.linalg.solve(matrix, right)
        except np.linalg.LinAlgError:
            raise ValueError("a loop of conductors without any impedance has no finite current") from None
        return solution


@dataclass(frozen=True)
class Wiring:
    """Where a site's boards hang on its circuit. Node tuples follow ``site.boards``."""

    circuit: Circuit
    lines: tuple[tuple[int, ...], ...]
    neutral: tuple[int, ...]
    pe: tuple[int | None, ...]
    earth: int
    emf: tuple[int, ...]
    """Branch of each line's EMF; its right-hand side is minus the EMF."""
    joints: dict[str, int]
    """Break place to the branch of its neutral; the current counts towards the source."""
    tied: bool
    """Whether any electrode ties the system to remote earth; the stated leak does not count."""

    def cuts(self, lines: tuple[str, ...]) -> dict[str, dict[int, float]]:
        """Every cut by its name: branches whose currents, each by its sign, add up to nothing while it is open.

        A lost neutral stops one conductor; an open line at the source stops its EMF; behind a blown fuse of a
        delta-star transformer the currents of two lines are equal, their difference nothing.
        """
        found = {place: {branch: 1.0} for place, branch in self.joints.items()}
        found |= {open_line(name): {branch: 1.0} for name, branch in zip(lines, self.emf, strict=True)}
        for k, name in enumerate(lines):
            first, *others = self.emf[k + 1 :] + self.emf[:k]
            if len(others) == 1:
                found[blown_fuse(name)] = {first: 1.0, others[0]: -1.0}
        return found


def parallel(ohms: Sequence[float]) -> float:
    """Parallel resistance [ohm] of electrodes; zero where one of them is."""
    return 0.0 if 0.0 in ohms else 1 / sum(1 / ohm for ohm in ohms)


def bus_of(site: Site, name: str) -> str:
    """The board with a cable whose node ``name`` sits on, or the source."""
    while name != SOURCE and site.board(name).cable is None:
        name = site.board(name).fed_from
    return name


def wire(site: Site, fault: bool = False) -> Wiring:
    """The site's circuit without loads; ``fault`` takes the cables' ohms at 20 C.

    Boards without a cable share all nodes of what feeds them. The PE of a board exists through its cable (where
    the feeder has one), its link or its electrode. In TT the source's electrode carries no PE.
    """
    circuit, source = Circuit(), site.source
    terminals = tuple(circuit.node() for _ in site.supply.geometry.names)
    star_point, bar, earth = circuit.node(), circuit.node(), circuit.node()
    emf = tuple(circuit.branch(STAR, terminal, source.line_ohm) for terminal in terminals)
    circuit.branch(star_point, STAR, source.neutral_ohm)
    joints = {SOURCE: circuit.branch(bar, star_point, source.star_link_ohm)}
    earthed = bar if source.earth_at == "neutral-bar" else star_point
    source_electrode = 1 / LEAK_S if source.electrode_ohm is None else source.electrode_ohm

    lines, neutral = {SOURCE: terminals}, {SOURCE: bar}
    pe: dict[str, int | None] = {SOURCE: None if site.supply.earthing == "TT" else earthed}
    buses = {b.name: bus_of(site, b.name) for b in site.boards}
    cabled = sorted((b for b in site.boards if b.cable is not None), key=lambda b: len(site.path(b.name)))
    for bus in (SOURCE, *(b.name for b in cabled)):
        members = [b for b in site.boards if buses[b.name] == bus]
        electrodes = [b.electrode_ohm for b in members if b.electrode_ohm is not None]
        linked = any(b.neutral_earth_link for b in members)
        cable = None if bus == SOURCE else site.board(bus).cable
        if cable is not None:
            feeder = bus_of(site, site.board(bus).fed_from)
            line_ohm = cable.fault_line_ohm if fault else cable.line_ohm
            neutral_ohm = cable.fault_neutral_ohm if fault else cable.neutral_ohm
            pe_ohm = cable.fault_pe_ohm if fault else cable.pe_ohm
            lines[bus] = tuple(circuit.node() for _ in terminals)
            for start, end in zip(lines[feeder], lines[bus], strict=True):
                circuit.branch(start, end, line_ohm)
            neutral[bus] = circuit.node()
            joints[bus] = circuit.branch(neutral[bus], neutral[feeder], neutral_ohm)
            upstream = pe[feeder]
            pe[bus] = None
            if pe_ohm is not None and upstream is not None:
                pe[bus] = node = circuit.node()
                circuit.branch(node, upstream, pe_ohm)
        local = pe[bus]
        if local is None and (linked or electrodes):
            pe[bus] = local = circuit.node()
        if bus == SOURCE and local == earthed:
            circuit.branch(earthed, earth, parallel([source_electrode, *electrodes]))
        else:
            if bus == SOURCE:
                circuit.branch(earthed, earth, source_electrode)
            if local is not None and electrodes:
                circuit.branch(local, earth, parallel(electrodes))
        if linked and local is not None and local != neutral[bus]:
            circuit.branch(neutral[bus], local, LINK_OHM if bus == SOURCE else 0.0)
    tied = source.electrode_ohm is not None or any(b.electrode_ohm is not None for b in site.boards)
    return Wiring(
        circuit,
        tuple(lines[buses[b.name]] for b in site.boards),
        tuple(neutral[buses[b.name]] for b in site.boards),
        tuple(pe[buses[b.name]] for b in site.boards),
        earth,
        emf,
        joints,
        tied,
    )
