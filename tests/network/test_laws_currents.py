"""Laws of currents and of sums, on drawn networks: Kirchhoff, three times V0, the mean square of the volts."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import assume, given

from relaycfg.model.geometry import ComplexArray
from relaycfg.network import Solved, connected, healthy_emf, tap
from relaycfg.relay import measured_quantities
from tests.network.dense import Dense
from tests.network.drawn import Broken, broken, emfs, law
from tests.network.sites import board

LAW = law(60)
KIRCHHOFF = 1e-7
"""Ampere of mismatch an ampere of load: what volts that are off by the solver's 1e-7 V do to a load."""
VOLT = 1e-6


def potentials(case: Broken, dense: Dense, solved: Solved, emf: ComplexArray) -> ComplexArray:
    """Every node's potential against earth: those of the boards as solved, star and star point from them.

    The star follows from the sum at L1 of the source, the star point from the sum at the star: two equations used
    up, all others are left to be checked.
    """
    source, states = case.site.source, connected(case.site)
    v = np.full(len(dense.nodes), np.nan + 0j)
    for number, each in enumerate(case.site.boards):
        neutral = solved.n_earth[number, 0]
        for k in range(3):
            v[dense.nodes[dense.root(f"{each.name}.L{k}")]] = solved.l_n[number, k, 0] + neutral
        v[dense.nodes[dense.root(f"{each.name}.N")]] = neutral
        if each.name in dense.with_pe:
            v[dense.nodes[dense.root(f"{each.name}.PE")]] = solved.pe_earth[number, 0]
    star = dense.nodes[dense.root("star")]
    v[star] = 0
    v[star] = source.line_ohm * dense.leaving(v, emf, states, 0)[dense.nodes[dense.root("source.L0")]]
    point = dense.nodes[dense.root("star point")]
    if np.isnan(v[point]):
        v[point] = 0
        v[point] = source.neutral_ohm * dense.leaving(v, emf, states, 0)[star]
    return v


@given(broken(), emfs())
@LAW
def test_currents_sum_to_zero_at_every_node(case: Broken, emf: ComplexArray) -> None:
    """Source: Kirchhoff's current law at L, N and PE of every board, at the source's terminals and its star.

    Currents are formed outside the package, conductor by conductor and load by load, from the potentials alone. A
    board on the source's own bar shows what stands there.
    """
    case = replace(case, site=replace(case.site, boards=(board("bar"), *case.site.boards)))
    solved = case.solve(emf)
    assume(solved.converged.all())
    dense = Dense(case.site, case.place, case.joint_ohm)
    v = potentials(case, dense, solved, emf)
    load_s = sum(abs(complex(x.p_w, x.q_var)) for x in case.site.loads) / 230**2 / 0.5**2
    worst = np.abs(dense.leaving(v, emf, connected(case.site), 0)).max()
    assert worst < KIRCHHOFF * max(1.0, np.abs(v).max() * load_s)


@given(broken(stiff=True), emfs())
@LAW
def test_sum_of_the_line_to_neutral_volts_is_three_times_what_the_neutral_moved(
    case: Broken, emf: ComplexArray
) -> None:
    """Source: own arithmetic. Behind lines without impedance each L-N is its EMF less the neutral's shift.

    The shift is added up along the neutral here: drop of every conductor to the star, and the volts of the joint.
    """
    case = replace(case, site=replace(case.site, boards=(board("bar"), *case.site.boards)))
    made, solved = case.site, case.solve(emf)
    assume(solved.converged.all())
    index = {b.name: k for k, b in enumerate(made.boards)}
    bar = emf.sum() / 3 - solved.l_n[index["bar"], :, 0].sum() / 3
    for each in made.boards:
        shift = bar
        for step in made.path(each.name):
            cable = made.board(step).cable
            shift += 0 if cable is None else cable.neutral_ohm * solved.neutral_a[index[step], 0]
            shift += solved.joint_v[0] if step == case.place else 0
        volts = solved.l_n[index[each.name], :, 0]
        assert volts.sum() == pytest.approx(emf.sum() - 3 * shift, abs=VOLT * max(1.0, np.abs(volts).max()))


@given(broken())
@LAW
def test_mean_square_of_the_volts_is_that_between_lines_and_that_of_v0(case: Broken) -> None:
    """Source: own algebra (second moments about the mean): sum |L-N|^2 = sum |L-L|^2 / 3 + 3 |V0|^2 at any board.

    Behind a stiff source the volts between lines are those of the sound supply, and it reads U0^2 + V0^2 (next test).
    """
    solved = case.solve()
    assume(solved.converged.all())
    for number in range(len(case.site.boards)):
        seen = measured_quantities(case.site.supply.geometry, tap(solved, number)[0])
        left = (seen["l_n_v"] ** 2).sum()
        assert left == pytest.approx((seen["l_l_v"] ** 2).sum() / 3 + 3 * seen["v0_v"] ** 2, rel=1e-9)


@given(broken(stiff=True))
@LAW
def test_mean_square_invariant_behind_a_stiff_source(case: Broken) -> None:
    """Source: own algebra: mean |E_k - Vn|^2 = U0^2 + |Vn|^2, as balanced EMFs sum to zero; at every board."""
    solved = case.solve()
    assume(solved.converged.all())
    for volts in solved.l_n[..., 0]:
        v0 = volts.mean()
        assert (np.abs(volts) ** 2).mean() == pytest.approx(case.site.source.emf_v**2 + abs(v0) ** 2, rel=1e-8)


@given(broken(stiff=True))
@LAW
def test_break_behind_a_stiff_source_leaves_v1_and_v2_alone(case: Broken) -> None:
    """Source: own arithmetic: a shift of the star point is in V0 alone, whatever the loads, at every board."""
    solved = case.solve()
    assume(solved.converged.all())
    geometry = case.site.supply.geometry
    for volts in solved.l_n[..., 0]:
        _, v1, v2 = geometry.sequences(volts)
        assert v1 == pytest.approx(case.site.source.emf_v, abs=VOLT)
        assert abs(v2) < VOLT
    assert healthy_emf(case.site) == pytest.approx(case.site.source.emf_v * geometry.phasors)
