"""What start-up inhibit and dead-bus block keep from operating, how long, and what they leave alone."""

import math

import numpy as np
import pytest

from relaycfg.model.device import Function
from relaycfg.model.settings import Settings, Stage
from relaycfg.model.site import Feed, Relay
from relaycfg.relay import play

# Sensitive side: a delay of 0.4 s is 0.37 s (the error of 0.03 s), an excursion lasts 0.03 s longer (window, refresh).
DECIDED_S, LASTS_ON_S = 0.37, 0.03


@pytest.fixture
def undervoltage(device, geometry):
    """Instant at which a 27 of 184 V and 0.4 s operates on a course of taps; inhibit 0.5 s, dead below 46 V."""

    def instant(taps, lengths, inhibit_s=0.5, side="sensitive"):
        feed = Feed("auxiliary", 19, 29)
        relay = Relay("R1", "MB", "MB", "lines", device, feed, "shunt", feed, 0.01, 0.05, dead_bus_pu=0.2)
        stage = Stage(Function.UNDERVOLTAGE, 1, True, 184.0, 0.4, 1.03)
        settings = Settings("R1", device.name, "", (stage,), inhibit_s, "by hand")
        played = play(np.array(taps), np.array(lengths), device, settings, 50.0, relay, side, geometry, 230.0)
        return played["27 stage 1"]

    return instant


def test_a_sag_is_counted_from_the_end_of_the_inhibit_to_its_own_end(undervoltage, tap):
    dead, low, sound = tap(level_v=0), tap(level_v=150), tap()
    short, long = (0.5 + DECIDED_S - LASTS_ON_S + more for more in (-0.01, 0.01))
    assert undervoltage([dead, low, sound], [1.0, short, math.inf]) == math.inf
    assert undervoltage([dead, low, sound], [1.0, long, math.inf]) == pytest.approx(1.5 + DECIDED_S)


def test_the_inhibit_runs_on_over_the_pieces_of_a_course(undervoltage, tap):
    dead, low, lower = tap(level_v=0), tap(level_v=150), tap(level_v=140)
    for pieces in ([0.2, 0.2, math.inf], [0.5, 0.1, math.inf], [0.3, 0.2, math.inf]):
        assert undervoltage([dead, low, lower, low], [1.0, *pieces]) == pytest.approx(1.5 + DECIDED_S)
    assert undervoltage([dead, tap(), low], [1.0, 0.6, math.inf]) == pytest.approx(1.6 + DECIDED_S)


def test_a_system_that_was_never_dead_has_no_inhibit_and_no_inhibit_blocks_only_while_dead(undervoltage, tap):
    dead, low = tap(level_v=0), tap(level_v=150)
    assert undervoltage([low], [math.inf]) == pytest.approx(DECIDED_S)
    assert undervoltage([dead, low], [1.0, math.inf], inhibit_s=0.0) == pytest.approx(1.0 + DECIDED_S)


def test_the_inhibit_counts_from_the_return_of_the_last_dead_piece(undervoltage, tap):
    dead, low = tap(level_v=0), tap(level_v=150)
    assert undervoltage([dead, dead, low], [0.3, 0.3, math.inf]) == pytest.approx(0.6 + 0.5 + DECIDED_S)


def test_one_live_line_or_one_at_the_edge_is_no_dead_system(undervoltage, tap):
    """Source: definition: all lines below 0.2 of 230 V, that is below 46 V; the neutral's volts do not count."""
    for live in range(3):
        one_live = np.append(230.0 * (np.arange(3) == live), 0).astype(complex)
        assert undervoltage([one_live], [math.inf]) == pytest.approx(DECIDED_S)
    assert undervoltage([tap(level_v=46.01)], [math.inf]) == pytest.approx(DECIDED_S)
    assert undervoltage([tap(level_v=45.99)], [math.inf]) == math.inf
    assert undervoltage([tap(level_v=0, n_pe=230.0)], [math.inf]) == math.inf


def test_the_latest_opening_after_energising_waits_for_inhibit_delay_measuring_and_switching(undervoltage, tap):
    opened_s = undervoltage([tap(level_v=0), tap(level_v=150)], [1.0, math.inf], side="insensitive")
    assert opened_s == pytest.approx(1.5 + 0.43 + LASTS_ON_S + 0.01 + 0.05)
