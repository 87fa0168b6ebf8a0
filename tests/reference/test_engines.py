"""The network against a general distribution power-flow engine, on random sites with every conductor drawn."""

from functools import cache

import pytest

from tests.reference import engines
from tests.reference.engines import BEYOND_ZIP, FEW, LIMIT_V, UNDEFINED, Tally, compare, kind_of

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
    if kind_of(seed)[1] != "zip":
        assert tally.left[BEYOND_ZIP] == 0


def test_compared_sample_has_what_it_claims_to_cover() -> None:
    """Source: own count over the networks above: break states, loads beyond their band, neutrals on the leak alone."""
    total = Tally()
    for seed in range(FEW):
        total.add(compared(seed))
    assert {kind_of(seed) for seed in range(FEW)} == {(e, law) for e in engines.EARTHINGS for law in engines.LAWS}
    assert total.networks == FEW
    assert total.open_states > 500
    assert total.beyond_band > 20
    assert total.leak_held > 5
    assert total.left[BEYOND_ZIP] < 0.05 * total.states


def test_comparison_notices_a_wrong_conductor(monkeypatch: pytest.MonkeyPatch) -> None:
    """Source: own arithmetic: 10 mohm where there is no impedance make more than 0.01 V from an ampere on."""
    monkeypatch.setattr(engines, "SHORT_OHM", 0.01)
    assert any(compare(seed).apart for seed in range(3))
