"""Margins and bounds of one stage in a corridor that is worked by hand in ``hand_corridor``."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from relaycfg.model.device import Accuracy, Function
from relaycfg.model.settings import Stage
from relaycfg.study.choice import harmful_states
from relaycfg.study.evidence import Evidence
from relaycfg.study.margins import dependability, security
from relaycfg.study.stage_results import stage_results
from relaycfg.study.stages import ActiveStage, active_stages
from tests.study.hand_corridor import ELEMENT, RUNS, evidence, ladder, settings, stage, states


def one(base: Evidence, *stages: Stage) -> ActiveStage:
    return active_stages(base, settings(*stages))[0]


def test_security_is_the_way_to_the_next_case_in_volts_seconds_and_units(tmp_path: Path) -> None:
    # 280 V 0.6 s: 10 V lower the long swell picks up for 1.02 s; the short one stays 0.22 s. A unit is 2.3 V, so
    # 10 V are 4.35 units, in steps of 0.05 the last that holds is 4.3; in time there would be ten.
    found = security(one(evidence(tmp_path, states()), stage(280.0, 0.6)))
    assert found.secure
    assert (found.volts, found.limit, found.seconds) == pytest.approx((10.0, 270.0, 0.38))
    assert (found.volts_case, found.seconds_case) == ("case 7, long swell", "case 8, short swell (all lines)")
    assert found.units == pytest.approx(4.3)


def test_each_case_has_its_own_volts_and_seconds(tmp_path: Path) -> None:
    # Case 8 never lasts 0.6 s, so no pickup makes it trip; case 7 does not pick up at 280 V, so no delay does.
    found = security(one(evidence(tmp_path, states()), stage(280.0, 0.6)))
    (volts, no_seconds), (no_volts, seconds) = found.by_case[7], found.by_case[8]
    assert (volts, seconds) == pytest.approx((10.0, 0.38))
    assert (no_volts, no_seconds) == (None, None)


def test_a_delay_longer_than_every_case_is_limited_by_the_drop_out_at_what_stands(tmp_path: Path) -> None:
    # 245 V / 0.98 is 250 V: below it a swell that started the stage never ends. 260 V keeps 10 V.
    found = security(one(evidence(tmp_path, states()), stage(260.0, 3.1)))
    assert found.volts == pytest.approx(10.0)
    assert found.volts_case == "case 1, upper limit: it would not drop out again"
    assert found.seconds == pytest.approx(3.1 - 1.02)


def test_an_insecure_stage_shows_by_how_much_it_fails(tmp_path: Path) -> None:
    # 260 V 0.6 s trips in the long swell: 0.42 s too short, 10 V too low, no unit left.
    found = security(one(evidence(tmp_path, states()), stage(260.0, 0.6)))
    assert not found.secure
    assert (found.volts, found.seconds) == pytest.approx((-10.0, -0.42))
    assert found.units is None


def test_margins_in_volts_are_those_of_the_knob_whose_error_moves_with_it(tmp_path: Path) -> None:
    # With 2 % of error the end of 280 V stands at 274.4 V; the pickup may fall to 270 / 0.98 = 275.51 V.
    wide = replace(ELEMENT, accuracy=Accuracy(2.0, 0.0, 0.0, 0.05, "sum"))
    found = security(one(evidence(tmp_path, states(), own=ladder(wide)), stage(280.0, 0.6)))
    assert found.volts == pytest.approx(280 - 270 / 0.98)
    assert found.seconds == pytest.approx(0.55 - 0.22)


def test_dependability_is_the_way_to_the_nearest_core_state_that_only_this_stage_clears(tmp_path: Path) -> None:
    # Of 280 V 0.6 s depends 285 V 0.7 s: 5 V, 0.04 s; 325 V 0.5 s needs the other. ln(0.7 / 0.66) / ln 1.1 = 0.617.
    base = evidence(tmp_path, states())
    slow, fast = active_stages(base, settings(stage(280.0, 0.6), stage(320.0, 0.1, 2)))
    found = dependability(slow, (fast,), base, harmful_states(base.scenarios))
    assert (found.volts, found.seconds, found.room) == pytest.approx((5.0, 0.04, 5.0))
    assert found.units == pytest.approx(np.log(0.7 / 0.66) / np.log(1.1))
    assert found.state == "break at Main, sample 1, supply nominal, as modelled"
    other = dependability(fast, (slow,), base, harmful_states(base.scenarios))
    assert (other.volts, other.seconds) == pytest.approx((5.0, 0.34))


def test_no_state_depends_on_a_stage_whose_states_another_clears_too(tmp_path: Path) -> None:
    base = evidence(tmp_path, states())
    slow, twin = active_stages(base, settings(stage(280.0, 0.6), stage(270.0, 0.6, 2)))
    found = dependability(slow, (twin,), base, harmful_states(base.scenarios))
    assert (found.volts, found.seconds, found.units) == (None, None, None)


def test_bounds_of_a_stage_carry_their_arithmetic(tmp_path: Path) -> None:
    # Pickup from 270 V (long swell) to 285 V (the state); delay from 0.22 s (short swell) to 0.7 - 0.06 = 0.64 s.
    base = evidence(tmp_path, states(), states(model="all constant impedance"))
    setting = settings(stage(280.0, 0.6), stage(320.0, 0.1, 2))
    active = active_stages(base, setting)
    securities = {a.stage.label: security(a) for a in active}
    found = stage_results(base, setting, active, securities, harmful_states(base.scenarios), {})[0]
    assert [(b.of, b.side, b.unit) for b in found.bounds] == [
        ("pickup", "not below", "V"),
        ("delay", "not below", "s"),
        ("pickup", "not above", "V"),
        ("delay", "not above", "s"),
    ]
    assert [b.value for b in found.bounds] == pytest.approx([270.0, 0.22, 285.0, 0.64])
    texts = [b.arithmetic for b in found.bounds]
    assert texts[0].startswith("the case reaches 270.0 V for longer than the delay")
    assert texts[1].startswith("stays picked up 0.220 s with 0.020 s of window and refresh")
    assert texts[2] == "least sensitive 280.0 + error 0.0 = 280.0 V; the state shows 285.0 V"
    assert texts[3].startswith("deadline 0.700 s - measuring, output, coil and breaker 0.060 s")
    assert [b.source for b in found.bounds[:2]] == ["table of cases, case 7", "table of cases, case 8"]
    # Alone it clears 285 V 0.7 s of the six.
    assert (found.clears_percent, found.pickup_percent, found.marked) == pytest.approx((100 / 6, 100 * 280 / 230, 280))
    assert found.clearing_s == pytest.approx(0.66)
    assert found.margins is not None
    assert (found.margins.security_v, found.margins.dependability_s) == pytest.approx((10.0, 0.04))
    assert found.reason == (
        "280.0 V is 10.0 V clear of case 7, long swell; 0.6 s outlasts case 8, short swell (all lines) by 0.380 s; "
        "alone it clears 16.7 % of the harmful states in time"
    )


def test_bounds_of_an_undervoltage_stage_are_mirrored(tmp_path: Path) -> None:
    # The same corridor mirrored about 0 V: severities -v, standing -245, pickups fall. 10 V up to the long dip.
    mirror = replace(
        ELEMENT,
        function=Function.UNDERVOLTAGE,
        pickup=replace(ELEMENT.pickup, low=100.0, high=220.0),
        dropout_ratio=(1.02,),
        accuracy=Accuracy(0.0, 1.0, 0.0, 0.1, "sum"),
    )
    runs = replace(
        RUNS,
        severity=np.array([[[-170.0, -230.0, -230.0]], [[-90.0, -90.0, -90.0]]]),
        standing=-210.0,
        duration_s=np.array([[1.0], [0.2]]),
    )
    own = ladder(mirror, runs)
    some = states(volts=[120.0, 90.0], deadline_s=[5.0, 0.9], core=np.array([True, True]))
    some = replace(some, severity={Function.UNDERVOLTAGE: -some.highest_v})
    base = evidence(tmp_path, some, replace(some, model="all constant impedance"), own=own)
    setting = settings(replace(stage(160.0, 0.6, function=Function.UNDERVOLTAGE), dropout_ratio=1.02))
    active = active_stages(base, setting)
    assert (active[0].sensitive.pickup, active[0].insensitive.pickup) == (-161.0, -159.0)
    securities = {a.stage.label: security(a) for a in active}
    found = stage_results(base, setting, active, securities, harmful_states(base.scenarios), {})[0]
    # Up to 170 V less 1 V of error; 0.22 + 0.1 s; down to 120 V plus 1 V; 0.9 - 0.06 - 0.1 s.
    assert [(b.of, b.side) for b in found.bounds] == [
        ("pickup", "not above"),
        ("delay", "not below"),
        ("pickup", "not below"),
        ("delay", "not above"),
    ]
    assert [b.value for b in found.bounds] == pytest.approx([169.0, 0.32, 121.0, 0.74])
    assert (found.pickup_low, found.pickup_high) == pytest.approx((159.0, 161.0))


def test_bounds_name_what_stands_where_it_limits(tmp_path: Path) -> None:
    base = evidence(tmp_path, states(), states(model="all constant impedance"))
    setting = settings(stage(260.0, 3.1))
    active = active_stages(base, setting)
    securities = {a.stage.label: security(a) for a in active}
    found = stage_results(base, setting, active, securities, harmful_states(base.scenarios), {})[0]
    assert found.bounds[0].value == pytest.approx(250.0)
    assert found.bounds[0].arithmetic.startswith("standing 245.0 V / drop-out 0.98 = 250.0 V")


def test_where_no_case_starts_a_stage_what_stands_is_its_limit(tmp_path: Path) -> None:
    # Both cases milder than the 245 V that stand: 260 V may fall by 15 V, and no delay is asked for.
    mild = replace(RUNS, severity=np.full((2, 1, 3), 244.0))
    base = evidence(tmp_path, states(), states(model="all constant impedance"), own=ladder(runs=mild))
    setting = settings(stage(260.0, 3.1))
    active = active_stages(base, setting)
    secure = security(active[0])
    assert (secure.volts, secure.seconds, secure.volts_case) == (15.0, None, "case 1, upper limit")
    found = stage_results(base, setting, active, {"59 stage 1": secure}, harmful_states(base.scenarios), {})[0]
    assert (found.bounds[0].side, found.bounds[0].value) == ("not below", 245.0)
    assert found.bounds[0].arithmetic == "standing 245.0 V; most sensitive 260.0 - error 0.0 = 260.0 V"
