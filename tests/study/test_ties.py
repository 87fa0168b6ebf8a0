"""A delay that equals R in decimals does not outlast it, whatever the last bit of a sum says."""

from pathlib import Path

import pytest

from relaycfg.model.device import Function
from relaycfg.model.settings import Settings, Stage
from relaycfg.study import check
from tests.study import yard


@pytest.mark.parametrize(("clearing_s", "delay_s"), [(0.06, 0.1), (0.09, 0.13), (0.29, 0.33)])
def test_a_delay_that_equals_a_case_with_its_window_is_not_secure(
    clearing_s: float, delay_s: float, tmp_path: Path
) -> None:
    # Fault, then 0.03 s of window and refresh; the delay less 0.01 s is the same to the digit: the machine trips.
    site = yard.site(tmp_path, relay=yard.RELAY.replace("clearing_s = 0.1", f"clearing_s = {clearing_s}"))
    stage = Stage(Function.DISPLACEMENT, 1, True, 60.0, delay_s, 0.95)
    study = check(site, Settings("R1", "Test relay", "", (stage,), 0.5, "by hand"), 20, 1)
    case = next(c for c in study.cases if c.name.startswith("Short circuit behind Main"))
    assert case.outcome == "trip"
    assert not study.stages[0].secure
