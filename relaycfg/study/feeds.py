"""Auxiliary supply and trip coil: the volts they live on while the neutral is lost."""

from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal

import numpy as np

from relaycfg.model.break_results import Share
from relaycfg.model.geometry import BoolArray, ComplexArray, FloatArray, Geometry
from relaycfg.model.own_life_results import FeedLife, HeldLoss
from relaycfg.model.site import Feed
from relaycfg.study.evidence import Evidence
from relaycfg.study.levels import NOMINAL
from relaycfg.study.scenarios import Scenarios
from relaycfg.study.shares import share
from relaycfg.study.stages import ActiveStage, operating_s

RELEASE = "undervoltage release"
Held = Literal["supply", "coil"]
Mask = Callable[[Evidence, Scenarios], BoolArray]

HELD_IN = "below its range it opens the switch by itself, which counts as opened; above it nothing is promised"
WHILE_CLOSED = "out of its range at any time until the switch is open counts as failed: no time is stated for it"
AT_TRIP = "carries these volts only while it trips; out of its range then counts as failed"
DROPS_OUT = "below its range it drops out or chatters, above it nothing is promised: both count as failed"


@dataclass(frozen=True)
class FeedRange:
    """Volts of one feed over all break scenarios, and in which share of the harmful ones it is out of range."""

    what: str
    between: str
    lowest_v: float
    highest_v: float
    allowed: tuple[float, float] | None
    """None where the range is not stated: nothing can be judged."""
    harmful: int
    failing: int
    """Harmful scenarios in which it keeps the switch closed."""


def feed_ranges(evidence: Evidence) -> tuple[FeedRange, ...]:
    """The feeds that are taken from the system itself; an auxiliary source is none of them."""
    return tuple(_range(evidence, held, what, feed) for held, what, feed in _from_system(evidence))


def feed_lives(evidence: Evidence, active: tuple[ActiveStage, ...]) -> tuple[FeedLife, ...]:
    """The same feeds with their shares of states, the time above range and what they do in cases that must hold."""
    return tuple(_life(evidence, active, held, what, feed) for held, what, feed in _from_system(evidence))


def trip_shares(evidence: Evidence) -> tuple[Share, Share]:
    """Shares of the harmful states in which the trip fails: as built, and with everything self-opening."""
    return _share(evidence, trip_fails), _share(evidence, fails_though_self_opening)


def fed(evidence: Evidence, scenario: Scenarios) -> BoolArray:
    """States [states] in which supply and coil let the switch open."""
    return ~trip_fails(evidence, scenario)


def trip_fails(evidence: Evidence, scenario: Scenarios) -> BoolArray:
    """States [states] in which the supply or the coil keeps the switch closed.

    An undervoltage release opens by itself where its own volts are below its range, whatever the relay does.
    """
    supply_low, supply_high = _beyond(evidence, scenario.taps, evidence.relay.supply)
    coil_low, coil_high = _beyond(evidence, scenario.taps, evidence.relay.trip_coil)
    if evidence.relay.trip_coil_kind == RELEASE:
        return ~coil_low & (supply_low | supply_high | coil_high)
    return supply_low | supply_high | coil_low | coil_high


def unable(evidence: Evidence, taps: ComplexArray) -> BoolArray:
    """Board taps [states, lines + 1] at which no stage can open the switch: supply or coil is out of its range.

    A release below its range has opened the switch already, which is no stage's doing.
    """
    found = np.zeros(len(taps), bool)
    for feed in (evidence.relay.supply, evidence.relay.trip_coil):
        low, high = _beyond(evidence, taps, feed)
        found |= low | high
    return found


def unable_words(evidence: Evidence, tap: ComplexArray) -> str:
    """Which feed is out of its range at one board tap [lines + 1], with its volts; empty where none is."""
    found = []
    for held, _, feed in _from_system(evidence):
        low, high = (bool(side[0]) for side in _beyond(evidence, tap[None], feed))
        if not low and not high:
            continue
        volts = f"({_volts(evidence.site.supply.geometry, tap[None], feed)[0]:.0f} V)"
        name = "relay" if held == "supply" else "coil"
        if low and held == "coil" and evidence.relay.trip_coil_kind == RELEASE:
            found.append(f"release opens by itself {volts}")
        else:
            found.append(f"{name} unfed {volts}" if low else f"{name} above its range {volts}")
    return ", ".join(found)


def fails_though_self_opening(evidence: Evidence, scenario: Scenarios) -> BoolArray:
    """The same with an output relay that is energised while healthy, and a release on the coil's feed.

    Either of them without volts then opens the switch; above its range nothing is promised of either.
    """
    supply_low, supply_high = _beyond(evidence, scenario.taps, evidence.relay.supply)
    coil_low, coil_high = _beyond(evidence, scenario.taps, evidence.relay.trip_coil)
    return ~(supply_low | coil_low) & (supply_high | coil_high)


def _from_system(evidence: Evidence) -> list[tuple[Held, str, Feed]]:
    relay = evidence.relay
    feeds: list[tuple[Held, str, Feed]] = [
        ("supply", "relay supply", relay.supply),
        ("coil", f"trip coil ({relay.trip_coil_kind})", relay.trip_coil),
    ]
    return [entry for entry in feeds if entry[2].between != "auxiliary"]


def _range(evidence: Evidence, held: Held, what: str, feed: Feed) -> FeedRange:
    lowest, highest, harmful, failing = np.inf, 0.0, 0, 0
    released = held == "coil" and evidence.relay.trip_coil_kind == RELEASE
    for scenario in evidence.scenarios:
        volts = _volts(evidence.site.supply.geometry, scenario.taps, feed)[scenario.resolved]
        harm = scenario.harmful[scenario.resolved]
        lowest, highest = min(lowest, float(volts.min(initial=np.inf))), max(highest, float(volts.max(initial=0.0)))
        low, high = (side[scenario.resolved] for side in _beyond(evidence, scenario.taps, feed))
        harmful += int(harm.sum())
        failing += int((harm & (high if released else low | high)).sum())
    return FeedRange(what, feed.between, lowest, highest, _stated(feed), harmful, failing)


def _life(evidence: Evidence, active: tuple[ActiveStage, ...], held: Held, what: str, feed: Feed) -> FeedLife:
    kind = evidence.relay.trip_coil_kind
    released = held == "coil" and kind == RELEASE
    judged = {"shunt": AT_TRIP, RELEASE: HELD_IN, "contactor": DROPS_OUT}[kind] if held == "coil" else WHILE_CLOSED
    found = _range(evidence, held, what, feed)
    longest: list[float] = []
    for scenario in evidence.scenarios:
        above = _beyond(evidence, scenario.taps, feed)[1] & scenario.resolved
        if held == "coil" and kind == "shunt":
            longest += [evidence.relay.coil_and_breaker_s] if above.any() else []
        else:
            longest += operating_s(active, scenario, evidence)[above].tolist()
    above_s = max(longest, default=np.inf)
    return FeedLife(
        what,
        feed.between,
        found.lowest_v,
        found.highest_v,
        found.allowed,
        _share(evidence, lambda e, s: _beyond(e, s.taps, feed)[0]),
        _share(evidence, lambda e, s: _beyond(e, s.taps, feed)[1]),
        above_s if np.isfinite(above_s) else None,
        released,
        _held_losses(evidence, feed) if released else (),
        judged,
    )


def _held_losses(evidence: Evidence, feed: Feed) -> tuple[HeldLoss, ...]:
    """Cases that must hold and take a release's volts below its range; a dip counts however short it is."""
    found = []
    for case in evidence.cases:
        if case.expect != "hold" or feed.low_v is None:
            continue
        worst = (np.inf, 0.0)
        for course in case.courses:
            volts = _volts(evidence.site.supply.geometry, np.stack([s.tap for s in course.segments]), feed)
            low = volts < feed.low_v
            seconds = sum(s.duration_s for s, below in zip(course.segments, low, strict=True) if below)
            if low.any() and (float(volts.min()), -seconds) < (worst[0], -worst[1]):
                worst = (float(volts.min()), seconds)
        if np.isfinite(worst[0]):
            found.append(HeldLoss(case.number, case.name, worst[0], worst[1] if np.isfinite(worst[1]) else None))
    return tuple(found)


def _share(evidence: Evidence, what: Mask) -> Share:
    """Share of the harmful states at nominal supply in which ``what`` holds under a load model that harms."""
    nominal = [s for s in evidence.scenarios if s.level == NOMINAL]
    hit = of = 0
    for pair in zip(nominal[::2], nominal[1::2], strict=True):
        resolved = pair[0].resolved & pair[1].resolved
        of += int((resolved & (pair[0].harmful | pair[1].harmful)).sum())
        found = np.zeros(len(resolved), bool)
        for scenario in pair:
            found |= scenario.harmful & what(evidence, scenario)
        hit += int((found & resolved).sum())
    return share(hit, of)


def _stated(feed: Feed) -> tuple[float, float] | None:
    return None if feed.low_v is None or feed.high_v is None else (feed.low_v, feed.high_v)


def _beyond(evidence: Evidence, taps: ComplexArray, feed: Feed) -> tuple[BoolArray, BoolArray]:
    """Taps [states] at which the feed is below, and above its range; never where that or the feed is another's."""
    nowhere = np.zeros(len(taps), bool)
    if feed.between == "auxiliary":
        return nowhere, nowhere
    volts = _volts(evidence.site.supply.geometry, taps, feed)
    low = nowhere if feed.low_v is None else volts < feed.low_v
    high = nowhere if feed.high_v is None else volts > feed.high_v
    return low, high


def _volts(geometry: Geometry, taps: ComplexArray, feed: Feed) -> FloatArray:
    """Volts of a feed at taps [states, lines + 1]."""
    first, second = feed.between.split("-")
    l_n = taps[:, :-1]
    if second == "N":
        return np.abs(l_n[:, geometry.names.index(first)])
    return np.abs(l_n[:, geometry.names.index(first)] - l_n[:, geometry.names.index(second)])
