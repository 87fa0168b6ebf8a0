"""Laws of a loose joint and of what does not reach the neutral, on drawn networks."""

from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from relaycfg.model.site import NONE, SOURCE, Load, Motor, Site
from tests.network.drawn import BETWEEN, Broken, broken, law, loads_at, motors_at, networks
from tests.network.sites import board, cable, load, site

LAW = law(40)
VOLT = 1e-6
JOINTS_OHM = (0.0, 0.01, 0.1, 1.0, 10.0, 100.0, 1e4)
MONOTONE = ((1.0, 0.0, 0.0), (0.0, 1.0, 0.0), (0.5, 0.5, 0.0))


@st.composite
def passive(draw: st.DrawFn) -> tuple[Site, str]:
    """A network that is passive step by step: impedances of any angle, and in-phase currents that do not fall.

    A share of constant power is left out: its current falls while the voltage rises.
    """
    made = draw(networks())
    laws = [draw(st.sampled_from(MONOTONE)) for _ in made.loads]
    loads = tuple(
        replace(x, zip_p=law, zip_q=law, q_var=x.q_var if law == MONOTONE[0] else 0.0)
        for x, law in zip(made.loads, laws, strict=True)
    )
    return replace(made, loads=loads), draw(st.sampled_from(made.places))


@given(passive())
@LAW
def test_voltage_across_a_joint_rises_with_its_resistance(drawn: tuple[Site, str]) -> None:
    """Source: own algebra, for loads whose current never falls back as the voltage rises.

    The rest of the network takes a current J(w) at w volts across the joint, with Re (J1 - J2) conj(w1 - w2) <= 0,
    and J = G w in the joint. So (|w1| - |w2|) (G1 |w1| - G2 |w2|) <= 0: with more ohms the volts do not fall, the
    amperes do not rise. Limits: no ohms are a sound neutral, many an open one.
    """
    made, place = drawn
    solved = [Broken(made, place, ohm).solve() for ohm in JOINTS_OHM]
    assume(all(s.converged.all() for s in solved))
    across, through = ([abs(complex(getattr(s, name)[0])) for s in solved] for name in ("joint_v", "joint_a"))
    assert across[0] == 0
    assert all(more >= less - VOLT for less, more in pairwise(across))
    assert all(more <= less + VOLT for less, more in pairwise(through))
    for ohm, volts, amperes in zip(JOINTS_OHM, across, through, strict=True):
        assert volts == pytest.approx(ohm * amperes, rel=1e-6, abs=VOLT)
    if place != SOURCE:
        incoming = [b.name for b in made.boards].index(place)
        assert [s.neutral_a[incoming, 0] for s in solved] == pytest.approx([s.joint_a[0] for s in solved], abs=1e-6)
    assert solved[0].l_n == pytest.approx(Broken(made, NONE, None).solve().l_n, abs=VOLT)


def test_displacement_itself_may_fall_while_a_joint_gets_worse() -> None:
    """Source: own arithmetic, by hand, on a site made for it: loads that balance as a whole, not board by board.

    Equal resistances of 23 ohm (g): one on L1 at Main, one on L2 and one on L3 at Shed, which has 1 ohm of neutral of
    its own; lines without ohms, r the joint at Main. Sums at both neutrals against the star:
    n_M (1/r + g + 1) - n_S = g E and n_S (1 + 2 g) - n_M = -g E. With the joint sound Shed is displaced by its own
    neutral cable; the worse the joint, the less of the current has to come from the source, and the less it drops.
    """
    boards = [board("Main", cable=cable(0j, neutral=1e-6 + 0j)), board("Shed", "Main", cable(0j, neutral=1 + 0j))]
    each_w = 230.0**2 / 23
    made = site(boards, [load("Main", "L1", each_w), load("Shed", "L2", each_w), load("Shed", "L3", each_w)])
    g = 1 / 23
    main, shed = [], []
    for ohm in (0.01, 0.1, 1.0, 10.0, 1e3):
        volts = Broken(made, "Main", ohm).solve().l_n[:, :, 0]
        by_hand = np.linalg.solve([[1 / (ohm + 1e-6) + g + 1, -1], [-1, 1 + 2 * g]], [g * 230, -g * 230])
        assert -volts.mean(axis=1) == pytest.approx(by_hand, abs=1e-5)
        main.append(abs(volts[0].mean()))
        shed.append(abs(volts[1].mean()))
    assert main == sorted(main)
    assert shed == sorted(shed, reverse=True)
    assert shed[0] > 2.5 * shed[-1]


@st.composite
def with_more_between_lines(draw: st.DrawFn) -> tuple[Broken, Broken]:
    """A broken network behind stiff lines, and the same with loads and motors between lines added anywhere."""
    case = draw(broken(stiff=True))
    names = st.sampled_from([b.name for b in case.site.boards])
    more: list[Load] = draw(st.lists(names.flatmap(lambda n: loads_at(n, BETWEEN, False)), min_size=1, max_size=4))
    machines: list[Motor] = draw(st.lists(names.flatmap(lambda n: motors_at(n, ("all", "L1-L2"))), max_size=2))
    made = replace(case.site, loads=(*case.site.loads, *more), motors=(*case.site.motors, *machines))
    return case, replace(case, site=made)


@given(with_more_between_lines())
@LAW
def test_what_lies_between_lines_does_not_move_the_neutral_behind_a_stiff_source(cases: tuple[Broken, Broken]) -> None:
    """Source: own arithmetic (no path for zero sequence, no impedance that its current could drop volts in)."""
    plain, more = (case.solve() for case in cases)
    assume(plain.converged.all() and more.converged.all())
    assert more.l_n == pytest.approx(plain.l_n, abs=VOLT)
    assert more.joint_v == pytest.approx(plain.joint_v, abs=VOLT)
    assert more.neutral_a == pytest.approx(plain.neutral_a, abs=1e-4)
