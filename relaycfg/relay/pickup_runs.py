"""Where each channel is picked up, for all pairs of pickup and drop-out at once: samples become codes, codes runs."""

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from relaycfg.model.geometry import FloatArray

IntArray = NDArray[np.intp]
AT_ONCE = 200_000
"""Pairs times pieces handled in one go: few pieces would be lost in calls, many in memory."""


@dataclass(frozen=True)
class PickupRuns:
    """Runs in the order of their unit and time: ``unit`` [runs], ``begin_s`` and ``end_s`` [runs], none of no length.

    A unit is one timer of one event under one pair: pair, then event, then timer, counted in one number.
    """

    unit: IntArray
    begin_s: FloatArray
    end_s: FloatArray

    @classmethod
    def of(cls, unit: IntArray, begin_s: FloatArray, end_s: FloatArray) -> "PickupRuns":
        """Those of some length."""
        lasting = end_s > begin_s
        return cls(unit[lasting], begin_s[lasting], end_s[lasting])


def pickup_runs(
    severity: FloatArray,
    duration_s: FloatArray,
    pickup: FloatArray,
    dropout: FloatArray,
    timers: Literal["per phase", "shared"],
    phases: Literal["any", "all"],
) -> PickupRuns:
    """Stretches in which a timer runs, for every pair and event.

    ``severity`` [events, segments, channels] is constant over each segment, ``duration_s`` [events or 1, segments];
    ``pickup`` and ``dropout`` [pairs], no drop-out beyond its pickup. Units count [pairs, events, timers]; timers are
    the channels, or one where they share it.
    """
    severity, duration_s = _padding_last(severity, duration_s)
    events, segments, channels = severity.shape
    levels = np.unique(np.concatenate([pickup, dropout])).astype(severity.dtype)
    pair, begin, end = _pieces(severity, levels).runs(np.searchsorted(levels, pickup), np.searchsorted(levels, dropout))
    row, segment = np.divmod(begin, segments + 1)
    start_s = np.zeros((len(duration_s), segments + 1))
    np.cumsum(duration_s, axis=1, out=start_s[:, 1:])
    clock = row // channels if len(start_s) > 1 else np.zeros_like(row)
    unit = pair * (events * channels) + row
    runs = PickupRuns.of(unit, start_s[clock, segment], start_s[clock, segment + end - begin])
    if phases == "any" and timers == "per phase":
        return runs
    return _joined(runs, channels, channels if phases == "all" else 1)


@dataclass(frozen=True)
class _Pieces:
    """Stretches of one code: the number of levels at or below a sample. Those of code 0 are left out.

    ``begin`` and ``end`` [pieces] are places in a line of all [events, channels, segments + 1]: the last place of a
    row is never taken, so that pieces of two rows never touch.
    """

    begin: IntArray
    end: IntArray
    code: NDArray[np.uint16]

    def runs(self, pickup: IntArray, dropout: IntArray) -> tuple[IntArray, IntArray, IntArray]:
        """Pair, begin and end of each run: a stretch above the code ``dropout`` from its first piece above ``pickup``.

        Codes [pairs]; runs come in the order of the pairs, and of their begins.
        """
        order = np.argsort(dropout, kind="stable")
        left, found, done = self, [], 0
        while done < len(order):
            # Drop-outs rise, so a piece left out is never missed later, and the rest shrinks.
            left = left._above(int(dropout[order[done]]))
            some = order[done : done + max(1, AT_ONCE // max(1, len(left.code)))]
            pair, begin, end = left._runs(pickup[some], dropout[some])
            found.append((some[pair], begin, end))
            done += len(some)
        pair, begin, end = (np.concatenate(part) for part in zip(*found, strict=True))
        back = np.argsort(pair, kind="stable")
        return pair[back], begin[back], end[back]

    def _above(self, code: int) -> "_Pieces":
        kept = self.code > code
        return self if kept.all() else _Pieces(self.begin[kept], self.end[kept], self.code[kept])

    def _runs(self, pickup: IntArray, dropout: IntArray) -> tuple[IntArray, IntArray, IntArray]:
        """The same for a few pairs at once."""
        kept = self.code > dropout[:, np.newaxis]
        pair = np.repeat(np.arange(len(dropout)), kept.sum(axis=1))
        piece = np.flatnonzero(kept) - pair * len(self.code)
        begin, end, count = self.begin[piece], self.end[piece], len(piece)
        fresh = np.ones(count, bool)
        fresh[1:] = (begin[1:] != end[:-1]) | (pair[1:] != pair[:-1])
        first = np.flatnonzero(fresh)
        beyond = np.append(first[1:], count)[: len(first)]
        high = np.append(np.flatnonzero(self.code[piece] > pickup[pair]), count)
        picked = high[np.searchsorted(high, first)]
        there = picked < beyond
        return pair[first[there]], begin[picked[there]], end[beyond[there] - 1]


def _pieces(severity: FloatArray, levels: FloatArray) -> _Pieces:
    """Code every sample that reaches a level and keep where the code changes."""
    segments = severity.shape[1]
    line = np.moveaxis(severity, -1, 1).reshape(-1)
    at = np.flatnonzero(line >= levels[0])
    code = np.searchsorted(levels, line[at], side="right").astype(np.uint16)
    change = np.ones(len(at) + 1, bool)
    change[1:-1] = (code[1:] != code[:-1]) | (np.diff(at) != 1)
    change[np.searchsorted(at, np.arange(0, len(line), segments))] = True
    edge = np.flatnonzero(change)
    begin, end, code = at[edge[:-1]], at[edge[1:] - 1] + 1, code[edge[:-1]]
    row = begin // segments
    return _Pieces(begin + row, end + row, code)


def _padding_last(severity: FloatArray, duration_s: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Segments of no duration moved to the end, where they part nothing."""
    none = duration_s <= 0
    if not none[:, :-1].any():
        return severity, duration_s
    order = np.argsort(none, axis=1, kind="stable")
    return np.take_along_axis(severity, order[..., np.newaxis], axis=1), np.take_along_axis(duration_s, order, axis=1)


def _joined(runs: PickupRuns, channels: int, needed: int) -> PickupRuns:
    """Stretches in which at least ``needed`` channels of an event are picked up at once."""
    count = len(runs.unit)
    instant = np.concatenate([runs.begin_s, runs.end_s])
    step = np.repeat([1, -1], count)
    unit = np.tile(runs.unit // channels, 2)
    # A channel that picks up where another drops out keeps a shared timer running: rises come first.
    order = np.lexsort((-step, instant, unit))
    instant, step, unit = instant[order], step[order], unit[order]
    depth = np.cumsum(step)
    begins, ends = (step > 0) & (depth == needed), (step < 0) & (depth == needed - 1)
    return PickupRuns.of(unit[begins], instant[begins], instant[ends])
