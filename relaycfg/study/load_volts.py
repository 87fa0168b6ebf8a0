"""Volts that single loads and motors get, per unit of their own nominal voltage."""

from collections.abc import Sequence

import numpy as np

from relaycfg.model.geometry import FloatArray
from relaycfg.model.site import Load, Motor, Site
from relaycfg.network import Network, Solved


def load_volts(
    site: Site, network: Network, items: Sequence[Load | Motor], solved: Solved
) -> tuple[FloatArray, FloatArray]:
    """Lowest and highest [items, states] of the lines (or pairs) each lies between, over its nominal voltage."""
    geometry, nominal = site.supply.geometry, site.supply.nominal_v
    l_n = np.moveaxis(solved.l_n, 1, -1)
    to_neutral = np.abs(l_n) / nominal
    between = np.abs(geometry.line_to_line(l_n)) / (nominal * geometry.line_to_line_ratio)
    low, high = np.empty((2, len(items), l_n.shape[1]))
    for k, item in enumerate(items):
        board = network.boards.index(item.board)
        pairs = [k for k, pair in enumerate(geometry.pairs) if set(pair) <= set(item.lines)]
        volts = to_neutral[board][:, list(item.lines)] if item.to_neutral else between[board][:, pairs]
        low[k], high[k] = volts.min(axis=-1), volts.max(axis=-1)
    return low, high


def is_electronic(load: Load) -> bool:
    """Whether a load takes constant power inside its band, as switch-mode supplies and drivers do."""
    return load.zip_p == (0.0, 0.0, 1.0) and load.p_w > 0


def mean_va(load: Load) -> float:
    """What a load takes on average at nominal volts [VA]: its rating by usage and demand."""
    return abs(complex(load.p_w, load.q_var)) * load.usage * load.demand


def other_users(site: Site, place: str, trips: str) -> bool:
    """Whether the model has loads to neutral behind a break that the relay's switch does not disconnect."""
    switched = site.behind(trips)
    return any(load.board not in switched for load in behind(site, place))


def behind(site: Site, place: str) -> tuple[Load, ...]:
    """Loads to neutral whose neutral is lost by a break at ``place``; generation is none of them."""
    boards = site.behind(place)
    return tuple(load for load in site.loads if load.board in boards and load.to_neutral and load.p_w > 0)
