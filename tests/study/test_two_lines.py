"""Split phase and two lines of a star through the study: cases, elements, settings, worked break, JSON."""

import json
from pathlib import Path

import jsonschema
import numpy as np
import pytest

from relaycfg import text
from relaycfg.files import read_settings, read_site
from relaycfg.model.device import NO_DISPLACEMENT, Function
from relaycfg.model.geometry import geometry_of, split_phase, two_of_star
from relaycfg.network import Network, connected
from relaycfg.study import breaks, check, derive
from relaycfg.study.cases import must_hold_cases
from relaycfg.study.evidence import gather
from relaycfg.study.levels import healthy_taps, supply_levels
from relaycfg.study.third_harmonic import third_harmonic
from relaycfg.text import breaks_text, derive_text, study_dict
from tests.study import two_lines

EXAMPLE = Path(__file__).parents[2] / "examples" / "split-phase" / "site.toml"
SCHEMA = json.loads((Path(text.__file__).parent / "result.schema.json").read_text())
BOTH = pytest.mark.parametrize("system", ["1ph-3w", "2ph-3w"])


def cases_of(site):
    network = Network(site)
    levels = supply_levels(site, network)
    healthy = healthy_taps(site, network, levels, connected(site), "Panel")
    return {case.name: case for case in must_hold_cases(site, network, levels, healthy, "Panel")}


def volts(course):
    return np.abs(course.segments[0].tap[:-1])


def test_displacement_of_split_phase_is_half_the_difference_of_the_legs():
    """Source: own arithmetic: 160 and -80 V have the mean 40 V; a neutral off the line is found too."""
    legs = split_phase()
    assert legs.has_displacement
    assert legs.displacement(np.array([160.0, -80.0])) == pytest.approx(40)
    shift = -25 + 11j
    assert legs.displacement(120 * legs.phasors - shift) == pytest.approx(-shift)
    assert legs.neutral_shift(120 * legs.phasors - shift) == pytest.approx(shift)


@pytest.mark.parametrize("order", ["L1-L2-L3", "L1-L3-L2"])
def test_two_lines_of_a_star_have_no_displacement_but_the_volts_between_them_place_the_neutral(order):
    """Source: own arithmetic: the mean of 1 and a^2 has the size 1/2, so 60 V stand there with nothing broken."""
    pair = two_of_star(order)
    assert not pair.has_displacement
    assert abs((120 * pair.phasors).mean()) == pytest.approx(60)
    assert np.isnan(pair.displacement(120 * pair.phasors))
    shift = -25 + 11j
    assert pair.neutral_shift(120 * pair.phasors - shift) == pytest.approx(shift)
    assert pair.line_to_line_ratio == pytest.approx(3**0.5)


def test_only_three_lines_have_an_order_of_their_sequences():
    assert [geometry_of(s).has_sequences for s in ("3ph-4w", "1ph-3w", "2ph-3w")] == [True, False, False]
    assert [geometry_of(s).of_star for s in ("3ph-4w", "1ph-3w", "2ph-3w")] == [True, False, True]


@BOTH
def test_dips_come_on_one_line_and_on_all(tmp_path, system):
    """Source: own arithmetic on 120 V: 40 percent is 48 V; V0 of a one-leg dip is 0.6 x 120 / 2 = 36 V."""
    site = two_lines.site(tmp_path, system)
    dip = cases_of(site)["Dip to 40 %, 0.2 s"]
    by_name = {c.label: c for c in dip.courses}
    assert volts(by_name["all lines"]) == pytest.approx([48, 48])
    assert volts(by_name["one line"]) == pytest.approx([48, 120])
    assert "two lines" not in by_name
    if system == "1ph-3w":
        assert len(by_name) == 2
        assert abs(by_name["one line"].segments[0].tap[:-1].mean()) == pytest.approx(36)


def test_a_dip_through_a_delta_star_transformer_is_seen_at_any_two_of_its_three_lines(tmp_path):
    """Source: Bollen's types (from memory): C at h leaves 1 and sqrt(1/4 + 3/4 h^2) twice, D h and sqrt(3/4 + h^2/4).

    Any two lines: the pair alike, and each of the others beside it. The volts between lines stay those of the type.
    """
    h = 0.4
    site = two_lines.site(tmp_path, "2ph-3w")
    dip = cases_of(site)["Dip to 40 %, 0.2 s"]
    low_c, low_d = 120 * np.sqrt(1 / 4 + 3 / 4 * h**2), 120 * np.sqrt(3 / 4 + h**2 / 4)
    c = [volts(x) for x in dip.courses if "type C" in x.label]
    d = [volts(x) for x in dip.courses if "type D" in x.label]
    np.testing.assert_allclose(sorted(map(sorted, c)), sorted([[low_c, 120], [low_c, low_c], [low_c, 120]]))
    np.testing.assert_allclose(sorted(map(sorted, d)), sorted([[48, low_d], [low_d, low_d], [48, low_d]]))
    between = [abs(x.segments[0].tap[0] - x.segments[0].tap[1]) for x in dip.courses if "type C" in x.label]
    # V_b - V_c of type C is h times 208 V; the two others keep sqrt(9/4 + 3/4 h^2) of 120 V.
    assert sorted(between) == pytest.approx(sorted([h * 120 * 3**0.5, *[120 * np.sqrt(9 / 4 + 3 / 4 * h**2)] * 2]))


@BOTH
def test_short_circuits_of_two_lines_are_between_them_and_of_either_to_neutral(tmp_path, system):
    """Source: own arithmetic, voltage divider on a bolted L1-N fault at the panel: N rises by Z_N/(Z_L + Z_N) of E1.

    Z_L = 0.03 + j0.02, Z_N = 0.03 + j0.01 ohm; L2 then stands at E2 less that rise. Supply at its upper limit, 127 V.
    """
    site = two_lines.site(tmp_path, system)
    fault = cases_of(site)["Short circuit behind Panel, 0.05 s"]
    by_name = {c.label: c for c in fault.courses}
    kinds = {label.split()[0] for label in by_name}
    assert kinds == {"L1-N", "L2-N", "L1-PE", "L2-PE", "L-L", "L-L-N"}
    e1, e2 = 127 * site.supply.geometry.phasors
    rise = (0.03 + 0.01j) / (0.06 + 0.03j)
    assert volts(by_name["L1-N near end, upper limit"]) == pytest.approx([0, abs(e2 - rise * e1)], abs=1e-6)
    assert volts(by_name["L2-N near end, upper limit"]) == pytest.approx([abs(e1 - rise * e2), 0], abs=1e-6)
    half = abs(e1 + e2) / 2
    assert volts(by_name["L-L near end, upper limit"]) == pytest.approx([half, half], abs=1e-6)
    assert volts(by_name["L-L-N near end, upper limit"]) == pytest.approx([0, 0], abs=1e-6)


def test_a_two_line_supply_carries_its_unbalance_as_its_source_does(tmp_path):
    """Legs of one winding: displacement 2 percent is 2.4 V, half their difference, and no V2. Own arithmetic.

    Two lines of a star keep V2/V1: at its worst angle it lowers one line and raises the other, about 2 percent each.
    """
    loads = two_lines.load("L1-L2", 0.001, "nothing", 1.0)
    legs = two_lines.site(tmp_path / "legs", "1ph-3w", loads, supply="displacement_percent = 2")
    assert legs.supply.unbalance_percent == 0
    standing = cases_of(legs)["Most unbalanced healthy state"]
    assert "V2/V1" not in standing.source
    displaced = next(c for c in standing.courses if "V0" in c.label)
    assert abs(displaced.segments[0].tap[:-1].mean()) == pytest.approx(2.4, abs=0.01)
    star = two_lines.site(tmp_path / "star", "2ph-3w", loads, supply="unbalance_percent = 2")
    standing = cases_of(star)["Most unbalanced healthy state"]
    assert "V2/V1 2 %" in standing.source
    uneven = next(c for c in standing.courses if "line-to-neutral deviation" in c.label)
    first, second = volts(uneven)
    assert 200 * abs(first - second) / (first + second) / 2 == pytest.approx(2 * np.cos(np.pi / 6), abs=0.02)
    assert not any("V0" in c.label for c in standing.courses)
    assert "V0" not in standing.figures


def test_the_supplys_displacement_parts_two_lines_of_a_star_most(tmp_path):
    """Source: own arithmetic: d along E1 - E2 moves each line by d cos 30, one up and one down, to first order."""
    loads = two_lines.load("L1-L2", 0.001, "nothing", 1.0)
    site = two_lines.site(tmp_path, "2ph-3w", loads, supply="unbalance_percent = 0\ndisplacement_percent = 1")
    standing = cases_of(site)["Most unbalanced healthy state"]
    apart = max(abs(volts(c)[0] - volts(c)[1]) for c in standing.courses)
    level = max(volts(c).mean() for c in standing.courses)
    assert apart == pytest.approx(2 * 1.2 * np.cos(np.pi / 6), rel=0.02)
    assert level <= 127 + 1e-6


def test_the_third_harmonic_of_two_legs_cancels_in_their_neutral_and_that_of_two_lines_of_a_star_adds(tmp_path):
    """Source: own arithmetic at 180 Hz: N-PE = 3rd-harmonic amperes in N times |0.03 + j0.03| ohm.

    1.2 kW on L1 and 0.6 kW on L2 with 20 percent: 2 and 1 A. The legs: 2 A, L2 being off; the star's lines: 3 A.
    """
    loads = "".join(
        two_lines.load(f"L{k + 1}-N", kw, f"l {k}", 1.0).replace("harmonic_percent = 0", "harmonic_percent = 20")
        for k, kw in enumerate((1.2, 0.6))
    )
    ohm = abs(0.03 + 0.03j)
    legs = third_harmonic(two_lines.site(tmp_path / "legs", "1ph-3w", loads), "Panel")
    star = third_harmonic(two_lines.site(tmp_path / "star", "2ph-3w", loads), "Panel")
    assert legs.n_pe_v == pytest.approx(2 * ohm)
    assert star.n_pe_v == pytest.approx(3 * ohm)
    # V0 of the legs: the mean of 2 A in one line, (0.03 + j0.06) / 2, and all of them in N. Star: there is no V0.
    assert legs.v0_v == pytest.approx(2 * abs((0.03 + 0.06j) / 2 + 0.03 + 0.03j))
    assert star.v0_v == 0


def test_each_element_of_split_phase_sees_the_load_ratio_that_a_divider_gives(tmp_path):
    """Source: own arithmetic (series divider across 240 V): light leg 240 k/(1 + k), V0 120 (k - 1)/(k + 1)."""
    study = derive(two_lines.site(tmp_path, "1ph-3w"), 300, 1)
    lowest = {
        f: min(s.pickup for s in study.settings.of(f) if s.on) for f in (Function.OVERVOLTAGE, Function.DISPLACEMENT)
    }
    over, shift = 1.01 * lowest[Function.OVERVOLTAGE], lowest[Function.DISPLACEMENT]
    error = float(study.device.element(Function.DISPLACEMENT).accuracy.pickup_error(shift))
    shift += error
    assert study.smallest_asymmetry["59"] == pytest.approx(over / (240 - over), rel=1e-3)
    assert study.smallest_asymmetry["59N"] == pytest.approx((120 + shift) / (120 - shift), rel=1e-3)
    assert f"59 from {over / (240 - over):.2f}:1," in derive_text(study)
    # Each of two channels errs by 1 % of 120 V; with the worst signs V0 errs by as much (own arithmetic).
    assert error == pytest.approx(1.2)


def test_59n_from_line_to_neutral_is_refused_on_two_lines_of_a_star_and_listed_off(tmp_path):
    site = two_lines.site(tmp_path, "2ph-3w")
    assert site.relay.device.element(Function.DISPLACEMENT) is None
    assert site.relay.device.why_off(Function.DISPLACEMENT) == NO_DISPLACEMENT
    assert any(w.startswith("Device: its 59N has to be off") for w in site.warnings)
    study = derive(site, 200, 1)
    stages = {r.stage.label: r for r in study.stages}
    assert not stages["59N stage 1"].stage.on
    assert stages["59N stage 1"].reason == stages["59N stage 2"].reason == NO_DISPLACEMENT
    assert "59N" not in study.smallest_asymmetry
    assert all(c.highest_v0_v != c.highest_v0_v for c in study.cases)
    assert "V0 at the relay" not in {p.name for s in study.breaks.summaries for p in s.percentiles}


def test_a_59n_that_is_on_all_the_same_is_an_exception(tmp_path):
    site = two_lines.site(tmp_path, "2ph-3w")
    path = tmp_path / "settings.toml"
    head = 'schema = 1\nfor_relay = "R1"\ndevice = "Two-line relay"\n'
    path.write_text(head + "[[displacement]]\nstage = 1\non = true\npickup_v = 20\ndelay_s = 1\n")
    study = check(site, read_settings(path, site), 50, 1)
    found = next(f for f in study.findings if f.about == "59N stage 1")
    assert found.exception
    assert "nothing broken" in found.sentence
    assert found.do == "switch 59N stage 1 off"


@BOTH
def test_59n_measured_from_n_to_earth_serves_two_lines(tmp_path, system):
    """In TN-S the PE stays behind: N to PE is the shift, 2:1 on a stiff 240 or 208 V being 40 V or 69.3 V. Hand-worked.

    The star's 69.28 V: reference case two-of-three-208. Cables of 0.03 ohm take up to 0.5 V of it.
    """
    loads = two_lines.load("L1-N", 2.0, "a", 1.0) + two_lines.load("L2-N", 1.0, "b", 1.0)
    site = two_lines.site(tmp_path, system, loads, displacement_from="n-to-earth")
    row = next(r for r in breaks(site, samples=2, seed=1, state="connected").rows if r.at == "Panel")
    expected = {"1ph-3w": 40.0, "2ph-3w": 69.28}[system]
    assert row.relays["R1"].n_pe_v == pytest.approx(expected, abs=0.5)
    study = derive(site, 50, 1)
    assert any(s.on for s in study.settings.of(Function.DISPLACEMENT))


@BOTH
@pytest.mark.parametrize(
    ("definition", "stays"),
    [("line-to-neutral deviation", True), ("spread", True), ("line-to-line deviation", False), ("V2/V1", False)],
)
def test_47_keeps_the_definitions_that_two_lines_have(tmp_path, system, definition, stays):
    elements = two_lines.OVER + two_lines.UNBALANCE.replace("DEFINITION", definition)
    device = two_lines.site(tmp_path, system, elements=elements).relay.device
    assert (device.element(Function.UNBALANCE) is not None) == stays
    assert bool(device.why_off(Function.UNBALANCE)) != stays


def test_the_sum_of_two_lines_is_twice_the_displacement(tmp_path):
    """A device that counts the sum (3v0) is set to twice the volts, on twice the knob and errors. Own arithmetic."""
    double = two_lines.DISPLACEMENT.replace("min = 4, max = 100, step = 0.5", "min = 8, max = 200, step = 1.0")
    one = derive(two_lines.site(tmp_path / "v0", "1ph-3w"), 200, 1)
    over = two_lines.OVER + two_lines.UNDER
    two = derive(two_lines.site(tmp_path / "sum", "1ph-3w", elements=over + double, quantity="3v0"), 200, 1)
    pickups = [[s.pickup for s in study.settings.of(Function.DISPLACEMENT) if s.on] for study in (one, two)]
    assert len(pickups[0]) == 2
    assert pickups[1] == pytest.approx([2 * p for p in pickups[0]])
    injected = [next(t.inject for t in study.tests if t.element == "59N stage 1") for study in (one, two)]
    assert injected[0] == injected[1]


def test_the_test_schedule_lowers_one_leg_by_twice_the_displacement(tmp_path):
    """Source: own arithmetic: 120 V and 120 - 2 V0 have the mean V0; the volts printed are those to inject."""
    study = derive(two_lines.site(tmp_path, "1ph-3w"), 100, 1)
    stage = next(s for s in study.settings.of(Function.DISPLACEMENT) if s.on)
    point = next(t for t in study.tests if t.element == stage.label)
    assert point.inject == f"all lines 120 V, then L1 slowly to {120 - 2 * stage.pickup:.1f} V"


def test_a_lost_neutral_of_split_phase_is_two_legs_in_series_and_worked_so_by_hand(tmp_path):
    """Source: own arithmetic: 3 kW and 1 kW at 120 V in series across 240 V are 60 and 180 V."""
    loads = two_lines.load("L1-N", 3.0, "a", 1.0) + two_lines.load("L2-N", 1.0, "b", 1.0)
    study = derive(two_lines.site(tmp_path, "1ph-3w", loads), 20, 1)
    assert study.worked.l_n_v == pytest.approx((60, 180))
    assert abs(study.worked.shift_v) == pytest.approx(60)
    assert study.worked.solver_l_n_v == pytest.approx((60, 180), abs=1.0)


def test_equal_loads_are_invisible_on_split_phase_and_a_low_voltage_on_two_lines_of_a_star(tmp_path):
    """Source: own arithmetic: half of 240 V is 120 V, half of 207.85 V is 103.92 V."""
    loads = two_lines.load("L1-N", 2.0, "a", 1.0) + two_lines.load("L2-N", 2.0, "b", 1.0)
    for system, expected in (("1ph-3w", 120.0), ("2ph-3w", 103.92)):
        site = two_lines.site(tmp_path / system, system, loads)
        study = breaks(site, samples=2, seed=1)
        row = next(r for r in study.rows if (r.at, r.state) == ("Panel", "connected"))
        assert row.boards["Panel"].l_n_v == pytest.approx([expected] * 2, abs=1.1)
        said = any(n.startswith("break at Panel, state connected") for n in study.notes)
        assert said == (system == "1ph-3w")
        shown = derive_text(derive(site, 20, 1))
        assert ("no voltage relay can see it" in shown) == (system == "1ph-3w")
        assert ("103.9 V on either line" in shown) == (system == "2ph-3w")


@BOTH
def test_the_results_of_two_lines_keep_to_the_published_form(tmp_path, system):
    result = json.loads(json.dumps(study_dict(derive(two_lines.site(tmp_path, system), 100, 1), "test", True)))
    jsonschema.Draft202012Validator(SCHEMA).validate(result)
    row = next(r for r in result["breaks"] if r["at"] == "Panel")
    panel, relay = row["boards"]["Panel"], row["relays"]["R1"]
    assert (len(panel["l_n_v"]), len(panel["l_l_v"])) == (2, 1)
    for found in (panel, relay):
        assert (found["v0_v"] is None) == (system == "2ph-3w")
    assert (relay["unbalance_percent"]["v2_v1"], relay["unbalance_percent"]["l_l_deviation"]) == (None, None)
    assert relay["unbalance_percent"]["l_n_deviation"] > 0


@BOTH
def test_the_same_seed_gives_the_same_two_line_study(tmp_path, system):
    site = two_lines.site(tmp_path, system)
    first, second = (study_dict(derive(site, 60, 3), "test", True) for _ in range(2))
    assert json.dumps(first) == json.dumps(second)


@BOTH
def test_break_tables_have_two_columns_of_volts(tmp_path, system):
    site = two_lines.site(tmp_path, system)
    shown = breaks_text(site, breaks(site, samples=20, seed=1))
    head = next(line for line in shown.splitlines() if line.startswith("Place") and "Worst board" in line)
    assert head.split()[4:6] == ["L1", "L2"]
    assert "L3" not in shown
    assert len(shown.splitlines()) <= 60


def test_the_shipped_split_phase_site_derives_without_an_exception():
    site = read_site(EXAMPLE, need_relay=True)
    assert site.warnings == ()
    evidence = gather(site, site.relay, 50, 1)
    assert {c.expect for c in evidence.cases} == {"hold", "either"}
    assert derive(site, 500, 1).exceptions == 0


def test_a_device_without_any_usable_element_sees_nothing_and_says_why(tmp_path):
    study = derive(two_lines.site(tmp_path, "2ph-3w", elements=two_lines.DISPLACEMENT), 20, 1)
    assert study.breaks.seen_places == 0
    assert {s.why_not for s in study.breaks.summaries} == {
        "no element of the device has anything to measure in this system"
    }
    assert study.exceptions > 0
