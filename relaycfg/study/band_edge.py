"""How far the shares of a place move with the lower edge of the band in which electronic load keeps its power."""

from dataclasses import replace
from typing import TypeVar

import numpy as np

from relaycfg.model.after_break_results import BandEdge
from relaycfg.model.geometry import BoolArray
from relaycfg.model.site import Site
from relaycfg.network import Network, Solved
from relaycfg.study.evidence import Evidence
from relaycfg.study.levels import NOMINAL
from relaycfg.study.load_volts import is_electronic
from relaycfg.study.scenarios import AS_MODELLED, Scenarios, judge
from relaycfg.study.shares import share
from relaycfg.study.stages import ActiveStage, operating_s

T = TypeVar("T")
STATES = 250
"""States compared, the first ones of the sample: a difference needs fewer than a share."""


def with_edge(site: Site, edge_pu: float) -> Site:
    """The site with all electronic load keeping its power down to ``edge_pu``."""
    loads = tuple(replace(load, band_low_pu=edge_pu) if is_electronic(load) else load for load in site.loads)
    return replace(site, loads=loads)


def band_edges(evidence: Evidence, places: tuple[str, ...], stages: tuple[ActiveStage, ...]) -> dict[str, BandEdge]:
    """Shares at both ends beside those as stated, for each place; empty without electronic load or a range."""
    edges = evidence.site.judgement.unsteady.band_edge_pu
    if edges is None or not any(is_electronic(load) for load in evidence.site.loads):
        return {}
    sites = [with_edge(evidence.site, edge) for edge in edges]
    networks = [Network(site) for site in sites]
    states = evidence.states.take(np.arange(min(STATES, evidence.states.count)))
    found = {}
    for place in places:
        judged = [next(s for s in evidence.scenarios if _is_base(s, place))]
        solved = [network.solve(place, states, evidence.levels.nominal) for network in networks]
        judged += [
            judge(s, evidence.relay, n, place, NOMINAL, AS_MODELLED, r)
            for s, n, r in zip(sites, networks, solved, strict=True)
        ]
        moved = [_moved_v(evidence.solved[place], r) for r in solved]
        first = slice(states.count)
        harmful = [share(int((s.harmful & s.resolved)[first].sum()), states.count) for s in judged]
        core = [share(int((s.harmful & s.core & s.resolved)[first].sum()), states.count) for s in judged]
        seen = [share(int(_seen(s, evidence, stages)[first].sum()), states.count) for s in judged]
        lost = [int((~s.resolved)[first].sum()) for s in judged]
        found[place] = BandEdge(edges, _three(harmful), _three(core), _three(seen), _three(lost), (moved[0], moved[1]))
    return found


def _three(items: list[T]) -> tuple[T, T, T]:
    first, second, third = items
    return first, second, third


def _moved_v(before: Solved, after: Solved) -> tuple[float, float]:
    """Median and most of how far any line's volts at any board move, over the states that both resolve."""
    count = after.l_n.shape[-1]
    there = before.converged[:count] & after.converged
    apart = np.abs(np.abs(after.l_n) - np.abs(before.l_n[..., :count])).max(axis=(0, 1))[there]
    return (float(np.median(apart)), float(apart.max())) if len(apart) else (0.0, 0.0)


def _is_base(scenario: Scenarios, place: str) -> bool:
    return (scenario.place, scenario.level, scenario.model) == (place, NOMINAL, AS_MODELLED)


def _seen(scenario: Scenarios, evidence: Evidence, stages: tuple[ActiveStage, ...]) -> BoolArray:
    seen: BoolArray = np.isfinite(operating_s(stages, scenario, evidence)) & scenario.resolved
    return seen
