"""The search over on/off combinations against trying every one of them, and what its bound promises."""

import numpy as np
import pytest

from relaycfg.study.branch_and_bound import CLOSE, largest_ratio

EMF = 230 * np.exp(-2j * np.pi * np.arange(3) / 3)
KINDS = {
    "inductive": lambda rng, n: -rng.uniform(0, 0.8, n),
    "with capacitors": lambda rng, n: np.where(rng.random(n) < 0.2, np.pi / 2, -rng.uniform(0, 0.8, n)),
    "both signs": lambda rng, n: np.where(rng.random(n) < 0.2, 1, -1) * rng.uniform(0, 1.2, n),
    "with generation": lambda rng, n: -rng.uniform(0, 0.6, n) + np.pi * (rng.random(n) < 0.2),
    "any angle": lambda rng, n: rng.uniform(-np.pi, np.pi, n),
}


def star(rng: np.random.Generator, switches: int, kind: str, fixed_s: float) -> tuple[np.ndarray, ...]:
    """Millman's sums of loads on three lines, lognormal in size: a0 [lines], a [lines, switches], b0, b [switches]."""
    y = rng.lognormal(0, 1, switches) * np.exp(1j * KINDS[kind](rng, switches))
    lines = rng.integers(0, 3, switches)
    return fixed_s * EMF, y * (EMF[:, None] - EMF[lines]), complex(fixed_s), y


def every_combination(a0: np.ndarray, a: np.ndarray, b0: complex, b: np.ndarray) -> float:
    """The largest ratio by trying them all."""
    on = (np.arange(2 ** len(b))[:, None] >> np.arange(len(b)) & 1).astype(float)
    over = np.abs(b0 + on @ b)
    sound = over > 1e-9 * np.abs(b).sum()
    return float((np.abs(a0[:, None] + a @ on.T)[:, sound] / over[sound]).max())


@pytest.mark.parametrize("kind", KINDS)
@pytest.mark.parametrize("fixed_s", [0.0, 0.05])
def test_search_finds_the_largest_of_all_combinations_and_never_bounds_below_it(kind: str, fixed_s: float) -> None:
    missed = []
    for seed in range(30):
        rng = np.random.default_rng([seed, *map(ord, kind)])
        problem = star(rng, int(rng.integers(1, 13)), kind, fixed_s)
        found, truth = largest_ratio(*problem, 50_000), every_combination(*problem)
        over = problem[2] + found.on @ problem[3]
        again = abs(problem[0][found.row] + problem[1][found.row] @ found.on) / abs(over)
        assert found.ratio == pytest.approx(again, rel=1e-9)
        assert found.bound >= truth * (1 - 1e-9)
        missed.append(truth / found.ratio - 1)
    assert max(missed) < CLOSE


@pytest.mark.parametrize("kind", ["inductive", "with capacitors"])
def test_sixteen_loads_agree_with_all_65536_combinations(kind: str) -> None:
    for seed in range(2):
        problem = star(np.random.default_rng(seed), 16, kind, 0.02)
        found, truth = largest_ratio(*problem, 50_000), every_combination(*problem)
        assert found.ratio == pytest.approx(truth, rel=CLOSE)
        assert truth * (1 - 1e-9) <= found.bound <= truth * (1 + 2 * CLOSE)


@pytest.mark.parametrize("kind", ["inductive", "both signs"])
def test_forty_switchable_loads_are_proved_within_the_node_limit(kind: str) -> None:
    for seed in range(3):
        found = largest_ratio(*star(np.random.default_rng(seed), 40, kind, 0.01), 50_000)
        assert found.nodes < 50_000
        assert found.bound <= found.ratio * (1 + CLOSE)


def test_where_forty_loads_with_bare_capacitors_are_not_settled_the_gap_is_told() -> None:
    """Bare capacitors can cancel inductive load, which leaves the bound open for long; the search ends all the same."""
    found = largest_ratio(*star(np.random.default_rng(0), 40, "with capacitors", 0.01), 5_000)
    assert found.nodes < 6_000
    assert found.bound > found.ratio * (1 + CLOSE)


def test_a_search_cut_short_still_bounds_what_the_whole_search_finds() -> None:
    for seed in range(10):
        problem = star(np.random.default_rng(seed), 14, "with capacitors", 0.01)
        assert largest_ratio(*problem, 3).bound >= largest_ratio(*problem, 50_000).ratio


def test_loads_that_can_cancel_each_other_have_no_bound_while_the_search_is_short() -> None:
    """G and -G on one line: together they leave nothing to hold the neutral, and V = A / 0."""
    y = np.array([1.0, -1.0 + 1e-12j, 0.5, 0.3, 0.2])
    lines = np.array([0, 0, 1, 2, 1])
    found = largest_ratio(np.zeros(3, complex), y * (EMF[:, None] - EMF[lines]), 0j, y, 3)
    assert found.bound == np.inf
