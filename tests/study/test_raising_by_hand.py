"""Security margins are raised to the cap, to the deadline, or to what is kept towards it: corridors worked by hand.

One swell of 270 V for 1 s, standing 245 V with drop-out 0.98 (never below 250 V), pickups by 1 V, delays by 0.1 s,
0.06 s from the delay to the open switch, no errors. A unit is 2.3 V and 10 % of time.
"""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from relaycfg.model.device import Function, SettableRange
from relaycfg.model.judgement import Judgement
from relaycfg.study.choice import Rung, best_cover, choose, demand, detection_rung, harmful_states, raise_margins
from relaycfg.study.ladder import Ladder
from relaycfg.study.settle import settle
from tests.study.hand_corridor import ELEMENT, RUNS, evidence, ladder, states

FINE = replace(ELEMENT, pickup=SettableRange(240.0, 320.0, 1.0), delay_s=SettableRange(0.1, 3.0, 0.1))
SWELL = replace(
    RUNS, severity=RUNS.severity[:1], duration_s=RUNS.duration_s[:1], names=RUNS.names[:1], cases=RUNS.cases[:1]
)


def fine(kept_units: float = 0.0, cover_kept: float = 0.98) -> Ladder:
    judgement = Judgement(margin_cap_units=2.0, cover_kept=cover_kept, deadline_kept_units=kept_units)
    return replace(ladder(FINE, SWELL), judgement=judgement)


def as_set(own: Ladder, rungs: tuple[Rung, ...]) -> list[tuple[float, float, float]]:
    return [(float(own.pickups[r.pickup]), float(own.delays[r.delay]), r.margin_units) for r in rungs]


def chosen(
    own: Ladder, volts: list[float], deadline_s: list[float], stages: int = 1
) -> list[tuple[float, float, float]]:
    scenario = states(volts=volts, deadline_s=deadline_s, core=np.ones(len(volts), bool))
    wanted = demand(own, (scenario,), harmful_states((scenario,)))
    return as_set(own, choose(own, wanted, wanted, stages))


def test_with_room_the_fastest_stage_at_the_cap_then_the_lowest_pickup() -> None:
    # 275 V less 4.6 V is the first beyond the swell: nothing picks it up, the shortest delay will do.
    assert chosen(fine(), [300.0], [5.0]) == [(275.0, 0.1, 2.0)]


def test_inside_the_swell_the_cap_costs_time() -> None:
    # Below 273 V the swell counts 1.02 s: 1.3 s is the first beyond 1.02 x 1.21; 255 V less 4.6 V is above 250 V.
    assert chosen(fine(), [273.0], [5.0]) == [(255.0, 1.3, 2.0)]


def test_a_short_deadline_takes_the_greatest_margin_that_still_meets_it() -> None:
    # 1.3 s allow 1.2 s; 1.2 / 1.02 are 1.7 units, 1.5 in quarters; 254 V less 3.45 V is above 250 V.
    assert chosen(fine(), [273.0], [1.3]) == [(254.0, 1.2, 1.5)]


def test_while_margins_are_raised_time_kept_towards_the_core_comes_before_more_security() -> None:
    # One unit kept (1.18 s) leaves 1.1 s and 0.79 unit of security, less than what is kept; half a unit (1.24 s)
    # leaves the same 1.1 s, and 0.75 is more than half. 252 V less 1.73 V is above 250 V. Nothing kept: 1.2 s.
    scenario = states(volts=[269.0], deadline_s=[1.3], core=np.ones(1, bool))
    for kept_units, expected in ((1.0, (252.0, 1.1, 0.75)), (0.0, (254.0, 1.2, 1.5))):
        own = fine(kept_units)
        wanted = demand(own, (scenario,), harmful_states((scenario,)))
        assert as_set(own, raise_margins(own, wanted, wanted, (Rung(11, 10, 0.0),))) == [expected]


def test_two_stages_are_taken_only_where_one_does_not_keep_the_share() -> None:
    # 265 V in 5 s and 300 V in 0.5 s need both; 300 V in 5 s does not, nor 1 of 100 states that may be given up.
    assert len(chosen(fine(), [265.0, 300.0], [5.0, 0.5], stages=2)) == 2
    assert len(chosen(fine(), [265.0, 300.0], [5.0, 5.0], stages=2)) == 1
    own = fine()
    scenario = states(volts=[265.0, *[300.0] * 99], deadline_s=[5.0, *[0.5] * 99], core=np.zeros(100, bool))
    wanted = demand(own, (scenario,), harmful_states((scenario,)))
    nothing = demand(own, (scenario,), (np.zeros(100, bool),))
    assert len(choose(own, wanted, nothing, 2)) == 1
    assert len(choose(replace(own, judgement=replace(own.judgement, cover_kept=1.0)), wanted, nothing, 2)) == 2


def test_no_core_state_is_given_up_for_the_rest() -> None:
    # One stage: 99 others at 300 V in 0.5 s, or the core state at 265 V: the core state stands first.
    own = fine()
    core = np.arange(100) == 0
    scenario = states(volts=[265.0, *[300.0] * 99], deadline_s=[2.0, *[0.5] * 99], core=core)
    wanted = demand(own, (scenario,), harmful_states((scenario,)))
    need = demand(own, (scenario,), (core,))
    (pickup, _, _), *_ = as_set(own, choose(own, wanted, need, 1))
    assert pickup <= 265.0
    (pickup, _, _), *_ = as_set(own, best_cover(own, wanted, demand(own, (scenario,), (~core,)), 1))
    assert pickup > 265.0


def test_raised_stages_stand_in_order_and_never_lose_margin() -> None:
    own = fine()
    scenario = states(volts=[265.0, 300.0], deadline_s=[1.3, 0.5], core=np.ones(2, bool))
    wanted = demand(own, (scenario,), harmful_states((scenario,)))
    bare = best_cover(own, wanted, wanted, 2)
    assert [(p, t) for p, t, _ in as_set(own, bare)] == [(251.0, 1.1), (271.0, 0.1)]
    raised = raise_margins(own, wanted, wanted, bare)
    assert as_set(own, raised) == [(254.0, 1.2, 1.5), (275.0, 0.1, 2.0)]


def test_each_of_three_stages_is_raised_while_the_other_two_keep_what_they_clear() -> None:
    # With the short swell too (310 V, 0.22 s): 265 V in 2 s, 300 V in 0.6 s and 318 V in 0.2 s each need their own.
    # At two units: 255 - 4.6 V is above 250 V and 1.3 s beyond 1.02 x 1.21; 275 V, 0.3 s; 315 V, the shortest.
    own = replace(fine(), runs=RUNS)
    scenario = states(volts=[265.0, 300.0, 318.0], deadline_s=[2.0, 0.6, 0.2], core=np.ones(3, bool))
    wanted = demand(own, (scenario,), harmful_states((scenario,)))
    bare = best_cover(own, wanted, wanted, 3)
    assert [(p, t) for p, t, _ in as_set(own, bare)] == [(251.0, 1.1), (271.0, 0.3), (311.0, 0.1)]
    raised = raise_margins(own, wanted, wanted, bare)
    assert as_set(own, raised) == [(255.0, 1.3, 2.0), (275.0, 0.3, 2.0), (315.0, 0.1, 2.0)]


@pytest.mark.parametrize(("floor", "pickup", "delay_s"), [(0.0, 255.0, 1.3), (260.0, 261.0, 1.3), (290.0, 291.0, 0.1)])
def test_detection_takes_the_lowest_pickup_above_its_floor_at_the_cap(
    floor: float, pickup: float, delay_s: float
) -> None:
    own = fine()
    rung = detection_rung(own, floor)
    assert rung is not None
    assert as_set(own, (rung,)) == [(pickup, delay_s, 2.0)]


def test_no_detection_where_no_pickup_lies_above_the_floor() -> None:
    assert detection_rung(fine(), 320.0) is None


def test_a_detection_stage_no_more_sensitive_than_the_one_chosen_is_not_set(tmp_path: Path) -> None:
    # As 59N with a state at 265 V in 5 s both would be 255 V 1.3 s: one stage stays off. At 300 V in 5 s the chosen
    # stage is 275 V 0.1 s, and 255 V 1.3 s is added below it.
    for volts, expected in ((265.0, [(255.0, 1.3)]), (300.0, [(255.0, 1.3), (275.0, 0.1)])):
        own = replace(fine(), element=replace(FINE, function=Function.DISPLACEMENT, quantity="v0"))
        some = states(volts=[volts], deadline_s=[5.0], core=np.ones(1, bool))
        folder = tmp_path / str(volts)
        folder.mkdir()
        base = evidence(folder, replace(some, severity={Function.DISPLACEMENT: some.highest_v}), own=own)
        found = settle(base).settings.of(Function.DISPLACEMENT)
        assert [(s.pickup, s.delay_s) for s in found if s.on] == expected
