"""Auxiliary supply and trip coil: the volts they live on while the neutral is lost."""

from dataclasses import dataclass

import numpy as np

from relaycfg.model.geometry import BoolArray, FloatArray
from relaycfg.model.site import Feed
from relaycfg.study.evidence import Evidence
from relaycfg.study.scenarios import Scenarios


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


def feed_ranges(evidence: Evidence) -> tuple[FeedRange, ...]:
    """The feeds that are taken from the system itself; an auxiliary source is none of them."""
    relay = evidence.relay
    feeds = (("relay supply", relay.supply), (f"trip coil ({relay.trip_coil_kind})", relay.trip_coil))
    return tuple(_range(evidence, what, feed) for what, feed in feeds if feed.between != "auxiliary")


def _range(evidence: Evidence, what: str, feed: Feed) -> FeedRange:
    lowest, highest, harmful, failing = np.inf, 0.0, 0, 0
    for scenario in evidence.scenarios:
        volts = _volts(evidence, scenario, feed)[scenario.resolved]
        harm = scenario.harmful[scenario.resolved]
        lowest, highest = min(lowest, float(volts.min(initial=np.inf))), max(highest, float(volts.max(initial=0.0)))
        harmful += int(harm.sum())
        failing += int((harm & _outside(volts, feed)).sum())
    stated = None if feed.low_v is None or feed.high_v is None else (feed.low_v, feed.high_v)
    return FeedRange(what, feed.between, lowest, highest, stated, harmful, failing)


def fed(evidence: Evidence, scenario: Scenarios) -> BoolArray:
    """States [states] in which relay and trip coil have the volts they need (an undervoltage release needs none)."""
    relay = evidence.relay
    feeds = [relay.supply, *([] if relay.trip_coil_kind == "undervoltage release" else [relay.trip_coil])]
    working = np.ones(scenario.deadline_s.shape, bool)
    for feed in feeds:
        if feed.between != "auxiliary":
            working &= ~_outside(_volts(evidence, scenario, feed), feed)
    return working


def _outside(volts: FloatArray, feed: Feed) -> BoolArray:
    low = -np.inf if feed.low_v is None else feed.low_v
    high = np.inf if feed.high_v is None else feed.high_v
    outside: BoolArray = (volts < low) | (volts > high)
    return outside


def _volts(evidence: Evidence, scenario: Scenarios, feed: Feed) -> FloatArray:
    geometry = evidence.site.supply.geometry
    first, second = feed.between.split("-")
    l_n = scenario.taps[:, :-1]
    if second == "N":
        return np.abs(l_n[:, geometry.names.index(first)])
    return np.abs(l_n[:, geometry.names.index(first)] - l_n[:, geometry.names.index(second)])
