"""The smallest load asymmetry that each element sees at one place, through cables, electrodes and earth links.

The line-to-neutral loads of every board give way to a resistive star of what they take on average (usage times demand);
on the boards behind the break one line takes k times each of the two others, all in all the same watts, while the other
boards stay balanced. Loads between lines stay away: they do not move the neutral. A ratio counts as seen where it is
seen whichever line is the heavy one. Where an electrode leads the displacement away the watts matter: the smaller the
load, the larger the ratio that is seen.
"""

from dataclasses import replace

import numpy as np

from relaycfg.model.geometry import ComplexArray, FloatArray
from relaycfg.model.place_results import PlaceAsymmetry
from relaycfg.model.site import Load, Site
from relaycfg.network import LoadStates, Network, tap
from relaycfg.study.asymmetry import LARGEST_RATIO, element_sets, picks_up
from relaycfg.study.evidence import Evidence
from relaycfg.study.scenarios import seen_places
from relaycfg.study.stages import ActiveStage

COARSE = 200
FINE = 50
"""Ratios tried from 1 to 100, then between the last not seen and the first seen: k is within 0.05 percent."""
_Tried = tuple[FloatArray, ComplexArray]
"""Ratios and their taps."""


def place_asymmetries(evidence: Evidence, stages: tuple[ActiveStage, ...]) -> tuple[PlaceAsymmetry, ...]:
    """One entry for every place the relay sees, behind which some load lies between a line and the neutral."""
    site = evidence.site
    watts = {board.name: _average_w(site, board.name) for board in site.boards}
    network = Network(_with_stars(site, watts))
    found = []
    for place in seen_places(site, evidence.relay):
        behind = set(site.behind(place))
        load_w = sum(watts[b] for b in behind)
        if load_w > 0:
            tried = np.geomspace(1.0, LARGEST_RATIO, COARSE)
            coarse = (tried, _taps(evidence, network, place, behind, tried))
            ratios = {
                name: _smallest(evidence, network, place, behind, chosen, coarse)
                for name, chosen in element_sets(stages).items()
            }
            found.append(PlaceAsymmetry(place, load_w, ratios))
    return tuple(found)


def _average_w(site: Site, board: str) -> float:
    """Mean watts of the loads between lines and neutral of one board; generation and motors are left out."""
    mine = (load for load in site.loads if load.board == board and load.to_neutral and load.p_w > 0)
    return sum(load.usage * load.demand * load.p_w for load in mine)


def _with_stars(site: Site, watts: dict[str, float]) -> Site:
    """The site with one resistive load a board and line, in the order of boards and lines."""
    names = site.supply.geometry.names
    loads = tuple(
        Load(
            name=f"{board} {line}",
            board=board,
            between=f"{line}-N",
            lines=(k,),
            to_neutral=True,
            p_w=watts[board] / len(names),
            q_var=0.0,
            zip_p=(1.0, 0.0, 0.0),
            zip_q=(1.0, 0.0, 0.0),
            band_low_pu=0.0,
            band_high_pu=2.0,
            usage=1.0,
            demand=1.0,
            group="",
            minds_low_v=False,
            third_harmonic_percent=0.0,
            kind="",
        )
        for board in watts
        for k, line in enumerate(names)
    )
    return replace(site, loads=loads, motors=())


def _smallest(
    evidence: Evidence, network: Network, place: str, behind: set[str], stages: tuple[ActiveStage, ...], coarse: _Tried
) -> float | None:
    """Smallest k seen whichever line is heavy; None where none up to the largest is."""
    ratios, taps = coarse
    seen = picks_up(evidence, stages, taps).all(axis=0)
    if not seen.any():
        return None
    first = int(np.argmax(seen))
    if first == 0:
        return float(ratios[0])
    fine = np.geomspace(ratios[first - 1], ratios[first], FINE)[1:-1]
    closer = picks_up(evidence, stages, _taps(evidence, network, place, behind, fine)).all(axis=0)
    return float(fine[np.argmax(closer)] if closer.any() else ratios[first])


def _taps(evidence: Evidence, network: Network, place: str, behind: set[str], ratios: FloatArray) -> ComplexArray:
    """Taps [heavy lines, ratios, lines + 1] with the neutral open at ``place``."""
    lines = len(evidence.site.supply.geometry.names)
    heavy = np.eye(lines)[:, :, None]
    share = lines * np.where(heavy == 1, ratios, 1.0) / (ratios + lines - 1)
    even = np.ones_like(share)
    factors = np.concatenate([share if board in behind else even for board in network.boards], axis=1)
    count = lines * len(ratios)
    loads = factors.transpose(1, 0, 2).reshape(lines * len(network.boards), count)
    states = LoadStates(loads, np.zeros((0, count), np.int8), tuple(map(str, range(count))))
    solved = network.solve(place, states, evidence.levels.nominal, all_impedance=True)
    relay = evidence.relay
    taps = tap(solved, network.boards.index(relay.measures_at), relay.earth_reference)
    return taps.reshape(lines, len(ratios), lines + 1)
