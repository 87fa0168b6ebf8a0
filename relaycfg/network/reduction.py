"""A site's network reduced once: what its load branches see of EMF, load currents and an EMF at each break."""

from dataclasses import dataclass

import numpy as np

from relaycfg.model.geometry import ComplexArray
from relaycfg.model.site import Site
from relaycfg.network.branches import Branches
from relaycfg.network.circuit import Wiring, wire


@dataclass(frozen=True)
class Reduction:
    """Linear maps from EMF [lines], branch currents and joint EMF to voltages and currents.

    With all joints whole and w an EMF in series with one of them:
    U = by_emf emf - z i + joint[place] w for the branch voltages, and
    joint current (towards the source) = c0 emf - back i + y w. ``show_*`` give the reported quantities alike,
    rows in the order of ``rows``. Beside the break places stand the cuts of the lines (``Wiring.cuts``): there w lies
    in series with each branch of the cut, by its sign, and the joint current is the sum of theirs.
    """

    by_emf: ComplexArray
    z: ComplexArray
    joint: dict[str, ComplexArray]
    c0: dict[str, ComplexArray]
    back: dict[str, ComplexArray]
    y: dict[str, complex]
    show_emf: ComplexArray
    show_current: ComplexArray
    show_joint: dict[str, ComplexArray]
    rows: dict[str, slice]
    has_pe: tuple[bool, ...]
    tied: bool


def reduce_network(site: Site, branches: Branches) -> Reduction:
    """Reduce the site's network to the given branches; one dense solve of all nodes.

    Source: nodal equations with branch currents kept (own algebra): the matrix is symmetric, so the joint current
    follows from the load currents by the same numbers as the branch voltages from the joint EMF.
    """
    wiring = wire(site)
    circuit, boards, lines = wiring.circuit, len(site.boards), len(site.supply.geometry.names)
    ports = boards * lines
    see_ports = np.zeros((ports, circuit.size), complex)
    for board in range(boards):
        for line in range(lines):
            see_ports[board * lines + line, wiring.lines[board][line]] += 1
            see_ports[board * lines + line, wiring.neutral[board]] -= 1
    cuts = wiring.cuts(site.supply.geometry.names)
    places = list(cuts)
    count = len(branches.board)
    right = np.zeros((circuit.size, lines + count + len(places)), complex)
    for line, branch in enumerate(wiring.emf):
        right[circuit.current(branch), line] = -1
    right[:, lines : lines + count] = -see_ports.T @ branches.feed
    for column, place in enumerate(places):
        for branch, sign in cuts[place].items():
            right[circuit.current(branch), lines + count + column] = sign
    solution = circuit.solve(right)
    emf, current, joint = solution[:, :lines], solution[:, lines : lines + count], solution[:, lines + count :]
    see = branches.see @ see_ports
    show, own, rows = _shown(site, wiring, branches, see_ports)
    through = {place: right[:, lines + count + k].real @ solution for k, place in enumerate(places)}
    return Reduction(
        see @ emf,
        -(see @ current),
        {place: see @ joint[:, k] for k, place in enumerate(places)},
        {place: through[place][:lines] for place in places},
        {place: -through[place][lines : lines + count] for place in places},
        {place: complex(through[place][lines + count + k]) for k, place in enumerate(places)},
        show @ emf,
        show @ current + own,
        {place: show @ joint[:, k] for k, place in enumerate(places)},
        rows,
        tuple(pe is not None for pe in wiring.pe),
        wiring.tied,
    )


def _shown(
    site: Site, wiring: Wiring, branches: Branches, see_ports: ComplexArray
) -> tuple[ComplexArray, ComplexArray, dict[str, slice]]:
    """Reported quantities from all unknowns [rows, size], and directly from branch currents [rows, branches].

    Rows: line-to-neutral ports, neutral to earth, neutral to PE, PE to earth, neutral current. The neutral
    current of a board without a cable is what its own loads and the neutrals of the boards fed from it bring.
    """
    circuit, boards = wiring.circuit, len(site.boards)
    ports = len(see_ports)
    names = ("n_earth", "n_pe", "pe_earth", "neutral_a")
    rows = {"l_n": slice(0, ports)}
    rows |= {name: slice(ports + k * boards, ports + (k + 1) * boards) for k, name in enumerate(names)}
    show = np.zeros((ports + len(names) * boards, circuit.size), complex)
    own = np.zeros((len(show), len(branches.board)), complex)
    show[:ports] = see_ports
    to_neutral = branches.feed.sum(axis=0)
    for board in range(boards):
        pe = wiring.pe[board]
        n_earth, n_pe, pe_earth, neutral_a = (rows[name].start + board for name in names)
        for row, plus, minus in (
            (n_earth, wiring.neutral[board], wiring.earth),
            (n_pe, wiring.neutral[board], pe),
            (pe_earth, pe, wiring.earth),
        ):
            if plus is not None and minus is not None:
                show[row, plus] += 1
                show[row, minus] -= 1
        waiting = [site.boards[board]]
        while waiting:
            part = waiting.pop()
            if part.cable is not None:
                show[neutral_a, circuit.current(wiring.joints[part.name])] += 1
                continue
            for number, owner in enumerate(branches.board):
                if site.boards[owner].name == part.name:
                    own[neutral_a, number] += to_neutral[number]
            waiting += [b for b in site.boards if b.fed_from == part.name]
    return show, own, rows
