"""The test schedule injects what the stage measures, and its accept bands follow the declared errors."""

from pathlib import Path

import pytest

from relaycfg.model.device import Function
from relaycfg.model.results import Study
from relaycfg.model.settings import Settings, Stage
from relaycfg.study import check
from tests.study import yard


@pytest.fixture(scope="module")
def study(tmp_path_factory: pytest.TempPathFactory) -> Study:
    site = yard.site(tmp_path_factory.mktemp("yard"))
    stages = (
        Stage(Function.OVERVOLTAGE, 1, True, 270.0, 4.0, 0.97),
        Stage(Function.UNDERVOLTAGE, 1, True, 180.0, 2.0, 1.02),
        Stage(Function.DISPLACEMENT, 1, True, 30.0, 1.0, 0.95),
        Stage(Function.DISPLACEMENT, 2, True, 90.0, 0.5, 0.95),
    )
    return check(site, Settings("R1", "Test relay", "", stages, 0.5, "by hand"), 20, 1)


def point(study: Study, label: str, number: int) -> tuple[str, float, float, str]:
    found = [t for t in study.tests if t.element == label][number]
    return found.inject, found.accept_low, found.accept_high, found.avoid


def test_pickup_bands_are_the_declared_error_either_way(study: Study) -> None:
    # Hand-worked: 1 % of 270 V is 2.7 V; 1 % of 30 V is below the 0.5 V floor.
    assert point(study, "59 stage 1", 0)[1:3] == pytest.approx((267.3, 272.7))
    assert point(study, "59N stage 1", 0)[1:3] == pytest.approx((29.5, 30.5))


def test_time_bands_add_measuring_and_output_on_the_long_side(study: Study) -> None:
    # Hand-worked: 4 s with 1 % is 0.04 s either way, then window 0.02, refresh 0.01 and output 0.01 s.
    assert point(study, "59 stage 1", 1)[1:3] == pytest.approx((3.96, 4.08))


def test_displacement_is_injected_on_one_line(study: Study) -> None:
    # Hand-worked: V0 = (230 - U) / 3, so 30 V needs 140 V; 90 V is out of reach that way and is injected alone, 270 V.
    assert point(study, "59N stage 1", 0)[0] == "all lines 230 V, then L1 slowly to 140.0 V"
    assert point(study, "59N stage 2", 0)[0] == "other lines at 0 V, L1 from 0 V slowly to 270.0 V"


def test_stages_that_would_act_first_are_named(study: Study) -> None:
    # At 140 V on one line the 27 at 180 V is picked up too; at 270 V on one line V0 is 13 V, below the 59N.
    assert point(study, "59N stage 1", 0)[3] == "disable 27 stage 1"
    assert point(study, "59 stage 1", 0)[3] == "none"


def test_the_schedule_covers_every_line_of_every_stage(study: Study) -> None:
    lines = [(t.element, t.line) for t in study.tests]
    assert lines.count(("59 stage 1", "L2")) == 2
    assert lines.count(("27 stage 1", "L3")) == 2
    assert [line for element, line in lines if element == "59N stage 1"] == ["L1", "L1"]


def test_a_device_that_measures_n_to_pe_is_injected_there(tmp_path: Path) -> None:
    site = yard.site(tmp_path, displacement_from="n-to-earth")
    stages = (Stage(Function.DISPLACEMENT, 1, True, 30.0, 1.0, 0.95),)
    study = check(site, Settings("R1", "Test relay", "", stages, 0.5, "by hand"), 20, 1)
    assert study.tests[0].inject == "N against PE from 0 V slowly to 30.0 V"
