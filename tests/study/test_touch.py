"""Touch voltage against voltage dividers, and the times by touch voltage as information."""

import numpy as np
import pytest

from relaycfg.files import read_site
from relaycfg.model.site import TouchTimes
from relaycfg.network import Network, connected, healthy_emf
from relaycfg.study import derive
from relaycfg.study.touch import due_s, place_touch
from tests.reference.case import CASES
from tests.study import yard

TIMES = TouchTimes(((70.0, 1.0), (100.0, 0.7), (200.0, 0.2), (400.0, 0.04)))


def touch(name, place, file="site.toml"):
    site = read_site(CASES / name / file)
    network, states = Network(site), connected(site)
    solved = network.solve(place, states, healthy_emf(site))
    return place_touch(site, network, place, states, solved)


def test_one_house_behind_a_broken_pen_lifts_its_metalwork_as_a_divider_says():
    """Source: voltage divider: 1 kW at 230 V is 52.9 ohm beside 10 ohm of the electrode: 230 * 10 / 62.9 = 36.6 V."""
    found = touch("touch-single-phase", "House")
    (house,) = [b for b in found.boards if b.board == "House"]
    assert house.largest_v == pytest.approx(230 * 10 / 62.9, abs=0.01)
    assert (house.limit_v, house.above.count, found.conductor) == (50.0, 0, "PEN")


def at_main(site):
    network, states = Network(site), connected(site)
    return place_touch(site, network, "Main", states, network.solve("Main", states, healthy_emf(site)))


def test_boards_stand_highest_first_and_those_without_pe_are_named(tmp_path):
    """In TT a PE begins at an electrode: without any there is no figure, with one the boards behind it have it."""
    bare = at_main(yard.site(tmp_path, earthing="TT"))
    assert (bare.boards, set(bare.without_pe), bare.above.count) == ((), {"Main", "Shed"}, 0)
    found = at_main(yard.site(tmp_path, earthing="TN-C-S", more=ELECTRODE))
    assert found.without_pe == ()
    volts = [b.largest_v for b in found.boards]
    assert volts == sorted(volts, reverse=True)
    assert len(volts) == 3
    assert volts[0] > 1


def test_a_limit_of_its_own_counts_at_its_board_alone(tmp_path):
    """The two boards share one PE: the same volts lie above 1 V at one and not above 120 V at the other."""
    path = yard.write(tmp_path, earthing="TN-C-S")
    text = path.read_text().replace('fed_from = "Main"', 'fed_from = "Main"\ntouch_limit_v = 120')
    path.write_text(text.replace('fed_from = "source"', 'fed_from = "source"\ntouch_limit_v = 1\nelectrode_ohm = 50'))
    found = at_main(yard.read(tmp_path))
    above = {b.board: (b.limit_v, b.above.count) for b in found.boards}
    assert above == {"Main": (1.0, 1), "Shed": (120.0, 0)}
    assert found.above.count == 1


def test_the_times_are_those_of_the_next_higher_voltage_and_none_beyond_the_table():
    """Source: table of the row ev-annex-times as quoted; the rule between steps is our own, on the short side."""
    volts = np.array([49.0, 51.0, 70.0, 71.0, 100.0, 150.0, 400.0, 401.0])
    found = due_s(TIMES, volts, np.full(8, 50.0))
    assert found.tolist() == [np.inf, 1.0, 1.0, 0.7, 0.7, 0.2, 0.04, 0.0]
    assert np.isinf(due_s(TouchTimes(), volts, np.full(8, 50.0))).all()


def test_shares_add_up_to_the_states_above_the_limit(tmp_path):
    study = derive(yard.site(tmp_path, earthing="TN-C-S", more=ELECTRODE), 300, 1)
    by_place = {t.at: t for t in study.touch}
    relay = by_place["Main"].relay
    assert relay is not None
    assert relay.within.count + relay.late.count + relay.never.count == by_place["Main"].above.count > 0
    assert {relay.within.of, relay.late.of, relay.never.of} == {by_place["Main"].above.count}
    assert all(t.above.of == 300 for t in study.touch)
    assert by_place["Shed"].relay is None
    # No load outside the relay's switch hangs on this PEN: what stays on it is not in the model.
    assert (relay.left_v, relay.left_board, relay.left) == (None, "", None)


ELECTRODE = """
[[board]]
name = "Yard lamp"
fed_from = "Main"
electrode_ohm = 50
"""
NEIGHBOUR = """
[[board]]
name = "Neighbour"
fed_from = "source"
neutral_earth_link = true
electrode_ohm = 30
[board.cable]
line_ohm = [0.1, 0.0]
neutral_ohm = [0.1, 0.0]
[[board]]
name = "House"
fed_from = "Neighbour"
[board.cable]
line_ohm = [0.05, 0.0]
neutral_ohm = [0.05, 0.0]
pe_ohm = [0.05, 0.0]
[[load]]
board = "Neighbour"
name = "neighbour heater"
between = "L1-N"
kw = 3
usage = 1
kind = "constant impedance"
[[load]]
board = "House"
name = "house heater"
between = "L2-N"
kw = 1
usage = 1
kind = "constant impedance"
"""
HEAD = """
[supply]
nominal_v = 230
earthing = "TN-C-S"
[[source]]
kind = "impedance"
line_ohm = [0.0, 0.0]
electrode_ohm = 5
"""


def test_a_neighbour_on_the_same_pen_keeps_the_metalwork_up_with_the_switch_open(tmp_path):
    """Source: voltage divider of what stays: 3 kW (17.63 ohm) and its line, through 30 and 5 ohm of electrodes."""
    relay = yard.RELAY.partition("[[fault]]")[0].replace('"Main"', '"House"')
    (tmp_path / "site.toml").write_text(HEAD + NEIGHBOUR + relay)
    (tmp_path / "relay.toml").write_text(
        yard.DEVICE.format(measures="l-n", displacement_from="l-n") + yard.OVER + yard.UNDER + yard.DISPLACEMENT
    )
    study = derive(yard.read(tmp_path), 50, 1)
    relay = next(t.relay for t in study.touch if t.at == "Neighbour")
    assert relay is not None
    ohm = 230**2 / 3000 + 0.1
    assert relay.left_v == pytest.approx(230 * 30 / (30 + 5 + ohm), rel=1e-3)
    assert relay.left.count == relay.left.of == 50
