"""Short circuits: hand arithmetic, the range engineers know, bolted faults and every earthing."""

import numpy as np
import pytest

from relaycfg.model.site import Site
from relaycfg.network import healthy_emf, short_circuit
from tests.network.sites import board, cable, site

PHASORS = np.exp(1j * np.deg2rad([0.0, -120.0, 120.0]))


def street(neutral_ratio: float = 1.0, pe: complex | None = 0.2 + 0j, cold: float = 1.0) -> Site:
    """A stiff source, board A on it, board B behind a cable of 0.2 ohm, board C behind another."""
    boards = [
        board("A"),
        board("B", "A", cable(0.2 + 0j, neutral_ratio * 0.2 + 0j, pe, cold)),
        board("C", "B", cable(0.1 + 0j, pe=pe)),
    ]
    return site(boards, electrode_ohm=5.0)


@pytest.mark.parametrize("ratio", [1.0, 1.5, 2.0, 3.0])
def test_bolted_line_to_neutral_fault_looks_like_a_lost_neutral(ratio: float) -> None:
    """Source: engineering fact: V0 153 to 192 V, sound phases 1.32 to 1.52 U0 for Z_N / Z_L 1 to 3; divider by hand."""
    taps = short_circuit(street(ratio), "B", "L-N", 0j, healthy_emf(street()))
    shift = 230 * ratio / (1 + ratio)
    assert taps["B"][0] == pytest.approx(0, abs=1e-9)
    assert taps["B"][1:3] == pytest.approx(230 * PHASORS[1:] - shift, abs=1e-9)
    v0, sound = abs(taps["B"][:3].mean()), np.abs(taps["B"][1:3]) / 230
    assert 152.5 < v0 < 192.5
    assert sound == pytest.approx(np.full(2, sound[0]), abs=1e-9)
    assert 1.315 < sound[0] < 1.525
    assert taps["C"][:3] == pytest.approx(taps["B"][:3], abs=1e-9)
    assert taps["A"][:3] == pytest.approx(230 * PHASORS, abs=1e-9)


def test_neutral_against_pe_during_a_fault() -> None:
    """Source: own arithmetic: an L-N fault lifts N, an L-PE fault lifts PE, by their share of the loop."""
    emf = healthy_emf(street())
    by_n, by_pe = (short_circuit(street(pe=0.2 + 0j), "B", kind, 0.05 + 0j, emf)["B"] for kind in ("L-N", "L-PE"))
    assert by_n[3] == pytest.approx(230 * 0.2 / 0.5, abs=1e-9)
    assert by_pe[3] == pytest.approx(-230 * 0.2 / 0.5, abs=1e-9)
    assert by_pe[0] == pytest.approx(230 * 0.3 / 0.5, abs=1e-9)


def test_line_to_line_and_three_phase_faults_leave_the_neutral_alone() -> None:
    """Source: own arithmetic: no zero sequence; the faulted lines meet half way, or share one divider."""
    emf = healthy_emf(street())
    pair = short_circuit(street(), "B", "L-L", 0j, emf)["B"]
    assert pair[:3] == pytest.approx([-emf[2] / 2, -emf[2] / 2, emf[2]], abs=1e-9)
    far = short_circuit(street(), "B", "L-L", 0.1 + 0j, emf)["B"]
    assert far[0] - far[1] == pytest.approx((emf[0] - emf[1]) * 0.2 / 0.6, abs=1e-9)
    three = short_circuit(street(), "B", "three-phase", 0.3 + 0j, emf)["B"]
    assert three[:3] == pytest.approx(emf * 0.3 / 0.5, abs=1e-9)
    assert abs(three[3]) < 1e-9


def test_tt_fault_to_earth_returns_through_the_electrodes() -> None:
    """Source: own arithmetic: 230 V over board and source electrode and the conductors."""
    made = site([board("A", cable=cable(0.1 + 0j), electrode=20.0), board("B")], electrode_ohm=2.0, earthing="TT")
    tap = short_circuit(made, "A", "L-PE", 0.05 + 0j, healthy_emf(made))["A"]
    current = 230 / (0.1 + 0.1 + 20 + 2)
    assert tap[0] == pytest.approx(230 - 0.1 * current, abs=1e-9)
    assert tap[3] == pytest.approx(-22 * current, abs=1e-9)
    with pytest.raises(ValueError, match="board B has no protective conductor"):
        short_circuit(made, "B", "L-PE", 0j, healthy_emf(made))


def test_cables_count_cold() -> None:
    """Source: engineering fact: faults are computed at 20 C; a divider of 0.1 + 0.1 against 0.1 + 0.1 ohm."""
    emf = healthy_emf(street())
    cold = short_circuit(street(cold=0.5, pe=None), "B", "L-N", 0.1 + 0j, emf)["B"]
    assert abs(cold[0]) == pytest.approx(230 * 0.2 / 0.4, abs=1e-9)
    assert np.isnan(cold[3])
    to_pe = short_circuit(street(cold=0.5), "B", "L-PE", 0.1 + 0j, emf)["B"]
    assert to_pe[3] == pytest.approx(-230 * 0.1 / 0.4, abs=1e-9)


def test_source_impedance_and_its_zero_sequence_count() -> None:
    """Source: own arithmetic: fault at the bar through Z1 and (Z0 - Z1) / 3."""
    made = site([board("A")], line_ohm=0.02j, neutral_ohm=0.01j, electrode_ohm=1.0)
    tap = short_circuit(made, "A", "L-N", 0j, healthy_emf(made))["A"]
    assert tap[1] == pytest.approx(230 * PHASORS[1] - 230 / 3, abs=1e-9)


def test_bolted_fault_on_an_ideal_source_is_refused() -> None:
    """Source: own arithmetic: nothing limits the current."""
    made = site([board("A")], electrode_ohm=1.0)
    with pytest.raises(ValueError, match="without any impedance"):
        short_circuit(made, "A", "L-N", 0j, healthy_emf(made))
