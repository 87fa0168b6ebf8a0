"""What the schedule of sweeps owes every state: its own root, its own status, a leak only where nothing else holds."""

import numpy as np
import pytest

from relaycfg.model.geometry import ComplexArray
from relaycfg.model.site import Site
from relaycfg.network import Network, connected, healthy_emf, join, least, sampled
from relaycfg.network.loadlaw import Law
from relaycfg.network.solver import Solution, _error, chase, middle
from relaycfg.network.sweeps import Iterate, Problem
from tests.network.sites import board, cable, load, site

LINES = ("L1", "L2", "L3")


@pytest.mark.parametrize(("watts", "held_s"), [(0.01, 1e-6), (0.05, 1e-6), (0.06, 0.0), (0.5, 0.0)])
def test_leak_stands_across_an_open_joint_only_where_loads_hold_less(watts: float, held_s: float) -> None:
    """Source: own arithmetic: one load of P / 230^2 siemens in series with the leak of 1e-6 S across 230 V."""
    made = site([board("A", cable=cable(0.1 + 0j))], [load("A", "L1", watts)])
    solved = Network(made).solve("A", connected(made), healthy_emf(made))
    assert solved.converged.all()
    siemens = watts / 230**2
    assert abs(solved.joint_v[0]) == pytest.approx(230 * siemens / (siemens + held_s), rel=1e-4)


@pytest.mark.parametrize(("ohm", "stable"), [(5.0, True), (8.0, True), (9.5, False), (40.0, False)])
def test_a_joint_holds_net_generation_as_long_as_it_conducts_more(ohm: float, stable: bool) -> None:
    """Source: own arithmetic: 6 kW of generation are -0.1134 S; the star point is held by 1 / ohm - 0.1134 S.

    Stiff source, so Millman's closed form gives the shift where it is held.
    """
    watts = np.array([-3e3, -2e3, -1e3])
    made = site([board("A")], [load("A", at, p) for at, p in zip(LINES, watts, strict=True)])
    emf = healthy_emf(made)
    solved = Network(made).solve("source", connected(made), emf, ohm)
    if stable:
        shift = (emf * watts / 230**2).sum() / (watts.sum() / 230**2 + 1 / ohm)
        assert solved.converged[0]
        assert not solved.unstable[0]
        assert solved.joint_v[0] == pytest.approx(shift, abs=1e-6)
        assert solved.joint_a[0] == pytest.approx(shift / ohm, abs=1e-6)
    else:
        assert solved.unstable[0]


@pytest.mark.parametrize("place", ["none", "source"])
def test_impedances_are_stable_with_and_without_a_break(place: str) -> None:
    """Source: own arithmetic: passive linear loads have one root, held by their own conductance."""
    made = site([board("A")], [load("A", at, p) for at, p in zip(LINES, (3e3, 2e3, 1e3), strict=True)])
    solved = Network(made).solve(place, connected(made), healthy_emf(made))
    assert not solved.unstable.any()
    assert not solved.several.any()


def stubborn(zip_p: tuple[float, float, float] = (0.0, 0.0, 1.0), steady_w: float = 400.0, q: float = 0.3) -> Site:
    """Loads far from impedances behind an open neutral: states that need many small steps."""
    loads = [
        load("A", at, p, q * p, zip_p=zip_p, band=(0.3, 1.6), usage=0.6, name=f"{at} {p}")
        for at, p in zip(LINES * 4, np.linspace(300.0, 3300.0, 12), strict=True)
    ]
    steady = [load("A", at, steady_w) for at in LINES]
    return site([board("A", cable=cable(0.2 + 0.1j))], [*loads, *steady], line_ohm=0.02 + 0.02j, electrode_ohm=5.0)


@pytest.mark.parametrize("made", [stubborn(), stubborn((0.0, 1.0, 0.0), steady_w=10.0, q=0.8)])
def test_every_stubborn_state_comes_to_rest_where_no_current_is_left_over(made: Site) -> None:
    """Source: Kirchhoff's current law at the floating neutral, currents by the load law's definition."""
    states = sampled(made, 1000, 3)
    solved = Network(made).solve("A", states, healthy_emf(made))
    assert solved.converged.all()
    into_neutral = np.zeros(states.count, complex)
    for of, factor in zip(made.loads, states.loads, strict=True):
        u = solved.l_n[0, of.lines[0]]
        m = np.clip(np.abs(u) / 230, of.band_low_pu, of.band_high_pu)
        p = of.p_w * (np.array([m * m, m, m**0]).T @ of.zip_p)
        q = of.q_var * (np.array([m * m, m, m**0]).T @ of.zip_q)
        into_neutral += factor * u * (p - 1j * q) / (m * 230) ** 2
    assert np.abs(into_neutral).max() < 1e-6  # amperes, of some 10 A of load
    assert np.abs(solved.neutral_a).max() < 1e-6


def test_a_state_is_the_same_alone_or_in_crowds_of_easy_ones() -> None:
    """Source: array equals scalar."""
    made = stubborn()
    states, emf, network = sampled(made, 60, 4), healthy_emf(made), Network(made)
    together = network.solve("A", join(states, connected(made)), emf)
    for state in range(0, 60, 7):
        alone = network.solve("A", states.take([state]), emf)
        assert together.l_n[..., state] == pytest.approx(alone.l_n[..., 0], abs=1e-6)
        assert together.below_band[state] == alone.below_band[0]


def test_middle_is_half_way_between_the_extremes_of_the_states() -> None:
    """Source: contract, by hand: at 200 V, the geometric mean of 100 and 400 V, where ci = 200 A gives 1 S."""
    z = np.array([[1.0, 2.0, 9.0]])
    nothing = np.zeros((1, 3))
    law = Law(z, -z, nothing + 200, nothing - 400, nothing + 4e4, nothing, np.array([[100.0]]), np.array([[400.0]]))
    assert middle(law) == pytest.approx([(1 + 9) / 2 + 1 + 1 - 1j * ((1 + 9) / 2 + 2)])


def test_error_left_is_the_last_move_times_its_rate_within_what_can_be_believed() -> None:
    """Source: own arithmetic: moves that shrink by r leave at most r of the last one; 0.1 to 10 are believed."""
    before, last = np.array([1.0, 1.0, 1e-3, 1e-6, 0.0, 0.0]), np.array([0.5, 0.01, 2e-3, 1.0, 0.0, 1e-3])
    assert _error(before, last) == pytest.approx([0.25, 0.001, 4e-3, 10.0, 0.0, 1e-2])


def test_roots_far_from_the_sound_neutral_are_found_where_loads_differ_a_little() -> None:
    """Source: own arithmetic: equal loads of constant power rest on roots that turn into each other by a third of a
    turn; nearly equal ones keep all three, since each is held by a slope of its own. Impedances have one root.
    """
    for zip_p, several in (((0.0, 0.0, 1.0), True), ((1.0, 0.0, 0.0), False)):
        loads = [load("A", at, p, zip_p=zip_p) for at, p in zip(LINES, (2010.0, 2000.0, 1990.0), strict=True)]
        made = site([board("A")], loads)
        solved = Network(made).solve("source", connected(made), healthy_emf(made), look_for_roots=True)
        assert solved.converged[0]
        assert bool(solved.several[0]) == several


def test_usual_states_need_no_more_than_the_usual_schedule(monkeypatch: pytest.MonkeyPatch) -> None:
    """Source: contract: most states of usual loads have converged after it; the rest alone is chased."""
    loads = [
        load("A", at, p, 0.3 * p, zip_p=(0.5, 0.2, 0.3), usage=0.6, name=f"{at} {p}")
        for at, p in zip(LINES * 4, np.linspace(300.0, 3300.0, 12), strict=True)
    ]
    steady = [load("A", at, 400.0) for at in LINES]
    made = site([board("A", cable=cable(0.2 + 0.1j))], [*loads, *steady], line_ohm=0.02 + 0.02j, electrode_ohm=5.0)
    chased: list[int] = []

    def watched(problem: Problem, law: Law, about_s: ComplexArray, at: Iterate, *start: complex) -> Solution:
        chased.append(law.z_re.shape[1])
        return chase(problem, law, about_s, at, *start)

    monkeypatch.setattr("relaycfg.network.network.chase", watched)
    solved = Network(made).solve("A", sampled(made, 1000, 6), healthy_emf(made))
    assert solved.converged.all()
    assert sum(chased) < 100


def test_no_current_is_said_to_pass_an_open_joint_or_one_that_is_not_there() -> None:
    """Source: contract: 0 when open or without a break, the leak's nanoamperes included."""
    made = site([board("A", cable=cable(0.1 + 0j))], [load("A", "L1", 0.01), load("A", "L2", 2e3, usage=0.0)])
    states = join(connected(made), least(made))
    for place, joint_ohm in (("A", None), ("none", None), ("none", 5.0)):
        solved = Network(made).solve(place, states, healthy_emf(made), joint_ohm)
        assert solved.joint_a.tolist() == [0, 0]


@pytest.mark.parametrize("watts", [(-8e3, 2e3, 1e3), (-3001.0, 2e3, 1e3)])
def test_generation_that_outweighs_the_load_on_an_open_neutral_never_counts_as_converged(watts):
    # Own algebra: a floating star of conductances that sum to less than nothing pushes its neutral away from the one
    # point where the currents balance. A step of nothing there would look like rest, at a joint that carries current.
    made = site([board("A", cable=cable(0.1 + 0j))], [load("A", f"L{k + 1}", w) for k, w in enumerate(watts)])
    solved = Network(made).solve("A", connected(made), healthy_emf(made))
    assert not solved.converged[0]
    assert solved.unstable[0]
