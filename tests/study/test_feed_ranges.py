"""Volts of relay supply and trip coil over all break states, and how often they are out of range: counted by hand."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from relaycfg.model.site import Feed
from relaycfg.study.evidence import Evidence
from relaycfg.study.feeds import fed, feed_ranges
from tests.study.hand_corridor import evidence, states

# L1 at 180, 200, 253, 260 and 400 V; L2 opposite to it at 230 V, so 410 to 630 V between them. The last has no
# solution, the third harms nothing.
L1_V = (180.0, 200.0, 253.0, 260.0, 400.0)


def base_of(folder: Path, supply: Feed, coil: Feed) -> Evidence:
    taps = np.array([[v, -230.0, 0.0, 0.0] for v in L1_V], complex)
    deadline_s = np.array([5.0, 5.0, np.inf, 5.0, 5.0])
    resolved = np.array([True, True, True, True, False])
    some = states(volts=L1_V, deadline_s=deadline_s, core=np.zeros(5, bool), taps=taps, resolved=resolved)
    base = evidence(folder, some, replace(some, model="all constant impedance"))
    return replace(base, relay=replace(base.relay, supply=supply, trip_coil=coil))


def test_extremes_and_failures_are_those_of_the_resolved_states(tmp_path: Path) -> None:
    # Two load models: six harmful resolved states, of which 180 and 260 V are out of 195 to 253 V.
    base = base_of(tmp_path, Feed("L1-N", 195.0, 253.0), Feed("L1-L2", 400.0, 480.0))
    supply, coil = feed_ranges(base)
    assert (supply.what, supply.between, supply.allowed) == ("relay supply", "L1-N", (195.0, 253.0))
    assert (supply.lowest_v, supply.highest_v) == (180.0, 260.0)
    assert (supply.harmful, supply.failing) == (6, 4)
    assert (coil.what, coil.lowest_v, coil.highest_v) == ("trip coil (shunt)", 410.0, 490.0)
    assert coil.failing == 2
    assert fed(base, base.scenarios[0]).tolist() == [False, True, False, False, False]


@pytest.mark.parametrize(
    ("feed", "failing"),
    [(Feed("L1-N", None, 253.0), 2), (Feed("L1-N", 195.0, None), 2), (Feed("L1-N", None, None), 0)],
)
def test_a_side_that_is_not_stated_fails_nothing(feed: Feed, failing: int, tmp_path: Path) -> None:
    (found,) = feed_ranges(base_of(tmp_path, feed, Feed("auxiliary", 19.0, 29.0)))
    assert (found.allowed, found.failing) == (None, failing)


def test_an_auxiliary_source_is_none_of_them(tmp_path: Path) -> None:
    battery = Feed("auxiliary", 19.0, 29.0)
    base = base_of(tmp_path, battery, battery)
    assert feed_ranges(base) == ()
    assert fed(base, base.scenarios[0]).all()
