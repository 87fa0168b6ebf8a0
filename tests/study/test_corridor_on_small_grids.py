"""Corridor against brute force: every set of stages on small random grids, judged by definitions and step machine."""

from dataclasses import replace
from functools import cache

import numpy as np
import pytest

from relaycfg.model.device import Function
from relaycfg.model.settings import Settings, Stage
from relaycfg.study.evidence import Evidence, gather
from relaycfg.study.joint import joint_core
from relaycfg.study.scenarios import Scenarios
from relaycfg.study.settle import settle
from tests.study import yard
from tests.study.small_grids import Grid, drawn_grids, drawn_states, joined, sets_of

OVER, UNDER, SHIFT = Function.OVERVOLTAGE, Function.UNDERVOLTAGE, Function.DISPLACEMENT
PAIRS = ((OVER, UNDER), (OVER, SHIFT), (UNDER, SHIFT))
MOST_BITS = 64
"""Core states of a grid, so that the states a set clears are the bits of one number."""

Enumerated = tuple[np.ndarray, np.ndarray, np.ndarray]


@cache
def numbered_sets(knobs: int, stages: int) -> list[np.ndarray]:
    """The same sets for every grid of that size."""
    return sets_of(knobs, stages)


def enumerated(grid: Grid, scenarios: tuple[Scenarios, ...], core: np.ndarray) -> Enumerated:
    """Every set of stages of one element: core states cleared as bits, whether it is secure, how many stages."""
    secure, clears = grid.secure(), grid.every_clears(scenarios)[:, core]
    bits = (clears.astype(np.uint64) << np.arange(clears.shape[1], dtype=np.uint64)).sum(axis=1, dtype=np.uint64)
    found = []
    for chosen in numbered_sets(len(bits), grid.ladder.element.stages):
        count = chosen.shape[1]
        found.append(
            (np.bitwise_or.reduce(bits[chosen], axis=1), secure[chosen].all(axis=1), np.full(len(chosen), count))
        )
    cleared, secure_sets, stages = (np.concatenate(part) for part in zip(*found, strict=True))
    return cleared, secure_sets, stages


def best_joint(one: Enumerated, other: Enumerated) -> tuple[int, int]:
    """Most core states that any secure joint set clears, and the fewest stages that clear as many."""
    covered = np.bitwise_count(one[0][:, np.newaxis] | other[0]).astype(int)
    covered[~(one[1][:, np.newaxis] & other[1])] = -1
    stages = one[2][:, np.newaxis] + other[2]
    most = int(covered.max())
    return most, int(stages[covered == most].min())


def drawn(seed: int, stages: int = 2) -> tuple[tuple[Grid, ...], tuple[Scenarios, ...], np.ndarray]:
    """Two elements, two scenario sets, and which of their states are core and have to be cleared."""
    rng = np.random.default_rng(seed)
    functions = PAIRS[seed % len(PAIRS)]
    grids = drawn_grids(rng, functions, pickups=5, delays=4, stages=stages)
    scenarios = (drawn_states(rng, functions, 90), drawn_states(rng, functions, 60))
    core = joined(scenarios, "core") & joined(scenarios, "harmful") & joined(scenarios, "resolved")
    assert core.sum() <= MOST_BITS
    return grids, scenarios, core


def split(mask: np.ndarray, scenarios: tuple[Scenarios, ...]) -> tuple[np.ndarray, ...]:
    return tuple(np.split(mask, np.cumsum([len(s.deadline_s) for s in scenarios])[:-1]))


def joint_mismatches(seed: int) -> list[str]:
    """What the joint search says otherwise than the enumeration."""
    grids, scenarios, core = drawn(seed, stages=2 + seed % 2)
    found = joint_core({g.function: g.ladder for g in grids}, scenarios, split(core, scenarios))
    cleared, stages, wrong = np.zeros(len(core), bool), 0, []
    for grid in grids:
        ladder = grid.ladder
        for rung in found[grid.function]:
            pickup, delay_s = float(ladder.pickups[rung.pickup]), float(ladder.delays[rung.delay])
            cleared |= np.concatenate([grid.clears(pickup, delay_s, s) for s in scenarios])
            if not grid.holds(pickup, delay_s, ladder.dropout_ratio, ladder.reset, ladder.hold_s):
                wrong.append(f"{seed}: {grid.function} {pickup} V {delay_s} s trips")
        stages += len(found[grid.function])
    one, other = (enumerated(g, scenarios, core) for g in grids)
    if (int((cleared & core).sum()), stages) != best_joint(one, other):
        wrong.append(f"{seed}: {int((cleared & core).sum())} core by {stages} stages, not {best_joint(one, other)}")
    return wrong


def test_no_secure_joint_set_clears_more_core_or_as_much_with_fewer_stages() -> None:
    assert [line for seed in range(160) for line in joint_mismatches(seed)] == []


@pytest.mark.parametrize("seed", range(500, 512))
def test_three_elements_together_clear_the_greatest_core(seed: int) -> None:
    rng = np.random.default_rng(seed)
    functions = (OVER, UNDER, SHIFT)
    grids = drawn_grids(rng, functions, pickups=4, delays=3, stages=2)
    scenarios = (drawn_states(rng, functions, 100),)
    core = joined(scenarios, "core") & joined(scenarios, "harmful")
    found = joint_core({g.function: g.ladder for g in grids}, scenarios, (core,))
    one, other, last = (enumerated(g, scenarios, core) for g in grids)
    pairs = np.bitwise_or.outer(one[0][one[1]], other[0][other[1]]).ravel()
    stages = np.add.outer(one[2][one[1]], other[2][other[1]]).ravel()
    cleared = np.bitwise_count(np.bitwise_or.outer(pairs, last[0][last[1]])).astype(int)
    fewest = int(np.add.outer(stages, last[2][last[1]])[cleared == cleared.max()].min())
    mine = np.zeros(len(core), bool)
    for grid in grids:
        for rung in found[grid.function]:
            ladder = grid.ladder
            mine |= grid.clears(float(ladder.pickups[rung.pickup]), float(ladder.delays[rung.delay]), scenarios[0])
    assert (int((mine & core).sum()), sum(map(len, found.values()))) == (cleared.max(), fewest)


def test_on_most_grids_the_courses_close_part_of_the_corridor() -> None:
    limited = 0
    for seed in range(30):
        grids, scenarios, core = drawn(seed)
        found = [enumerated(g, scenarios, core) for g in grids]
        most, _ = best_joint(*found)
        limited += 0 < most < best_joint(*((bits, np.ones_like(secure), n) for bits, secure, n in found))[0]
    assert limited > 20


@pytest.fixture(scope="module")
def base(tmp_path_factory: pytest.TempPathFactory) -> Evidence:
    """A whole study to put the grids into."""
    site = yard.site(tmp_path_factory.mktemp("site"))
    assert site.relay is not None
    return gather(site, site.relay, 2, 1)


def settled(base: Evidence, grids: tuple[Grid, ...], scenarios: tuple[Scenarios, ...]) -> Settings:
    judgement = grids[0].ladder.judgement
    return settle(
        replace(
            base,
            site=replace(base.site, judgement=judgement),
            relay=grids[0].ladder.relay,
            ladders={g.function: g.ladder for g in grids},
            scenarios=scenarios,
        )
    ).settings


def insecure(grids: tuple[Grid, ...], settings: Settings) -> list[str]:
    """Active stages that the step machine trips, with the drop-out and reset they were given."""
    return [
        s.label
        for g in grids
        for s in settings.of(g.function)
        if s.on and not g.holds(s.pickup, s.delay_s, s.dropout_ratio, s.reset, s.hold_s)
    ]


def active(grid: Grid, settings: Settings) -> list[Stage]:
    """Its stages that are on."""
    return [s for s in settings.of(grid.function) if s.on]


def test_derived_settings_clear_the_greatest_core_and_hold_through_every_course(base: Evidence) -> None:
    wrong = []
    for seed in range(1000, 1120):
        grids, scenarios, core = drawn(seed)
        settings = settled(base, grids, scenarios)
        cleared = np.logical_or.reduce([g.stage_clears(active(g, settings), scenarios) for g in grids])
        most, _ = best_joint(*(enumerated(g, scenarios, core) for g in grids))
        if int((cleared & core).sum()) != most:
            wrong.append(f"{seed}: {int((cleared & core).sum())} core states, not {most}")
        wrong += [f"{seed}: {label} trips" for label in insecure(grids, settings)]
    assert wrong == []


def best_alone(
    grid: Grid, scenarios: tuple[Scenarios, ...], wanted: np.ndarray, core: np.ndarray
) -> tuple[int, int, int]:
    """Most core and, with it, most states that a secure set clears; fewest stages that keep that core and share."""
    secure, clears = grid.secure(), grid.every_clears(scenarios)
    scores = []
    for chosen in numbered_sets(len(secure), grid.ladder.element.stages):
        for knobs in chosen[secure[chosen].all(axis=1)]:
            cleared = clears[knobs].any(axis=0)
            scores.append((int((cleared & core).sum()), int((cleared & wanted).sum()), len(knobs)))
    most_core, most, _ = max(scores)
    kept = grid.ladder.judgement.cover_kept * most
    return most_core, most, min(n for c, w, n in scores if c == most_core and w >= kept)


def test_one_element_keeps_the_greatest_core_and_its_share_of_the_rest_with_fewest_stages(base: Evidence) -> None:
    wrong = []
    for seed in range(2000, 2060):
        rng = np.random.default_rng(seed)
        grids = drawn_grids(rng, ((OVER,), (UNDER,))[seed % 2], pickups=5, delays=4, stages=2)
        scenarios = (drawn_states(rng, (grids[0].function,), 150), drawn_states(rng, (grids[0].function,), 50))
        wanted = joined(scenarios, "harmful") & joined(scenarios, "resolved")
        core = wanted & joined(scenarios, "core")
        settings = settled(base, grids, scenarios)
        stages = active(grids[0], settings)
        cleared = grids[0].stage_clears(stages, scenarios)
        most_core, most, fewest = best_alone(grids[0], scenarios, wanted, core)
        have = int((cleared & core).sum()), int((cleared & wanted).sum()), len(stages)
        if have[0] != most_core or have[1] < grids[0].ladder.judgement.cover_kept * most or have[2] != fewest:
            wrong.append(f"{seed}: {have}, not {(most_core, most, fewest)}")
        wrong += [f"{seed}: {label} trips" for label in insecure(grids, settings)]
    assert wrong == []
