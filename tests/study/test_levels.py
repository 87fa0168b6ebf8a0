"""Where a band is promised at a board, every healthy state stands at its limit there; at the source, the EMF does."""

from pathlib import Path

import numpy as np
import pytest

from relaycfg.model.site import NONE, Site
from relaycfg.network import Network, connected, least, sampled
from relaycfg.study.evidence import gather
from relaycfg.study.levels import healthy_taps, supply_levels
from tests.study import yard

HIGH_V, LOW_V = 253.0, 195.5
"""EN 50160, all ten-minute means, as quoted: +10 / -15 % of 230 V."""


def at_board(folder: Path, board: str) -> Site:
    path = yard.write(folder)
    path.write_text(path.read_text().replace('band_at = "source"', f'band_at = "{board}"'))
    return yard.read(folder)


@pytest.mark.parametrize("board", ["Main", "Shed"])
def test_limits_are_met_at_the_board_with_least_and_with_all_load(board: str, tmp_path: Path) -> None:
    site = at_board(tmp_path, board)
    network = Network(site)
    levels = supply_levels(site, network)
    at = network.boards.index(board)
    upper = np.abs(network.solve(NONE, least(site), levels.upper).l_n[at])
    lower = np.abs(network.solve(NONE, connected(site), levels.lower).l_n[at])
    assert upper.max() == pytest.approx(HIGH_V, abs=1e-3)
    assert lower.min() == pytest.approx(LOW_V, abs=1e-3)
    # The drop in the cables comes on top at the source.
    assert abs(levels.lower[0]) > lower.min()


def test_every_healthy_state_stands_at_the_limit_at_the_board_of_the_band(tmp_path: Path) -> None:
    site = at_board(tmp_path, "Main")
    network = Network(site)
    levels = supply_levels(site, network)
    healthy = healthy_taps(site, network, levels, sampled(site, 20, 1), "Main")
    assert np.abs(healthy.upper[:, :-1]).max(axis=1) == pytest.approx(HIGH_V)
    assert np.abs(healthy.lower[:, :-1]).min(axis=1) == pytest.approx(LOW_V)
    assert len(healthy.names) == len(healthy.upper) > 20


def test_a_board_further_on_has_the_drop_of_its_cable_below_the_limit(tmp_path: Path) -> None:
    site = at_board(tmp_path, "Main")
    network = Network(site)
    levels = supply_levels(site, network)
    shed = healthy_taps(site, network, levels, sampled(site, 20, 1), "Shed")
    row = shed.names.index("connected")
    assert np.abs(shed.lower[row, :-1]).min() < LOW_V
    # Unscaled, as the source stands without load.
    assert np.abs(shed.no_load[row, :-1]).max() < 230.0


def test_promised_at_the_source_the_limits_are_its_emf(tmp_path: Path) -> None:
    site = yard.site(tmp_path)
    network = Network(site)
    levels = supply_levels(site, network)
    assert [np.abs(emf) for _, emf in levels.named()] == [
        pytest.approx([volts] * 3) for volts in (230.0, HIGH_V, LOW_V)
    ]
    healthy = healthy_taps(site, network, levels, sampled(site, 5, 1), "Main")
    row = healthy.names.index("least")
    solved = network.solve(NONE, least(site), levels.upper).l_n[network.boards.index("Main"), :, 0]
    assert healthy.upper[row, :-1] == pytest.approx(solved)


def test_the_standing_limits_are_the_states_with_the_most_extreme_line(tmp_path: Path) -> None:
    # The states that pull all lines down together, or up, need not be those with the lowest, or highest, one.
    site = yard.site(tmp_path)
    assert site.relay is not None
    study = gather(site, site.relay, 20, 1)
    levels = supply_levels(site, study.network)
    healthy = healthy_taps(site, study.network, levels, study.states, "Main")
    upper, lower, free = (
        np.abs(case.courses[0].segments[0].tap[:-1])
        for case in study.cases
        if case.name.startswith(("Supply at its", "Source at its"))
    )
    assert upper.max() == max(np.abs(tap[:-1]).max() for tap in healthy.upper)
    assert lower.min() == min(np.abs(tap[:-1]).min() for tap in healthy.lower)
    assert free.max() == max(np.abs(tap[:-1]).max() for tap in healthy.no_load)
