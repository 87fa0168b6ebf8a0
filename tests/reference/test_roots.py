"""States with several roots: all roots by an independent search, and the package's answer among them."""

from collections.abc import Callable
from functools import cache

import numpy as np
import pytest

from relaycfg.model.site import SOURCE, Site
from relaycfg.network import Network, connected, healthy_emf
from tests.network.dense import Dense
from tests.network.sites import board, load, site
from tests.reference.engines_sites import heavy_site
from tests.reference.engines_tally import ROOT_LIMIT_V
from tests.reference.roots import FEW, Count, examine, rows_of, zip_site
from tests.reference.roots_at_rest import filled, from_package
from tests.reference.roots_path import connected_root
from tests.reference.roots_search import Question, Roots, search

POWER_KW = (3.0, 2.0, 1.0)
BAND = (0.2, 2.0)
"""So wide that both constant-power roots of POWER_KW lie inside it."""


def star(powers_kw: tuple[float, ...], band: tuple[float, float] = BAND) -> Site:
    """Constant power on every line of one board on a stiff source (10 micro-ohm)."""
    lines = zip(("L1", "L2", "L3"), powers_kw, strict=True)
    loads = [load("B", line, 1000 * power, zip_p=(0.0, 0.0, 1.0), band=band) for line, power in lines]
    return site([board("B")], loads, line_ohm=1e-5, electrode_ohm=10.0)


def question_of(made: Site) -> Question:
    """Everything on, the star link open."""
    return Question(Dense(made, SOURCE), healthy_emf(made), connected(made), 0)


def inside(question: Question, roots: Roots, band: tuple[float, float]) -> list[tuple[np.ndarray, float]]:
    """Line-to-neutral phasors and stability of the roots with every load inside its band."""
    found = [(question.dense.board(x, "B")[0], s) for x, s in zip(roots.found, roots.stability, strict=True)]
    return [(u, s) for u, s in found if ((np.abs(u) > 230 * band[0]) & (np.abs(u) < 230 * band[1])).all()]


def quadratic(powers_kw: tuple[float, ...]) -> np.ndarray:
    """Displacements [V] at which the currents of constant powers P_k at unity factor on a stiff star add up to nought.

    Own algebra: sum P_k / (E_k - w) = 0, times all three denominators, is a quadratic in w.
    """
    emf = 230 * np.exp(-2j * np.pi * np.arange(3) / 3)
    terms = [p * np.poly(np.delete(emf, k)) for k, p in enumerate(powers_kw)]
    return np.roots(np.sum(terms, axis=0))


def test_search_finds_both_constant_power_roots_of_the_worked_example() -> None:
    """Source: worked example constant-power-roots (own arithmetic: roots of the quadratic), tolerance 0.06 V."""
    question = question_of(star(POWER_KW))
    roots = search(question)
    found = sorted(np.abs(u).tolist() for u, _ in inside(question, roots, BAND))
    assert roots.complete
    assert found == [
        pytest.approx([244.6, 156.6, 324.9], abs=0.06),
        pytest.approx([324.4, 337.8, 81.4], abs=0.06),
    ]
    displaced = sorted(abs(u.sum()) / 3 for u, _ in inside(question, roots, BAND))
    assert displaced == pytest.approx([102.0, 149.8], abs=0.06)


def test_neither_constant_power_root_of_the_worked_example_is_stable() -> None:
    """Source: the same worked example. The package answers with a state at a band's edge and says both."""
    made = star(POWER_KW)
    question = question_of(made)
    assert [s < 0 for _, s in inside(question, search(question), BAND)] == [True, True]
    solved = Network(made).solve(SOURCE, connected(made), question.emf, look_for_roots=True)
    assert solved.converged.all()
    assert solved.below_band.all()
    assert solved.several.all()


@pytest.mark.parametrize(("heavy_ratio", "displacement_v"), [(1.01, 13.3), (1.05, 29.4), (1.1, 41.3), (1.2, 57.5)])
def test_nearest_constant_power_root_goes_with_the_root_of_the_unbalance(
    heavy_ratio: float, displacement_v: float
) -> None:
    """Source: worked example constant-power-small-unbalance (own arithmetic: roots of the quadratic), 0.06 V."""
    question = question_of(star((heavy_ratio, 1.0, 1.0)))
    found = [u for u, _ in inside(question, search(question), BAND)]
    assert min(abs(u.sum()) / 3 for u in found) == pytest.approx(displacement_v, abs=0.06)


@pytest.mark.parametrize("powers_kw", [POWER_KW, (1.0, 1.3, 1.1), (2.0, 1.0, 1.0), (0.5, 0.8, 1.0)])
def test_search_finds_every_root_of_the_quadratic_inside_the_band(powers_kw: tuple[float, ...]) -> None:
    """Source: own algebra (a quadratic has no third root); 10 micro-ohm of source make less than 2 mV here."""
    question = question_of(star(powers_kw))
    ours = sorted(abs(u.sum()) / 3 for u, _ in inside(question, search(question), BAND))
    assert ours == pytest.approx(sorted(np.abs(quadratic(powers_kw))), abs=2e-3)


def test_a_missed_root_shows_in_the_signs() -> None:
    """Source: degree theory, own algebra: the signs at all roots add up to that far away, and without any one not."""
    question = question_of(star(POWER_KW))
    signs = [question.sign(x) for x in search(question).found]
    assert len(signs) > 1
    assert sum(signs) == question.sign_far()
    assert all(sum(signs) - sign != question.sign_far() for sign in signs)


@cache
def counted(site_of: Callable[[int], Site]) -> Count:
    """All states of FEW sites."""
    count = Count()
    for seed in range(FEW):
        count.add(examine(site_of(seed), seed))
    return count


@pytest.mark.parametrize("site_of", [heavy_site, zip_site])
def test_answer_is_a_root_stable_and_the_sound_neutrals_own(site_of: Callable[[int], Site]) -> None:
    """Source: independent search; limits of the project: 1e-6 V, nothing unsaid."""
    count = counted(site_of)
    assert count.states == 3 * FEW == count.one_root + count.several_roots
    assert count.worst_v <= ROOT_LIMIT_V
    assert (count.incomplete, count.unresolved) == (0, 0)
    assert (count.wrongly_several, count.missed_several, count.wrongly_stable, count.off_path) == (0, 0, 0, 0)
    assert count.with_path > 0
    assert all(row.holds for row in rows_of("these", count))


def test_sample_on_constant_power_alone_has_several_roots_and_lost_paths() -> None:
    """Source: own count; without such states the promise above says little."""
    count = counted(heavy_site)
    assert count.several_roots >= 6
    assert count.most_roots >= 5
    assert 0 < count.with_path < count.states


def test_an_answer_off_every_root_is_noticed() -> None:
    """Source: own arithmetic: a neutral shifted by a volt is a volt from the root it was."""
    made = heavy_site(1)
    place, network, states, emf = made.places[-1], Network(made), connected(made), healthy_emf(made)
    question = Question(Dense(made, place), emf, states, 0)
    ours = filled(
        question.dense, from_package(question.dense, network, network.solve(place, states, emf), 0), emf, states, 0
    )
    number, away = search(question).nearest(ours)
    assert away <= ROOT_LIMIT_V
    shifted = ours.copy()
    shifted[question.dense.nodes[question.dense.root(f"{place}.N")]] += 1.0
    assert search(question).nearest(shifted) == (number, pytest.approx(1.0, abs=1e-5))


def test_path_of_a_joint_ends_at_the_joints_own_answer() -> None:
    """Source: independent route: resistance raised to 5 ohm step by step, then the dense solve of 5 ohm."""
    made = heavy_site(1)
    place, states, emf = made.places[-1], connected(made), healthy_emf(made)
    reached = connected_root(made, place, emf, states, 0, 5.0)
    assert reached is not None
    assert reached == pytest.approx(Dense(made, place, 5.0).solve(emf, states, 0), abs=1e-6)
