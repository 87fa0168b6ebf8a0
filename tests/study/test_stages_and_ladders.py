"""Which stages act, when they act, and what an element's ladder makes of the device's file: worked by hand."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from relaycfg.model.device import Accuracy, Function, SettableRange
from relaycfg.study.stages import active_stages, clears, operating_s
from tests.study.hand_corridor import ELEMENT, OVER, evidence, ladder, settings, stage, states


def test_only_stages_that_are_on_and_trip_and_exist_act_wherever_they_stand(tmp_path: Path) -> None:
    base = evidence(tmp_path, states())
    found = active_stages(
        base,
        settings(
            replace(stage(260.0, 3.1), on=False),
            replace(stage(270.0, 3.1), action="alarm"),
            stage(290.0, 0.6, 3),
            stage(200.0, 0.6, function=Function.UNDERVOLTAGE),
            stage(280.0, 0.6),
            stage(320.0, 0.1, 2),
        ),
    )
    assert [a.stage.pickup for a in found] == [280.0, 320.0]
    assert [a.clearing_s for a in found] == pytest.approx([0.66, 0.16])


def test_a_count_is_held_only_where_the_stage_is_set_so(tmp_path: Path) -> None:
    base = evidence(tmp_path, states())
    held = replace(stage(280.0, 0.6), reset="held", hold_s=0.4)
    kept, dropped = active_stages(base, settings(held, replace(held, number=2, reset="instantaneous")))
    assert (kept.hold_s, dropped.hold_s) == (0.4, 0.0)


def test_the_fastest_stage_that_sees_a_state_counts(tmp_path: Path) -> None:
    # 285 V is seen by 280 V 0.6 s only, 325 V by both; the state of 285 V 0.5 s is seen but too late.
    base = evidence(tmp_path, states())
    both = active_stages(base, settings(stage(280.0, 0.6), stage(320.0, 0.1, 2)))
    seconds = operating_s(both, base.scenarios[0], base)
    assert seconds == pytest.approx([np.inf, 0.66, 0.66, 0.16, np.inf, np.inf])
    assert clears(both[0], base.scenarios[0], base).tolist() == [False, True, False, False, False, False]
    assert clears(both[1], base.scenarios[0], base).tolist() == [False, False, False, True, False, False]


def test_all_phases_together_see_the_least_line(tmp_path: Path) -> None:
    taps = np.array([[300.0, 250.0, 240.0, 0.0], [300.0, 301.0, 299.0, 0.0]], complex)
    some = states(volts=[300.0, 301.0], deadline_s=[5.0, 5.0], core=np.ones(2, bool), taps=taps)
    base = evidence(tmp_path, some)
    every = active_stages(base, settings(replace(stage(280.0, 0.6), phases="all")))[0]
    assert every.severity(some, base).tolist() == [240.0, 299.0]
    assert clears(every, some, base).tolist() == [False, True]
    assert every.ladder.runs.every


@pytest.mark.parametrize(
    ("function", "quantity", "unit"),
    [
        # 1 % of 230 V, of its 400 V between lines, of three times V0, and one point.
        (Function.OVERVOLTAGE, "l-n", 2.3),
        (Function.OVERVOLTAGE, "l-l", 3.98372),
        (Function.DISPLACEMENT, "v0", 2.3),
        (Function.DISPLACEMENT, "3v0", 6.9),
        (Function.UNBALANCE, "spread", 1.0),
    ],
)
def test_a_unit_is_one_percent_as_the_element_counts_volts(function: Function, quantity: str, unit: float) -> None:
    assert ladder(replace(ELEMENT, function=function, quantity=quantity)).unit == pytest.approx(unit, abs=1e-5)


def test_drop_out_nearest_to_one_and_reset_at_once_are_the_most_secure() -> None:
    wide = ladder(replace(ELEMENT, dropout_ratio=(0.9, 0.97, 1.05), reset=("held", "instantaneous"), hold_s=0.3))
    assert (wide.dropout_ratio, wide.reset, wide.hold_s) == (0.97, "instantaneous", 0.0)
    held = ladder(replace(ELEMENT, dropout_ratio=(1.05, 1.02), reset=("held",), hold_s=0.3))
    assert (held.dropout_ratio, held.reset, held.hold_s) == (1.02, "held", 0.3)


def test_rungs_rise_in_severity_with_their_errors() -> None:
    # 27 from 100 to 104 V with 1 % and 0.5 V summed: 104 V stands first, -102.46 V at its most sensitive.
    under = replace(
        ELEMENT,
        function=Function.UNDERVOLTAGE,
        pickup=SettableRange(100.0, 104.0, 2.0),
        accuracy=Accuracy(1.0, 0.5, 10.0, 0.02, "sum"),
    )
    own = ladder(under)
    assert own.pickups.tolist() == [104.0, 102.0, 100.0]
    assert own.sensitive == pytest.approx([-105.54, -103.52, -101.5])
    assert own.insensitive == pytest.approx([-102.46, -100.48, -98.5])
    assert own.shortest[1] == pytest.approx(0.6 - 0.08)
    assert own.clearing[1] == pytest.approx(0.6 + 0.08 + 0.06)
    assert own.clearing[-1] == np.inf


def test_ride_through_at_a_margin_is_that_of_the_lower_pickup() -> None:
    # 290 V less 2 units of 2.3 V is 285.4 V: R as at 285.4 V; the delay shrinks by 1.21 before it is compared.
    own = ladder()
    assert own.element.function is OVER
    assert own.ride_through(0.0).seconds == pytest.approx([np.inf, 1.02, 0.22, 0.22, 0.0])
    # 280 V less 5 units is 268.5 V, inside the long swell; 260 V less 5 is 248.5 V, which never drops out.
    assert own.ride_through(5.0).seconds == pytest.approx([np.inf, np.inf, 1.02, 0.22, 0.22])
    # 1.1 s / 1.1 is 1.0 s, shorter than 1.02 s; 0.1 s is longer than nothing at any margin.
    assert [int(k) for k in own.fastest(0.0)] == [7, 2, 1, 1, 0]
    assert [int(k) for k in own.fastest(1.0)] == [7, 3, 1, 1, 0]
