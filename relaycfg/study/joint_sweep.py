"""A loose joint in the neutral, from a milliohm to open: volts, amperes, watts, and the ohms each stage first sees.

The joint is swept on a coarse grid of its logarithm; a finer grid lies about the hottest joint and in each step in
which a stage picks up, and ohms are interpolated inside its steps: within TOLERANCE of exact roots.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from relaycfg.model.device import Element
from relaycfg.model.geometry import BoolArray, ComplexArray, FloatArray
from relaycfg.model.joint_results import JointPoint, JointSight, JointState, JointSweep
from relaycfg.model.site import NONE, SOURCE, Relay, Site
from relaycfg.network import LoadStates, Network, Solved, connected, join, tap
from relaycfg.relay import severities

LEAST_OHM, MOST_OHM = 1e-3, 1e3
COARSE = 37
"""Joints of the coarse grid, six to the decade, besides the open one."""
FINE = 21
TOLERANCE = 1e-3
"""Of the ohms at which a stage picks up, as a share of them."""
HEAT_TOLERANCE = 1e-2
"""Of the ohms of the hottest joint, as a share: its watts, flat there, are a hundred times closer."""
CANDIDATES = 30
TRIED = np.geomspace(0.1, 100, 7)
"""Joints [ohm] at which many states are compared: two to the decade, where joints burn."""


@dataclass(frozen=True)
class Watch:
    """A stage as a sweep looks at it: ``pickup`` is the severity from which it surely picks up."""

    label: str
    element: Element
    pickup: float
    every_line: bool
    clearing_s: float | None
    """Longest time to the open switch; None for an alarm."""

    def over(self, site: Site, relay: Relay, taps: ComplexArray) -> FloatArray:
        """By how much taps [..., lines + 1] are beyond the pickup [...]."""
        channels = severities(self.element, site.supply.geometry, taps, relay.device.displacement_from)
        worst = channels.min(axis=-1) if self.every_line else channels.max(axis=-1)
        beyond: FloatArray = worst - self.pickup
        return beyond


@dataclass(frozen=True)
class Heat:
    """Swept joints of one load state, rising ohms, open last; arrays are [joints]."""

    ohm: FloatArray
    volts: FloatArray
    watts: FloatArray
    highest_v: FloatArray
    v0_v: FloatArray
    """nan where there is no relay, or no displacement in its system."""
    taps: ComplexArray | None
    resolved: BoolArray

    def take(self, order: np.ndarray) -> "Heat":
        """Some joints, in the order given."""
        taps = None if self.taps is None else self.taps[order]
        ohm, volts, watts = self.ohm[order], self.volts[order], self.watts[order]
        highest, v0 = self.highest_v[order], self.v0_v[order]
        return Heat(ohm, volts, watts, highest, v0, taps, self.resolved[order])

    def with_more(self, other: "Heat") -> "Heat":
        """Joints of both, rising, each once."""
        taps = None if self.taps is None or other.taps is None else np.concatenate([self.taps, other.taps])
        both = Heat(
            np.concatenate([self.ohm, other.ohm]),
            np.concatenate([self.volts, other.volts]),
            np.concatenate([self.watts, other.watts]),
            np.concatenate([self.highest_v, other.highest_v]),
            np.concatenate([self.v0_v, other.v0_v]),
            taps,
            np.concatenate([self.resolved, other.resolved]),
        )
        return both.take(np.unique(both.ohm, return_index=True)[1])


def joint_sweep(
    site: Site, network: Network, place: str, states: LoadStates, emf: ComplexArray, watches: Sequence[Watch] = ()
) -> JointSweep:
    """Every one of a few load states swept at one place, as modelled; two solutions for all of them together."""
    grid = np.append(np.geomspace(LEAST_OHM, MOST_OHM, COARSE), np.inf)
    coarse = _swept(site, network, place, states, emf, [grid] * states.count)
    finer = [_finer(site, heat, watches) for heat in coarse]
    fine = _swept(site, network, place, states, emf, finer)
    found = tuple(
        _state(site, name, first, more, watches) for name, first, more in zip(states.names, coarse, fine, strict=True)
    )
    return JointSweep(place, site.conductor(place), found)


def hottest_of(
    site: Site, network: Network, place: str, emf: ComplexArray, states: LoadStates, opened: Solved, sound: Solved
) -> int:
    """The state whose joint at ``place`` grows hottest, of the CANDIDATES most likely ones.

    Likely are those of the largest volts across the open neutral times current of the sound one: four times the most
    heat of one EMF behind a resistance, which loads that are no impedances bend. These are solved at TRIED joints.
    """
    current = np.abs(neutral_current(site, network, place, sound))
    likely = np.where(opened.converged & sound.converged, np.abs(opened.joint_v) * current, 0.0)
    chosen = np.argsort(-likely, kind="stable")[:CANDIDATES]
    watts = heat_at(network, place, emf, states.take(chosen), TRIED)[0]
    return int(chosen[np.argmax(watts.max(axis=0))])


def heat_at(
    network: Network, place: str, emf: ComplexArray, states: LoadStates, ohms: FloatArray
) -> tuple[FloatArray, Solved]:
    """Watts [joints, states] in every joint of ``ohms``, 0 without a solution; and the solution, joints outermost."""
    every = np.repeat(ohms, states.count)
    solved = network.solve(place, states.take(np.tile(np.arange(states.count), len(ohms))), emf, every)
    watts = np.where(solved.converged, np.abs(solved.joint_v) ** 2 / every, 0.0)
    return watts.reshape(len(ohms), states.count), solved


def neutral_current(site: Site, network: Network, place: str, sound: Solved) -> ComplexArray:
    """Current [states] that the sound neutral carries at a break place, towards the source."""
    fed = [b.name for b in site.boards if b.fed_from == SOURCE] if place == SOURCE else [place]
    total: ComplexArray = sound.neutral_a[[network.boards.index(b) for b in fed]].sum(axis=0)
    return total


def _swept(
    site: Site, network: Network, place: str, states: LoadStates, emf: ComplexArray, ohms: Sequence[FloatArray]
) -> list[Heat]:
    """Each state at its own joints, all solved at once."""
    which = np.repeat(np.arange(states.count), [len(row) for row in ohms])
    every = np.concatenate(list(ohms))
    solved = network.solve(place, states.take(which), emf, every)
    volts = np.abs(solved.joint_v)
    relay = site.relay
    taps = None if relay is None else tap(solved, network.boards.index(relay.measures_at), relay.earth_reference)
    v0 = np.full(len(every), np.nan) if taps is None else np.abs(site.supply.geometry.displacement(taps[:, :-1]))
    whole = Heat(every, volts, volts**2 / every, np.abs(solved.l_n).max(axis=(0, 1)), v0, taps, solved.converged)
    return [whole.take(np.flatnonzero(which == k)) for k in range(states.count)]


def _finer(site: Site, heat: Heat, watches: Sequence[Watch]) -> FloatArray:
    """Joints about the hottest one and inside the first step in which each stage picks up."""
    last = len(heat.ohm) - 2
    top = int(np.argmax(np.where(heat.resolved, heat.watts, -1.0)))
    pieces = [(max(top - 1, 0), min(top + 1, last))]
    for watch in watches:
        first = _first(_seen(site, heat, watch))
        if first is not None and 0 < first <= last:
            pieces.append((first - 1, first))
    spans = [np.geomspace(heat.ohm[a], heat.ohm[b], FINE) for a, b in pieces]
    return np.unique(np.concatenate(spans))


def _state(site: Site, name: str, coarse: Heat, fine: Heat, watches: Sequence[Watch]) -> JointState:
    both = coarse.with_more(fine)
    watts = np.where(both.resolved, both.watts, 0.0)
    tripping = [w for w in watches if w.clearing_s is not None]
    blind = np.ones(len(both.ohm), bool)
    for watch in tripping:
        blind &= ~_seen(site, both, watch)
    sights = tuple(_sight(site, both, watch) for watch in watches)
    # Joints just below the first ohms seen are blind too: their heat is that at the interpolated pickup.
    trips = [s for s in sights if s.clearing_s is not None and s.joint_ohm is not None and s.joint_w is not None]
    edge = min(trips, key=lambda s: s.joint_ohm or 0.0, default=None)
    unseen_w = max(float(watts[blind].max(initial=0.0)), (edge.joint_w or 0.0) if edge is not None else 0.0)
    return JointState(
        name,
        tuple(_point(coarse, k) for k in range(len(coarse.ohm))),
        _point(both, int(np.argmax(watts))),
        sights,
        unseen_w if watches else None,
    )


def _seen(site: Site, heat: Heat, watch: Watch) -> BoolArray:
    """Joints [joints] on which the stage surely picks up; none that has no solution."""
    assert site.relay is not None
    assert heat.taps is not None
    seen: BoolArray = (watch.over(site, site.relay, heat.taps) >= 0) & heat.resolved
    return seen


def _first(seen: BoolArray) -> int | None:
    return int(np.argmax(seen)) if seen.any() else None


def _sight(site: Site, heat: Heat, watch: Watch) -> JointSight:
    watts = np.where(heat.resolved, heat.watts, 0.0)
    first = _first(_seen(site, heat, watch))
    if first is None:
        return JointSight(watch.label, False, None, None, None, float(watts.max()), watch.clearing_s)
    at = _point(heat, first)
    ohm, volts, heat_w = at.joint_ohm, at.joint_v, at.joint_w
    if first > 0 and np.isfinite(heat.ohm[first]) and heat.resolved[first - 1]:
        assert site.relay is not None
        assert heat.taps is not None
        below, above = watch.over(site, site.relay, heat.taps[first - 1 : first + 1])
        share = float(below / (below - above))
        logs = np.log(heat.ohm[first - 1 : first + 1])
        ohm = float(np.exp(logs[0] + share * (logs[1] - logs[0])))
        volts = float(heat.volts[first - 1] + share * (heat.volts[first] - heat.volts[first - 1]))
        heat_w = volts**2 / ohm
    before = float(max(watts[:first].max(initial=0.0), heat_w))
    return JointSight(watch.label, True, ohm, volts, heat_w, before, watch.clearing_s)


def _point(heat: Heat, k: int) -> JointPoint:
    volts, ohm = float(heat.volts[k]), float(heat.ohm[k])
    return JointPoint(
        ohm,
        volts,
        volts / ohm,
        float(heat.watts[k]),
        None if np.isnan(heat.v0_v[k]) else float(heat.v0_v[k]),
        float(heat.highest_v[k]),
        bool(heat.resolved[k]),
    )


def sweeps(
    site: Site,
    network: Network,
    emf: ComplexArray,
    drawn: LoadStates,
    opened: dict[str, Solved],
    watches: dict[str, Sequence[Watch]],
) -> tuple[JointSweep, ...]:
    """Every place of ``opened`` (its neutral open in the drawn states): the connected and the hottest drawn state.

    ``watches`` holds the stages to look at by place; a place without an entry is swept without any.
    """
    sound = network.solve(NONE, drawn, emf)
    found = []
    for place, solved in opened.items():
        worst = hottest_of(site, network, place, emf, drawn, solved, sound)
        states = join(connected(site), drawn.take([worst]))
        found.append(joint_sweep(site, network, place, states, emf, watches.get(place, ())))
    return tuple(found)
