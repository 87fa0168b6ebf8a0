"""Break scenarios: place x load state x supply level x load model, with what the relay sees and how long it has."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from relaycfg.model.device import Function
from relaycfg.model.geometry import BoolArray, ComplexArray, FloatArray
from relaycfg.model.site import SOURCE, Relay, Site
from relaycfg.network import LoadStates, Network, Solved, tap
from relaycfg.relay import severities
from relaycfg.study.deadlines import high_deadline_s, is_core, low_deadline_s
from relaycfg.study.levels import NOMINAL, Levels

AS_MODELLED = "as modelled"
ALL_IMPEDANCE = "all constant impedance"


@dataclass(frozen=True)
class Scenarios:
    """The states of one place, one supply level and one load model; every array is [states].

    ``severity`` is the worst channel of each element the device has. ``deadline_s`` is inf where nothing is
    harmed behind the relay's switch.
    """

    place: str
    level: str
    model: str
    severity: dict[Function, FloatArray]
    deadline_s: FloatArray
    core: BoolArray
    high: BoolArray
    low: BoolArray
    highest_v: FloatArray
    highest_board: NDArray[np.intp]
    resolved: BoolArray
    v0: ComplexArray
    taps: ComplexArray

    @property
    def harmful(self) -> BoolArray:
        """States in which something behind the relay's switch is harmed."""
        return self.high | self.low


def seen_places(site: Site, relay: Relay) -> tuple[str, ...]:
    """Break places upstream of the relay's own neutral tap: the only ones it can see."""
    return tuple(p for p in (SOURCE, *site.path(relay.measures_at)) if p in site.places)


def all_scenarios(
    site: Site, relay: Relay, network: Network, levels: Levels, states: LoadStates, nominal: dict[str, Solved]
) -> tuple[Scenarios, ...]:
    """Every scenario the relay's settings are judged on: the places it can see, at all supply levels.

    Two by two: as modelled, then with every load a constant impedance. ``nominal`` holds the places already solved
    as modelled at the nominal level.
    """
    found = []
    for place in seen_places(site, relay):
        for level, emf in levels.named():
            modelled = nominal[place] if level == NOMINAL else network.solve(place, states, emf)
            impedance = network.solve(place, states, emf, all_impedance=True)
            found.append(judge(site, relay, network, place, level, AS_MODELLED, modelled))
            found.append(judge(site, relay, network, place, level, ALL_IMPEDANCE, impedance))
    return tuple(found)


def judge(site: Site, relay: Relay, network: Network, place: str, level: str, model: str, solved: Solved) -> Scenarios:
    """Harm, deadline and severities of solved states."""
    geometry = site.supply.geometry
    equipment = site.equipment
    magnitudes = np.abs(solved.l_n)
    behind = [network.boards.index(b) for b in site.behind(relay.trips)]
    minding = {load.board for load in site.loads if load.minds_low_v}
    low_boards = [k for k in behind if network.boards[k] in minding]
    highest = magnitudes[behind].max(axis=1)
    highest_v = highest.max(axis=0)
    lowest_v = magnitudes[low_boards].min(axis=(0, 1)) if low_boards else np.full_like(highest_v, np.inf)
    high_s, low_s = high_deadline_s(equipment, highest_v), low_deadline_s(equipment, lowest_v)
    taps = tap(solved, network.boards.index(relay.measures_at), relay.earth_reference)
    return Scenarios(
        place,
        level,
        model,
        {
            e.function: severities(e, geometry, taps, relay.device.displacement_from).max(axis=-1)
            for e in relay.device.elements
        },
        np.minimum(high_s, low_s),
        is_core(equipment, highest_v, lowest_v),
        np.isfinite(high_s),
        np.isfinite(low_s),
        highest_v,
        np.array(behind)[np.argmax(highest, axis=0)],
        solved.converged,
        -geometry.neutral_shift(taps[:, :-1]),
        taps,
    )
