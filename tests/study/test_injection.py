"""What is injected for elements between lines, for 3V0 and for unbalance, and which other stages that picks up."""

from pathlib import Path

import pytest

from relaycfg.model.device import Function
from relaycfg.model.results import Study
from relaycfg.model.settings import Settings, Stage
from relaycfg.study import check
from tests.study import yard

UNBALANCE = (
    yard.ELEMENT.format(function="47", stages=1, low=2.0, high=40.0, step=1.0, ratios="[0.95]", more="")
    .replace('unit = "v"', 'unit = "percent"')
    .replace("pickup_v", "pickup_points")
)


def checked(folder: Path, *stages: Stage, **changes: str) -> Study:
    site = yard.site(folder, **changes)
    return check(site, Settings("R1", "Test relay", "", stages, 0.5, "by hand"), 20, 1)


def test_between_lines_all_lines_are_raised_together(tmp_path: Path) -> None:
    # 440 V between lines is 254.0 V on each; the stage at 430 V (425.7 V at its least) picks up on the way.
    over = yard.ELEMENT.format(function="59", stages=2, low=400.0, high=500.0, step=1.0, ratios="[0.97]", more="")
    stages = [Stage(Function.OVERVOLTAGE, n, True, p, 4.0, 0.97, quantity="l-l") for n, p in ((1, 440.0), (2, 430.0))]
    study = checked(tmp_path, *stages, elements=over, measures="l-l")
    first = study.tests[0]
    assert first.inject == "all lines from 230 V slowly to 254.0 V, 440.0 V between lines"
    assert (first.line, first.avoid) == ("L1-L2", "disable 59 stage 2")
    assert {t.line for t in study.tests} == {"L1-L2", "L2-L3", "L3-L1"}
    second = next(t for t in study.tests if t.element == "59 stage 2")
    assert second.avoid == "none"


def test_unbalance_is_injected_by_lowering_one_line(tmp_path: Path) -> None:
    # One line at u of the others: mean (2 + u) / 3, deviation 2 (1 - u) / (2 + u); 20 % is u = 1.6 / 2.2, 167.3 V.
    stage = Stage(Function.UNBALANCE, 1, True, 20.0, 2.0, 0.95, quantity="line-to-neutral deviation")
    study = checked(tmp_path, stage, elements=yard.OVER + UNBALANCE)
    assert study.tests[0].inject == f"all lines 230 V, then L1 slowly to {230 * 1.6 / 2.2:.1f} V"
    assert (study.tests[0].expect, study.tests[0].unit) == ("picks up at 20.0 %", "%")


def test_undervoltage_is_timed_below_its_pickup(tmp_path: Path) -> None:
    study = checked(tmp_path, Stage(Function.UNDERVOLTAGE, 1, True, 180.0, 2.0, 1.02))
    pickup, timed = study.tests[:2]
    assert pickup.inject == "all lines 230 V, then L1 slowly to 180.0 V"
    volts = float(timed.inject.rsplit(" to ", 1)[1].split()[0])
    # At least twice the 1 % of 180 V away.
    assert volts <= 180 - 2 * 1.8 + 0.05
    assert (timed.accept_low, timed.accept_high) == pytest.approx((1.98, 2.06))


def test_a_stage_that_clears_nothing_is_warned_of_when_settings_are_checked(tmp_path: Path) -> None:
    study = checked(tmp_path, Stage(Function.OVERVOLTAGE, 1, True, 419.0, 30.0, 0.97))
    found = next(f for f in study.findings if f.about == "59 stage 1" and f.severity == "warning")
    assert "clears no harmful state in time" in found.sentence
