"""Where the joint sets are too many to be searched whole, elements improved in turn stay secure and lose nothing."""

import numpy as np
import pytest

from relaycfg.model.device import Function
from relaycfg.study import joint
from tests.study.small_grids import drawn_grids, drawn_states, joined
from tests.study.test_corridor_on_small_grids import enumerated, split

THREE = (Function.OVERVOLTAGE, Function.UNDERVOLTAGE, Function.DISPLACEMENT)


TWO = (Function.OVERVOLTAGE, Function.DISPLACEMENT)
NOT_AT_ONCE = (6024, 6132, 6151)
"""Grids on which one round does not settle two elements."""
DRAWN = [*((THREE, seed) for seed in range(5000, 5030)), *((TWO, seed) for seed in NOT_AT_ONCE)]


@pytest.mark.parametrize(("functions", "seed"), DRAWN)
def test_in_turn_no_other_choice_of_one_element_clears_more(
    functions: tuple[Function, ...], seed: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    # Brute force over the grid of each element, the stages of the others left as chosen.
    monkeypatch.setattr(joint, "MOST_SETS", 0)
    rng = np.random.default_rng(seed)
    grids = drawn_grids(rng, functions, pickups=5, delays=4, stages=2)
    scenarios = (drawn_states(rng, functions, 90), drawn_states(rng, functions, 60))
    core = joined(scenarios, "core") & joined(scenarios, "harmful") & joined(scenarios, "resolved")
    found = joint.joint_core({g.function: g.ladder for g in grids}, scenarios, split(core, scenarios))
    cleared = {}
    for grid in grids:
        own = np.zeros(len(core), bool)
        for rung in found[grid.function]:
            pickup, delay_s = float(grid.ladder.pickups[rung.pickup]), float(grid.ladder.delays[rung.delay])
            own |= np.concatenate([grid.clears(pickup, delay_s, s) for s in scenarios])
            assert grid.holds(pickup, delay_s, grid.ladder.dropout_ratio, grid.ladder.reset, grid.ladder.hold_s)
        cleared[grid.function] = own[core]
    together = int(np.logical_or.reduce(list(cleared.values())).sum())
    for grid in grids:
        theirs = np.logical_or.reduce([c for f, c in cleared.items() if f is not grid.function])
        bits = np.uint64(sum(1 << k for k in np.flatnonzero(theirs).tolist()))
        masks, secure, _ = enumerated(grid, scenarios, core)
        assert together == int(np.bitwise_count(masks[secure] | bits).max())
