"""Short circuits in circuits behind a board: the dip, swell and displacement at every board until they are cleared."""

from typing import Literal

import numpy as np

from relaycfg.model.geometry import ComplexArray
from relaycfg.model.site import EarthReference, Site
from relaycfg.network.circuit import wire

FaultKind = Literal["L-N", "L-PE", "L-L", "L-L-N", "three-phase"]


def short_circuit(
    site: Site,
    board: str,
    kind: FaultKind,
    circuit_ohm: complex,
    emf: ComplexArray,
    earth_reference: EarthReference = "local PE",
    line: int = 0,
) -> dict[str, ComplexArray]:
    """The tap [lines + 1] of every board during a short circuit behind ``board``, loads left out.

    ``circuit_ohm`` is one way, each conductor of the final circuit alike; 0 is a bolted fault at the board. ``emf``
    [lines] in volts. Cables count with their ohms at 20 C, the source with its own; L-N and L-PE faults are on the
    line of that index, L-L and L-L-N ones on the first two. In TT an L-PE fault returns through the electrodes. A tap
    is the line-to-neutral phasors, then neutral against local PE (nan without one), or against remote earth where the
    ``earth_reference`` is an electrode of its own. Raises ValueError for an L-PE fault at a board without PE, and
    where nothing limits the current. Valid for the steady state, machines not feeding in.
    """
    wiring = wire(site, fault=True)
    circuit = wiring.circuit
    index = [b.name for b in site.boards].index(board)
    lines, neutral, pe = wiring.lines[index], wiring.neutral[index], wiring.pe[index]
    if kind == "L-N":
        circuit.branch(lines[line], neutral, 2 * circuit_ohm)
    elif kind == "L-PE":
        if pe is None:
            raise ValueError(f"board {board} has no protective conductor that a fault could return through")
        circuit.branch(lines[line], pe, 2 * circuit_ohm)
    elif kind == "L-L":
        circuit.branch(lines[0], lines[1], 2 * circuit_ohm)
    else:
        meeting = circuit.node()
        for start in lines[:2] if kind == "L-L-N" else lines:
            circuit.branch(start, meeting, circuit_ohm)
        if kind == "L-L-N":
            circuit.branch(meeting, neutral, circuit_ohm)
    right = np.zeros((circuit.size, 1), complex)
    for branch, volts in zip(wiring.emf, emf, strict=True):
        right[circuit.current(branch), 0] = -volts
    volts_at = circuit.solve(right)[:, 0]
    taps = {}
    for number, other in enumerate(site.boards):
        local = wiring.earth if earth_reference == "own electrode" else wiring.pe[number]
        star = volts_at[wiring.neutral[number]]
        displacement = np.nan if local is None else star - volts_at[local]
        taps[other.name] = np.array([*(volts_at[list(wiring.lines[number])] - star), displacement], complex)
    return taps
