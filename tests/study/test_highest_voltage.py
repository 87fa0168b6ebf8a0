"""The highest volts over all on/off combinations, against circuits worked by hand and against every state solved."""

import math
from dataclasses import replace
from itertools import product
from pathlib import Path

import numpy as np
import pytest

from relaycfg.model.site import Site
from relaycfg.network import LoadStates, Network, healthy_emf
from relaycfg.study.breaks import breaks
from relaycfg.study.highest_voltage import highest_voltage, named_state
from tests.study.yard import load, site


def stiff(made: Site) -> Site:
    """The site with cables and source of next to no ohms."""
    small = 1e-6 + 0j
    source = replace(made.source, line_ohm=small)
    boards = tuple(
        replace(b, cable=replace(b.cable, line_ohm=small, neutral_ohm=small, pe_ohm=small if b.cable.pe_ohm else None))
        for b in made.boards
        if b.cable is not None
    )
    return replace(made, source=source, boards=boards)


def test_resistors_are_switched_to_the_corner_that_millman_gives_by_hand(tmp_path: Path) -> None:
    """Always on 1, 2, 3 kW at L1, L2, L3, switched 9 kW at L2 and at L3. A line has sqrt3 U0 sqrt(b^2 + c^2 + b c) over
    the sum, b and c the other two lines (equal angles; engineering text, fact 2). In parts of sqrt3 U0, L1 has
    0.726 (1, 2, 3), 0.851 (1, 11, 3), 0.874 (1, 2, 12) and 0.830 (1, 11, 12); the other lines have less.
    """
    loads = "".join(load("Shed", f"L{k}-N", float(k), f"lamp {k}", usage=1.0) for k in (1, 2, 3))
    loads += "".join(load("Shed", f"L{k}-N", 9.0, f"oven {k}") for k in (2, 3))
    made = stiff(site(tmp_path, loads=loads))
    found = highest_voltage(made, Network(made), healthy_emf(made), "Shed")
    assert found.how == "closed form"
    assert found.switchable == 2
    assert (found.line, found.loads_on) == ("L1", ("oven 3",))
    assert found.stiff_v == pytest.approx(math.sqrt(3) * 230 * math.sqrt(2**2 + 12**2 + 24) / 15, rel=1e-9)
    assert found.bound_v == found.stiff_v
    assert found.impedance_v == pytest.approx(found.stiff_v, abs=0.05)


def test_one_load_alone_leaves_the_idle_lines_at_the_volts_between_lines(tmp_path: Path) -> None:
    made = stiff(site(tmp_path, loads=load("Shed", "L1-N", 2.0, "kettle") + load("Shed", "L2-N", 1.0, "lamp")))
    found = highest_voltage(made, Network(made), healthy_emf(made), "Shed")
    assert found.stiff_v == pytest.approx(math.sqrt(3) * 230, rel=1e-9)
    assert len(found.loads_on) == 1


def test_capacitor_against_coil_is_worked_by_hand(tmp_path: Path) -> None:
    """Fixed at L1: 1 kvar coil with 1 kW (Y = g (1 - j)); switched at L2: 2 kvar capacitor (Y = 2j g).

    V1 = E12 Y2 / (Y1 + Y2) has sqrt3 U0 2 / |1 + j| = sqrt6 U0 = 563 V; the idle line more:
    V3 = (E31 (1 - j) + E32 2j) / (1 + j) has (3 + sqrt3) / sqrt2 U0 = 770 V. Above sqrt3 U0: nothing is clamped.
    """
    made = stiff(site(tmp_path, loads=load("Shed", "L1-N", 1.0, "coil", usage=1.0) + load("Shed", "L2-N", 1.0, "cap")))
    coil, cap = made.loads
    made = replace(made, loads=(replace(coil, q_var=1000.0), replace(cap, p_w=0.0, q_var=-2000.0)))
    found = highest_voltage(made, Network(made), healthy_emf(made), "Shed")
    assert found.how == "branch and bound"
    assert (found.line, found.loads_on) == ("L3", ("cap",))
    assert found.stiff_v == pytest.approx((3 + math.sqrt(3)) / math.sqrt(2) * 230, rel=1e-9)
    assert found.bound_v == pytest.approx(found.stiff_v, rel=2e-4)


@pytest.mark.parametrize("seed", range(6))
def test_every_combination_solved_in_a_stiff_network_stays_at_or_below_it(seed: int, tmp_path: Path) -> None:
    """Groups, a star, fixed loads, loads that are never on, power factors of both signs; TN-C-S with its electrodes."""
    rng = np.random.default_rng(seed)
    where = ["L1-N", "L2-N", "L3-N", "L1-N", "L2-N", "L3-N", "L1-N", "L2-N", "L1-L2-L3-N", "L1-N", "L3-N"]
    loads = "".join(load("Shed", at, 1.0, f"load {k}") for k, at in enumerate(where))
    made = stiff(site(tmp_path, loads=loads, earthing="TN-C-S"))
    angles = rng.uniform(-1.0, 1.0, len(where)) * (seed > 1)
    powers = rng.lognormal(8, 1, len(where)) * np.exp(1j * angles)
    usages = [0.5] * 8 + [0.4, 1.0, 0.0]
    groups = ["a", "", "a", "", "", "", "", "", "", "", ""]
    made = replace(
        made,
        boards=tuple(replace(b, electrode_ohm=5.0) if b.neutral_earth_link else b for b in made.boards),
        loads=tuple(
            replace(old, p_w=p.real, q_var=p.imag, usage=u, group=g, demand=0.8)
            for old, p, u, g in zip(made.loads, powers, usages, groups, strict=True)
        ),
    )
    network, emf = Network(made), healthy_emf(made)
    switched = [k for k, u in enumerate(usages) if 0 < u < 1]
    every = [on for on in product((0.0, 1.0), repeat=len(switched)) if on[switched.index(0)] == on[switched.index(2)]]
    factors = np.zeros((len(where), len(every)))
    factors[switched] = 0.8 * np.array(every).T
    factors[9] = 0.8
    states = LoadStates(factors, np.zeros((0, len(every)), np.int8), tuple(map(str, range(len(every)))))
    for place in made.places:
        solved = network.solve(place, states, emf, all_impedance=True)
        behind = [network.boards.index(b) for b in made.behind(place)]
        truth = float(np.abs(solved.l_n[behind]).max())
        found = highest_voltage(made, network, emf, place)
        assert found.how == ("closed form" if seed < 2 else "branch and bound")
        assert found.stiff_v == pytest.approx(truth, rel=3e-4)
        assert found.bound_v >= truth * (1 - 1e-4)
        assert found.impedance_v == pytest.approx(truth, rel=3e-4)


def test_the_combination_is_shown_again_by_its_name_and_by_its_loads(tmp_path: Path) -> None:
    made = site(tmp_path)
    for place in made.places:
        whole = breaks(made, samples=50, seed=1, at=place)
        (found,) = whole.highest
        listed = "on: " + "; ".join(found.loads_on)
        for name in ("worst", listed):
            (row,) = breaks(made, samples=50, seed=1, at=place, state=name).rows
            assert max(row.boards[found.board].l_n_v) == pytest.approx(found.modelled_v, abs=1e-9)
            assert row.all_impedance is not None
            assert max(max(b.l_n_v) for b in row.all_impedance.boards.values()) == pytest.approx(
                found.impedance_v, abs=1e-9
            )


def test_a_sampled_worst_state_is_shown_again_with_the_same_volts(tmp_path: Path) -> None:
    made = site(tmp_path)
    for summary in breaks(made, samples=300, seed=7).summaries:
        assert summary.worst
        for worst in summary.worst:
            again = breaks(made, samples=1, seed=7, at=summary.at, state=f"sample {worst.index}")
            line = made.supply.geometry.names.index(worst.line)
            assert again.rows[0].boards[worst.board].l_n_v[line] == pytest.approx(worst.volts, abs=1e-6)


def test_named_loads_are_on_at_their_demand_beside_what_is_always_on(tmp_path: Path) -> None:
    loads = "".join(load("Main", "L1-N", 1.0, name, usage) for name, usage in (("a", 1.0), ("b", 0.5), ("c", 0.5)))
    made = site(tmp_path, loads=loads)
    made = replace(made, loads=tuple(replace(x, demand=0.7) for x in made.loads))
    assert named_state(made, ("c",), "n").loads[:, 0].tolist() == [0.7, 0.0, 0.7]
    with pytest.raises(ValueError, match=r"^d$"):
        named_state(made, ("c", "d"), "n")


def test_a_name_of_no_load_state_is_refused(tmp_path: Path) -> None:
    with pytest.raises(ValueError, match="no load state is called 'all'"):
        breaks(site(tmp_path), samples=10, seed=1, state="all")


def test_a_load_that_takes_nothing_is_no_switch(tmp_path: Path) -> None:
    """Legal: demand 0. Nothing is left to switch behind the break, and the idle lines show the volts that stand."""
    made = site(tmp_path, loads=load("Shed", "L1-N", 2.0, "spare"))
    made = replace(made, loads=tuple(replace(x, demand=0.0) for x in made.loads))
    found = highest_voltage(made, Network(made), healthy_emf(made), "Shed")
    assert (found.switchable, found.how) == (0, "nothing to switch")
