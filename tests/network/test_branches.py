"""Where loads and motors hang, by hand: every kind of motor, shares of a load, bands that meet at one place."""

from dataclasses import replace

import numpy as np
import pytest

from relaycfg.model.site import Load, Motor, Site
from relaycfg.network import LoadStates, Network, Solved, connected, healthy_emf, motor_start
from relaycfg.network.branches import build_branches
from tests.network.sites import board, cable, load, motor, site

EMF = 230 * np.exp(1j * np.deg2rad([0.0, -120.0, 120.0]))
RUNNING_VA, STARTING_VA = 3e3 + 2e3j, 4e3 + 12e3j
MIXED = (0.3, 0.3, 0.4)


def solve(loads: list[Load], motors: list[Motor], place: str = "none") -> tuple[Site, Solved]:
    """Everything on at one board behind a line of 0.2 ohm and a sound or open neutral of as much."""
    made = site([board("A", cable=cable(0.2 + 0j))], loads, motors)
    solved = Network(made).solve(place, connected(made), healthy_emf(made))
    assert solved.converged.all()
    return made, solved


def test_motor_between_two_lines_is_one_admittance_between_them() -> None:
    """Source: own arithmetic: a divider of the line voltage by the motor and 0.2 + 0.2 ohm."""
    made, solved = solve([], [motor("A", RUNNING_VA, STARTING_VA, "L1-L2")])
    for of, power in ((solved, RUNNING_VA), (motor_start(Network(made), made, 0, connected(made), EMF), STARTING_VA)):
        y = power.conjugate() / (3 * 230**2)
        expected = (EMF[0] - EMF[1]) / (1 + 0.4 * y)
        assert of.l_n[0, 0, 0] - of.l_n[0, 1, 0] == pytest.approx(expected, abs=1e-6)
        assert of.l_n[0, 2, 0] == pytest.approx(EMF[2], abs=1e-6)
        assert abs(of.neutral_a[0, 0]) < 1e-6


def test_motor_to_the_neutral_is_a_third_of_its_power_on_every_line_it_has() -> None:
    """Source: definition: line and neutral of 0.2 ohm; three equal parts leave the neutral without current."""
    _, single = solve([], [motor("A", RUNNING_VA, STARTING_VA, "L2")])
    y = RUNNING_VA.conjugate() / 230**2
    assert single.l_n[0, 1, 0] == pytest.approx(EMF[1] / (1 + 0.4 * y), abs=1e-6)
    assert single.neutral_a[0, 0] == pytest.approx(y * single.l_n[0, 1, 0], abs=1e-6)
    _, star = solve([], [motor("A", RUNNING_VA, STARTING_VA, "all", to_neutral=True)])
    assert star.l_n[0, :, 0] == pytest.approx(EMF / (1 + 0.2 * y / 3), abs=1e-6)
    assert abs(star.neutral_a[0, 0]) < 1e-6


def test_motor_tied_to_the_neutral_has_a_zero_sequence_and_one_without_has_none() -> None:
    """Source: own arithmetic: with an open neutral a tied star adds its admittance to every line."""
    lamps = [load("A", "L1", 4e3), load("A", "L2", 1e3)]
    stiff = site([board("A")], lamps)
    y_star = RUNNING_VA.conjugate() / 3 / 230**2
    for tied, own in ((True, y_star), (False, 0j)):
        made = replace(stiff, motors=(motor("A", RUNNING_VA, STARTING_VA, "all", to_neutral=tied),))
        y = np.array([4e3, 1e3, 0]) / 230**2 + own
        solved = Network(made).solve("source", connected(made), healthy_emf(made))
        assert solved.joint_v[0] == pytest.approx((EMF * y).sum() / y.sum(), abs=1e-6)


def test_three_wire_motor_answers_each_sequence_with_its_own_admittance() -> None:
    """Source: definition: running, V1 meets the running, V2 the locked-rotor admittance; starting, both the latter."""
    turn = EMF / 230
    made, _ = solve([], [motor("A", RUNNING_VA, STARTING_VA)])
    states = connected(made)
    run_y, start_y = RUNNING_VA.conjugate() / (3 * 230**2), STARTING_VA.conjugate() / (3 * 230**2)
    for sequence, first in ((turn, run_y), (turn.conj(), start_y)):
        solved = Network(made).solve("none", states, 200 * sequence)
        assert solved.l_n[0, :, 0] == pytest.approx(200 * sequence / (1 + 0.2 * first), abs=1e-6)
        solved = motor_start(Network(made), made, 0, states, 200 * sequence)
        assert solved.l_n[0, :, 0] == pytest.approx(200 * sequence / (1 + 0.2 * start_y), abs=1e-6)
    stopped = Network(made).solve("none", LoadStates(states.loads, 0 * states.motors, states.names), EMF)
    assert stopped.l_n[0, :, 0] == pytest.approx(EMF, abs=1e-6)


def test_three_wire_load_is_a_third_on_every_pair_at_line_volts() -> None:
    """Source: own arithmetic: constant impedance in triangle is a star of the same power without neutral."""
    _, solved = solve([load("A", "all", 9e3, 3e3)], [])
    y = (9e3 - 3e3j) / (3 * 230**2)
    assert solved.l_n[0, :, 0] == pytest.approx(EMF / (1 + 0.2 * y), abs=1e-6)
    _, pair = solve([load("A", "L3-L1", 4e3, 1e3)], [])
    assert pair.l_n[0, 2, 0] - pair.l_n[0, 0, 0] == pytest.approx(
        (EMF[2] - EMF[0]) / (1 + 0.4 * (4e3 - 1e3j) / (3 * 230**2)), abs=1e-6
    )


def test_loads_at_one_place_add_whether_their_bands_agree_or_not() -> None:
    """Source: own arithmetic: inside its band, at 230 V, a load draws P / 230 whatever its law."""
    loads = [
        load("A", "L1", 2300.0),
        load("A", "L1", 1150.0, zip_p=MIXED, band=(0.7, 1.2), name="a"),
        load("A", "L1", 460.0, zip_p=MIXED, band=(0.9, 1.1), name="b"),
        load("A", "L1", 230.0, zip_p=MIXED, band=(0.9, 1.1), name="c"),
        load("A", "L1", 690.0, zip_p=(1.0, 0.0, 0.0), zip_q=(0.0, 0.0, 1.0), name="d"),
    ]
    made = site([board("A")], loads)
    network, states = Network(made), connected(made)
    assert network.solve("none", states, EMF).neutral_a[0, 0] == pytest.approx(21.0, abs=1e-6)
    low = network.solve("none", states, 0.5 * EMF).neutral_a[0, 0]

    def edge(m: float) -> float:  # ZIP at the band's edge, taken as an impedance from there down
        return 0.5 * (0.3 * m * m + 0.3 * m + 0.4) / (m * m)

    assert low == pytest.approx(0.5 * 10 + 5 * edge(0.7) + 2 * edge(0.9) + 1 * edge(0.9) + 0.5 * 3, abs=1e-6)
    assert network.solve("none", states, 0.5 * EMF, all_impedance=True).neutral_a[0, 0] == pytest.approx(10.5, abs=1e-6)


def test_shares_of_a_load_in_its_state_scale_its_current() -> None:
    """Source: definition: a factor on the rating, parts of the law alike."""
    made = site([board("A")], [load("A", "L1", 2300.0, 1150.0, zip_p=MIXED), load("A", "L1", 460.0)])
    states = LoadStates(np.array([[0.25, 0.0], [0.5, 1.0]]), np.zeros((0, 2), np.int8), ("a", "b"))
    current = Network(made).solve("none", states, EMF).neutral_a[0]
    assert current == pytest.approx([2.5 - 1.25j + 1.0, 2.0], abs=1e-6)


def test_healthy_emf_is_the_source_times_a_scale_at_its_angles() -> None:
    """Source: definition."""
    made = site([board("A")], emf_v=240.0)
    assert healthy_emf(made) == pytest.approx(240 / 230 * EMF)
    assert healthy_emf(made, 1.1) == pytest.approx(264 / 230 * EMF)
    turned = site([board("A")], phase_order="L1-L3-L2")
    assert healthy_emf(turned) == pytest.approx(EMF.conj())


def test_loads_share_a_branch_where_place_and_band_agree_and_impedances_join_any() -> None:
    """Source: contract: fewest branches, since every one of them is solved for."""
    bands = {"a": (0.7, 1.2), "b": (0.7, 1.2), "c": (0.8, 1.2), "d": (0.7, 1.1)}
    banded = [load("A", "L1", 1e3, zip_p=MIXED, band=band, name=name) for name, band in bands.items()]
    linear = [load("A", "L1", 1e3, band=(0.5, 1.5)), load("A", "L1", 2e3, band=(0.9, 1.1)), load("A", "L2", 1e3)]
    motors = [motor("A", RUNNING_VA, STARTING_VA, "L1"), motor("A", RUNNING_VA, STARTING_VA, "L2-L3")]
    built = build_branches(site([board("A"), board("B")], [*linear, *banded, load("B", "L1", 1e3)], motors))
    assert len(built.board) == 3 + 1 + 1 + 1  # three bands on L1, L2 and L2-L3 at A, one at B
    assert sorted(built.board) == [0, 0, 0, 0, 0, 1]
    assert sorted(set(built.low_v / built.nominal_v)) == pytest.approx([0.5, 0.7, 0.8])
    half_linear = replace(banded[0], zip_p=(1.0, 0.0, 0.0), zip_q=(0.0, 1.0, 0.0))
    assert len(build_branches(site([board("A")], [linear[0], half_linear])).board) == 1
    assert len(build_branches(site([board("A")], [banded[2], half_linear])).board) == 2
