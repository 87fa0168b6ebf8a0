"""Touch voltage: metalwork against remote earth over the load states of every break, and what the relay leaves of it.

Nothing here is protection against electric shock: the times are set beside the relay's own as information.
"""

import numpy as np

from relaycfg.model.geometry import BoolArray, FloatArray
from relaycfg.model.site import Site, TouchTimes
from relaycfg.model.touch_results import BoardTouch, PlaceTouch, RelayTouch
from relaycfg.network import LoadStates, Network, Solved
from relaycfg.network.states import OFF
from relaycfg.study.evidence import Evidence
from relaycfg.study.levels import NOMINAL
from relaycfg.study.load_volts import other_users
from relaycfg.study.shares import share
from relaycfg.study.stages import ActiveStage, operating_s


def touch_voltages(evidence: Evidence, stages: tuple[ActiveStage, ...]) -> tuple[PlaceTouch, ...]:
    """Every place with its boards; those the relay sees also with what it does about them."""
    site, network = evidence.site, evidence.network
    operated = _operated(evidence, stages)
    found = []
    for place, solved in evidence.solved.items():
        relay = None
        if place in operated:
            opened = network.solve(
                place, _disconnected(site, evidence.states, evidence.relay.trips), evidence.levels.nominal
            )
            known = site.conductor(place) != "PEN" or other_users(site, place, evidence.relay.trips)
            relay = _relay(site, network, solved, opened if known else None, operated[place])
        found.append(place_touch(site, network, place, evidence.states, solved, relay))
    return tuple(found)


def place_touch(
    site: Site, network: Network, place: str, states: LoadStates, solved: Solved, relay: RelayTouch | None = None
) -> PlaceTouch:
    """One place from its solved states."""
    volts, limits = _volts(solved), _limits(site, network)
    known = [k for k in range(len(network.boards)) if not np.isnan(solved.pe_earth[k]).any()]
    boards, resolved = [], int(solved.converged.sum())
    for k in known:
        top = int(np.argmax(volts[k]))
        above = share(int((volts[k] > limits[k]).sum()), resolved)
        boards.append(BoardTouch(network.boards[k], float(limits[k]), float(volts[k, top]), states.names[top], above))
    anywhere = (volts > limits[:, None]).any(axis=0)
    return PlaceTouch(
        place,
        site.conductor(place),
        tuple(sorted(boards, key=lambda b: -b.largest_v)),
        share(int(anywhere.sum()), resolved),
        int((~solved.converged).sum()),
        tuple(b for k, b in enumerate(network.boards) if k not in known),
        relay,
    )


def due_s(times: TouchTimes, volts: FloatArray, limits: FloatArray) -> FloatArray:
    """Longest times [s] of the table for touch volts of any shape: inf up to the limit, 0 beyond the table.

    Between two steps the time is that of the higher voltage, which is the shorter one.
    """
    if not times.points:
        return np.full(volts.shape, np.inf)
    steps, seconds = (np.array(column) for column in zip(*times.points, strict=True))
    longest = np.append(seconds, 0.0)[np.searchsorted(steps, volts, side="left")]
    return np.where(volts > limits, longest, np.inf)


def _relay(site: Site, network: Network, solved: Solved, opened: Solved | None, operated: FloatArray) -> RelayTouch:
    """``opened`` is None where what else hangs on the broken PEN is not in the model: its 0 V would be no finding."""
    limits = _limits(site, network)[:, None]
    volts = _volts(solved)
    above = (volts > limits).any(axis=0)
    due = due_s(site.touch, volts, limits).min(axis=0)
    within: BoolArray = above & (operated <= due)
    never: BoolArray = above & ~np.isfinite(operated)
    late = above & ~within & ~never
    many = int(above.sum())
    shares = (share(int(within.sum()), many), share(int(late.sum()), many), share(int(never.sum()), many))
    if opened is None:
        return RelayTouch(*shares, None, "", None)
    left = _volts(opened)
    stays = left.max(axis=1)
    top = int(np.argmax(stays))
    return RelayTouch(
        *shares,
        float(stays[top]),
        network.boards[top],
        share(int((left > limits).any(axis=0).sum()), left.shape[1]),
    )


def _operated(evidence: Evidence, stages: tuple[ActiveStage, ...]) -> dict[str, FloatArray]:
    """Longest time to the open switch [states] under either load model, by the places the relay sees."""
    found: dict[str, FloatArray] = {}
    for scenario in evidence.scenarios:
        if scenario.level == NOMINAL:
            seconds = operating_s(stages, scenario, evidence)
            found[scenario.place] = np.maximum(found.get(scenario.place, seconds), seconds)
    return found


def _disconnected(site: Site, states: LoadStates, trips: str) -> LoadStates:
    """The states with all that hangs behind the relay's switch off."""
    behind = set(site.behind(trips))
    loads, motors = states.loads.copy(), states.motors.copy()
    loads[[k for k, load in enumerate(site.loads) if load.board in behind]] = 0.0
    motors[[k for k, motor in enumerate(site.motors) if motor.board in behind]] = OFF
    return LoadStates(loads, motors, states.names)


def _volts(solved: Solved) -> FloatArray:
    """PE to remote earth [boards, states]; 0 where there is none and where no solution was found."""
    return np.where(solved.converged, np.nan_to_num(np.abs(solved.pe_earth)), 0.0)


def _limits(site: Site, network: Network) -> FloatArray:
    return np.array([site.board(name).touch_limit_v for name in network.boards])
