"""The choice of stages equals brute force over every pickup and delay on small grids."""

from itertools import combinations

import numpy as np
import pytest

from relaycfg.model.device import Accuracy, Device, Element, Function, SettableRange
from relaycfg.model.judgement import Judgement
from relaycfg.model.site import Feed, Relay
from relaycfg.study.choice import Demand, choose, covered_by, demand, detection_rung, harmful_states
from relaycfg.study.ladder import Ladder
from relaycfg.study.ride_through import Runs
from relaycfg.study.scenarios import Scenarios

DEADLINES = np.array([0.3, 0.8, 2.0, 5.0])


def ladder(rng: np.random.Generator, stages: int, function: Function) -> Ladder:
    """A small grid with random must-hold excursions; own invention throughout."""
    sign = -1.0 if function is Function.UNDERVOLTAGE else 1.0
    span = SettableRange(150.0, 210.0, 10.0) if sign < 0 else SettableRange(240.0, 330.0, 10.0)
    element = Element(
        function,
        stages,
        span,
        "v",
        None,
        SettableRange(0.1, 3.1, 0.5),
        (1.02,) if sign < 0 else (0.98,),
        ("instantaneous",),
        0.0,
        Accuracy(1.0, 0.5, 1.0, 0.02, "greater"),
        "l-n",
    )
    device = Device("grid", ("l-n",), "rms", 1.0, 0.5, "per phase", "l-n", (element,))
    feed = Feed("auxiliary", 20.0, 30.0)
    relay = Relay("R", "B", "B", "lines and neutral", device, feed, "shunt", feed, 0.01, 0.03)
    volts = rng.uniform(140, 225, (6, 2, 3)) if sign < 0 else rng.uniform(235, 335, (6, 2, 3))
    seconds = rng.choice([0.05, 0.2, 0.6, 1.5], (6, 2))
    names = tuple(f"case {k}" for k in range(6))
    standing = sign * (227.0 if sign < 0 else 233.0)
    numbers = tuple(range(6))
    runs = Runs(sign * volts, seconds, names, numbers, dict(enumerate(names)), standing, "standing", 0.02, False)
    judgement = Judgement(margin_cap_units=2.0, cover_kept=0.98, deadline_kept_units=1.0)
    return Ladder(element, relay, 50.0, 230.0, 3**0.5, runs, judgement)


def scenario(rng: np.random.Generator, function: Function, states: int) -> Scenarios:
    volts = rng.uniform(120, 230, states) if function is Function.UNDERVOLTAGE else rng.uniform(230, 345, states)
    sign = -1.0 if function is Function.UNDERVOLTAGE else 1.0
    deadline = np.where(rng.random(states) < 0.8, rng.choice(DEADLINES, states), np.inf)
    harmful = np.isfinite(deadline)
    still = np.zeros(states, bool)
    return Scenarios(
        "B",
        "nominal",
        "as modelled",
        {function: sign * volts},
        deadline,
        harmful & (rng.random(states) < 0.4),
        harmful,
        still,
        volts,
        np.zeros(states, int),
        np.ones(states, bool),
        np.zeros(states, complex),
        np.zeros((states, 4), complex),
    )


def core_of(states: Scenarios) -> tuple[np.ndarray, ...]:
    return (states.harmful & states.core,)


def both(own: Ladder, states: Scenarios) -> tuple[Demand, Demand]:
    return demand(own, (states,), harmful_states((states,))), demand(own, (states,), core_of(states))


def brute_force(own: Ladder, states: Scenarios, stages: int) -> tuple[int, int, int]:
    """Best core, best cover with that core, and the fewest stages for it, over every set of secure stages."""
    reach = own.ride_through().seconds
    pairs = [(k, t) for k in range(len(own.pickups)) for t in range(len(own.delays)) if own.shortest[t] > reach[k]]
    severity = states.severity[own.element.function]
    clears = {
        (k, t): (severity >= own.insensitive[k]) & (own.clearing[t] <= states.deadline_s) & states.harmful
        for k, t in pairs
    }
    scores = []
    for count in range(1, stages + 1):
        for chosen in combinations(pairs, count):
            cleared = np.logical_or.reduce([clears[c] for c in chosen])
            scores.append((int((cleared & states.core).sum()), int(cleared.sum()), count))
    core, total, _ = max(scores, default=(0, 0, 0))
    enough = [n for c, t, n in scores if c == core and t >= 0.98 * total]
    return core, total, min(enough, default=0) if total else 0


@pytest.mark.parametrize("function", [Function.OVERVOLTAGE, Function.UNDERVOLTAGE])
@pytest.mark.parametrize("seed", range(12))
def test_no_better_set_of_stages_exists(seed: int, function: Function) -> None:
    rng = np.random.default_rng(seed)
    stages = 1 + seed % 2
    own = ladder(rng, stages, function)
    states = scenario(rng, function, 60)
    rungs = choose(own, *both(own, states), stages)
    core, total, fewest = brute_force(own, states, stages)
    cleared = covered_by(own, rungs, states) & states.harmful
    assert int((cleared & states.core).sum()) == core
    assert 0.98 * total <= int(cleared.sum()) <= total
    assert len(rungs) == fewest


@pytest.mark.parametrize("seed", range(12))
def test_every_chosen_stage_is_secure_with_the_margin_it_was_chosen_at(seed: int) -> None:
    rng = np.random.default_rng(seed)
    own = ladder(rng, 2, Function.OVERVOLTAGE)
    states = scenario(rng, Function.OVERVOLTAGE, 60)
    for rung in choose(own, *both(own, states), 2):
        reach = own.ride_through(rung.margin_units).seconds[rung.pickup]
        assert own.shortest[rung.delay] / 1.1**rung.margin_units > reach


def test_the_detection_stage_is_the_lowest_pickup_with_a_secure_delay() -> None:
    own = ladder(np.random.default_rng(1), 2, Function.OVERVOLTAGE)
    rung = detection_rung(own, 0.0)
    assert rung is not None
    fastest = own.fastest(rung.margin_units)
    assert (fastest[: rung.pickup] == len(own.delays)).all()
    assert fastest[rung.pickup] == rung.delay < len(own.delays)
    higher = detection_rung(own, float(own.sensitive[rung.pickup]))
    assert higher is not None
    assert higher.pickup == rung.pickup + 1


def test_demand_counts_every_reachable_state_once() -> None:
    rng = np.random.default_rng(5)
    own = ladder(rng, 2, Function.OVERVOLTAGE)
    states = scenario(rng, Function.OVERVOLTAGE, 500)
    need = demand(own, (states,), harmful_states((states,)))
    reached = states.harmful & (states.severity[Function.OVERVOLTAGE] >= own.insensitive[0])
    assert need.reachable == int(reached.sum())
