"""Whole settings played through courses of phasors."""

import math

import numpy as np
import pytest

from relaycfg.model.device import Device, Function
from relaycfg.model.settings import Settings, Stage
from relaycfg.model.site import Feed, Relay
from relaycfg.relay import play

LOST = 57.5
"""Displacement of loads 2:1:1 behind a lost neutral at 230 V: 172.5 / 263.5 / 263.5 V."""


@pytest.fixture
def played(device, geometry):
    def with_stages(taps, lengths, side="sensitive", inhibit_s=0.5, of=device, stages=None):
        stages = stages or (
            Stage(Function.OVERVOLTAGE, 1, True, 255.0, 0.6, 0.97),
            Stage(Function.UNDERVOLTAGE, 1, True, 184.0, 0.2, 1.03),
            Stage(Function.DISPLACEMENT, 1, True, 22.0, 0.7, 0.9),
            Stage(Function.UNBALANCE, 1, True, 20.0, 0.4, 0.9),
            Stage(Function.OVERVOLTAGE, 2, False, 240.0, 0.05, 0.97),
            Stage(Function.DISPLACEMENT, 2, True, 12.0, 0.05, 0.9, action="alarm"),
        )
        settings = Settings("R1", device.name, "", stages, inhibit_s, "by hand")
        feed = Feed("auxiliary", 19, 29)
        relay = Relay("R1", "MB", "MB", "lines", of, feed, "shunt", feed, 0.01, 0.05, dead_bus_pu=0.2)
        return play(np.array(taps), np.array(lengths), of, settings, 50.0, relay, side, geometry, 230.0)

    return with_stages


def test_a_lost_neutral_operates_every_stage_that_is_on_and_trips(played, tap):
    instants = played([tap(), tap(shift=LOST)], [1.0, math.inf])
    assert instants == pytest.approx({"59 stage 1": 1.57, "27 stage 1": 1.17, "59N stage 1": 1.67, "47 stage 1": 1.37})


def test_the_insensitive_side_counts_everything_up_to_the_open_switch(played, tap):
    instants = played([tap(), tap(shift=LOST)], [1.0, math.inf], side="insensitive")
    measuring_and_switching_s = 0.02 + 0.01 + 0.06
    assert instants["59 stage 1"] == pytest.approx(1.6 + 0.03 + measuring_and_switching_s)


def test_the_sides_differ_for_an_excursion_as_long_as_the_delay(played, tap):
    swell = [tap(), tap(level_v=290), tap()]
    assert played(swell, [1, 0.6, math.inf])["59 stage 1"] == pytest.approx(1.57)
    assert played(swell, [1, 0.6, math.inf], side="insensitive")["59 stage 1"] == math.inf
    assert played(swell, [1, 0.545, math.inf])["59 stage 1"] == pytest.approx(1.57)  # window and refresh carry it over
    assert played(swell, [1, 0.535, math.inf])["59 stage 1"] == math.inf


def test_energising_onto_a_lost_neutral_blocks_27_and_47_only(played, tap):
    dead, lost = tap(level_v=0), tap(shift=LOST)
    instants = played([dead, lost], [1.0, math.inf])
    assert instants["59 stage 1"] == pytest.approx(1.57)
    assert instants["59N stage 1"] == pytest.approx(1.67)
    assert instants["27 stage 1"] == pytest.approx(1.67)
    assert instants["47 stage 1"] == pytest.approx(1.87)


def test_a_dead_system_does_not_operate_undervoltage(played, tap):
    assert set(played([tap(), tap(level_v=40)], [1.0, math.inf]).values()) == {math.inf}
    assert played([tap(), tap(level_v=50)], [1.0, math.inf])["27 stage 1"] == pytest.approx(1.17)


def test_the_inhibit_starts_again_when_the_system_dies_again(played, tap):
    dead, low = tap(level_v=0), tap(level_v=150)
    instants = played([dead, low, dead, low], [1.0, 0.4, 0.1, math.inf])
    assert instants["27 stage 1"] == pytest.approx(1.5 + 0.5 + 0.17)


def test_an_element_that_the_device_lacks_does_not_operate(played, tap, elements):
    bare = Device("Bare", ("l-n",), "rms", 1.0, 0.5, "per phase", "l-n", (elements["59"],))
    instants = played([tap(shift=LOST)], [math.inf], of=bare)
    assert instants["59 stage 1"] < math.inf
    assert instants["59N stage 1"] == math.inf
