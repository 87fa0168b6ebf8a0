"""The chosen stages of all elements together clear the greatest core: joint enumeration on small grids."""

from itertools import combinations, product

import numpy as np
import pytest

from relaycfg.model.device import Function
from relaycfg.study.choice import Rung, covered_by
from relaycfg.study.joint import joint_core
from relaycfg.study.ladder import Ladder
from relaycfg.study.scenarios import Scenarios
from tests.study.test_choice import ladder, scenario

FUNCTIONS = (Function.OVERVOLTAGE, Function.UNDERVOLTAGE)


def both(seed: int) -> tuple[dict[Function, Ladder], Scenarios]:
    rng = np.random.default_rng(seed)
    ladders = {f: ladder(rng, 1 + (seed + k) % 2, f) for k, f in enumerate(FUNCTIONS)}
    states = scenario(rng, FUNCTIONS[0], 80)
    states.severity[FUNCTIONS[1]] = -rng.uniform(120, 230, 80)
    return ladders, states


def secure_sets(own: Ladder) -> list[tuple[Rung, ...]]:
    """Every set of secure (pickup, delay) pairs up to the element's stages; of each pickup the fastest is enough."""
    reach = own.ride_through().seconds
    pairs = []
    for k in range(len(own.pickups)):
        secure = np.flatnonzero(own.shortest > reach[k])
        if len(secure):
            pairs.append(Rung(k, int(secure[0]), 0.0))
    return [subset for count in range(own.element.stages + 1) for subset in combinations(pairs, count)]


@pytest.mark.parametrize("seed", range(20))
def test_no_joint_set_clears_more_core(seed: int) -> None:
    ladders, states = both(seed)
    core = states.harmful & states.core
    found = joint_core(ladders, (states,), (core,))
    cleared = np.logical_or.reduce([covered_by(ladders[f], found[f], states) for f in ladders])
    best = 0
    masks = {f: [covered_by(own, subset, states) & core for subset in secure_sets(own)] for f, own in ladders.items()}
    for one, other in product(*masks.values()):
        best = max(best, int((one | other).sum()))
    assert int((cleared & core).sum()) == best
