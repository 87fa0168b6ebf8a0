"""Laws of symmetry on drawn networks: turned lines, other names, other scales, sums of sources."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from relaycfg.model.geometry import ComplexArray, three_phase
from relaycfg.model.site import Board, Cable, Load, Motor, Site
from relaycfg.network import Solved
from tests.network.drawn import Broken, broken, emfs, law

LAW = law(50)
VOLT = 1e-6
TURN = {"L1": "L2", "L2": "L3", "L3": "L1", "L1-L2": "L2-L3", "L2-L3": "L3-L1", "L3-L1": "L1-L2", "all": "all"}
SWAP = {"L1": "L1", "L2": "L3", "L3": "L2", "L1-L2": "L3-L1", "L2-L3": "L2-L3", "L3-L1": "L1-L2", "all": "all"}
LINE = {"L1": 0, "L2": 1, "L3": 2}


def resolved(*solutions: Solved) -> bool:
    """Whether every one is a solution, on a branch of solutions that ends nowhere near."""
    return all(s.converged.all() and not s.unstable.any() for s in solutions)


def renamed(made: Site, names: dict[str, str]) -> Site:
    """The site with its loads and motors on the lines of other names."""

    def moved(item: Load | Motor) -> dict[str, object]:
        lines = tuple(LINE[names[f"L{k + 1}"]] for k in item.lines)
        return {"between": names[item.between], "lines": lines}

    loads = tuple(replace(x, **moved(x)) for x in made.loads)  # type: ignore[arg-type]
    motors = tuple(replace(x, **moved(x)) for x in made.motors)  # type: ignore[arg-type]
    return replace(made, loads=loads, motors=motors)


@given(broken())
@LAW
def test_turning_the_loads_turns_the_voltages(case: Broken) -> None:
    """Source: own arithmetic (lines a third of a turn apart): what L1 saw L2 sees, lagging by that third."""
    turned = replace(case, site=renamed(case.site, TURN))
    before, after = case.solve(), turned.solve()
    assume(resolved(before, after))
    third = case.site.supply.geometry.phasors[1]
    assert after.l_n == pytest.approx(third * np.roll(before.l_n, 1, axis=1), abs=VOLT)
    assert after.joint_v == pytest.approx(third * before.joint_v, abs=VOLT)
    assert after.pe_earth == pytest.approx(third * before.pe_earth, abs=VOLT, nan_ok=True)
    assert after.neutral_a == pytest.approx(third * before.neutral_a, abs=1e-4)


@given(broken())
@LAW
def test_two_lines_that_change_names_in_the_other_phase_order_change_nothing(case: Broken) -> None:
    """Source: own arithmetic (the same circuit under other names)."""
    order = "L1-L3-L2" if case.site.supply.geometry.angles_deg[1] < 0 else "L1-L2-L3"
    made = renamed(case.site, SWAP)
    other = replace(case, site=replace(made, supply=replace(made.supply, geometry=three_phase(order))))
    before, after = case.solve(), other.solve()
    assume(resolved(before, after))
    assert after.l_n == pytest.approx(before.l_n[:, [0, 2, 1]], abs=VOLT)
    assert after.joint_v == pytest.approx(before.joint_v, abs=VOLT)


def scaled(case: Broken, volts: float, ohms: float) -> Broken:
    """The same circuit with all volts and all ohms times a factor; powers go with volts squared over ohms."""
    power = volts**2 / ohms

    def cable(c: Cable | None) -> Cable | None:
        return c and Cable(*(None if z is None else z * ohms for z in vars(c).values()))  # type: ignore[arg-type]

    def board(b: Board) -> Board:
        electrode = None if b.electrode_ohm is None else b.electrode_ohm * ohms
        return replace(b, cable=cable(b.cable), electrode_ohm=electrode)

    made, source = case.site, case.site.source
    assert source.electrode_ohm is not None
    site = replace(
        made,
        supply=replace(made.supply, nominal_v=made.supply.nominal_v * volts),
        source=replace(
            source,
            emf_v=source.emf_v * volts,
            line_ohm=source.line_ohm * ohms,
            neutral_ohm=source.neutral_ohm * ohms,
            star_link_ohm=source.star_link_ohm * ohms,
            electrode_ohm=source.electrode_ohm * ohms,
        ),
        boards=tuple(board(b) for b in made.boards),
        loads=tuple(replace(x, p_w=x.p_w * power, q_var=x.q_var * power) for x in made.loads),
        motors=tuple(
            replace(x, running_va=x.running_va * power, starting_va=x.starting_va * power) for x in made.motors
        ),
    )
    return replace(case, site=site, joint_ohm=None if case.joint_ohm is None else case.joint_ohm * ohms)


@given(broken(), st.floats(0.4, 2.5), st.floats(0.2, 5.0))
@LAW
def test_volts_scale_with_volts_and_amperes_with_volts_over_ohms(case: Broken, volts: float, ohms: float) -> None:
    """Source: own arithmetic (dimensions); loads keep their band in units of nominal, so any load law scales."""
    before, after = case.solve(), scaled(case, volts, ohms).solve()
    assume(resolved(before, after))
    assert after.l_n == pytest.approx(volts * before.l_n, abs=3 * VOLT)
    assert after.joint_v == pytest.approx(volts * before.joint_v, abs=3 * VOLT)
    assert after.neutral_a == pytest.approx(volts / ohms * before.neutral_a, abs=1e-3)
    assert after.below_band == pytest.approx(before.below_band)


@given(broken(linear=True), emfs(), emfs(), st.complex_numbers(max_magnitude=2, allow_nan=False))
@LAW
def test_superposition_of_sources_for_constant_impedance(
    case: Broken, first: ComplexArray, second: ComplexArray, factor: complex
) -> None:
    """Source: own arithmetic (linearity): the answer to a sum of EMFs is the sum of the answers, factors included."""
    one, two, both = case.solve(first), case.solve(second), case.solve(first + factor * second)
    assume(resolved(one, two, both))
    largest = max(1.0, *(float(np.abs(s.l_n).max()) / 100 for s in (one, two)))
    for name in ("l_n", "n_earth", "pe_earth", "joint_v"):
        together = getattr(one, name) + factor * getattr(two, name)
        assert getattr(both, name) == pytest.approx(together, abs=VOLT * largest, nan_ok=True), name
