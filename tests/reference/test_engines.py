"""The network against a general distribution power-flow engine and a dense solve, on random sites drawn in full."""

from functools import cache

import pytest

from tests.reference import engines, engines_dense, engines_dss
from tests.reference.engines import FEW, FEW_HEAVY, compare, compare_heavy
from tests.reference.engines_sites import EARTHINGS, LAWS, kind_of
from tests.reference.engines_tally import BEYOND_ZIP, ENGINE_LEFT, LIMIT_V, UNDEFINED, Tally

compared = cache(compare)


@pytest.mark.parametrize("seed", range(FEW))
def test_every_voltage_agrees_with_a_power_flow_engine(seed: int) -> None:
    """Source: a general distribution power-flow engine, explicit neutral and PE; limit of the project, 0.01 V.

    Sound, open and with joints of 0.1, 1 and 10 ohm at every break place. Nothing is left out but what engines.py
    says that it leaves out.
    """
    tally = compared(seed)
    assert tally.apart == []
    assert max(tally.worst_v.values()) <= LIMIT_V
    assert set(tally.left) <= {UNDEFINED, BEYOND_ZIP}
    assert tally.other_root == 0
    if kind_of(seed)[1] != "zip":
        assert tally.left[BEYOND_ZIP] == 0


def test_compared_sample_has_what_it_claims_to_cover() -> None:
    """Source: own count over the networks above: break states, loads beyond their band, neutrals on the leak alone."""
    total = Tally()
    for seed in range(FEW):
        total.add(compared(seed))
    assert {kind_of(seed) for seed in range(FEW)} == {(e, law) for e in EARTHINGS for law in LAWS}
    assert total.networks == FEW
    assert total.open_states > 500
    assert total.beyond_band > 20
    assert total.leak_held > 5
    assert total.left[BEYOND_ZIP] < 0.05 * total.states


def test_networks_on_constant_power_alone_agree_or_rest_on_another_root() -> None:
    """Source: the same engine; a state that differs has to be a root of the dense equations in both answers.

    States with several solutions have to be said to have them, for the engine has shown another one.
    """
    total = Tally()
    for seed in range(FEW_HEAVY):
        total.add(compare_heavy(seed))
    assert total.apart == []
    assert max(total.worst_v.values()) <= LIMIT_V
    assert set(total.left) <= {UNDEFINED, ENGINE_LEFT}
    assert total.other_root == total.other_root_said
    assert total.states > 20 * total.unanswered


@pytest.mark.parametrize("seed", range(engines_dense.FEW))
def test_every_network_agrees_with_the_dense_solve(seed: int) -> None:
    """Source: independent route (nodal equations of every node, general root finder); limit of the project, 1e-6 V."""
    found = engines_dense.compare(seed)
    assert found.states == 10  # two load states of the sound network, the open break and three joints
    assert found.worst_v <= engines_dense.LIMIT_V


def test_comparison_notices_a_wrong_conductor(monkeypatch: pytest.MonkeyPatch) -> None:
    """Source: own arithmetic: 10 mohm where there is no impedance make more than 0.01 V from an ampere on."""
    monkeypatch.setattr(engines_dss, "SHORT_OHM", 0.01)
    assert any(compare(seed).apart for seed in range(3))


def test_a_row_of_a_network_that_is_apart_does_not_hold(monkeypatch: pytest.MonkeyPatch) -> None:
    """Source: promise of the table: what is apart, or left without an answer, fails its row and is named in it."""
    monkeypatch.setattr(engines_dss, "SHORT_OHM", 0.01)
    monkeypatch.setattr(engines, "FEW", 3)
    first = next(iter(engines.rows(quick=True)))
    assert not first.holds
    assert "APART: network 0" in first.note
