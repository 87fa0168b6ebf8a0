"""Trip instants of all settings on all events at once: which counts are reached, and which of them trip first."""

from dataclasses import dataclass
from itertools import pairwise
from typing import Literal

import numpy as np

from relaycfg.model.geometry import BoolArray, FloatArray
from relaycfg.relay.machine import GRAIN_S
from relaycfg.relay.pickup_runs import IntArray, PickupRuns, pickup_runs


@dataclass(frozen=True)
class TripTable:
    """Everything a definite-time stage may do on given events, for pairs of pickup and drop-out and every delay.

    One entry a run: ``group`` [runs], pair and event in one number, rising; ``reach_s`` the count reached at its end;
    ``since_s`` the instant from which a delay is counted: its begin less what was held from earlier runs.
    """

    pairs: int
    events: int
    group: IntArray
    since_s: FloatArray
    reach_s: FloatArray

    @property
    def longest_s(self) -> FloatArray:
        """The longest count [pairs, events], which any longer delay outlasts: 0 without pickup, inf without reset."""
        longest = np.zeros(self.pairs * self.events)
        if len(self.group):
            first = _firsts(self.group)
            longest[self.group[first]] = np.maximum.reduceat(self.reach_s, first)
        return longest.reshape(self.pairs, self.events)

    def instants(self, delay_s: FloatArray) -> FloatArray:
        """Trip instants [pairs, delays, events] from the start of each event, inf where a delay holds.

        ``delay_s`` [delays] in rising order. A setting of several stages trips at the least of their entries.
        """
        group, since_s, reach_s = self._records()
        last = np.searchsorted(delay_s, reach_s + GRAIN_S, side="right")
        first = np.append(0, last[:-1])[: len(last)]
        first[_firsts(group)] = 0
        entries = last - first
        every, skipped = np.arange(entries.sum()), np.cumsum(entries) - last
        place = every + np.repeat(group * len(delay_s) - skipped, entries)
        table = np.full(self.pairs * self.events * len(delay_s), np.inf)
        table[place] = np.repeat(since_s, entries) + delay_s[every - np.repeat(skipped, entries)]
        return table.reshape(self.pairs, self.events, len(delay_s)).swapaxes(1, 2)

    def _records(self) -> tuple[IntArray, FloatArray, FloatArray]:
        """Group, since and reach of the runs that count further than all that would trip before them."""
        order = np.lexsort((-self.reach_s, self.since_s, self.group))
        group, since_s, reach_s = self.group[order], self.since_s[order], self.reach_s[order]
        # One running maximum over all groups: rank the counts and lift each group above the one before.
        height = np.unique(reach_s, return_inverse=True)[1] + group * (len(group) + 1)
        kept = np.ones(len(group), bool)
        kept[1:] = height[1:] > np.maximum.accumulate(height)[:-1]
        return group[kept], since_s[kept], reach_s[kept]


def trip_table(
    severity: FloatArray,
    duration_s: FloatArray,
    pickup: FloatArray,
    dropout: FloatArray,
    reset: Literal["instantaneous", "held"] = "instantaneous",
    hold_s: float = 0.0,
    timers: Literal["per phase", "shared"] = "per phase",
    phases: Literal["any", "all"] = "any",
    lag_s: float = 0.0,
) -> TripTable:
    """The table of ``pickup`` and ``dropout`` [pairs] on events; the rest as in :func:`relaycfg.relay.machine.run`.

    ``severity`` [events, segments, channels], ``duration_s`` [events or 1, segments]. Every entry is what the plain
    machine finds for that setting; the tests hold the two equal. Valid for definite time and drop-outs not beyond
    their pickups. Source: own algebra on the definition of that machine.
    """
    runs = pickup_runs(severity, duration_s, pickup, dropout, timers, phases)
    events = len(severity)
    group = runs.unit if phases == "all" or timers == "shared" else runs.unit // severity.shape[-1]
    over_s = np.broadcast_to(duration_s.cumsum(axis=1)[:, -1], (events,))[group % events]
    hold = hold_s if reset == "held" else 0.0
    since_s, reach_s = _counts(runs, np.minimum(runs.end_s + lag_s, over_s), hold)
    return TripTable(len(pickup), events, group, since_s, reach_s)


def _counts(runs: PickupRuns, end_s: FloatArray, hold_s: float) -> tuple[FloatArray, FloatArray]:
    """Since when, and how far, each run counts: what the window keeps and what the hold joins included."""
    same = runs.unit[1:] == runs.unit[:-1]
    alone = np.ones(len(runs.unit), bool)
    alone[1:] = ~same | (runs.begin_s[1:] - end_s[:-1] > hold_s + GRAIN_S)
    until = end_s.copy()
    until[:-1] = np.where(same, np.minimum(end_s[:-1], runs.begin_s[1:]), end_s[:-1])
    since_s, reach_s = runs.begin_s.copy(), until - runs.begin_s
    rank = _rank(alone)
    order = np.argsort(rank, kind="stable")
    cut = np.searchsorted(rank[order], np.arange(1, rank.max(initial=0) + 2))
    for first, beyond in pairwise(cut):
        joined = order[first:beyond]
        since_s[joined] -= reach_s[joined - 1]
        reach_s[joined] += reach_s[joined - 1]
    return since_s, reach_s


def _rank(alone: BoolArray) -> IntArray:
    """How many runs of the same count stand before each."""
    place = np.arange(len(alone))
    rank: IntArray = place - np.maximum.accumulate(np.where(alone, place, 0))
    return rank


def _firsts(group: IntArray) -> IntArray:
    """Where a new group begins."""
    return np.flatnonzero(np.append(True, group[1:] != group[:-1])[: len(group)])
