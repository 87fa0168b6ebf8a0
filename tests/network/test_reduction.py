"""What is reported at boards that share nodes, feed several others, or have two ways back, by hand."""

import numpy as np
import pytest

from relaycfg.network import Network, connected, healthy_emf, short_circuit
from tests.network.sites import board, cable, load, site

EMF = 230 * np.exp(1j * np.deg2rad([0.0, -120.0, 120.0]))


def test_a_board_without_cable_carries_the_neutrals_of_all_it_feeds() -> None:
    """Source: contract, Kirchhoff: own loads and every board fed from it, with and without a cable between.

    Cables of a micro-ohm, so that every load sees 230 V; boards in both orders, since either could hide the other.
    """
    wire = cable(1e-6 + 0j)
    boards = [board("S"), board("A", "S", wire), board("B", "S", wire), board("T", "S"), board("C", "T", wire)]
    loads = [load(at, "L1", 230.0 * a) for at, a in (("S", 1), ("A", 2), ("B", 4), ("T", 8), ("C", 16))]
    for listed in (boards, boards[::-1]):
        made = site(listed, loads)
        solved = Network(made).solve("none", connected(made), healthy_emf(made))
        at = dict(zip((b.name for b in listed), solved.neutral_a[:, 0], strict=True))
        assert at == pytest.approx({"S": 31, "A": 2, "B": 4, "T": 24, "C": 16}, abs=1e-3)


def test_a_joint_however_resistive_needs_no_leak() -> None:
    """Source: own arithmetic: 0.01 W at 230 V (0.189 microsiemens) in series with a joint of one microsiemens."""
    made = site([board("A")], [load("A", "L1", 0.01)])
    solved = Network(made).solve("source", connected(made), healthy_emf(made), 1e6)
    siemens = 0.01 / 230**2
    assert solved.joint_v[0] == pytest.approx(230 * siemens / (siemens + 1e-6), rel=1e-6)
    assert solved.joint_a[0] == pytest.approx(solved.joint_v[0] * 1e-6, rel=1e-6)


def test_short_circuit_wants_an_emf_for_every_line() -> None:
    """Source: contract: EMF [lines]."""
    made = site([board("A", cable=cable(0.1 + 0j))], electrode_ohm=1.0)
    with pytest.raises(ValueError, match="shorter"):
        short_circuit(made, "A", "L-N", 0j, EMF[:2])


def test_a_source_without_electrode_takes_nothing_back_through_earth() -> None:
    """Source: own arithmetic: behind an open combined conductor an electrode of 50 ohm at the board needs another at
    the source: with one of 2 ohm the load of 8.82 ohm sees a divider, without one all 230 V stand across the break.
    """
    load_ohm = 230**2 / 6e3
    for electrode_ohm, expected in ((2.0, 230 * 52 / (52 + load_ohm)), (None, 230.0)):
        main = board("A", cable=cable(1e-9 + 0j), link=True, electrode=50.0)
        made = site([main], [load("A", "L1", 6e3)], electrode_ohm=electrode_ohm, earthing="TN-C-S")
        solved = Network(made).solve("A", connected(made), healthy_emf(made))
        assert solved.joint_v[0] == pytest.approx(expected, abs=0.01)
        assert solved.pe_earth[0, 0] == pytest.approx(expected * 50 / 52 if electrode_ohm else 0, abs=0.02)
