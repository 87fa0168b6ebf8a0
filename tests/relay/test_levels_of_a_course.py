"""A course counts from the pickup's end of the band and goes on counting down to the drop-out's, on either side."""

import math

import numpy as np
import pytest

from relaycfg.model.device import Function
from relaycfg.model.settings import Settings, Stage
from relaycfg.model.site import Feed, Relay
from relaycfg.relay import play

# Errors of 1 percent and 0.03 s. 27 at 184 V: most sensitive 185.84 V with drop-out at 191.4 V (times 1.03), least
# sensitive 182.16 V with 187.6 V. 59 at 255 V: 252.45 V with 244.9 V (times 0.97), and 257.55 V with 249.8 V.
CASES = [
    ("27", "sensitive", 185.7, 186.0, 191.3, 191.5),
    ("27", "insensitive", 182.1, 182.3, 187.5, 187.7),
    ("59", "sensitive", 252.5, 252.4, 245.0, 244.8),
    ("59", "insensitive", 257.6, 257.5, 249.9, 249.7),
]


@pytest.fixture
def operated(device, geometry, tap):
    """Whether a stage operates on a course of symmetrical levels [V] from a sound system, each so many seconds."""
    stages = {
        "59": Stage(Function.OVERVOLTAGE, 1, True, 255.0, 1.0, 0.97),
        "27": Stage(Function.UNDERVOLTAGE, 1, True, 184.0, 1.0, 1.03),
    }

    def on(name, side, *course):
        feed = Feed("auxiliary", 19, 29)
        relay = Relay("R1", "MB", "MB", "lines", device, feed, "shunt", feed, 0.01, 0.05)
        settings = Settings("R1", device.name, "", (stages[name],), 0.0, "by hand")
        taps = np.array([tap(level_v=volts) for volts, _ in course])
        lengths = np.array([length_s for _, length_s in course])
        played = play(taps, lengths, device, settings, 50.0, relay, side, geometry, 230.0)
        return played[f"{name} stage 1"] < math.inf

    return on


@pytest.mark.parametrize(("name", "side", "beyond", "short", "kept", "dropped"), CASES)
def test_pickup_and_dropout_each_act_at_their_own_volts(operated, name, side, beyond, short, kept, dropped):
    """Source: own arithmetic on the definition of the band."""
    assert operated(name, side, (230.0, 1.0), (beyond, math.inf))
    assert not operated(name, side, (230.0, 1.0), (short, math.inf))
    assert operated(name, side, (230.0, 1.0), (beyond, 0.2), (kept, math.inf))
    assert not operated(name, side, (230.0, 1.0), (beyond, 0.2), (dropped, math.inf))
