"""A loose joint in the neutral: the sweep against hand figures, exact roots and every joint solved one by one."""

from dataclasses import replace
from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest
from scipy.optimize import brentq

from relaycfg.files import read_site
from relaycfg.model.device import Accuracy, Device, Element, Function, SettableRange
from relaycfg.model.site import Feed, Relay, Site
from relaycfg.network import Network, connected, healthy_emf, sampled, tap
from relaycfg.relay import severities
from relaycfg.study import derive
from relaycfg.study.early_warning import ADVISED
from relaycfg.study.joint_sweep import HEAT_TOLERANCE, TOLERANCE, TRIED, Watch, heat_at, joint_sweep, sweeps
from tests.reference.case import CASES
from tests.study import yard

STEPS = SettableRange(1.0, 400.0, 1.0)
EXACT = Accuracy(0.0, 0.0, 0.0, 0.0, "greater")


def element(function: Function, quantity: str = "l-n") -> Element:
    return Element(function, 1, STEPS, "v", None, STEPS, (0.99,), ("instantaneous",), 0.0, EXACT, quantity)


def watch(pickup_v: float, function: Function = Function.OVERVOLTAGE, quantity: str = "l-n") -> Watch:
    return Watch(f"{function.value} {pickup_v:g}", element(function, quantity), pickup_v, False, 1.0)


def watched(site: Site, board: str) -> Site:
    """The site with a relay at that board; the sweep looks at nothing else of it."""
    device = Device("Exact", ("l-n",), "rms", 1.0, 0.5, "per phase", "l-n", (element(Function.OVERVOLTAGE),))
    feed = Feed("auxiliary", None, None)
    return replace(site, relay=Relay("R", board, board, "lines", device, feed, "shunt", feed, 0.0, 0.0))


@pytest.fixture(scope="module")
def star() -> Site:
    """6, 3 and 1.5 kW on a stiff source, with a relay at their board."""
    return watched(read_site(CASES / "loose-joint" / "site.toml"), "Star")


def swept(site: Site, watches=()):
    return joint_sweep(site, Network(site), "source", connected(site), healthy_emf(site), watches).states[0]


def test_the_hottest_joint_and_its_watts_are_those_of_the_hand_figures(star):
    """Source: own arithmetic: most where the joint equals 1 over the sum of admittances, V0^2 sum(Y) / 4."""
    hottest = swept(star).hottest
    assert hottest.joint_ohm == pytest.approx(5.038, rel=HEAT_TOLERANCE)
    assert hottest.joint_w == pytest.approx(375.0, abs=0.06)
    assert hottest.joint_a**2 * hottest.joint_ohm == pytest.approx(hottest.joint_w)


@pytest.mark.parametrize(
    ("pickup_v", "ohm", "shift_v", "watts"),
    [(253.0, 2.58, 29.45, 336.0), (264.5, 5.07, 43.6, 375.0), (276.0, 9.82, 57.45, 336.2)],
)
def test_each_pickup_is_first_seen_at_the_ohms_and_watts_of_the_hand_figures(star, pickup_v, ohm, shift_v, watts):
    """Source: own arithmetic, nodal equations and Millman (reference case loose-joint-pickup)."""
    (sight,) = swept(star, [watch(pickup_v)]).sights
    assert sight.joint_ohm == pytest.approx(ohm, abs=0.006)
    assert sight.joint_v == pytest.approx(shift_v, abs=0.02)
    assert sight.joint_w == pytest.approx(watts, abs=0.2)
    assert sight.before_w == pytest.approx(max(watts, 375.0) if ohm > 5.038 else watts, abs=0.2)


def test_the_sweep_goes_from_a_milliohm_to_open(star):
    """Source: reference case loose-joint: 17.25 A through a sound neutral, 86.93 V across the open one."""
    points = swept(star).points
    assert points[0].joint_ohm == pytest.approx(0.001)
    assert points[0].joint_a == pytest.approx(17.25, abs=0.01)
    assert points[-1].joint_ohm == float("inf")
    assert (points[-1].joint_v, points[-1].joint_w) == (pytest.approx(86.93, abs=0.006), 0.0)
    assert points[-1].highest_l_n_v == pytest.approx(301.1, abs=0.06)
    assert all(a.joint_v < b.joint_v for a, b in pairwise(points))


@pytest.mark.parametrize(("amperes", "watts"), [((10, 5, 3), 100), ((26, 13, 6.5), 290), ((100, 60, 40), 760)])
def test_at_23_volts_of_displacement_a_joint_already_burns_as_much(star, amperes, watts):
    """Source: engineering basis 2.8: about 100, 290 and 760 W for boards of 10/5/3, 26/13/6.5 and 100/60/40 A."""
    loads = tuple(replace(load, p_w=230.0 * a) for load, a in zip(star.loads, amperes, strict=True))
    (sight,) = swept(replace(star, loads=loads), [watch(23.0, Function.DISPLACEMENT, "v0")]).sights
    assert sight.joint_v == pytest.approx(23.0, rel=TOLERANCE)
    assert sight.joint_w == pytest.approx(watts, rel=0.06)


def test_what_no_stage_sees_is_the_most_any_joint_below_the_first_pickup_burns(star):
    """Source: reference case: 336 W at 2.58 ohm; beyond it every joint is seen."""
    assert swept(star, [watch(253.0)]).unseen_w == pytest.approx(336.0, abs=0.3)
    assert swept(star, [watch(310.0)]).unseen_w == pytest.approx(375.0, abs=0.06)
    assert swept(star).unseen_w is None


def test_a_stage_that_even_the_open_neutral_does_not_reach_sees_nothing(star):
    (sight,) = swept(star, [watch(310.0)]).sights
    assert (sight.seen, sight.joint_ohm) == (False, None)
    assert sight.before_w == pytest.approx(375.0, abs=0.06)


def test_a_stage_that_only_an_open_neutral_reaches_says_so(star):
    """Source: reference case: 301.06 V open; at 1000 ohm the highest line stays 0.3 V below that."""
    (sight,) = swept(star, [watch(301.0)]).sights
    assert (sight.seen, sight.joint_ohm) == (True, float("inf"))


@pytest.fixture(scope="module")
def workshop() -> Site:
    return read_site(Path(__file__).parents[2] / "examples" / "workshop" / "site.toml", need_relay=True)


def test_first_ohms_are_those_of_an_exact_root_with_loads_that_are_no_impedances(workshop):
    """Source: Brent's method on the plain solver, one joint at a time."""
    network, emf = Network(workshop), healthy_emf(workshop)
    states = sampled(workshop, 40, 3)
    index = network.boards.index("MB")
    for k in (0, 7, 11):
        state = states.take([k])
        one = watch(14.0, Function.DISPLACEMENT, "v0")

        def over(ohm: float, state=state, one=one) -> float:
            taps = tap(network.solve("MB", state, emf, float(ohm)), index)
            return float(severities(one.element, workshop.supply.geometry, taps, "l-n")[0, 0] - one.pickup)

        if over(1e3) <= 0:
            continue
        (sight,) = joint_sweep(workshop, network, "MB", state, emf, [one]).states[0].sights
        grid = np.geomspace(1e-3, 1e3, 200)
        values = np.array([over(ohm) for ohm in grid])
        first = int(np.argmax(values >= 0))
        assert sight.joint_ohm == pytest.approx(brentq(over, grid[first - 1], grid[first]), rel=TOLERANCE)


def test_joints_of_their_own_solve_as_one_joint_at_a_time(workshop):
    """Each state with its own ohms is the same as all states with those ohms: the plain way, tested elsewhere."""
    network, emf, states = Network(workshop), healthy_emf(workshop), sampled(workshop, 30, 5)
    ohms = np.array([1e-3, 0.1, 3.0, 40.0, np.inf] * 6)
    together = network.solve("Workshop", states, emf, ohms)
    for ohm in (1e-3, 0.1, 3.0, 40.0, np.inf):
        mine = ohms == ohm
        alone = network.solve("Workshop", states, emf, None if np.isinf(ohm) else float(ohm))
        assert np.abs(together.l_n - alone.l_n)[..., mine].max() < 1e-5
        assert np.abs(together.joint_a - alone.joint_a)[mine].max() < 1e-3
    for wrong in (np.zeros(30), np.ones(29)):
        with pytest.raises(ValueError, match="each state's joint"):
            network.solve("Workshop", states, emf, wrong)


def test_the_swept_sample_is_the_hottest_of_all_samples(workshop):
    """Source: every one of 400 states solved at every tried joint. Of the example: a few candidates stand for all."""
    network, emf, states = Network(workshop), healthy_emf(workshop), sampled(workshop, 400, 2)
    opened = {place: network.solve(place, states, emf) for place in workshop.places}
    for sweep in sweeps(workshop, network, emf, states, opened, {}):
        watts, _ = heat_at(network, sweep.at, emf, states, TRIED)
        assert [s.name for s in sweep.states] == ["connected", states.names[int(np.argmax(watts.max(axis=0)))]]


def test_the_advised_alarm_is_the_lowest_pickup_above_what_stands_and_lets_go(tmp_path):
    """Source: definition: most sensitive end times drop-out above the standing displacement; the step below fails."""
    study = derive(yard.site(tmp_path), 200, 1)
    warning = study.early_warning
    found = study.device.element(Function.DISPLACEMENT)
    assert warning is not None
    assert warning.pickup_v is not None
    assert warning.standing_v is not None

    def lets_go(pickup_v: float) -> bool:
        error = max(0.01 * pickup_v, 0.5)
        return (pickup_v - error) * 0.95 > warning.standing_v

    assert lets_go(warning.pickup_v)
    assert not lets_go(warning.pickup_v - found.pickup.step) or warning.pickup_v == found.pickup.low
    assert "no hot-joint detector" in warning.sentence


def test_the_advice_changes_no_setting_and_the_alarm_speaks_no_later_than_a_59n_trip(tmp_path):
    study = derive(yard.site(tmp_path), 200, 1)
    assert all(r.stage.action == "trip" for r in study.stages if r.stage.on)
    pairs = 0
    for sweep in study.breaks.joints:
        for state in sweep.states:
            ohms = {s.stage: s.joint_ohm for s in state.sights if s.joint_ohm is not None}
            for name, ohm in ohms.items():
                if name.startswith("59N stage"):
                    assert ohms[ADVISED] <= ohm
                    pairs += 1
    assert pairs > 0


def test_without_a_displacement_element_the_advice_says_there_is_none(tmp_path):
    study = derive(yard.site(tmp_path, elements=yard.OVER + yard.UNDER), 100, 1)
    assert study.early_warning is not None
    assert study.early_warning.pickup_v is None
    assert "no displacement element" in study.early_warning.sentence
    assert all(s.stage != ADVISED for sweep in study.breaks.joints for state in sweep.states for s in state.sights)


def test_places_the_relay_cannot_see_are_swept_without_stages(tmp_path):
    study = derive(yard.site(tmp_path), 100, 1)
    by_place = {sweep.at: sweep for sweep in study.breaks.joints}
    assert set(by_place) == {"source", "Main", "Shed"}
    assert by_place["Shed"].unseen is None
    assert all(state.sights == () and state.unseen_w is None for state in by_place["Shed"].states)
    for place in ("source", "Main"):
        unseen, unheard = by_place[place].unseen, by_place[place].unheard
        assert unseen is not None
        assert unheard is not None
        assert 0 <= unheard.count <= unseen.count <= unseen.of == 100
