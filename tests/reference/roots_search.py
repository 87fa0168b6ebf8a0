"""All roots of one load state with a broken neutral: a general root finder from many starts on the dense equations.

Whether all were found is checked by degree theory (own algebra): outside their bands loads are constant impedances, so
the equations are a linear map plus something bounded, and the signs of the slope's determinant at all roots add up to
its sign far away. So the number of roots is odd where no two of them touch, and a root left out alone shows.
"""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from scipy.optimize import root

from relaycfg.network import LoadStates
from tests.network.dense import LINES, Dense
from tests.reference.roots_at_rest import slope_sign, stability, way_to_rest

SAME_V = 1e-3
"""Roots nearer to each other at every node are one."""
RADII = (0.2, 0.45, 0.7, 0.95, 1.2)
ANGLES = 12
MORE_STARTS = 300
FAR_V = 1e6


@dataclass(frozen=True)
class Roots:
    """Distinct unknowns of one state, how stable each is [ohm], and whether their signs add up."""

    found: list[np.ndarray]
    stability: list[float]
    complete: bool

    def nearest(self, x: np.ndarray) -> tuple[int, float]:
        """Number of the root nearest to unknowns x, and the largest distance of a node [V]; inf without roots."""
        away = [far(x, other) for other in self.found]
        return (int(np.argmin(away)), min(away)) if away else (-1, np.inf)


@dataclass(frozen=True)
class Question:
    """One state of a site with a broken neutral."""

    dense: Dense
    emf: np.ndarray
    states: LoadStates
    state: int

    def sign(self, x: np.ndarray) -> int:
        """Sign of the slope's determinant."""
        return slope_sign(self.dense, x, self.states, self.state)

    def sign_far(self) -> int:
        """Its sign with every load above its band."""
        x = np.random.default_rng(0).normal(size=2 * len(self.dense.nodes)) * FAR_V
        return self.sign(x)

    def rest(self, x: np.ndarray) -> np.ndarray | None:
        """Where a general root finder and then Newton's method come to rest from x, if they do."""
        found = root(
            self.dense.mismatch,
            x,
            args=(self.emf, self.states, self.state),
            jac=lambda y, *_: self.dense.jacobian(y, self.states, self.state),
            tol=1e-10,
        ).x
        way, place = way_to_rest(self.dense, found, self.emf, self.states, self.state)
        return place if np.isfinite(way) else None

    def starts(self, displacements: Iterator[complex]) -> Iterator[np.ndarray]:
        """Lines at their EMFs, neutrals behind the break (and what hangs on them) at each displacement [V]."""
        dense = self.dense
        assert dense.broken is not None
        island = {dense.root(dense.broken[1])}
        sound = [{dense.root(a), dense.root(b)} for a, b, _ in dense.conductors if "earth" not in (a, b)]
        sound = [ends for ends in sound if ends != {dense.root(name) for name in dense.broken}]
        while more := set().union(*(ends for ends in sound if ends & island)) - island:
            island |= more
        base = dense.potentials(dense.flat(self.emf))
        for line in LINES:
            for board in dense.site.boards:
                base[dense.nodes[dense.root(f"{board.name}.L{line}")]] = self.emf[line]
        inside = np.array([node in island for node in dense.nodes])
        for w in displacements:
            v = np.where(inside, w, base)
            yield np.concatenate([v.real, v.imag])


def displacements(emf_v: float) -> Iterator[complex]:
    """No displacement, then circles up to 1.2 of the EMF, each turned against the last."""
    yield 0j
    for number, radius in enumerate(RADII):
        for k in range(ANGLES):
            yield radius * emf_v * np.exp(2j * np.pi * (k + 0.5 * (number % 2)) / ANGLES)


def scattered(emf_v: float, seed: int) -> Iterator[complex]:
    """MORE_STARTS random displacements up to 1.5 of the EMF."""
    rng = np.random.default_rng(seed)
    for _ in range(MORE_STARTS):
        yield 1.5 * emf_v * np.sqrt(rng.random()) * np.exp(2j * np.pi * rng.random())


def search(question: Question, also: tuple[np.ndarray, ...] = ()) -> Roots:
    """Roots from all starts of ``displacements`` and from the unknowns ``also``; random ones until the signs add up."""
    found: list[np.ndarray] = []
    emf_v, target = float(np.abs(question.emf).max()), question.sign_far()

    def complete() -> bool:
        return sum(question.sign(x) for x in found) == target

    def enter(start: np.ndarray) -> None:
        x = question.rest(start)
        if x is not None and all(far(x, other) > SAME_V for other in found):
            found.append(x)

    for start in (*question.starts(displacements(emf_v)), *also):
        enter(start)
    for start in question.starts(scattered(emf_v, 1)):
        if complete():
            break
        enter(start)
    dense, states, state = question.dense, question.states, question.state
    return Roots(found, [stability(dense, x, states, state) for x in found], complete())


def far(x: np.ndarray, other: np.ndarray) -> float:
    """Largest distance of a node [V]."""
    apart = x - other
    half = len(apart) // 2
    return float(np.hypot(apart[:half], apart[half:]).max())
