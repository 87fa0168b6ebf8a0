"""The earth that N is measured against: the local PE hides a broken PEN, an electrode apart shows it."""

from dataclasses import replace

import numpy as np
import pytest

from relaycfg.network import Network, connected, healthy_emf, short_circuit, tap
from relaycfg.study import breaks, derive
from relaycfg.study.third_harmonic import third_harmonic
from tests.study import yard

OWN = yard.RELAY.replace('trips = "Main"', 'trips = "Main"\nearth_reference = "own electrode"')
APART = """
[[board]]
name = "Yard lamp"
fed_from = "Main"
electrode_ohm = 20
"""


def pair(folder, **changes):
    """The same TN-C-S site measuring N against its PE, and against an electrode of its own."""
    sites = []
    for name, relay in (("local", yard.RELAY), ("own", OWN)):
        (folder / name).mkdir()
        given = {"earthing": "TN-C-S", "displacement_from": "n-to-earth", "more": APART, "relay": relay} | changes
        sites.append(yard.site(folder / name, **given))
    return sites


def seen(site):
    return {s.at: s.seen for s in breaks(site, samples=20, seed=1).summaries}


def test_a_broken_pen_is_seen_with_an_electrode_of_its_own_and_not_against_pe(tmp_path):
    local, own = pair(tmp_path, elements=yard.DISPLACEMENT)
    assert seen(local) == {"source": False, "Main": False, "Shed": False}
    assert seen(own) == {"source": False, "Main": True, "Shed": False}


def test_what_the_relay_reads_is_the_neutral_against_remote_earth(tmp_path):
    """Source: voltage divider: the electrode's own volts are the neutral's, for N and PE are tied at the board."""
    _, own = pair(tmp_path)
    network, states = Network(own), connected(own)
    solved = network.solve("Main", states, healthy_emf(own))
    index = network.boards.index("Main")
    read = abs(tap(solved, index, "own electrode")[0, -1])
    assert read == pytest.approx(abs(solved.pe_earth[index, 0]), rel=1e-6)
    assert read == pytest.approx(abs(solved.joint_v[0]) * 20 / 22, rel=0.01)
    assert abs(tap(solved, index)[0, -1]) < 1e-3


def test_the_warning_of_a_blind_local_pe_names_the_remedy(tmp_path):
    local, own = pair(tmp_path)
    found = [f for f in derive(local, 60, 1).findings if "PE of its own board" in f.sentence]
    assert [f.severity for f in found] == ["warning"]
    assert "Main" in found[0].sentence
    assert "own electrode" in found[0].do
    assert [f for f in derive(own, 60, 1).findings if "PE of its own board" in f.sentence] == []


def test_where_nothing_else_measures_the_place_itself_is_told_as_not_seen_with_the_remedy(tmp_path):
    local, _ = pair(tmp_path, elements=yard.DISPLACEMENT)
    study = derive(local, 60, 1)
    (found,) = [f for f in study.findings if f.sentence.startswith("break at Main is not seen")]
    assert "N and PE move together" in found.sentence
    assert "electrode outside the influence" in found.do


def test_the_choice_is_shown_with_both_figures_at_one_pickup(tmp_path):
    _, own = pair(tmp_path)
    study = derive(own, 100, 1)
    choice = study.earth_choice
    assert choice is not None
    by_place = {p.at: p for p in choice.places}
    assert (choice.chosen, set(by_place)) == ("own electrode", {"source", "Main"})
    main = by_place["Main"]
    assert (main.local.count, main.local_v) == (0, pytest.approx(0.0, abs=1e-3))
    assert main.own.count > 0
    assert choice.standing_own_v > choice.standing_local_v
    assert derive(yard.site(tmp_path), 20, 1).earth_choice is None


def test_must_hold_cases_are_read_against_the_same_earth(tmp_path):
    """In TN-C-S the PEN's drop of a sound network stands between N and remote earth, and not between N and PE."""
    local, own = pair(tmp_path)
    most = []
    for site in (local, own):
        study = derive(site, 100, 1)
        assert study.early_warning is not None
        most.append(study.early_warning.standing_v)
    assert most[0] < 0.01
    assert most[1] > 0.1


def test_a_short_circuit_lifts_the_neutral_against_an_electrode_of_its_own(tmp_path):
    """Source: with N and PE tied at the board the local PE reads nothing; N is off earth by its share of the loop.

    A bolted L-N fault at Main: source 0.01 + j0.01, line and PEN 0.02 + j0.01 each, so the PEN drops
    230 * |0.02 + j0.01| / |0.05 + j0.03| V; of it the electrodes 2 and 20 ohm leave 20/22 at the board.
    """
    _, own = pair(tmp_path)
    emf = healthy_emf(own)
    fault = short_circuit(own, "Main", "L-N", 0j, emf, "own electrode")["Main"]
    drop = 230 * abs(0.02 + 0.01j) / abs(0.05 + 0.03j)
    assert abs(fault[-1]) == pytest.approx(drop * 20 / 22, rel=0.02)
    assert abs(short_circuit(own, "Main", "L-N", 0j, emf)["Main"][-1]) < 1e-6


def test_the_third_harmonic_of_the_pen_reaches_an_electrode_of_its_own(tmp_path):
    """Source: own arithmetic: 3 I3 |R + j3X| of the PEN, which the tie of N and PE takes away from N-PE."""
    loads = yard.load("Main", "L1-N", 6.9, "office") + "third_harmonic_percent = 30\n"
    local, own = pair(tmp_path, loads=loads)
    amperes = own.loads[0].p_w / 230 * 0.3 * abs(complex(own.loads[0].p_w, own.loads[0].q_var)) / own.loads[0].p_w
    assert third_harmonic(own, "Main").n_pe_v == pytest.approx(amperes * abs(0.02 + 0.03j))
    assert third_harmonic(local, "Main").n_pe_v == 0.0


def test_a_device_that_reads_its_lines_has_no_use_for_an_earth(tmp_path):
    site = yard.site(tmp_path, relay=OWN)
    assert site.relay is not None
    assert site.relay.earth_reference == "local PE"
    assert any("earth_reference has no effect" in w for w in site.warnings)


def test_the_test_set_is_told_which_terminal_to_drive(tmp_path):
    _, own = pair(tmp_path)
    orders = [t.inject for t in derive(own, 60, 1).tests if t.element.startswith("59N")]
    assert orders
    assert all(order.startswith("N against the terminal of its own electrode") for order in orders)


def test_nothing_tied_to_earth_leaves_nothing_to_read(tmp_path):
    _, own = pair(tmp_path, more="")
    floating = replace(own, source=replace(own.source, electrode_ohm=None))
    network = Network(floating)
    solved = network.solve("Main", connected(floating), healthy_emf(floating))
    assert np.isnan(tap(solved, 0, "own electrode")[0, -1])
