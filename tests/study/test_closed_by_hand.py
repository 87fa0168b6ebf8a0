"""Closed corridors: what no setting clears, what blocks it and how near the nearest setting is, worked by hand."""

from pathlib import Path

import numpy as np
import pytest

from relaycfg.model.device import Function
from relaycfg.study.choice import harmful_states
from relaycfg.study.closed import blocked, closed_groups
from tests.study.hand_corridor import evidence, states
from tests.study.small_grids import drawn_grids, drawn_states


def test_the_states_that_no_setting_clears_are_grouped_by_what_blocks_them(tmp_path: Path) -> None:
    # 285 V 0.5 s: 280 V needs 0.66 s because of case 8, 320 V would be fast enough 35 V higher. 250 V: below 260 V the
    # standing volts never reset, 260 V lies 10 V higher. 230 V is below every pickup, the first with a delay is 260 V.
    own = evidence(tmp_path, states())
    left = blocked(own, harmful_states(own.scenarios))
    assert left[0].tolist() == [False, False, True, False, True, True]
    found = closed_groups(own, left)
    assert [g.core for g in found] == [True, False, False]
    first, *others = found
    assert (first.blockers, first.scenarios, first.worst_l_n_v) == ({"59": "case 8, short swell"}, 1, 285.0)
    assert (first.overlap_s, first.overlap_v) == pytest.approx((0.16, 35.0))
    assert "(59: case 8)" in first.sentence
    assert "0.16 s faster or 35.0 V more sensitive" in first.sentence
    by_blocker = {g.blockers["59"]: g for g in others}
    assert set(by_blocker) == {"case 1, upper limit", "out of its range"}
    assert by_blocker["case 1, upper limit"].overlap_s is None
    assert by_blocker["case 1, upper limit"].overlap_v == pytest.approx(10.0)
    assert by_blocker["out of its range"].overlap_v == pytest.approx(30.0)


def test_a_deadline_shorter_than_the_shortest_time_is_blocked_by_the_device_itself(tmp_path: Path) -> None:
    # 320 V and 0.1 s clear in 0.16 s: 0.06 s too late for 0.1 s, and no pickup is fast enough.
    own = evidence(tmp_path, states(volts=[325.0, 330.0], deadline_s=[0.1, 0.09]))
    found = closed_groups(own, blocked(own, harmful_states(own.scenarios)))
    assert [(g.core, g.blockers["59"], g.scenarios) for g in found] == [
        (True, "its own shortest time", 1),
        (False, "its own shortest time", 1),
    ]
    assert [g.overlap_s for g in found] == pytest.approx([0.07, 0.06])
    assert all(g.overlap_v is None for g in found)


def test_groups_of_several_scenario_sets_add_up(tmp_path: Path) -> None:
    low = states("lower limit", volts=[285.0, 290.0], deadline_s=[0.5, 0.6], core=np.array([True, True]))
    own = evidence(tmp_path, states(), low)
    first = closed_groups(own, blocked(own, harmful_states(own.scenarios)))[0]
    assert (first.scenarios, first.worst_l_n_v) == (3, 290.0)
    assert (first.overlap_s, first.overlap_v) == pytest.approx((0.06, 30.0))
    assert first.sentence.startswith("break at Main: 3 scenarios up to 290 V that no secure setting clears")


@pytest.mark.parametrize("seed", range(40))
def test_blocked_are_the_states_that_no_secure_pickup_and_delay_clears(seed: int, tmp_path: Path) -> None:
    # Against the step machine and the definitions, over every pickup and delay of both elements.
    rng = np.random.default_rng(seed)
    functions = (Function.OVERVOLTAGE, Function.DISPLACEMENT) if seed % 2 else (Function.UNDERVOLTAGE,)
    grids = drawn_grids(rng, functions, pickups=5, delays=4, stages=1)
    scenarios = (drawn_states(rng, functions, 40), drawn_states(rng, functions, 20))
    base = evidence(tmp_path, *scenarios, own=grids[0].ladder)
    base.ladders.update({g.function: g.ladder for g in grids})
    wanted = harmful_states(scenarios)
    cleared = np.logical_or.reduce([g.every_clears(scenarios)[g.secure()].any(axis=0) for g in grids])
    found = np.concatenate(blocked(base, wanted))
    assert (found == (np.concatenate(wanted) & ~cleared)).all()
    assert sum(g.scenarios for g in closed_groups(base, blocked(base, wanted))) == found.sum()
