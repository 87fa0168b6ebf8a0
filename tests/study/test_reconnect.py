"""Closing again onto a lost neutral: cycles an hour by hand, and what ends them."""

from dataclasses import replace
from pathlib import Path

import pytest

from relaycfg.model.reconnect_results import Pumping, Reconnection
from relaycfg.model.results import Study
from relaycfg.study import check, derive
from tests.cautions import bench
from tests.study import yard

AUTOMATIC = '[reconnect]\nafter_any_trip = "automatic"\ndelay_s = {wait}\n{more}\n'
STAGE = bench.stage("overvoltage", 1, 255.0, 1.0)
WAIT_S = 60.0


def checked(folder: Path, loads: str = bench.TWO_ONE_ONE, stage: str = STAGE, more: str = "") -> Study:
    site = bench.star(folder, loads)
    return check(site, bench.settings(site, stage, rest=AUTOMATIC.format(wait=WAIT_S, more=more)), 40, 1)


def again(study: Study) -> Reconnection:
    assert study.reconnection is not None
    return study.reconnection


def worst(study: Study) -> Pumping:
    return next(p for p in again(study).pumping if p.start == "worst")


def test_the_same_loads_pump_at_the_rate_of_trip_and_wait(tmp_path: Path) -> None:
    """By hand: T = clearing + wait; trips at c, c + T, ... up to an hour; every closing is onto the one state."""
    study = checked(tmp_path)
    clearing_s = study.stages[0].clearing_s
    found = worst(study)
    trips = int((3600 - clearing_s) / (clearing_s + WAIT_S)) + 1
    assert found.trip_s == pytest.approx(clearing_s)
    assert found.alike_per_hour == pytest.approx(3600 / (clearing_s + WAIT_S))
    assert (found.chance_per_hour, found.chance_most) == (trips, trips)
    assert found.harmful_closings == trips - 1
    assert found.on_voltage_s == pytest.approx(trips * clearing_s)
    assert found.ends == {"hour over": 200, "locked out": 0, "stays open": 0, "left connected unseen": 0}
    assert found.highest_v == pytest.approx(263.5, abs=0.1)
    assert found.first_stage == "59 stage 1"


def test_without_load_the_volts_look_healthy_in_every_tripped_state(tmp_path: Path) -> None:
    healthy = again(checked(tmp_path)).looks_healthy
    assert (healthy.count, healthy.of) == (40, 40)


def test_attempts_lock_it_out(tmp_path: Path) -> None:
    found = worst(checked(tmp_path, more="attempts = 3"))
    assert (found.alike_per_hour, found.chance_per_hour, found.harmful_closings) == (4, 4, 3)
    assert found.ends["locked out"] == 200


def test_loads_that_come_back_balanced_leave_the_board_connected_unseen(tmp_path: Path) -> None:
    """By hand: one heater, on half of the time, makes 2:1:1 of a balanced load. From its state the first trip is sure,
    each further one as likely as not: one trip in half of the courses, and none goes on for the hour."""
    loads = bench.shares(2.0, 2.0, 2.0) + yard.load("Main", "L1-N", 2.0, "kettle", usage=0.5)
    found = worst(checked(tmp_path, loads))
    assert found.ends["left connected unseen"] == 200
    assert 1 <= found.chance_per_hour <= 2
    assert found.alike_per_hour > 50


def test_loads_elsewhere_that_hold_the_shift_keep_the_switch_open(tmp_path: Path) -> None:
    """The relay opens the shed only; the main board's loads stay on the lost neutral, and so does the displacement."""
    loads = bench.TWO_ONE_ONE + yard.load("Shed", "L1-N", 0.1, "lamp", usage=1.0)
    site = yard.site(tmp_path, loads=loads, relay=yard.RELAY.replace('trips = "Main"', 'trips = "Shed"'))
    rest = AUTOMATIC.format(wait=WAIT_S, more="")
    study = check(site, bench.settings(site, STAGE, rest=rest), 20, 1)
    found = next(p for p in again(study).pumping if p.at == "source")
    assert not found.looks_healthy
    assert found.alike_per_hour == 0
    assert found.ends["stays open"] == 200
    assert found.chance_per_hour == 1


def test_an_automatic_setting_is_an_exception_with_its_cycles(tmp_path: Path) -> None:
    study = checked(tmp_path)
    finding = next(f for f in study.findings if f.about == "reconnect")
    assert finding.exception
    assert f"up to {worst(study).alike_per_hour:.0f} trips an hour at 60 s wait" in finding.sentence


def test_the_same_seed_gives_the_same_courses(tmp_path: Path) -> None:
    loads = bench.shares(2.0, 2.0, 2.0) + yard.load("Main", "L1-N", 2.0, "kettle", usage=0.9)
    first, second = (again(checked(tmp_path / name, loads)) for name in "ab")
    assert first == second


def test_derived_settings_close_by_hand_and_show_what_the_other_would_do(tmp_path: Path) -> None:
    found = again(derive(bench.star(tmp_path), 40, 1))
    assert (found.set_to, found.wait_s, found.attempts) == ("by hand", 60.0, None)
    assert found.pumping
    assert not found.allowed


def test_displacement_forbids_closing_only_where_its_stage_sees_it(tmp_path: Path) -> None:
    """V0 57.5 V: a 59N stage at 40 V sees it, one at 80 V and a missing one do not; volts between lines do not move."""
    for number, (pickup, stayed) in enumerate(((40.0, 0), (80.0, 40), (None, 40))):
        more = "" if pickup is None else bench.stage("displacement", 1, pickup, 5.0)
        found = again(checked(tmp_path / str(number), stage=STAGE + more))
        assert (found.v0_stayed.count, found.v0_stayed.of) == (stayed, 40)
        assert found.fooled.count == 0


def test_a_device_without_volts_between_lines_meets_no_condition_of_closing_by_itself(tmp_path: Path) -> None:
    found = again(checked(tmp_path))
    assert found.conditions[0].met == "no"
    assert len(found.conditions) == 6
    allowed = replace(found, conditions=tuple(replace(c, met="yes") for c in found.conditions))
    assert allowed.allowed
