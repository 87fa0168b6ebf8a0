"""What a load, a motor, a fault and a case of a file become in the model."""

import cmath
import math

import numpy as np
import pytest

from relaycfg.files.resolve_cases import final_clearing, moved_neutral, reference_swells
from relaycfg.files.tables import Tables, names, shipped
from relaycfg.model.geometry import three_phase

KW = "kw = 2\n"
SQRT3 = math.sqrt(3)


def load_of(bench, text, between="L1-N"):
    return bench.read(bench.with_(KW, text).replace('"L1-N"', f'"{between}"')).loads[0]


def test_kw_is_the_total_at_the_loads_own_nominal_voltage(bench):
    for between, lines, to_neutral in (
        ("L2-N", (1,), True), ("L3-L1", (2, 0), False), ("L1-L2-L3", (0, 1, 2), False), ("L1-L2-L3-N", (0, 1, 2), True)
    ):  # fmt: skip
        load = load_of(bench, "kw = 2\npf = 0.8\n", between)
        assert (load.lines, load.to_neutral) == (lines, to_neutral)
        assert (load.p_w, load.q_var) == pytest.approx((2000, 1500))


@pytest.mark.parametrize(
    ("between", "watts"),
    [("L1-N", 230 * 10), ("L1-L2", SQRT3 * 230 * 10), ("L1-L2-L3", 3 * 230 * 10), ("L1-L2-L3-N", 3 * 230 * 10)],
)
def test_current_is_the_whole_rms_current_of_each_line(bench, between, watts):
    load = load_of(bench, "current_a = 10\npf = 0.8\n", between)
    assert load.p_w == pytest.approx(0.8 * watts)
    assert load.q_var == pytest.approx(0.6 * watts)


@pytest.mark.parametrize(("between", "square"), [("L1-N", 230**2), ("L1-L2", 3 * 230**2), ("L1-L2-L3-N", 3 * 230**2)])
def test_ohms_are_a_constant_impedance_and_may_be_capacitive(bench, between, square):
    load = load_of(bench, "ohm = [30, -40]\n", between)
    assert complex(load.p_w, load.q_var) == pytest.approx(square / complex(30, 40))
    assert load.zip_p == load.zip_q == (1, 0, 0)


def test_leading_power_and_generation_turn_the_sign(bench):
    assert load_of(bench, 'kw = 2\npf = 0.8\nreactive = "leading"\n').q_var == pytest.approx(-1500)
    generation = load_of(bench, "kw = -2\npf = 0.8\n")
    assert (generation.p_w, generation.q_var) == pytest.approx((-2000, -1500))


def test_a_kind_brings_its_law_band_and_power_factor(bench):
    load = load_of(bench, 'kw = 2\nkind = "led lighting"\n')
    assert (load.zip_p, load.band_low_pu, load.band_high_pu) == ((0, 0, 1), 0.7, 1.2)
    assert load.q_var == pytest.approx(2000 * math.tan(math.acos(0.95)))


def test_the_law_of_every_kind_sums_to_one(bench):
    kinds = names("load-kinds")
    rows = "".join(f'MB,load {i},L1-N,1,"{kind}"\n' for i, kind in enumerate(kinds))
    bench.put("loads.csv", "board,name,between,kw,kind\n" + rows)
    loads = bench.read(bench.site + '[loads]\nfile = "loads.csv"\n').loads[: len(kinds)]
    assert all(sum(load.zip_p) == pytest.approx(1) and sum(load.zip_q) == pytest.approx(1) for load in loads)
    industrial = shipped()["class-industrial"].values["zip_p"]  # sums to 1.01 as printed
    assert sum(industrial) == pytest.approx(1.01)


def test_own_shares_hold_for_q_too_and_have_the_default_band(bench):
    load = load_of(bench, "kw = 2\nzip_p = [0.2, 0.3, 0.5]\n")
    assert load.zip_q == pytest.approx((0.2, 0.3, 0.5))
    assert (load.band_low_pu, load.band_high_pu, load.kind) == (0.7, 1.2, "zip")


def test_alike_loads_are_merged_and_alike_motors_are_not(bench):
    assert load_of(bench, "kw = 2\ncount = 4\n").p_w == 8000
    motor = '[[motor]]\nboard = "MB"\nname = "Fan"\nshaft_kw = 4.5\nefficiency = 0.9\npf = 0.8\ncount = 2\n'
    motors = bench.read(bench.site + motor + "[motor.start]\ncurrent_ratio = 6\npf = 0.6\nduration_s = 3\n").motors
    assert [m.name for m in motors] == ["Fan 1", "Fan 2"]
    assert motors[0].running_va == pytest.approx(5000 + 3750j)
    assert motors[0].starting_va == pytest.approx(6 * 6250 * (0.6 + 0.8j))
    assert (motors[0].start_s, motors[0].to_neutral, motors[0].shaft_w) == (3, False, 4500)


def test_a_member_without_usage_takes_that_of_its_group(bench):
    more = 'group = "day"\n[[load]]\nboard = "MB"\nbetween = "L2-N"\nkw = 1\ngroup = "day"\nusage = 0.3\n'
    assert [load.usage for load in bench.read(bench.site + more).loads] == [0.3, 0.3]


def test_phase_order_turns_the_geometry(bench):
    site = bench.read(bench.with_("nominal_v = 230", 'nominal_v = 230\nphase_order = "L1-L3-L2"'))
    assert site.supply.geometry.angles_deg == (0, 120, -120)


def test_faults_by_default_are_final_circuits_and_distribution_cables(bench):
    # IEC 60364-4-41 Table 41.1 (as quoted; TT read), 411.3.2.3 and .4 (as quoted)
    faults = bench.read().faults
    assert [(f.board, f.clearing_s, f.assumed) for f in faults] == [
        ("MB", 0.4, True), ("Workshop", 0.4, True), ("Workshop", 5.0, True)
    ]  # fmt: skip
    assert [f.circuit_ohm for f in faults] == [0.3 + 0.01j, 0.3 + 0.01j, 0j]
    tt = bench.read(bench.with_('"TN-S"', '"TT"')).faults
    assert [f.clearing_s for f in tt] == [0.2, 0.2, 1.0]
    assert [final_clearing("TN-S", v, Tables())[0] for v in (120, 127, 277, 480)] == [0.8, 0.4, 0.2, 0.1]


def test_own_faults_replace_the_assumed_ones(bench):
    own = '[[fault]]\nboard = "MB"\ncircuit_ohm = [0.1, 0.02]\nclearing_s = 0.05\n'
    assert [(f.circuit_ohm, f.clearing_s, f.assumed) for f in bench.read(bench.site + own).faults] == [
        (0.1 + 0.02j, 0.05, False)
    ]


def test_the_public_supply_set_has_class_3_dips_and_our_swells(bench):
    # IEC 61000-4-11 class 3 (as quoted); hold times of EN 50550 from memory, the 275 V cell as quoted
    reference = bench.read().reference
    assert [(d[0], d[1]) for d in reference.dips] == [(0, 0.01), (0, 0.02), (40, 0.2), (70, 0.5), (80, 5.0)]
    assert [(round(2.3 * s[0]), s[1], s[3]) for s in reference.swells] == [
        (275, 3.0, "quoted"), (300, 1.0, "memory"), (350, 0.25, "memory"), (400, 0.07, "memory")
    ]  # fmt: skip
    assert reference.interruption_s == 0.3
    at_60 = bench.read(bench.with_("nominal_v = 230", "nominal_v = 230\nfrequency_hz = 60")).reference
    assert at_60.dips[-1][1] == pytest.approx(5.0)


def test_no_sets_leave_no_reference_cases(bench):
    reference = bench.read(bench.site + "[must_hold]\nsets = []\ninterruption_s = 1\n").reference
    assert (reference.dips, reference.swells, reference.interruption_s) == ((), (), 1)


def test_our_swells_stay_inside_what_household_devices_must_not_trip_on():
    hold = dict(shipped()["household-overvoltage-hold-times"].points)
    assert {round(2.3 * percent, 6): s for percent, s, _, _ in reference_swells(Tables(), 230)} == hold


def test_a_moved_neutral_is_found_from_three_volts():
    geometry = three_phase()
    taps = 230 * geometry.phasors - cmath.rect(60, 0.7)
    emf, found = moved_neutral([float(v) for v in abs(taps)], geometry)
    assert emf == pytest.approx(230)
    assert np.array(found) == pytest.approx(taps)


def test_a_case_without_angles_keeps_line_to_line_volts_or_says_that_it_cannot(bench):
    case = '[[case]]\nname = "c"\nexpect = "trip"\n[[case.segment]]\nduration_s = 1\nl_n_v = '
    tap = 230 * three_phase().phasors - 40
    moved = bench.read(bench.site + case + f"{[float(v) for v in abs(tap)]}\n")
    assert np.array(moved.user_cases[0].segments[0].l_n_v) == pytest.approx(tap)
    assert moved.warnings == ()
    lost = bench.read(bench.site + case + "[0, 230, 230]\n")
    assert abs(sum(lost.user_cases[0].segments[0].l_n_v) / 3) == pytest.approx(230 / 3)  # a lost line, not a neutral
    assert lost.warnings == (
        "Case c: 0, 230, 230 V do not fit a moved neutral behind sound line-to-line volts; "
        "the angles of the source are taken. Give angle_deg.",
    )


def test_a_case_with_angles_is_taken_as_given(bench):
    case = '[[case]]\nname = "c"\nexpect = "hold"\n[[case.segment]]\nduration_s = 0.8\nl_n_v = [214, 226, 231]\n'
    site = bench.read(bench.site + case + "angle_deg = [0, -120, 120]\n")
    segment = site.user_cases[0].segments[0]
    assert [abs(v) for v in segment.l_n_v] == pytest.approx([214, 226, 231])
    assert math.degrees(cmath.phase(segment.l_n_v[2])) == pytest.approx(120)


def test_equipment_is_the_household_envelope_unless_given(bench):
    # EN 50550 Table 1 from memory, the 400 V cell as quoted
    equipment = bench.read().equipment
    assert equipment.high_points == ((275, 15), (300, 5), (350, 0.75), (400, 0.2))
    assert (equipment.sustained_high_v, equipment.sustained_high_s, equipment.sustained_low_v) == (255, 15, None)
    assert equipment.status == "memory"


def test_own_points_have_no_time_below_the_first(bench):
    own = "[equipment]\npoints = [[276, 15], [300, 5]]\nsustained_low_v = 184\n"
    equipment = bench.read(bench.site + own).equipment
    assert (equipment.sustained_high_v, equipment.high_points[0]) == (276, (276, 15))
    assert (equipment.sustained_low_v, equipment.sustained_low_s) == (184, 10)  # 80 % for 10 s, ITI curve as quoted


def test_a_curve_in_volts_is_scaled_far_from_its_voltage_and_says_so(bench):
    site = bench.read(bench.with_("nominal_v = 230", "nominal_v = 120"))
    assert site.equipment.high_points[0][0] == pytest.approx(275 * 120 / 230)
    assert site.warnings[0].startswith("Equipment: the household overvoltage envelope is given for 230 V")
    curve = '[equipment]\novervoltage = "information equipment, high side (120 V)"\n'
    percent = bench.read(bench.with_("nominal_v = 230", "nominal_v = 120") + curve)
    assert (percent.equipment.sustained_high_v, percent.equipment.high_points) == (132, ((144, 0.5),))
    assert percent.warnings == ()
