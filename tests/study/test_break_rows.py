"""Rows of single break states: no volts where there is no solution, and a note where nothing moves."""

import math
from dataclasses import replace

import pytest

from relaycfg.model.judgement import Judgement
from relaycfg.study import breaks
from tests.network.sites import board, cable, load, site


def star(*watts: float):
    loads = [load("A", f"L{k + 1}", w) for k, w in enumerate(watts)]
    made = site([board("A", cable=cable(0.1 + 0j))], loads, line_ohm=0.01 + 0j, neutral_ohm=0.01 + 0j)
    return replace(made, judgement=Judgement(balanced_pu=0.01))


def test_a_state_without_solution_shows_no_volts_and_no_joint():
    # Own algebra: -8 kW against 3 kW on a floating star of constant impedances runs away.
    rows = breaks(star(-8e3, 2e3, 1e3), samples=1, seed=1, at="A", state="connected").rows
    assert [row.status for row in rows] == ["unresolved"]
    assert (rows[0].boards, rows[0].relays) == ({}, {})
    assert math.isnan(rows[0].joint_v)
    sound = breaks(star(-8e3, 2e3, 1e3), samples=1, seed=1, at="none", state="connected").rows[0]
    assert sound.boards["A"].l_n_v[0] > 230


@pytest.mark.parametrize("place", ["source", "A"])
def test_balanced_load_behind_any_broken_neutral_is_named_as_not_detectable(place):
    found = breaks(star(2e3, 2e3, 2e3), samples=1, seed=1, at=place, state="connected")
    assert found.notes == (
        f"break at {place}, state connected: V0 0.0 V, the load behind it is balanced or off; not detectable by any "
        "voltage element",
    )
    assert breaks(star(2e3, 1e3, 2e3), samples=1, seed=1, at=place, state="connected").notes == ()
