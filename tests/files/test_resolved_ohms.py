"""Ohms of cables, transformers and generators against published rows and plain arithmetic."""

import cmath
import math

import pytest

from relaycfg.files.resolve_boards import resistance_20, warm
from relaycfg.files.resolve_supply import band_percent, series_ohm, star_neutral_ohm, zero_sequence
from relaycfg.files.tables import Tables
from relaycfg.model.geometry import three_phase

CABLE = "length_m = 40\nline_mm2 = 25\nneutral_mm2 = 25\npe_mm2 = 16"


@pytest.mark.parametrize(
    ("section", "metal", "ohm_per_km"),
    [(25, "Cu", 0.727), (95, "Cu", 0.193), (16, "Cu", 1.15), (50, "Al", 0.641), (150, "Al", 0.206)],
)
def test_resistance_at_20_degrees_is_that_of_iec_60228_class_2(section, metal, ohm_per_km):
    # IEC 60228, table for class 2 (as quoted; three independent tables agree)
    assert resistance_20(section, metal, Tables())[0] == ohm_per_km


def test_a_section_outside_the_table_goes_by_resistivity_and_says_so():
    # IEC 60287-1-1 Table 1 (as quoted): copper 0.017241 ohm mm2/m
    ohm, source = resistance_20(42, "Cu", Tables())
    assert ohm == pytest.approx(17.241 / 42)
    assert source.startswith("42 mm2 not in IEC 60228, IEC 60287-1-1")


def test_copper_at_70_degrees_is_a_fifth_above_20():
    # coefficient 0.00393 1/K, QED electrotechnics textbook (read): 1 + 0.00393 * 50
    assert warm(1.0, "Cu", 70, Tables()) == pytest.approx(1.1965)
    assert warm(1.0, "Al", 70, Tables()) == pytest.approx(1.1955)


def test_a_cable_is_warm_under_load_and_cold_in_a_fault(bench):
    cable = bench.read().board("Workshop").cable
    assert cable.line_ohm == pytest.approx(0.04 * complex(0.727 * 1.1965, 0.08))
    assert cable.fault_line_ohm == pytest.approx(0.04 * complex(0.727, 0.08))
    assert cable.pe_ohm == pytest.approx(0.04 * complex(1.15 * 1.1965, 0.08))
    assert bench.read().board("MB").cable is None


def test_reactance_by_default_grows_with_frequency_and_a_given_one_does_not(bench):
    at_60 = bench.with_("nominal_v = 230", "nominal_v = 230\nfrequency_hz = 60")
    assert bench.read(at_60).board("Workshop").cable.line_ohm.imag == pytest.approx(0.04 * 0.08 * 1.2)
    given = at_60.replace("line_mm2 = 25", "line_mm2 = 25\nreactance_ohm_per_km = 0.1")
    assert bench.read(given).board("Workshop").cable.line_ohm.imag == pytest.approx(0.004)


def test_ohms_given_are_taken_as_they_are(bench):
    site = bench.read(bench.with_(CABLE, "line_ohm = [0.1, 0.01]\nneutral_ohm = [0.2, 0.02]"))
    cable = site.board("Workshop").cable
    assert (cable.line_ohm, cable.neutral_ohm, cable.pe_ohm) == (0.1 + 0.01j, 0.2 + 0.02j, None)
    assert (cable.fault_line_ohm, cable.fault_neutral_ohm) == (cable.line_ohm, cable.neutral_ohm)


def test_transformer_impedance_is_the_percentage_of_rated_voltage_over_rated_current():
    # own arithmetic at 400 V and 4 %: 0.04 * 400^2 / S
    for kva, ohm in ((100, 0.064), (160, 0.04), (250, 0.0256), (400, 0.016), (630, 0.010159)):
        assert abs(series_ohm(4, kva, 400, 3.3)) == pytest.approx(ohm, abs=5e-7)
    assert cmath.phase(series_ohm(4, 400, 400, 3.3)) == pytest.approx(math.atan(3.3))


def test_transformer_ohms_go_by_the_no_load_volts_between_lines(bench):
    source = bench.read(bench.with_("rating_kva = 400", "rating_kva = 400\nno_load_v = 240")).source
    assert source.emf_v == 240
    assert abs(source.line_ohm) == pytest.approx(0.04 * 3 * 240**2 / 400e3)


def test_a_given_zero_sequence_ratio_enters_as_a_third_of_the_difference(bench):
    source = bench.read(bench.with_("rating_kva = 400", "rating_kva = 400\nzero_sequence_ratio = 4")).source
    assert source.neutral_ohm == pytest.approx(source.line_ohm)


def test_the_neutral_of_a_star_carries_the_currents_of_all_its_lines():
    # limiting cases of Z0 = Z1 + 3 Z_N
    assert star_neutral_ohm(0.1 + 0.2j, 0.1 + 0.2j, three_phase()) == 0
    assert star_neutral_ohm(0j, 3 + 6j, three_phase()) == pytest.approx(1 + 2j)


def test_vector_groups_have_the_zero_sequence_of_their_rows():
    # IEC 60076-8 Table 1 (as quoted): X0/X1 0.85 to 1 for Dyn, 0.1 for Yzn, 3 to 10 for Yyn; R0/R1 of Yzn from memory
    line, tables = 0.004 + 0.015j, Tables()
    assert zero_sequence(line, "dyn", tables)[0] == pytest.approx(complex(0.004, 0.015 * 0.925))
    assert zero_sequence(line, "yzn", tables)[0] == pytest.approx(complex(0.0016, 0.0015))
    assert zero_sequence(line, "yzn", tables)[2] == "memory"
    assert zero_sequence(line, "yyn", tables)[0].imag == pytest.approx(0.015 * 6.5)


def test_a_generator_has_its_transient_reactance_and_the_steps_of_its_class(bench):
    text = bench.with_('kind = "transformer"', 'kind = "generator"').replace("impedance_percent = 4", 'class = "G2"')
    source = bench.read(text.replace("rating_kva = 400", "rating_kva = 100\nreactance_percent = 20")).source
    assert source.line_ohm.imag == pytest.approx(0.2 * 3 * 230**2 / 100e3)
    # ISO 8528-5 class G2 (as quoted)
    assert (source.step_dip_percent, source.step_rise_percent, source.step_recovery_s) == (-20, 25, 6)


def test_a_plain_source_is_its_ohms(bench):
    text = bench.with_('kind = "transformer"', 'kind = "impedance"\nline_ohm = [0, 0]\nneutral_ohm = [0.1, 0.2]')
    source = bench.read(text.replace("rating_kva = 400\nimpedance_percent = 4\n", "")).source
    assert (source.line_ohm, source.neutral_ohm) == (0, 0.1 + 0.2j)
    assert source.step_recovery_s == 0


@pytest.mark.parametrize(
    ("row", "low", "high"),
    [("en-50160-all-means", -15, 10), ("uk-statutory", -6, 10), ("c84-1-b-120-service", -100 / 12, 70 / 12)],
)
def test_bands_are_read_in_percent_of_their_own_nominal(row, low, high):
    # EN 50160 and ANSI C84.1 Range B as quoted; the British statutory instrument read
    assert band_percent(Tables().row(row)) == pytest.approx((low, high))


def test_a_band_becomes_volts_of_the_site(bench):
    supply = bench.read(bench.with_("nominal_v = 230", 'nominal_v = 230\nband = "United Kingdom statutory"')).supply
    assert (supply.low_v, supply.high_v) == pytest.approx((216.2, 253.0))
    assert supply.band_source.startswith("Electricity Supply (Amendment) (No. 2) Regulations 1994")
    assert (supply.band_source.endswith(", read"), supply.band_status) == (False, "read")
    own = bench.read(bench.with_("nominal_v = 230", "nominal_v = 230\nlow_percent = -8\nhigh_percent = 6")).supply
    assert (own.low_v, own.high_v) == pytest.approx((211.6, 243.8))
    assert (own.band_source, own.band_status) == ("user", "user")
    assert bench.read().supply.band_status == "quoted"
