"""The network against ngspice, on random sites written out element by element."""

from functools import cache

import pytest

from tests.reference import engines_drawing, ngspice
from tests.reference.engines_sites import EARTHINGS, LAWS, kind_of
from tests.reference.engines_tally import ENGINE_LEFT, LIMIT_V, UNDEFINED, Tally
from tests.reference.ngspice import FEW, FEW_HEAVY, MISSING, PROGRAM, compare, compare_heavy

needs_ngspice = pytest.mark.skipif(PROGRAM is None, reason=MISSING)
compared = cache(compare)


@needs_ngspice
@pytest.mark.parametrize("seed", range(FEW))
def test_every_voltage_agrees_with_ngspice(seed: int) -> None:
    """Source: ngspice, constant impedance by .ac, other laws and motors by .op in real parts; limit 0.01 V.

    Sound, open and with joints of 0.1, 1 and 10 ohm at every break place; no state is left out.
    """
    tally = compared(seed)
    assert tally.apart == []
    assert max(tally.worst_v.values()) <= LIMIT_V
    assert set(tally.left) <= {UNDEFINED}
    assert tally.other_root == 0


@needs_ngspice
def test_compared_sample_has_what_it_claims_to_cover() -> None:
    """Source: own count over the networks above."""
    total = Tally()
    for seed in range(FEW):
        total.add(compared(seed))
    assert {kind_of(seed) for seed in range(FEW)} == {(e, law) for e in EARTHINGS for law in LAWS}
    assert total.open_states > 150
    assert total.beyond_band > 20


@needs_ngspice
def test_networks_on_constant_power_alone_agree_or_rest_on_another_root() -> None:
    """Source: ngspice; a state that differs has to be a root of the dense equations in both answers, and said."""
    total = Tally()
    for seed in range(FEW_HEAVY):
        total.add(compare_heavy(seed))
    assert total.apart == []
    assert max(total.worst_v.values()) <= LIMIT_V
    assert set(total.left) <= {UNDEFINED, ENGINE_LEFT}
    assert total.other_root == total.other_root_said > 0


@needs_ngspice
@pytest.mark.parametrize("seed", [0, 6])
def test_comparison_notices_a_wrong_conductor(seed: int, monkeypatch: pytest.MonkeyPatch) -> None:
    """Source: own arithmetic: 50 ohm at every joint and break is none of the cases compared."""
    monkeypatch.setattr(engines_drawing.Drawing, "broken_ohm", lambda *_: 50.0 + 0j)
    assert compare(seed).apart


@pytest.mark.parametrize("quick", [True, False])
def test_missing_ngspice_is_a_row_that_says_so(quick: bool, monkeypatch: pytest.MonkeyPatch) -> None:
    """Source: promise of the table: nothing is skipped in silence."""
    monkeypatch.setattr(ngspice, "PROGRAM", None)
    (row,) = ngspice.rows(quick)
    assert "NOT COMPARED" in row.case
    assert row.source == MISSING


def test_raw_file_without_the_asked_analysis_is_no_answer() -> None:
    """Source: ngspice writes its constants where an operating point was not found."""
    assert ngspice.read_raw("Plotname: constants\nVariables:\n\t0\tv(a)\tvoltage\nValues:\n 0\t1.0\n") == {}
