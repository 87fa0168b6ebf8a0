"""Whether an answer is a root of the dense equations: how far Newton's method moves it, and whether it stands there.

A root is judged by residual (in volts: the way to the point of rest next to it) and by stability, not by agreement in
voltage, since a network with constant-power loads may have several.
"""

import numpy as np

from relaycfg.network import LoadStates, Network, Solved
from tests.network.dense import LINES, Dense

STEPS, STILL_V = 12, 1e-9
"""Newton steps allowed, and the last one's size."""


def board_nodes(dense: Dense, name: str) -> list[int]:
    """Places of a board's lines, neutral and, if it has one, PE among the unknowns."""
    parts = [*(f"L{k}" for k in LINES), "N", *(["PE"] if name in dense.with_pe else [])]
    return [dense.nodes[dense.root(f"{name}.{part}")] for part in parts]


def from_package(dense: Dense, network: Network, solved: Solved, state: int) -> np.ndarray:
    """Potentials [nodes] of the package's answer, nan where it reports none (star, source, whatever no earth ties)."""
    v = np.full(len(dense.nodes), np.nan, complex)
    for number, name in enumerate(network.boards):
        n = solved.n_earth[number, state]
        phasors = [*(solved.l_n[number, :, state] + n), n, solved.pe_earth[number, state]]
        nodes = board_nodes(dense, name)
        v[nodes] = phasors[: len(nodes)]
    return v


def from_engine(dense: Dense, volts: dict[str, complex]) -> np.ndarray:
    """Potentials [nodes] of another engine's answer, by the names of its drawing."""
    numbers = {"L0": "1", "L1": "2", "L2": "3", "N": "4", "PE": "5"}
    names = {"star": "star.1", "star point": "star.4"}
    for node in dense.nodes:
        if node not in names:
            bus, _, part = node.rpartition(".")
            names[node] = f"{dense.bus(bus).lower()}.{numbers[part]}"
    return np.array([volts[names[node]] for node in dense.nodes])


def filled(dense: Dense, v: np.ndarray, emf: np.ndarray, states: LoadStates, state: int) -> np.ndarray:
    """Unknowns with nan replaced by what Kirchhoff's law gives there; these nodes have no loads, so it is linear."""
    gaps = np.flatnonzero(np.tile(np.isnan(v), 2))
    x = np.nan_to_num(np.concatenate([v.real, v.imag]))
    if len(gaps):
        slope = dense.jacobian(x, states, state)[np.ix_(gaps, gaps)]
        x[gaps] -= np.linalg.solve(slope, dense.mismatch(x, emf, states, state)[gaps])
    return x


def way_to_rest(
    dense: Dense, x: np.ndarray, emf: np.ndarray, states: LoadStates, state: int
) -> tuple[float, np.ndarray]:
    """Largest move of any node [V] from unknowns x to where Newton's method comes to rest, and that place.

    Infinite where it does not.
    """
    found = x
    for _ in range(STEPS):
        step = np.linalg.solve(dense.jacobian(found, states, state), dense.mismatch(found, emf, states, state))
        found = found - step
        if not np.isfinite(found).all():
            return np.inf, x
        if np.abs(step).max() < STILL_V:
            return float(np.abs(dense.potentials(found - x)).max()), found
    return np.inf, x


def slope_sign(dense: Dense, x: np.ndarray, states: LoadStates, state: int) -> int:
    """Sign of the determinant of the equations' slope at unknowns x; it changes only where two roots touch."""
    return int(np.linalg.slogdet(dense.jacobian(x, states, state))[0])


def stability(dense: Dense, x: np.ndarray, states: LoadStates, state: int) -> float:
    """Least work [ohm] that moving the broken neutral against its joint takes at unknowns x; negative: it runs away.

    Least eigenvalue of the symmetric part of the 2 x 2 real impedance between the ends of the break, joint included.
    """
    assert dense.broken is not None
    above, below = (dense.nodes[dense.root(name)] for name in dense.broken)
    count = len(dense.nodes)
    port = np.zeros((2 * count, 2))
    for k in (0, 1):
        port[below + k * count, k], port[above + k * count, k] = 1, -1
    impedance = port.T @ np.linalg.solve(dense.jacobian(x, states, state), port)
    return float(np.linalg.eigvalsh((impedance + impedance.T) / 2)[0])
