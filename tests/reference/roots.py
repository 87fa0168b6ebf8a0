"""States with several roots: the package's answer against all roots that an independent search finds.

Sites on constant power alone with an open neutral, and ZIP sites beside them. For every state: all roots, whether the
package's answer is one of them, whether it is stable where the package does not say otherwise, and whether it is the
one that hangs together with the sound neutral where there is such a one. Nothing is left out: what the package calls
unresolved is counted.
"""

from collections.abc import Iterator
from dataclasses import dataclass, fields, replace

import numpy as np

from relaycfg.model.site import Site
from relaycfg.network import Network, Solved, join, sampled
from tests.network.dense import Dense
from tests.reference.engines_sites import emf_of, heavy_site, states_of
from tests.reference.engines_tally import ROOT_LIMIT_V
from tests.reference.roots_at_rest import filled, from_package
from tests.reference.roots_path import connected_root
from tests.reference.roots_search import Question, far, search
from tests.reference.table import Row

FEW, MANY = 6, 40
"""Sites of either kind; one break place and three load states of each."""
ZIP = (0.3, 0.3, 0.4)
SOURCE = "root finder from many starts, dense equations"
PAIRS = "by the sum of their signs; two missed ones of opposite signs would not show"
TOUCHING_OHM = 1e-3
"""Two notions of stability (the package leaves out the sound network's own ohms) may differ by less than this [ohm]."""


@dataclass
class Count:
    """States by what was found, and the worst distance [V] of an answer from the root next to it."""

    states: int = 0
    one_root: int = 0
    several_roots: int = 0
    most_roots: int = 0
    incomplete: int = 0
    """States whose roots' signs do not add up: one was missed."""
    unresolved: int = 0
    said_unstable: int = 0
    said_several: int = 0
    wrongly_several: int = 0
    """Said to have several solutions where the search has one."""
    missed_several: int = 0
    """Two or more stable roots, none of them said (the package promises no complete search)."""
    wrongly_stable: int = 0
    """The answer's root is unstable and the package does not say so."""
    with_path: int = 0
    """States with a root that hangs together with the sound neutral."""
    off_path: int = 0
    """Those where the package answers with another one."""
    jumped_said: int = 0
    """States without such a root that are said to have several solutions or to be unstable."""
    worst_v: float = 0.0

    def add(self, other: "Count") -> None:
        """Take in another one."""
        for name in (f.name for f in fields(self)):
            ours, theirs = getattr(self, name), getattr(other, name)
            setattr(self, name, max(ours, theirs) if name in ("most_roots", "worst_v") else ours + theirs)


def zip_site(seed: int) -> Site:
    """The site of constant power alone with ZIP loads instead."""
    made = heavy_site(seed)
    return replace(made, loads=tuple(replace(x, zip_p=ZIP, zip_q=ZIP) for x in made.loads))


def examine(made: Site, seed: int) -> Count:
    """One open neutral of a site in three load states."""
    place = made.places[seed % len(made.places)]
    network, states, emf = Network(made), join(states_of(made, seed), sampled(made, 1, seed + 1000)), emf_of(made)
    solved, count = network.solve(place, states, emf, look_for_roots=True), Count()
    for state in range(states.count):
        question = Question(Dense(made, place), emf, states, state)
        judge(count, question, connected_root(made, place, emf, states, state), network, solved)
    return count


def judge(count: Count, question: Question, path: np.ndarray | None, network: Network, solved: Solved) -> None:
    """Enter one state."""
    dense, state = question.dense, question.state
    ours = filled(dense, from_package(dense, network, solved, state), question.emf, question.states, state)
    roots = search(question, (ours,) if path is None else (ours, path))
    stable = sum(value > 0 for value in roots.stability)
    count.states += 1
    count.one_root += len(roots.found) == 1
    count.several_roots += len(roots.found) > 1
    count.most_roots = max(count.most_roots, len(roots.found))
    count.incomplete += not roots.complete
    count.said_several += bool(solved.several[state])
    count.wrongly_several += bool(solved.several[state]) and len(roots.found) < 2
    count.missed_several += stable > 1 and not solved.several[state]
    if not solved.converged[state]:
        count.unresolved += 1
        return
    count.said_unstable += bool(solved.unstable[state])
    number, away = roots.nearest(ours)
    count.worst_v = max(count.worst_v, away)
    count.wrongly_stable += not solved.unstable[state] and roots.stability[number] < -TOUCHING_OHM
    if path is not None:
        count.with_path += 1
        count.off_path += far(path, roots.found[number]) > ROOT_LIMIT_V
    else:
        count.jumped_said += bool(solved.several[state] or solved.unstable[state])


def rows(quick: bool = False) -> Iterator[Row]:
    """Roots of both kinds of site (FEW of each if quick)."""
    for name, site_of in (("constant power", heavy_site), ("ZIP", zip_site)):
        count = Count()
        for seed in range(FEW if quick else MANY):
            count.add(examine(site_of(seed), seed))
        yield from rows_of(f"open neutral, {name}", count)


def rows_of(case: str, count: Count) -> Iterator[Row]:
    """Distance, then what has to be nought."""
    found = f"{count.states} states: {count.one_root} with one root, {count.several_roots} with several"
    found += f" (up to {count.most_roots}); said to have several: {count.said_several}"
    found += f", two stable ones and not said: {count.missed_several}; unresolved and said so: {count.unresolved}"
    yield Row(f"{case}: the answer is a root", SOURCE, count.worst_v, ROOT_LIMIT_V, "V", found)
    yield Row(f"{case}: roots that the search missed", "degree of the equations", count.incomplete, 0, "states", PAIRS)
    said = f"said to be unstable: {count.said_unstable}"
    yield Row(f"{case}: on an unstable root, not said", SOURCE, count.wrongly_stable, 0, "states", said)
    yield Row(f"{case}: said to have several, has one", SOURCE, count.wrongly_several, 0, "states")
    path = f"{count.with_path} of {count.states} states have a root that hangs together with the sound neutral; "
    path += f"the neutral jumps in the other {count.states - count.with_path}, {count.jumped_said} of them said"
    yield Row(
        f"{case}: not the sound neutral's own root", "joint raised step by step", count.off_path, 0, "states", path
    )
