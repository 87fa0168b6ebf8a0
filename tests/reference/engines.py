"""Random sites solved twice: by the package and by a general distribution power-flow engine, node by node.

Every state is compared or counted under the reason why not. Not compared: motors (the engine has another law for
three-wire ones), short circuits, loads of ZIP kind outside their band (it does not continue the band's edge there;
constant power is compared outside it too).
"""

from collections.abc import Iterator

from relaycfg.model.site import Site
from relaycfg.network import Network
from tests.reference import engines_dense
from tests.reference.engines_drawing import Drawing
from tests.reference.engines_dss import draw, engine_volts
from tests.reference.engines_sites import EARTHINGS, LAWS, cases, emf_of, heavy_site, kind_of, random_site, states_of
from tests.reference.engines_tally import BEYOND_ZIP, LIMIT_V, Answer, Tally
from tests.reference.table import Row

FEW, MANY = 60, 200
FEW_HEAVY, MANY_HEAVY = 10, 40
SOURCE = "general distribution power-flow engine"


def compare(seed: int) -> Tally:
    """One network in all cases, with everything connected and in one random load state."""
    return compare_site(random_site(seed), seed, f"network {seed} {kind_of(seed)}", kind_of(seed)[1] == "zip")


def compare_heavy(seed: int) -> Tally:
    """The same of a network that lives on constant power alone: several roots, or none that is stable."""
    return compare_site(heavy_site(seed), seed, f"heavy network {seed}", False, look=True)


def compare_site(made: Site, seed: int, name: str, no_edges: bool, look: bool = False) -> Tally:
    """A site in all cases and two load states; ``no_edges`` leaves out states with a load outside its band.

    ``look`` has the package look for further roots.
    """
    tally, network, states, emf = Tally(networks=1), Network(made), states_of(made, seed), emf_of(made)
    solutions = {case: network.solve(case[0], states, emf, case[1], look_for_roots=look) for case in cases(made)}
    for state in range(states.count):
        drawing = Drawing(made, emf, states.loads[:, state])
        draw(drawing)
        for (place, joint_ohm), solved in solutions.items():
            answer = Answer(drawing, network, solved, states, state, place, joint_ohm)
            if no_edges and solved.converged[state] and answer.beyond:
                tally.left[BEYOND_ZIP] += 1
            else:
                answer.enter(tally, engine_volts(drawing, place, joint_ohm), name)
    return tally


def rows(quick: bool = False) -> Iterator[Row]:
    """MANY networks (FEW if quick), a row for each earthing and load law; constant power alone; the dense solve."""
    for earthing, law in ((e, law) for law in dict.fromkeys(LAWS) for e in EARTHINGS):
        tally = Tally()
        for seed in range(FEW if quick else MANY):
            if kind_of(seed) == (earthing, law):
                tally.add(compare(seed))
        worst = float("inf") if tally.unanswered else tally.worst
        yield Row(f"power-flow engine, {earthing}, {law}", SOURCE, worst, LIMIT_V, "V", tally.note)
    tally = Tally()
    for seed in range(FEW_HEAVY if quick else MANY_HEAVY):
        tally.add(compare_heavy(seed))
    yield Row("power-flow engine, constant power alone", SOURCE, tally.worst, LIMIT_V, "V", tally.note)
    yield from engines_dense.rows(quick)
