"""Errors a naive tool makes about volts: how they add, which base they have, what stands behind them.

In order: sums at assumed angles, V0 and 3V0, the base, nominal for EMF, what is in the star, line-to-line judgement,
line-to-line volts taken for star volts.
"""

import re
from pathlib import Path

import numpy as np
import pytest

from relaycfg.cli import main
from relaycfg.errors import InputError
from relaycfg.files import write_starter
from relaycfg.model.device import Function
from relaycfg.study import check, derive, read_meter
from relaycfg.study.break_rows import SHORT_NAMES
from relaycfg.text import reading_text
from tests.cautions import bench
from tests.study import yard

READINGS = (239.0, 287.0, 177.0)
"""Volts printed in an article, which gives the shift as 64 V; the mean of their squares gives 63.6 V at 230 V."""
BY_SQUARES = 63.6
AT_ASSUMED_ANGLES = 31.8
TO_THE_VOLT = 0.6
"""Three magnitudes say the shift twice over at a known source: readings to the volt leave that much between."""

CASE = """
[[case]]
name = "Logger"
expect = "either"
source = "meter"
[[case.segment]]
duration_s = 20.0
l_n_v = [239.0, 287.0, 177.0]
"""


def test_adds_line_to_neutral_magnitudes_at_an_assumed_120_degrees_in_a_reading() -> None:
    """Own arithmetic on an article's volts: V0 is 63.6 V (3V0 190.7 V), not 31.8 V (95.5 V)."""
    naive = abs(sum(v * np.exp(-2j * np.pi / 3 * k) for k, v in enumerate(READINGS)))
    assert naive / 3 == pytest.approx(AT_ASSUMED_ANGLES, abs=0.05)
    assert np.sqrt(np.mean(np.square(READINGS)) - 230**2) == pytest.approx(BY_SQUARES, abs=0.05)
    for lines in (None, (398.4, 398.4, 398.4)):
        reading = read_meter(READINGS, lines, 230.0)
        assert reading.v0_v == pytest.approx(BY_SQUARES, abs=TO_THE_VOLT)
        printed = re.search(r"V0 ([\d.]+) V \(3V0 ([\d.]+) V\)", reading_text(reading))
        assert printed is not None
        assert float(printed[1]) == pytest.approx(BY_SQUARES, abs=TO_THE_VOLT)
        assert float(printed[2]) == pytest.approx(190.7, abs=3 * TO_THE_VOLT)


def test_adds_line_to_neutral_magnitudes_at_an_assumed_120_degrees_in_a_recorded_case(tmp_path: Path) -> None:
    """The same volts as a case of the site: a 59N set to 50 V acts on them, one set to 70 V does not."""
    site = bench.star(tmp_path, more=CASE)
    for pickup, outcome in ((50.0, "trip"), (70.0, "hold")):
        study = check(site, bench.settings(site, bench.stage("displacement", 1, pickup, 0.5)), 5, 1)
        case = next(c for c in study.cases if c.name == "Logger")
        assert case.highest_v0_v == pytest.approx(BY_SQUARES, abs=TO_THE_VOLT)
        assert case.outcome == outcome


def test_mixes_v0_and_3v0_in_what_a_stage_sees(tmp_path: Path) -> None:
    """2:1:1 puts V0 at 57.5 V, 3V0 at 172.5 V: pickups on either side of each, on a device that counts each."""
    low_knob, high_knob = yard.DISPLACEMENT, yard.DISPLACEMENT.replace("max = 150.0", "max = 450.0")
    for quantity, knob, sees, misses in (("v0", low_knob, 55.0, 60.0), ("3v0", high_knob, 168.0, 177.0)):
        site = bench.star(tmp_path / quantity, elements=knob, quantity=quantity)
        for pickup, percent in ((sees, 100), (misses, 0)):
            study = check(site, bench.settings(site, bench.stage("displacement", 1, pickup, 0.5)), 5, 1)
            assert [c.seen_percent for c in study.coverage if c.elements == "59N"] == [percent]


def test_mixes_v0_and_3v0_in_what_it_derives_and_prints(tmp_path: Path) -> None:
    """A device marked in 3V0 with three times the range, steps and errors is set to three times the figure."""
    plain = yard.DISPLACEMENT.replace("max = 150.0", "max = 120.0")
    triple = (
        plain.replace("min = 4.0, max = 120.0, step = 0.5", "min = 12.0, max = 360.0, step = 1.5")
        .replace("pickup_v = 0.5", "pickup_v = 4.6")
    )  # fmt: skip
    plain = plain.replace("pickup_v = 0.5", f"pickup_v = {4.6 / 3}")
    loads = "".join(yard.load("Main", f"L{k}-N", p, f"load {k} {p}") for k in (1, 2, 3) for p in (1.0, 2.0, 4.0))
    one = derive(bench.star(tmp_path / "v0", loads, elements=plain), 200, 1)
    three = derive(bench.star(tmp_path / "3v0", loads, elements=triple, quantity="3v0"), 200, 1)
    pickups = [[s.pickup for s in study.settings.of(Function.DISPLACEMENT) if s.on] for study in (one, three)]
    assert pickups[0]
    assert pickups[1] == pytest.approx([3 * p for p in pickups[0]])
    assert {s.quantity for s in three.settings.of(Function.DISPLACEMENT)} == {"3v0"}
    assert all("3V0" in p.expect for p in three.tests if p.unit == "V")


def test_mixes_v0_and_3v0_when_settings_name_the_other(tmp_path: Path) -> None:
    """A settings file in 3V0 for a device that counts V0 is refused, not read as V0."""
    site = bench.star(tmp_path)
    with pytest.raises(InputError, match='the device counts "v0"'):
        bench.settings(site, bench.stage("displacement", 1, 66.0, 1.0, quantity="3v0"))


def test_mixes_the_base_of_percentages(tmp_path: Path) -> None:
    """Own arithmetic: 25 % is 57.5 V of 230 V and 99.6 V of 398.4 V; without a base it is nothing."""
    site = bench.star(tmp_path)

    def percent(base_v: float | None) -> float:
        text = bench.stage("displacement", 1, 0, 1.0, pickup_v=None, pickup_percent=25, base_v=base_v)
        return bench.settings(site, text).stages[0].pickup

    assert percent(230.0) == pytest.approx(57.5)
    assert percent(230 * 3**0.5) == pytest.approx(99.6, abs=0.01)
    with pytest.raises(InputError, match="give the volts that are 100 percent"):
        percent(None)


def test_takes_nominal_for_the_emf_where_the_transformer_stands_at_242_v(tmp_path: Path) -> None:
    """Own arithmetic: loads of one power on two lines only put 242 sqrt 3 / 2 on each and 363 V on the third."""
    site = bench.star(tmp_path, bench.shares(5.0, 5.0, 0.0001), no_load_v=242)
    volts = bench.at_relay(site).l_n_v
    assert volts == pytest.approx((209.6, 209.6, 363.0), abs=0.1)
    study = derive(site, 20, 1)
    assert study.worked is not None
    assert study.worked.emf_v == pytest.approx(242)
    standing = next(c for c in study.cases if c.name == "Source at its no-load volts")
    assert standing.highest_l_n_v == pytest.approx(242)


def test_puts_motors_and_line_to_line_loads_into_the_star(tmp_path: Path) -> None:
    """Own arithmetic: 57.5 V at 2:1:1, whatever lies between lines; in the star 18 kW more would leave 17.7 V.

    (2:1:1 of 4, 2, 2 kW with 6 kW added on each line: shift 230 (10 - 8) / 26 V.)
    """
    between = yard.load("Main", "L1-L2-L3", 9.0, "three-wire oven", 1.0)
    between += yard.load("Main", "L1-L2", 6.0, "welder", 1.0) + yard.load("Main", "L2-L3", 3.0, "press", 1.0)
    motor = '[[motor]]\nboard = "Main"\nname = "Saw"\nshaft_kw = 7.5\npf = 0.84\nefficiency = 0.88\nusage = 1.0\n'
    seen = bench.at_relay(bench.star(tmp_path, bench.TWO_ONE_ONE + between, more=motor))
    assert seen.v0_v == pytest.approx(57.5, abs=1e-3)
    assert seen.l_n_v == pytest.approx((172.5, 263.498, 263.498), abs=1e-3)
    worked = derive(bench.star(tmp_path, bench.TWO_ONE_ONE + between, more=motor), 5, 1).worked
    assert worked is not None
    assert abs(worked.shift_v) == pytest.approx(57.5, abs=1e-3)


LINE_TO_LINE_47 = """
[[element]]
function = "47"
stages = 1
pickup = {{ min = 2, max = 30, step = 1, unit = "percent" }}
delay_s = {{ min = 0.05, max = 30, step = 0.01 }}
dropout_ratio = [0.95]
accuracy = {{ pickup_percent = 1, time_s = 0.01 }}
definition = "{definition}"
"""


@pytest.mark.parametrize("definition", ["V2/V1", "line-to-line deviation"])
def test_judges_neutral_loss_by_line_to_line_volts_or_v2(tmp_path: Path, definition: str) -> None:
    """A shifted neutral moves neither: L-L stays at 398.4 V, V2 at 0, while L1 stands at 172.5 V.

    A 47 on either must not be claimed to see it; set to 2 % it sees no state.
    """
    site = bench.star(tmp_path, elements=LINE_TO_LINE_47.format(definition=definition))
    seen = bench.at_relay(site)
    assert seen.l_l_v == pytest.approx([230 * 3**0.5] * 3, abs=1e-3)
    assert seen.unbalance_percent[SHORT_NAMES[definition]] == pytest.approx(0, abs=1e-4)
    assert seen.unbalance_percent[SHORT_NAMES["line-to-neutral deviation"]] == pytest.approx(26.02, abs=0.01)
    study = check(site, bench.settings(site, bench.stage("unbalance", 1, 2.0, 1.0)), 20, 1)
    assert study.breaks.seen_places == 0
    assert "line to line only" in study.breaks.summaries[0].why_not
    assert any(f.exception and "cannot see a lost neutral anywhere" in f.sentence for f in study.findings)
    assert all(c.seen_percent == 0 for c in study.coverage)


@pytest.mark.parametrize(("given", "meant"), [(400, 230), (380, 220), (398, 230), (208, 120), (480, 277)])
def test_takes_a_line_to_line_voltage_for_the_star_voltage(tmp_path: Path, given: int, meant: int) -> None:
    """Refused in a site file and in a new site, with the star voltage that is meant."""
    with pytest.raises(InputError, match=f"looks like a line-to-line voltage.*line to neutral, {meant}"):
        bench.star(tmp_path, nominal_v=given, no_load_v=given)
    with pytest.raises(InputError, match=f"looks like a line-to-line voltage.*line to neutral, {meant}"):
        write_starter(tmp_path / "new", given)


def test_takes_400_v_for_the_star_voltage_of_a_meter_reading(capsys: pytest.CaptureFixture[str]) -> None:
    """With 400 V as nominal nothing may be told of the neutral: no source of 400 V shows these volts."""
    with pytest.raises(SystemExit):
        main(["reading", "239", "287", "177", "--nominal", "400"])
    shown = capsys.readouterr().out
    assert "wrong nominal volts" in shown
    assert "V0" not in shown
