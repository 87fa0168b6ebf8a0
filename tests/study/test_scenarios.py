"""Harm, deadlines, core and severities of break states, state by state with plain loops over the solver's phasors."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from relaycfg.model.device import Function
from relaycfg.model.site import Equipment, Site
from relaycfg.network import Network, sampled
from relaycfg.study.levels import supply_levels
from relaycfg.study.scenarios import AS_MODELLED, Scenarios, judge, seen_places
from tests.study import yard

# Steps invented.
EQUIPMENT = Equipment(
    255.0, 15.0, ((275.0, 15.0), (300.0, 5.0), (400.0, 0.2)), 184.0, 10.0, ((150.0, 1.0),), "", "", ""
)
STATES = 60


@pytest.fixture(scope="module", params=["Main", "Shed"])
def judged(
    request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory
) -> tuple[Site, np.ndarray, Scenarios]:
    """A break at the source; the relay trips Main and everything behind it, or the shed alone."""
    loads = yard.UNEQUAL.replace('name = "Shed 1 0"', 'name = "Shed 1 0"\nminds_low_v = true')
    folder = tmp_path_factory.mktemp("yard")
    site = replace(yard.site(folder, loads=loads), equipment=EQUIPMENT)
    assert site.relay is not None
    relay = replace(site.relay, trips=request.param)
    network = Network(site)
    solved = network.solve("source", sampled(site, STATES, 1), supply_levels(site, network).nominal)
    assert network.boards == ("Main", "Shed")
    found = judge(replace(site, relay=relay), relay, network, "source", "nominal", AS_MODELLED, solved)
    return replace(site, relay=relay), solved.l_n, found


def test_the_highest_volts_are_those_of_the_boards_behind_the_tripped_switch(
    judged: tuple[Site, np.ndarray, Scenarios],
) -> None:
    site, l_n, found = judged
    assert site.relay is not None
    behind = [0, 1] if site.relay.trips == "Main" else [1]
    for state in range(STATES):
        by_board = {b: max(abs(v) for v in l_n[b, :, state]) for b in behind}
        board = max(by_board, key=lambda b: by_board[b])
        assert found.highest_v[state] == pytest.approx(by_board[board])
        assert found.highest_board[state] == board


def test_deadlines_and_core_follow_the_steps_of_the_equipment(judged: tuple[Site, np.ndarray, Scenarios]) -> None:
    site, l_n, found = judged
    assert site.relay is not None
    kinds = set()
    for state in range(STATES):
        behind = [0, 1] if site.relay.trips == "Main" else [1]
        high = max(abs(v) for b in behind for v in l_n[b, :, state])
        low = min(abs(v) for v in l_n[1, :, state])
        high_s = 0.2 if high >= 400 else 5.0 if high >= 300 else 15.0 if high > 255 else np.inf
        low_s = 1.0 if low <= 150 else 10.0 if low < 184 else np.inf
        assert found.deadline_s[state] == min(high_s, low_s)
        assert (found.high[state], found.low[state]) == (np.isfinite(high_s), np.isfinite(low_s))
        assert found.harmful[state] == (np.isfinite(high_s) or np.isfinite(low_s))
        assert found.core[state] == (high >= 275 or low <= 150)
        kinds.add((high_s, low_s))
    assert len(kinds) >= 4


def test_severities_and_displacement_are_those_of_the_tap(judged: tuple[Site, np.ndarray, Scenarios]) -> None:
    _, l_n, found = judged
    for state in range(STATES):
        lines = l_n[0, :, state]
        assert found.severity[Function.OVERVOLTAGE][state] == pytest.approx(max(abs(v) for v in lines))
        assert found.severity[Function.UNDERVOLTAGE][state] == pytest.approx(-min(abs(v) for v in lines))
        assert found.severity[Function.DISPLACEMENT][state] == pytest.approx(abs(sum(lines) / 3))
        assert abs(found.v0[state]) == pytest.approx(abs(sum(lines) / 3))
        assert found.taps[state, :-1] == pytest.approx(lines)


def test_only_places_upstream_of_the_tap_are_seen(tmp_path: Path) -> None:
    site = yard.site(tmp_path)
    assert site.relay is not None
    assert seen_places(site, site.relay) == ("source", "Main")
    assert seen_places(site, replace(site.relay, measures_at="Shed")) == ("source", "Main", "Shed")
