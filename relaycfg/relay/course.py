"""All active stages of one relay played through one course of voltages at its tap."""

from typing import Literal

import numpy as np

from relaycfg.model.device import Device, Function
from relaycfg.model.geometry import BoolArray, ComplexArray, FloatArray, Geometry
from relaycfg.model.settings import Settings
from relaycfg.model.site import Relay
from relaycfg.relay.bands import least_sensitive, measuring_s, most_sensitive
from relaycfg.relay.machine import run
from relaycfg.relay.quantities import severities

BLOCKABLE = (Function.UNDERVOLTAGE, Function.UNBALANCE)
"""Elements that start-up inhibit and dead-bus block act on: never overvoltage or displacement."""


def play(
    course_tap: ComplexArray,
    duration_s: FloatArray,
    device: Device,
    settings: Settings,
    frequency_hz: float,
    relay: Relay,
    side: Literal["sensitive", "insensitive"],
    geometry: Geometry,
    nominal_v: float,
) -> dict[str, float]:
    """When each active stage operates [s] from the start of the course, by stage label; inf where it holds.

    ``course_tap`` [segments, lines + 1] as phasors [V], ``duration_s`` [segments], the last may be inf. On the
    sensitive side (must hold) a stage sits at its most sensitive, an excursion lasts longer by window and refresh, and
    the figure is the earliest instant of decision. On the insensitive side (must be cleared) it sits at its least
    sensitive, the delay is longer by window and refresh, and the figure is the latest instant of the open switch.
    A stage whose element the device lacks does not operate.
    """
    measuring = measuring_s(device, frequency_hz)
    tap, lengths, blocked = _with_blocking(course_tap, duration_s, relay.dead_bus_pu * nominal_v, settings.inhibit_s)
    instants: dict[str, float] = {}
    for stage in settings.active:
        element = device.element(stage.function)
        if element is None:
            instants[stage.label] = np.inf
            continue
        severity = severities(element, geometry, tap, device.displacement_from)
        if stage.function in BLOCKABLE:
            severity = np.where(blocked[:, np.newaxis], -np.inf, severity)
        sensitive = side == "sensitive"
        band = most_sensitive(element, stage) if sensitive else least_sensitive(element, stage)
        trip = run(
            severity[np.newaxis],
            lengths[np.newaxis],
            band.pickup,
            band.dropout,
            band.delay_s + (0.0 if sensitive else measuring),
            stage.reset,
            stage.hold_s,
            device.timers,
            stage.phases,
            lag_s=measuring if sensitive else 0.0,
        )
        instants[stage.label] = float(trip[0]) + (0.0 if sensitive else relay.output_s + relay.coil_and_breaker_s)
    return instants


def _with_blocking(
    tap: ComplexArray, duration_s: FloatArray, dead_v: float, inhibit_s: float
) -> tuple[ComplexArray, FloatArray, BoolArray]:
    """The course cut where a start-up inhibit ends, with a flag a piece: system dead, or inhibit still running."""
    taps: list[ComplexArray] = []
    lengths: list[float] = []
    blocked: list[bool] = []
    left_s = 0.0
    for row, length_s in zip(tap, duration_s.tolist(), strict=True):
        dead = bool((np.abs(row[:-1]) < dead_v).all())
        if dead:
            left_s = inhibit_s
        inhibited_s = length_s if dead else min(left_s, length_s)
        for piece_s, block in ((inhibited_s, True), (length_s - inhibited_s if length_s > inhibited_s else 0.0, False)):
            if piece_s > 0:
                taps.append(row)
                lengths.append(piece_s)
                blocked.append(block)
        if not dead:
            left_s = max(0.0, left_s - length_s)
    return np.array(taps), np.array(lengths), np.array(blocked)
