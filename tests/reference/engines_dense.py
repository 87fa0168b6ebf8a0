"""The other engines' random sites by the plain dense solve: every board, sound and broken, to a microvolt."""

from collections import Counter
from collections.abc import Iterator
from dataclasses import dataclass, field

import numpy as np

from relaycfg.network import Network, Solved
from tests.network.dense import Dense
from tests.reference.engines_sites import EARTHINGS, LAWS, cases, emf_of, kind_of, random_site, states_of, with_motors
from tests.reference.roots_at_rest import filled, from_package
from tests.reference.table import Row

FEW, MANY = 24, 96
LIMIT_V = 1e-6
RESIDUAL_A = 1e-8
UNTIED = "states of sites without any electrode, without their potentials to earth (undefined)"
LEFT = "states the package left moving and says so"


@dataclass
class Compared:
    """States compared, worst difference [V], and what was not compared by reason."""

    networks: int = 0
    states: int = 0
    worst_v: float = 0.0
    elsewhere: int = 0
    """States whose dense solve first came to rest on another root; solved again from the package's answer."""
    left: Counter[str] = field(default_factory=Counter)

    def add(self, other: "Compared") -> None:
        """Take in another one."""
        self.networks += other.networks
        self.states += other.states
        self.worst_v = max(self.worst_v, other.worst_v)
        self.elsewhere += other.elsewhere
        self.left += other.left


def compare(seed: int) -> Compared:
    """One network with motors, one break place with each joint and the sound network, two load states."""
    made, compared = with_motors(random_site(seed), seed), Compared(networks=1)
    network, states, emf = Network(made), states_of(made, seed), emf_of(made)
    place = made.places[seed % len(made.places)]
    for where, joint_ohm in (case for case in cases(made) if case[0] in ("none", place)):
        solved, dense = network.solve(where, states, emf, joint_ohm), Dense(made, where, joint_ohm)
        for state in range(states.count):
            if not solved.converged[state]:
                compared.left[LEFT] += 1
                continue
            compared.states += 1
            untied = bool(np.isnan(solved.n_earth[0, state]))
            compared.left[UNTIED] += untied
            x = dense.solve(emf, states, state)
            worst = difference(dense, network, solved, state, x)
            if not worst <= LIMIT_V and not untied:
                compared.elsewhere += 1
                begin = filled(dense, from_package(dense, network, solved, state), emf, states, state)
                x = dense.solve(emf, states, state, begin)
                worst = difference(dense, network, solved, state, x)
            if not np.abs(dense.mismatch(x, emf, states, state)).max() < RESIDUAL_A:
                worst = np.inf
            compared.worst_v = max(compared.worst_v, worst)
    return compared


def difference(dense: Dense, network: Network, solved: Solved, state: int, x: np.ndarray) -> float:
    """Largest difference [V] over all boards: lines to neutral, neutral to PE, both to earth where that is defined.

    Raises AssertionError where the two do not agree on which boards have a PE.
    """
    worst = 0.0
    for number, name in enumerate(network.boards):
        l_n, n_earth, pe_earth = dense.board(x, name)
        assert np.isnan(solved.n_pe[number, state]) == np.isnan(pe_earth), f"{name}: PE or none"
        found = [*(solved.l_n[number, :, state] - l_n)]
        if not np.isnan(pe_earth):
            found.append(solved.n_pe[number, state] - (n_earth - pe_earth))
        if not np.isnan(solved.n_earth[number, state]):
            found.append(solved.n_earth[number, state] - n_earth)
        worst = max(worst, float(np.abs(found).max()))
    return worst


def rows(quick: bool = False) -> Iterator[Row]:
    """MANY networks (FEW if quick), a row for each earthing and load law."""
    for earthing, law in ((e, law) for law in dict.fromkeys(LAWS) for e in EARTHINGS):
        total = Compared()
        for seed in range(FEW if quick else MANY):
            if kind_of(seed) == (earthing, law):
                total.add(compare(seed))
        note = f"{total.networks} networks, {total.states} states; came to rest elsewhere first: {total.elsewhere}"
        note += "".join(f"; {count} {reason}" for reason, count in sorted(total.left.items()) if count)
        yield Row(f"dense solve, {earthing}, {law}", "nodal equations, root finder", total.worst_v, LIMIT_V, "V", note)
