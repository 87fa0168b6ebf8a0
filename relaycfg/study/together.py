"""Several relays on one site: which broken neutrals they clear between them.

Each relay opens the switch of its own board. A harmful load state counts as cleared where every harmed board lies
behind a switch that some relay opens before that board's own deadline, under each load model that harms. Volts are
those before any switch opens: once one has opened, the load behind the break is another one, and the volts of the
others move.
"""

from dataclasses import dataclass

import numpy as np

from relaycfg.model.break_results import Share
from relaycfg.model.geometry import BoolArray, FloatArray
from relaycfg.model.place_results import Together
from relaycfg.model.site import Relay, Site
from relaycfg.network import Network, Solved
from relaycfg.study.deadlines import high_deadline_s, low_deadline_s
from relaycfg.study.evidence import Evidence, gather
from relaycfg.study.levels import NOMINAL
from relaycfg.study.scenarios import ALL_IMPEDANCE, AS_MODELLED, judge, seen_places
from relaycfg.study.settle import settle
from relaycfg.study.shares import share
from relaycfg.study.stages import ActiveStage, active_stages, operating_s

Models = tuple[tuple[str, Solved], ...]
"""One place solved at nominal supply under each load model, by its name."""


@dataclass(frozen=True)
class Acting:
    """A relay with the stages that act, and the evidence its ladders were made from."""

    relay: Relay
    stages: tuple[ActiveStage, ...]
    evidence: Evidence


def solved_models(evidence: Evidence, place: str) -> Models:
    """One place as modelled and with every load a constant impedance."""
    impedance = evidence.network.solve(place, evidence.states, evidence.levels.nominal, all_impedance=True)
    return (AS_MODELLED, evidence.solved[place]), (ALL_IMPEDANCE, impedance)


def board_deadlines_s(site: Site, network: Network, solved: Solved) -> FloatArray:
    """Seconds [boards, states] that the equipment of each board stands its volts; inf where nothing is harmed."""
    magnitudes = np.abs(solved.l_n)
    minding = {load.board for load in site.loads if load.minds_low_v}
    low_s = low_deadline_s(site.equipment, magnitudes.min(axis=1))
    minds = np.array([name in minding for name in network.boards])[:, None]
    deadline: FloatArray = np.minimum(
        high_deadline_s(site.equipment, magnitudes.max(axis=1)), np.where(minds, low_s, np.inf)
    )
    return deadline


def opens_s(acting: Acting, place: str, models: Models) -> tuple[FloatArray, ...]:
    """Seconds [states] from the break to the relay's open switch, one array a load model; inf where it stays closed."""
    evidence = acting.evidence
    judged = (
        judge(evidence.site, acting.relay, evidence.network, place, NOMINAL, model, solved) for model, solved in models
    )
    return tuple(operating_s(acting.stages, scenario, evidence) for scenario in judged)


def cleared_states(
    site: Site, network: Network, models: Models, opened: tuple[tuple[Relay, tuple[FloatArray, ...]], ...]
) -> tuple[BoolArray, BoolArray]:
    """Harmful states, and those of them cleared by the relays of ``opened`` between them, each [states].

    States without a solution count as harmful and not cleared.
    """
    resolved: BoolArray = np.all([solved.converged for _, solved in models], axis=0)
    harmful, cleared = ~resolved, resolved.copy()
    for k, (_, solved) in enumerate(models):
        deadline_s = board_deadlines_s(site, network, solved)
        harmed = np.isfinite(deadline_s)
        in_time = np.zeros_like(harmed)
        for relay, seconds in opened:
            behind = [network.boards.index(b) for b in site.behind(relay.trips)]
            in_time[behind] |= seconds[k] <= deadline_s[behind]
        harmful |= harmed.any(axis=0)
        cleared &= (~harmed | in_time).all(axis=0)
    return harmful, harmful & cleared


def cleared_share(harmful: BoolArray, cleared: BoolArray) -> Share:
    """The cleared states as a share of the harmful ones."""
    return share(int(cleared.sum()), int(harmful.sum()))


def others(evidence: Evidence) -> tuple[Acting, ...]:
    """The other relays of the site, each at the settings that would be derived for it."""
    found = []
    for relay in evidence.site.every_relay[1:]:
        own = gather(evidence.site.with_relay(relay.name), relay, evidence.samples, evidence.seed)
        found.append(Acting(relay, active_stages(own, settle(own).settings), own))
    return tuple(found)


def together(evidence: Evidence, stages: tuple[ActiveStage, ...]) -> tuple[Together, ...]:
    """What all relays of the site cover at every place; nothing where there is only one.

    The studied relay acts with ``stages``, the others at derived settings.
    """
    if len(evidence.site.every_relay) < 2:
        return ()
    site, network = evidence.site, evidence.network
    every = (Acting(evidence.relay, stages, evidence), *others(evidence))
    found = []
    for place in site.places:
        models = solved_models(evidence, place)
        opened = tuple((a.relay, opens_s(a, place, models)) for a in every if place in seen_places(site, a.relay))
        harmful, cleared = cleared_states(site, network, models, opened)
        alone = {one[0].name: cleared_share(*cleared_states(site, network, models, (one,))) for one in opened}
        found.append(Together(place, share(int(harmful.sum()), len(harmful)), alone, cleared_share(harmful, cleared)))
    return tuple(found)
