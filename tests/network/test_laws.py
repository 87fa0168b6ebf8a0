"""Laws that any network obeys: closed forms and limits. Each check names where it comes from.

Those that hold on every network stand as properties in test_laws_currents, test_laws_symmetry and test_laws_joints.
"""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from relaycfg.model.geometry import three_phase
from relaycfg.model.site import Site
from relaycfg.network import Network, Solved, connected, healthy_emf, join, least, tap
from tests.network.sites import board, cable, impedance, load, site

LINES = ("L1", "L2", "L3")
MIXED = (0.3, 0.3, 0.4)


def solve(made: Site, place: str = "source", joint_ohm: float | None = None, **options: bool) -> Solved:
    """All loads on at the healthy EMF."""
    solved = Network(made).solve(place, connected(made), healthy_emf(made), joint_ohm, **options)
    assert solved.converged.all()
    return solved


def lamps(*watts: float, volts: float = 250.0) -> Site:
    """Loads of constant impedance in star on a stiff source."""
    loads = [load("A", at, p) for at, p in zip(LINES, watts, strict=True)]
    return site([board("A")], loads, emf_v=volts, nominal_v=volts)


def volts(solved: Solved, at: int = 0) -> np.ndarray:
    """Line-to-neutral RMS of a board, one state."""
    return np.abs(solved.l_n[at, :, 0])


def test_three_lamp_demonstration() -> None:
    """Source: common practice, no source; the open-neutral figures are own arithmetic (Millman)."""
    made = lamps(5.0, 10.0, 3.0)
    assert volts(solve(made, "none")) == pytest.approx([250, 250, 250], abs=1e-6)
    assert volts(solve(made)) == pytest.approx([284, 168, 318], abs=0.5)
    assert volts(solve(made, all_impedance=True)) == pytest.approx(volts(solve(made)), abs=1e-6)


def test_equal_loads_hide_a_break() -> None:
    """Source: engineering fact; own arithmetic (symmetry)."""
    assert volts(solve(lamps(7.0, 7.0, 7.0))) == pytest.approx([250, 250, 250], abs=1e-6)


def test_change_of_one_load_moves_all_three_voltages() -> None:
    """Source: common practice, no source."""
    before, after = volts(solve(lamps(5.0, 10.0, 3.0))), volts(solve(lamps(5.0, 12.0, 3.0)))
    assert np.abs(after - before).min() > 1.0


@given(st.lists(st.floats(0.01, 100), min_size=3, max_size=3))
@settings(max_examples=40, deadline=None, derandomize=True)
def test_resistive_loads_never_see_more_than_the_line_voltage(watts: list[float]) -> None:
    """Source: common practice, no source; own arithmetic (star point inside the triangle)."""
    assert volts(solve(lamps(*watts))).max() <= 250 * 3**0.5 + 1e-6


ohms = st.tuples(st.floats(0.5, 500), st.floats(-200, 500)).map(lambda z: complex(*z))


@given(st.lists(ohms, min_size=3, max_size=3))
@settings(max_examples=60, deadline=None, derandomize=True)
def test_ideal_source_agrees_with_millman(z: list[complex]) -> None:
    """Source: own arithmetic, Millman's closed form, and the mean-square invariant."""
    made = site([board("A")], [impedance("A", at, ohm) for at, ohm in zip(LINES, z, strict=True)])
    emf, y = healthy_emf(made), 1 / np.array(z)
    vn = (emf * y).sum() / y.sum()
    solved = solve(made)
    assert np.abs(solved.l_n[0, :, 0] - (emf - vn)).max() < 1e-6 * max(1, abs(vn) / 230)
    assert solved.joint_v[0] == pytest.approx(vn, abs=1e-6 * max(1, abs(vn) / 230))
    assert (volts(solved) ** 2).mean() == pytest.approx(230**2 + abs(vn) ** 2, rel=1e-9)


def test_star_tied_to_the_neutral_is_three_branches_of_a_third() -> None:
    """Source: own arithmetic (definition)."""
    plain = lamps(500.0, 200.0, 100.0, volts=230.0)
    tied = replace(plain, loads=(*plain.loads, load("A", "all", 900.0, 300.0, to_neutral=True, zip_p=MIXED)))
    apart = replace(plain, loads=(*plain.loads, *(load("A", at, 300.0, 100.0, zip_p=MIXED) for at in LINES)))
    assert solve(tied).l_n == pytest.approx(solve(apart).l_n, abs=1e-6)


def test_no_ohms_in_a_joint_are_a_sound_neutral_and_many_an_open_one() -> None:
    """Source: limits; what lies between is a law on drawn networks (test_laws_joints)."""
    made = site(
        [board("A", cable=cable(0.1 + 0.05j))],
        [load("A", at, p, zip_p=MIXED) for at, p in zip(LINES, (6e3, 3e3, 2e3), strict=True)],
    )
    sound, shorted = solve(made, "none"), solve(made, "A", 0.0)
    assert shorted.l_n == pytest.approx(sound.l_n, abs=1e-6)
    assert shorted.joint_a[0] == pytest.approx(sound.neutral_a[0, 0], abs=1e-6)
    assert solve(made, "A", 1e9).l_n == pytest.approx(solve(made, "A").l_n, abs=1e-4)


@pytest.mark.parametrize("zip_p", [(1.0, 0.0, 0.0), MIXED])
def test_downstream_break_leaves_the_board_upstream_alone(zip_p: tuple[float, float, float]) -> None:
    """Source: engineering fact: only breaks upstream of a neutral tap are seen there; stiff source."""
    boards = [board("A"), board("B", "A", cable(0.1 + 0.05j))]
    made = site(boards, [load("A", "L1", 2e3), load("B", "L1", 6e3, zip_p=zip_p), load("B", "L2", 2e3, zip_p=zip_p)])
    solved = solve(made, "B")
    assert volts(solved, 0) == pytest.approx([230, 230, 230], abs=1e-6)
    assert volts(solved, 1).max() > 280


def split(link_at: str) -> Site:
    """A PEN or an N and PE to board A, sub-board B behind it."""
    pe = None if link_at == "A" else 0.1 + 0j
    boards = [
        board("A", cable=cable(0.1 + 0.05j, pe=pe), link=link_at == "A", electrode=20.0 if pe is None else None),
        board("B", "A", cable(0.1 + 0j, pe=0.1 + 0j)),
    ]
    return site(
        boards,
        [load("B", "L1", 6e3), load("B", "L2", 2e3)],
        electrode_ohm=5.0,
        earthing="TN-C-S" if pe is None else "TN-S",
    )


def test_break_of_a_combined_conductor_moves_neutral_and_pe_together() -> None:
    """Source: engineering fact: upstream of the split N-to-PE reads about 0 while L-N is far off."""
    solved = solve(split("A"), "A")
    assert abs(solved.n_pe[0, 0]) < 1e-6
    assert abs(tap(solved, 0)[0, 3]) < 1e-6
    assert abs(solved.pe_earth[0, 0]) > 50
    assert volts(solved).max() > 270
    apart = solve(split("nowhere"), "A")
    assert abs(apart.n_pe[0, 0]) > 50
    assert abs(apart.pe_earth[0, 0]) < 1e-6


def test_side_of_the_star_link_that_carries_the_electrode_matters() -> None:
    """Source: own arithmetic: the electrode holds the side it sits on."""
    watts = [load("A", at, p) for at, p in zip(LINES, (6e3, 3e3, 1e3), strict=True)]
    on_bar, on_star = (
        solve(site([board("A", electrode=50.0)], watts, electrode_ohm=2.0, earth_at=side, earthing="TN-S"))
        for side in ("neutral-bar", "star-point")
    )
    assert abs(on_bar.n_earth[0, 0]) < 1e-6
    assert on_star.n_earth[0, 0] == pytest.approx(on_star.joint_v[0], abs=1e-6)
    assert abs(on_star.n_pe[0, 0]) > 80
    assert volts(on_bar) == pytest.approx(volts(on_star), abs=1e-6)


def test_combined_conductor_from_the_star_side_returns_through_a_second_bond() -> None:
    """Source: own arithmetic: with PE from the star point a link at the board bridges the open star link."""
    made = site(
        [board("A", cable=cable(0.1 + 0j, pe=0.2 + 0j), link=True)],
        [load("A", "L1", 6e3)],
        electrode_ohm=2.0,
        earth_at="star-point",
        earthing="TN-S",
    )
    bridged, alone = solve(made), solve(replace(made, boards=(board("A", cable=cable(0.1 + 0j)),)))
    load_ohm = 230**2 / 6e3
    assert volts(bridged)[0] == pytest.approx(230 * load_ohm / (load_ohm + 0.1 + 0.2), abs=1e-6)
    assert volts(alone)[0] == pytest.approx(0, abs=1e-2)


def test_tt_returns_a_pe_fault_voltage_to_its_own_electrode() -> None:
    """Source: own arithmetic: in TT the board's PE stays at earth whatever the neutral does."""
    made = site(
        [board("A", cable=cable(0.1 + 0j), electrode=30.0), board("B", "A", cable(0.1 + 0j))],
        [load("A", "L1", 6e3), load("A", "L2", 1e3)],
        electrode_ohm=5.0,
        earthing="TT",
    )
    solved = solve(made, "A")
    assert abs(solved.pe_earth[0, 0]) < 1e-9
    assert solved.n_pe[0, 0] == pytest.approx(solved.n_earth[0, 0], abs=1e-9)
    assert np.isnan(solved.pe_earth[1, 0])
    assert np.isnan(tap(solved, 1)[0, 3])


def test_nothing_tied_to_earth_has_no_potential_to_it_but_all_others() -> None:
    """Source: contract: null where the board has none; never nan between conductors."""
    made = site([board("A", cable=cable(0.1 + 0j, pe=0.1 + 0j))], [load("A", "L1", 6e3), load("A", "L2", 1e3)])
    solved = solve(made, "A")
    assert np.isnan(solved.n_earth).all()
    assert np.isnan(solved.pe_earth).all()
    assert solved.n_pe[0, 0] == pytest.approx(solved.joint_v[0], abs=1e-6)
    assert np.isfinite(solved.l_n).all()


@pytest.mark.parametrize("electrode", [None, 5.0])
def test_island_without_load_is_held_by_the_leak(electrode: float | None) -> None:
    """Source: own arithmetic: nothing drives a current, so nothing stands across the joint."""
    between = [load("A", "L1-L2", 7e3, 3e3, zip_p=MIXED), load("A", "all", 9e3, 2e3)]
    for lines in ([], between):
        boards = [board("S"), board("A", cable=cable(0.1 + 0.03j))]
        some = [load("A", at, p, 0.37 * p, usage=0.5) for at, p in zip(LINES, (6123.0, 1457.0, 789.0), strict=True)]
        loads = [*some, load("S", "L1", 9e3), *lines]
        made = site(boards, loads, electrode_ohm=electrode, line_ohm=0.01 + 0.02j, neutral_ohm=0.01 + 0j)
        solved = Network(made).solve("A", join(least(made), connected(made)), healthy_emf(made), look_for_roots=True)
        assert solved.converged.all()
        assert not solved.several.any()
        assert abs(solved.joint_v[0]) < 1e-6
        assert abs(solved.joint_v[1]) > 80
        assert abs(solved.l_n[:, :, 0].mean(axis=1)).max() < 1.0


def test_board_without_cable_shares_its_feeders_node() -> None:
    """Source: contract: a board without cable sits on its feeder's node; its neutral current is its own part."""
    boards = [board("S"), board("T", "S"), board("B", "T", cable(0.1 + 0j))]
    loads = [load("S", "L1", 2300.0), load("T", "L2", 4600.0), load("B", "L3", 230.0)]
    solved = solve(site(boards, loads), "none")
    assert solved.l_n[0] == pytest.approx(solved.l_n[1], abs=1e-9)
    assert np.abs(solved.neutral_a[1, 0]) == pytest.approx(
        abs(20 * three_phase().phasors[1] + 0.999132 * three_phase().phasors[2]), abs=1e-4
    )
    assert solved.neutral_a[0, 0] == pytest.approx(10 + solved.neutral_a[1, 0], abs=1e-9)


def test_boards_may_be_listed_in_any_order() -> None:
    """Source: own arithmetic (the same circuit)."""
    made = split("A")
    other = replace(made, boards=made.boards[::-1])
    assert solve(other, "A").l_n[::-1] == pytest.approx(solve(made, "A").l_n, abs=1e-9)
    assert Network(other).boards == ("B", "A")


def test_capacitive_and_inductive_loads_leave_the_triangle_unclamped() -> None:
    """Source: own arithmetic: admittances 1, +j, -j shift the star point by (1 + sqrt 3) U0."""
    made = site([board("A")], [impedance("A", "L1", 10 + 0j), impedance("A", "L2", -10j), impedance("A", "L3", 10j)])
    solved = solve(made)
    assert abs(solved.joint_v[0]) == pytest.approx((1 + 3**0.5) * 230, abs=1e-6)
    assert volts(solved).max() > 3**0.5 * 230 * 1.9


def test_other_roots_are_reported_and_the_sound_side_root_kept() -> None:
    """Source: engineering fact: constant impedance has one root, constant power with a band edge often several."""

    def made(zip_p: tuple[float, float, float]) -> Site:
        return site([board("A")], [load("A", at, p, zip_p=zip_p) for at, p in zip(LINES, (2e3, 2e3, 2e3), strict=True)])

    constant_power, linear = made((0.0, 0.0, 1.0)), made((1.0, 0.0, 0.0))
    assert not solve(linear, look_for_roots=True).several[0]
    assert solve(constant_power, look_for_roots=True).several[0]
    assert not solve(constant_power).several[0]


def test_constant_power_does_not_stay_in_balance() -> None:
    """Source: engineering fact: a floating star of constant power has no stable point inside its band."""
    made = site([board("A")], [load("A", at, 2e3, zip_p=(0.0, 0.0, 1.0)) for at in LINES])
    solved = solve(made)
    assert volts(solved).max() > 250
    assert solved.below_band[0]
    assert not solved.unstable[0]


def test_net_generation_on_a_floating_star_is_never_passed_off_as_a_state() -> None:
    """Source: own arithmetic: with a negative sum of admittances any shift drives itself on."""
    made = site([board("A")], [load("A", at, -p) for at, p in zip(LINES, (2e3, 3e3, 1e3), strict=True)])
    solved = Network(made).solve("source", connected(made), healthy_emf(made))
    assert solved.unstable[0] or not solved.converged[0]
    assert np.isfinite(solved.l_n).all()


def test_results_cannot_be_written_to() -> None:
    """Source: house rule: read-only arrays."""
    solved = solve(lamps(5.0, 10.0, 3.0))
    with pytest.raises(ValueError, match="read-only"):
        solved.l_n[0, 0, 0] = 0


def test_loop_without_impedance_is_refused() -> None:
    """Source: own arithmetic: PE and neutral of zero ohms side by side share a current nobody can tell."""
    made = site([board("A", cable=cable(0.1 + 0j, neutral=0j, pe=0j), link=True)], electrode_ohm=2.0)
    with pytest.raises(ValueError, match="without any impedance"):
        Network(made)


def test_unknown_places_and_negative_joints_are_refused() -> None:
    """Source: contract of the function."""
    made = lamps(5.0, 10.0, 3.0)
    network, states, emf = Network(made), connected(made), healthy_emf(made)
    with pytest.raises(KeyError, match="A"):
        network.solve("A", states, emf)
    with pytest.raises(ValueError, match="zero or more"):
        network.solve("source", states, emf, -1.0)


@pytest.mark.parametrize("place", ["none", "source"])
def test_overloaded_source_is_reported_not_nan(place: str) -> None:
    """Source: contract: never nan; constant power beyond what the source can carry falls below its band."""
    loads = [load("A", at, p, zip_p=(0.0, 0.0, 1.0)) for at, p in zip(LINES, (90e3, 50e3, 20e3), strict=True)]
    made = site([board("A")], loads, line_ohm=3j, neutral_ohm=-1j, electrode_ohm=5.0)
    solved = Network(made).solve(place, join(connected(made), least(made), connected(made)), healthy_emf(made))
    assert np.isfinite(solved.l_n).all()
    assert (solved.below_band | ~solved.converged).all()
