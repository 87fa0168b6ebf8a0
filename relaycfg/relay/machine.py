"""The plain reference machine: hysteresis and definite-time counters, stepped over pieces of constant voltage."""

from typing import Literal

import numpy as np

from relaycfg.model.geometry import BoolArray, FloatArray

GRAIN_S = 1e-9
"""Times closer than this are the same; without it sums of decimal seconds miss a delay they equal."""


def run(
    severity: FloatArray,
    duration_s: FloatArray,
    pickup: float | FloatArray,
    dropout: float | FloatArray,
    delay_s: float | FloatArray,
    reset: Literal["instantaneous", "held"] = "instantaneous",
    hold_s: float = 0.0,
    timers: Literal["per phase", "shared"] = "per phase",
    phases: Literal["any", "all"] = "any",
    lag_s: float = 0.0,
) -> FloatArray:
    """Trip instants [s] from the start of each event, inf where it never trips; shape [events].

    ``severity`` [events, segments, channels] is constant over each segment, ``duration_s`` [events, segments]; the
    last may be inf, and a segment of no duration (padding) changes nothing. ``pickup``, ``dropout`` and ``delay_s``
    are one figure or one an event.

    A channel picks up at or above ``pickup`` and drops out below ``dropout``. A counter runs while its channel is
    picked up and trips on reaching ``delay_s``. Reset "instantaneous" clears it on drop-out; "held" keeps it through
    gaps of up to ``hold_s``. Timers "shared": one counter while any channel is picked up. Phases "all": one counter
    while all are. ``lag_s`` lengthens every picked-up run, as a measuring window does with a falling excursion.

    Valid for definite time. Source: own definition.
    """
    events, segments, channels = severity.shape
    level, release, delay = (np.broadcast_to(x, (events,))[:, np.newaxis] for x in (pickup, dropout, delay_s))
    counters = 1 if phases == "all" or timers == "shared" else channels
    hold = hold_s if reset == "held" else 0.0
    picked_up = np.zeros((events, channels), dtype=bool)
    count, gap, tail = (np.zeros((events, counters)) for _ in range(3))
    gap[:] = np.inf
    start_s = np.zeros((events, 1))
    trip_s = np.full((events, counters), np.inf)
    for k in range(segments):
        length_s = duration_s[:, k, np.newaxis]
        there = length_s > 0
        beyond = severity[:, k] >= np.where(picked_up, release, level)
        picked_up = np.where(there, beyond, picked_up)
        running = _combined(picked_up, timers, phases)
        tail_s = np.minimum(tail, length_s)
        counted_s = np.where(running, length_s, tail_s)
        left_s = delay - count
        tripping = there & (running | (counted_s > 0)) & (left_s <= counted_s + GRAIN_S)
        trip_s = np.where(tripping, np.minimum(trip_s, start_s + np.maximum(left_s, 0.0)), trip_s)
        gap = np.where(running, 0.0, gap + length_s - tail_s)
        count = np.where(gap > hold + GRAIN_S, 0.0, count + counted_s)
        tail = np.where(running & there, lag_s, tail - tail_s)
        start_s = start_s + length_s
    earliest: FloatArray = trip_s.min(axis=-1)
    return earliest


def _combined(picked_up: BoolArray, timers: str, phases: str) -> BoolArray:
    """Which counters run, from which channels are picked up; [events, counters]."""
    if phases == "any" and timers == "per phase":
        return picked_up
    joined: BoolArray = np.all(picked_up, axis=-1) if phases == "all" else np.any(picked_up, axis=-1)
    return joined[:, np.newaxis]
