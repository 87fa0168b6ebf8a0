"""Supply levels: how far the source EMF may stand up or down, and what healthy states then show at the tap."""

from dataclasses import dataclass

import numpy as np

from relaycfg.model.geometry import ComplexArray
from relaycfg.model.site import NONE, SOURCE, EarthReference, Site
from relaycfg.network import LoadStates, Network, Solved, connected, corners, healthy_emf, join, least, tap

SCALE_STEPS = 6
NOMINAL = "nominal"


@dataclass(frozen=True)
class Levels:
    """Source EMFs [lines] at the no-load volts, and where the band's limits are met at ``band_at``."""

    nominal: ComplexArray
    upper: ComplexArray
    lower: ComplexArray

    def named(self) -> tuple[tuple[str, ComplexArray], ...]:
        """The levels with the names they are printed under."""
        return ((NOMINAL, self.nominal), ("upper limit", self.upper), ("lower limit", self.lower))


@dataclass(frozen=True)
class Healthy:
    """Taps [states, lines + 1] of the sound network, each state scaled until ``band_at`` stands at the limit."""

    names: tuple[str, ...]
    upper: ComplexArray
    lower: ComplexArray
    no_load: ComplexArray
    """Taps at the source's no-load EMF, not scaled to any limit."""


def supply_levels(site: Site, network: Network) -> Levels:
    """EMFs for the study; the upper limit is met with the least load, the lower with every load connected.

    Where the band is promised at the source itself its limits are EMFs, so that the drop in the network comes on
    top (source: EN 50160 states its band at the supply terminals).
    """
    nominal = healthy_emf(site)
    supply = site.supply
    return Levels(
        nominal,
        _at_limit(site, network, least(site), supply.high_v, highest=True),
        _at_limit(site, network, connected(site), supply.low_v, highest=False),
    )


def _at_limit(site: Site, network: Network, state: LoadStates, limit_v: float, highest: bool) -> ComplexArray:
    scale = limit_v / site.source.emf_v
    if site.supply.band_at == SOURCE:
        return healthy_emf(site, scale)
    board = network.boards.index(site.supply.band_at)
    for _ in range(SCALE_STEPS):
        # Loads are nearly linear in a sound network, so a ratio step converges in a few rounds.
        l_n = np.abs(network.solve(NONE, state, healthy_emf(site, scale)).l_n[board])
        scale *= limit_v / float(l_n.max() if highest else l_n.min())
    return healthy_emf(site, scale)


def earth_reference(site: Site) -> EarthReference:
    """The earth that the last column of every tap is measured against: that of the site's relay."""
    return "local PE" if site.relay is None else site.relay.earth_reference


def healthy_taps(site: Site, network: Network, levels: Levels, sample: LoadStates, board: str) -> Healthy:
    """What the sound network shows at ``board`` in the named states and the sample.

    The band holds per phase in every state, so each state is scaled by the ratio of the limit to its own extreme
    phase at ``band_at`` (linear; the ratio differs from 1 by the voltage drop only).
    """
    states = join(connected(site), least(site), corners(site), sample)
    index, earth = network.boards.index(board), earth_reference(site)
    upper = network.solve(NONE, states, levels.upper)
    lower = network.solve(NONE, states, levels.lower)
    no_load = network.solve(NONE, states, levels.nominal)
    return Healthy(
        states.names,
        tap(upper, index, earth) * _ratio(site, network, upper, site.supply.high_v, highest=True),
        tap(lower, index, earth) * _ratio(site, network, lower, site.supply.low_v, highest=False),
        tap(no_load, index, earth),
    )


def _ratio(site: Site, network: Network, solved: Solved, limit_v: float, highest: bool) -> ComplexArray:
    states = solved.l_n.shape[-1]
    if site.supply.band_at == SOURCE:
        return np.ones((states, 1), complex)
    l_n = np.abs(solved.l_n[network.boards.index(site.supply.band_at)])
    extreme = l_n.max(axis=0) if highest else l_n.min(axis=0)
    ratio: ComplexArray = (limit_v / extreme)[:, None].astype(complex)
    return ratio
