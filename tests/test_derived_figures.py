"""Figures the program derives, from a user's file to the result, against published tables and examples by hand.

Electrodes of rods and soil stand in ``tests/files/test_electrodes.py``.
What it does not derive: sizes of an electrode for a touch voltage, cable sections from a wire gauge, ohms of overhead
lines, starting current from a code letter, derating of motors.
The three definitions of unbalance on 400/395/388 V and others stand in ``tests/relay/test_quantities.py``.
"""

import cmath
import math

import numpy as np
import pytest

from relaycfg.model.geometry import three_phase
from relaycfg.network import Network, healthy_emf, least, motor_start, short_circuit
from relaycfg.relay import measured_quantities
from relaycfg.study.third_harmonic import third_harmonic
from tests.files.sweep import bare, read_bare

KFT_M = 304.8
IDEAL = 'kind = "impedance"\nline_ohm = [0, 0]\nneutral_ohm = [0, 0]'


@pytest.fixture
def made(tmp_path):
    """A site of the given pieces, read from its file."""
    return lambda **pieces: read_bare(tmp_path, bare(**pieces))


def cable(length_m, line_mm2, neutral_mm2, metal="Cu", temperature_c=70):
    return (
        f"[board.cable]\nlength_m = {length_m}\nline_mm2 = {line_mm2}\nneutral_mm2 = {neutral_mm2}\n"
        f'metal = "{metal}"\ntemperature_c = {temperature_c}'
    )


def current(between, amperes, pf=1.0, third_percent=0):
    """A load of constant current that is always on; the one that every bare site has is off in the least state."""
    return (
        f'[[load]]\nboard = "MB"\nname = "{between}"\nbetween = "{between}"\ncurrent_a = {amperes}\npf = {pf}\n'
        f'kind = "constant current"\nusage = 1\nthird_harmonic_percent = {third_percent}\n'
    )


def at_board(site):
    """Line-to-neutral phasors at the board with what is always on."""
    return Network(site).solve("none", least(site), healthy_emf(site)).l_n[0, :, 0]


@pytest.mark.parametrize(
    ("metal", "gauge", "section_mm2", "ohm_per_kft"),
    [
        ("Cu", "6", 13.302, 0.49),
        ("Cu", "4", 21.151, 0.31),
        ("Cu", "2", 33.631, 0.19),
        ("Cu", "1/0", 53.475, 0.12),
        ("Al", "4", 21.151, 0.51),
        ("Al", "1/0", 53.475, 0.20),
        ("Al", "4/0", 107.219, 0.10),
    ],
)
def test_a_cable_at_75_degrees_has_the_ohms_of_the_american_table(made, metal, gauge, section_mm2, ohm_per_kft):
    # NEC chapter 9, Table 9, PVC conduit, 75 C (as quoted, two texts); sections of the gauges by own arithmetic.
    # 3.5 %: two printed digits, and the two percent by which strands are longer than the cable.
    line = made(cable=cable(KFT_M, section_mm2, section_mm2, metal, 75)).board("MB").cable.line_ohm
    assert line.real == pytest.approx(ohm_per_kft, rel=0.035), gauge


@pytest.mark.parametrize(("section_mm2", "ohm_per_km"), [(50, 0.642 + 0.083j), (150, 0.208 + 0.080j)])
def test_a_cold_aluminium_cable_has_the_ohms_of_an_open_data_set(made, section_mm2, ohm_per_km):
    # Open line-type data set, four-core aluminium (as quoted). 1 % of R: IEC 60228 gives the most; 4 % of X: rounded.
    cold = made(cable=cable(1000, section_mm2, section_mm2, "Al")).board("MB").cable.fault_line_ohm
    assert cold.real == pytest.approx(ohm_per_km.real, rel=0.01)
    assert cold.imag == pytest.approx(ohm_per_km.imag, rel=0.04)


def test_the_drop_along_a_feeder_is_the_one_of_the_usual_formula(made):
    # I L (R cos + X sin) for a star of 50 A at 0.8 along 100 m of 25 mm2: 5 (0.8699 * 0.8 + 0.08 * 0.6) = 3.72 V;
    # IEC 60364-5-52 annex G (from memory). 0.02 V: the formula leaves out what is across the voltage.
    volts = np.abs(at_board(made(source=IDEAL, cable=cable(100, 25, 25), more=current("L1-L2-L3-N", 50, 0.8))))
    assert 230 - volts == pytest.approx([3.72] * 3, abs=0.02)


def test_the_drop_of_one_line_counts_there_and_back(made):
    # 2 I L R for 20 A along 30 m of 2.5 mm2, 7.41 ohm/km at 20 C (IEC 60228, as quoted): 1.2 * 8.866 = 10.64 V
    volts = np.abs(at_board(made(source=IDEAL, cable=cable(30, 2.5, 2.5), more=current("L1-N", 20))))
    assert 230 - volts[0] == pytest.approx(10.64, abs=0.01)


def test_a_reduced_neutral_displaces_by_its_own_ohms_three_times_and_those_of_the_line(made):
    # Own algebra: the lines read E1 - I (Zl + Zn), E2 - I Zn, E3 - I Zn. 50 A along 100 m of 95/50 mm2 at 70 C:
    # 50 / 3 |0.02309 + 3 * 0.04630 + j 4 * 0.008| = 2.752 V (ohms of IEC 60228, as quoted)
    l_n = at_board(made(source=IDEAL, cable=cable(100, 95, 50), more=current("L1-N", 50)))
    assert abs(l_n.mean()) == pytest.approx(2.752, abs=0.001)


def test_one_loaded_line_displaces_by_a_third_of_the_zero_sequence_ohms(made):
    # Symmetrical components (textbooks): I0 = I / 3, V0 = Z0 I0. 100 kVA, 4 %, Z0/Z1 9: 9 * 0.06348 * 50 / 3 = 9.52 V
    source = 'kind = "transformer"\nrating_kva = 100\nimpedance_percent = 4\nzero_sequence_ratio = 9'
    assert abs(at_board(made(source=source, more=current("L1-N", 50))).mean()) == pytest.approx(9.52, abs=0.005)


@pytest.mark.parametrize(
    ("rating_kva", "percent", "ohm"),
    [(100, 4, 0.064), (160, 4, 0.04), (250, 4, 0.0256), (400, 4, 0.016), (630, 4, 0.010159), (1000, 6, 0.0096),
     (1600, 6, 0.006)],
)  # fmt: skip
def test_a_short_circuit_behind_as_many_ohms_as_the_transformer_has_leaves_half_the_volts(
    made, rating_kva, percent, ohm
):
    # Z = u U^2 / S at 400 V, own arithmetic; the divider of two equal impedances
    text = f'kind = "transformer"\nno_load_v = 230.94\nrating_kva = {rating_kva}\nimpedance_percent = {percent}'
    site = made(source=f"{text}\nx_over_r = 3.5")
    circuit_ohm = cmath.rect(ohm, math.atan(3.5))
    left = short_circuit(site, "MB", "three-phase", circuit_ohm, healthy_emf(site))["MB"]
    assert np.abs(left[:3]) == pytest.approx([115.47] * 3, abs=0.01)


@pytest.mark.parametrize(
    ("shaft_kw", "rating_kva", "source_percent", "dip_percent"),
    [(55, 500, 5, 4.1), (22, 100, 4, 6.5), (22, 100, 20, 25.7)],
)
def test_a_motor_of_which_only_the_power_is_known_dips_its_supply_as_estimated(
    made, shaft_kw, rating_kva, source_percent, dip_percent
):
    # S_start / (S_start + S_sc), own arithmetic with the usual 6 times current, pf 0.85 and efficiency 0.9, which are
    # our defaults; exact where source and motor have one angle, so X/R of the source is that of a starting pf of 0.3.
    source = f'kind = "transformer"\nrating_kva = {rating_kva}\nimpedance_percent = {source_percent}'
    motor = f'[[motor]]\nboard = "MB"\nname = "Fan"\nshaft_kw = {shaft_kw}\n'
    site = made(source=f"{source}\nx_over_r = {math.tan(math.acos(0.3))}", more=motor)
    volts = np.abs(motor_start(Network(site), site, 0, least(site), healthy_emf(site)).l_n[0, :, 0])
    assert 100 * (1 - volts / 230) == pytest.approx([dip_percent] * 3, abs=0.06)


def test_a_motor_that_takes_six_times_its_current_has_the_code_letter_g(made):
    # NEMA MG 1; NEC Table 430.7(B) (as quoted, three texts): 5.6 to 6.29 kVA a horsepower; 1 hp is 745.7 W
    motor = made(more='[[motor]]\nboard = "MB"\nname = "Fan"\nshaft_kw = 7.457\n').motors[0]
    assert 5.6 <= abs(motor.starting_va) / 1000 / 10 <= 6.29


@pytest.mark.parametrize(("deviation", "low", "high"), [(2, 2, 2.3), (5, 5, 5.8), (10, 10, 11.6)])
def test_line_to_line_deviation_and_v2_over_v1_lie_in_the_range_of_the_letter(deviation, low, high):
    # P. Pillay and M. Manyage, Definitions of voltage unbalance, Table 1 (read). The upper edge to half of its last
    # digit; the lower one is the deviation itself to first order, and 2 % less at a deviation of 10 % (own arithmetic).
    turn = np.linspace(-1, 0, 2001)
    shares = np.concatenate([sign * np.stack([np.ones_like(turn), turn, -1 - turn], axis=1) for sign in (1, -1)])
    first, second, third = (400 * (1 + deviation / 100 * shares)).T
    inner = np.arccos((first**2 + second**2 - third**2) / (2 * first * second))
    corners = np.stack([first, 0 * first, second * np.exp(1j * inner), np.full(len(first), np.nan)], axis=1)
    unbalance = measured_quantities(three_phase(), corners)["unbalance_percent"]
    assert unbalance["line-to-line deviation"] == pytest.approx(deviation)
    assert unbalance["V2/V1"].min() == pytest.approx(low, rel=0.021)
    assert unbalance["V2/V1"].max() == pytest.approx(high, abs=0.05)


def test_a_fault_to_earth_lifts_the_neutral_to_50_v_where_the_standard_puts_its_limit(made):
    # IEC 60364-4-41, 411.4.1 (as quoted): R_B / R_E at most 50 / (U0 - 50), 0.2778 at 230 V; R_B 1 ohm, R_E 3.6 ohm.
    # A second board with an electrode of its own reads the neutral against earth that no current reaches.
    thin = "[board.cable]\nline_ohm = [1e-5, 0]\n"
    board = f'[[board]]\nname = "Far"\nfed_from = "MB"\nelectrode_ohm = 100\n{thin}'
    source = f"{IDEAL}\nelectrode_ohm = 1"
    site = made(earthing="TT", source=source, cable=f"electrode_ohm = 3.6\n{thin}", more=board)
    assert abs(short_circuit(site, "MB", "L-PE", 0j, healthy_emf(site))["Far"][-1]) == pytest.approx(50.0, abs=0.01)


def test_third_harmonic_currents_meet_in_the_neutral_three_times(made):
    # 3 I3 Z_N at 150 Hz, own arithmetic (physics): 3 lines of 10 A with 30 %; neutral 0.1 + j 0.02, line half of it.
    # 9 |0.1 + j 0.06| = 1.050 V of N against PE; V0 3 |0.05 + j 0.03 + 3 (0.1 + j 0.06)| = 1.224 V
    ohms = "[board.cable]\nline_ohm = [0.05, 0.01]\nneutral_ohm = [0.1, 0.02]\npe_ohm = [0.1, 0.02]"
    loads = "".join(current(f"{line}-N", 10, third_percent=30) for line in ("L1", "L2", "L3"))
    found = third_harmonic(made(source=IDEAL, cable=ohms, more=loads), "MB")
    assert (found.n_pe_v, found.v0_v) == pytest.approx((1.050, 1.224), abs=0.001)
