"""Loads laid on the lines at random or in every way: what the solver makes of many states, as shares and means."""

from itertools import product
from pathlib import Path
from typing import Any

import numpy as np

from relaycfg.network import LoadStates, Network, Solved
from tests.reference.setting import Setting, setting

SEED = 20260


def every(folder: Path, given: dict[str, Any]) -> dict[str, Any]:
    """Neutral currents over all ways to lay ``load_a`` amperes on the lines; the site has a load of 1 A a line."""
    amperes = np.array(given.pop("load_a"))
    made = setting(folder, given | {"at": "none"})
    lines = np.array(list(product(range(3), repeat=len(amperes))))
    neutral = np.abs(_solve(made, _on_lines(lines, np.broadcast_to(amperes, lines.shape))).neutral_a[-1])
    return {
        "allocations_count": len(lines),
        "mean_square_neutral_a": (neutral**2).mean(),
        "largest_neutral_a": neutral.max(),
    }


def sample(folder: Path, given: dict[str, Any]) -> dict[str, Any]:
    """Shares over ``states_count`` states of ``customers_count`` customers on the site's load of 1 A a line.

    Their amperes are spread evenly from the first to the second of ``spread_a``, or drawn log-normal of mean 1 A and
    coefficient of variation ``cv_ratio``; the lines are drawn at random or taken cyclically. ``exceed_a`` and
    ``exceed_v`` are what the neutral current and the highest phase are held against.
    """
    states, customers = given.pop("states_count"), int(given.pop("customers_count"))
    exceed_a, exceed_v = given.pop("exceed_a", np.inf), given.pop("exceed_v", np.inf)
    rng = np.random.default_rng([SEED, customers])
    shape = (states, customers)
    if "spread_a" in given:
        amperes = np.broadcast_to(np.linspace(*given.pop("spread_a"), customers), shape)
    else:
        sigma = np.sqrt(np.log1p(given.pop("cv_ratio") ** 2))
        amperes = rng.lognormal(-(sigma**2) / 2, sigma, shape)
    order = {"random": lambda: rng.integers(3, size=shape), "cyclic": lambda: np.arange(customers) % 3}
    lines = np.broadcast_to(order[given.pop("allocation")](), shape)
    made = setting(folder, given)
    solved = _solve(made, _on_lines(lines, amperes))
    l_n, neutral = np.abs(solved.l_n[-1]), np.abs(solved.neutral_a[-1])
    rms = np.sqrt((np.abs(solved.joint_v) ** 2).mean()) / made.site.supply.nominal_v
    return {
        "rms_shift_ratio": rms,
        "above_percent": 100 * (l_n.max(axis=0) > exceed_v).mean(),
        "exceed_percent": 100 * (neutral > exceed_a).mean(),
    }


def _on_lines(lines: np.ndarray, amperes: np.ndarray) -> np.ndarray:
    """Factors [lines, states] from the line and the amperes [states, customers] of every customer."""
    return np.array([np.where(lines == k, amperes, 0.0).sum(axis=1) for k in range(3)])


def _solve(made: Setting, factors: np.ndarray) -> Solved:
    count = factors.shape[1]
    states = LoadStates(factors, np.empty((0, count), np.int8), tuple(map(str, range(count))))
    solved = Network(made.site).solve(made.at, states, made.emf)
    if not solved.converged.all():
        raise ValueError("the solver did not come to rest")
    return solved
