"""Curves of a corridor that is worked by hand in ``hand_corridor``."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from relaycfg.study.corridors import corridors
from tests.study.hand_corridor import OVER, RUNS, evidence, ladder, states


def test_ride_through_has_a_step_wherever_seconds_or_case_change(tmp_path: Path) -> None:
    found = corridors(evidence(tmp_path, states()))[0]
    assert (found.function, found.unit, found.standing, found.standing_case) == (OVER, "V", 245.0, RUNS.standing_name)
    steps = [(s.pickup, s.seconds and round(s.seconds, 9), s.behind) for s in found.ride_through]
    assert steps == [
        (240.0, None, "case 1, upper limit"),
        (260.0, 1.02, "case 7, long swell"),
        (280.0, 0.22, "case 8, short swell (all lines)"),
        (320.0, 0.0, "no case picks it up"),
    ]


def test_withstand_is_the_time_left_for_the_delay_where_some_setting_reaches_the_state(tmp_path: Path) -> None:
    # Reached: 262 V 5 s at 260 V, 285 V 0.7 s at 280 V, 325 V 0.5 s at 320 V; each less 0.06 s.
    found = corridors(evidence(tmp_path, states()))[0]
    assert [s.pickup for s in found.withstand] == [260.0, 280.0, 320.0]
    assert [s.seconds for s in found.withstand] == pytest.approx([4.94, 0.64, 0.44])
    assert found.withstand[1].behind == "break at Main, 285 V at Main, supply nominal, as modelled"


def test_withstand_takes_the_mildest_state_of_a_deadline_and_leaves_out_steps_that_ask_no_more(tmp_path: Path) -> None:
    # 305 V 0.7 s comes after 285 V 0.7 s, and 325 V 5 s after it asks for nothing: one step stands.
    some = states(volts=[305.0, 285.0, 325.0], deadline_s=[0.7, 0.7, 5.0])
    found = corridors(evidence(tmp_path, some))[0]
    assert [(s.pickup, round(s.seconds or 0, 9)) for s in found.withstand] == [(280.0, 0.64)]
    assert "285 V" in found.withstand[0].behind


def test_unresolved_states_and_states_that_harm_nothing_bound_nothing(tmp_path: Path) -> None:
    some = states(volts=[285.0, 325.0], deadline_s=[0.7, np.inf], resolved=np.array([False, True]))
    assert corridors(evidence(tmp_path, some))[0].withstand == ()


def test_each_passing_case_is_one_dot_at_its_extreme_with_the_time_it_stays(tmp_path: Path) -> None:
    # A milder variant of case 8 (290 V for 3 s) and a case below what stands make no dots of their own.
    severity = np.concatenate([RUNS.severity, np.full((1, 1, 3), 290.0), np.full((1, 1, 3), 244.0)])
    runs = replace(
        RUNS,
        severity=severity,
        duration_s=np.array([[1.0], [0.2], [3.0], [9.0]]),
        names=(*RUNS.names, "case 8, short swell (mild)", "case 9, nothing"),
        cases=(7, 8, 8, 9),
        case_names={**RUNS.case_names, 9: "case 9, nothing"},
    )
    found = corridors(evidence(tmp_path, states(), own=ladder(runs=runs)))[0]
    dots = [(d.pickup, round(d.seconds or 0, 9), d.behind, d.case) for d in found.cases]
    assert dots == [(270.0, 1.02, "case 7, long swell", 7), (310.0, 0.22, "case 8, short swell", 8)]
