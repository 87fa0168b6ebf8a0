"""When the active stages trip on many courses of volts at once, at their least sensitive ends."""

import numpy as np

from relaycfg.model.after_break_results import Tripping
from relaycfg.model.geometry import ComplexArray, FloatArray
from relaycfg.relay import measuring_s, severities, trip_table
from relaycfg.study.evidence import Evidence
from relaycfg.study.shares import share
from relaycfg.study.stages import ActiveStage


def stage_instants(
    evidence: Evidence, stages: tuple[ActiveStage, ...], taps: ComplexArray, duration_s: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """First pickup, and the latest instant of the open switch, [stages, courses] s from the break; inf where never.

    ``taps`` [courses, segments, lines + 1], ``duration_s`` [courses, segments]. Stages of one element with the same
    reset and phases share one table. Start-up inhibit and dead-bus block act on a dead system only, which a lost
    neutral never is: the mean square of its lines does not fall below that of the source.
    """
    device, relay, frequency = evidence.relay.device, evidence.relay, evidence.site.supply.frequency_hz
    more_s, switching_s = measuring_s(device, frequency), relay.output_s + relay.coil_and_breaker_s
    picked, tripped = np.full((2, len(stages), len(taps)), np.inf)
    groups: dict[tuple[object, ...], list[int]] = {}
    for k, active in enumerate(stages):
        groups.setdefault((active.function, active.stage.reset, active.hold_s, active.stage.phases), []).append(k)
    for members in groups.values():
        first = stages[members[0]]
        severity = severities(first.ladder.element, evidence.site.supply.geometry, taps, device.displacement_from)
        table = trip_table(
            severity,
            duration_s,
            np.array([stages[k].insensitive.pickup for k in members]),
            np.array([stages[k].insensitive.dropout for k in members]),
            first.stage.reset,
            first.hold_s,
            device.timers,
            first.stage.phases,
        )
        delays = np.array([0.0, *sorted({stages[k].insensitive.delay_s + more_s for k in members})])
        instants = table.instants(delays)
        for pair, k in enumerate(members):
            picked[k] = instants[pair, 0]
            tripped[k] = instants[pair, int(np.searchsorted(delays, stages[k].insensitive.delay_s + more_s))]
    return picked, tripped + switching_s


def earliest(instants: FloatArray) -> FloatArray:
    """The first of any stage [courses]; inf where there is none."""
    found: FloatArray = instants.min(axis=0, initial=np.inf)
    return found


def tripping(what: str, instants: FloatArray, possible: bool) -> Tripping:
    """Share, median and 95 percent point of instants [courses]; ``possible`` where the courses last long enough."""
    there = np.isfinite(instants)
    return Tripping(
        what, share(int(there.sum()), len(instants)), point(instants[there], 50), point(instants[there], 95), possible
    )


def point(instants: FloatArray, percent: float) -> float | None:
    """A percent point of instants, as one of them; None of none."""
    return float(np.percentile(instants, percent, method="higher")) if len(instants) else None
