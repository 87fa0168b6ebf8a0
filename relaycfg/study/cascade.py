"""Over-volted loads fail open one after another, until none is left that has more than it stands."""

import numpy as np

from relaycfg.model.after_break_results import Cascade, Lost
from relaycfg.model.geometry import ComplexArray
from relaycfg.model.site import Site
from relaycfg.network import LoadStates, Network
from relaycfg.study.load_volts import load_volts


def cascades(site: Site, network: Network, place: str, states: LoadStates, emf: ComplexArray) -> tuple[Cascade, ...]:
    """The cascade of each state, all of them a round at a time.

    In each round the load that is on and farthest above its own damage volts fails open (of equal ones the first as
    listed); the rest is solved again. It ends where none is at or above its own, at the latest with the last load that
    has such a limit.
    """
    items = [(k, load) for k, load in enumerate(site.loads) if load.damage_pu is not None]
    rows = [k for k, _ in items]
    limit = np.array([load.damage_pu for _, load in items], float).reshape(-1, 1)
    loads = states.loads.copy()
    lost: list[list[Lost]] = [[] for _ in range(states.count)]
    last_v, resolved = np.zeros(states.count), np.ones(states.count, bool)
    going = np.arange(states.count)
    while len(going):
        part = states.take(going)
        solved = network.solve(place, LoadStates(loads[:, going], part.motors, part.names), emf)
        resolved[going] = solved.converged
        going = going[solved.converged]
        highest_v = np.abs(solved.l_n).max(axis=(0, 1))[solved.converged]
        last_v[going] = highest_v
        if not items:
            break
        volts = load_volts(site, network, [load for _, load in items], solved)[1][:, solved.converged]
        over = np.where(loads[rows][:, going] != 0, volts / limit, 0.0)
        worst = over.argmax(axis=0)
        fails = over.max(axis=0) >= 1
        for course, item, v in zip(going[fails], worst[fails], highest_v[fails], strict=True):
            lost[course].append(Lost(items[item][1].name, float(v)))
            loads[rows[item], course] = 0.0
        going = going[fails]
    return tuple(
        Cascade(name, tuple(rounds), float(v), bool(ok))
        for name, rounds, v, ok in zip(states.names, lost, last_v, resolved, strict=True)
    )
