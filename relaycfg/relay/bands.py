"""Error bands: each stage at its most sensitive for what must hold, at its least sensitive for what must be cleared."""

from dataclasses import dataclass

import numpy as np

from relaycfg.model.device import Device, Element, Function
from relaycfg.model.geometry import FloatArray
from relaycfg.model.settings import Stage
from relaycfg.model.site import Relay


@dataclass(frozen=True)
class Band:
    """One end of a stage's error band: pickup and drop-out as severities (27: negative volts), delay [s]."""

    pickup: float
    dropout: float
    delay_s: float


def most_sensitive(element: Element, stage: Stage) -> Band:
    """The end that operates first: for what must hold.

    The pickup error moves the pickup towards normal volts, the same comparator sets the drop-out (ratio times that
    pickup), the timing error shortens the delay.
    """
    pickup = float(pickups_most_sensitive(element, np.array(stage.pickup)))
    delay_s = float(shortest_delay(element, np.array(stage.delay_s)))
    return Band(pickup, stage.dropout_ratio * pickup, delay_s)


def least_sensitive(element: Element, stage: Stage) -> Band:
    """The end that operates last: for what must be cleared. Measuring and switching times are not in it."""
    pickup = float(pickups_least_sensitive(element, np.array(stage.pickup)))
    delay_s = float(longest_delay(element, np.array(stage.delay_s)))
    return Band(pickup, stage.dropout_ratio * pickup, delay_s)


def pickups_most_sensitive(element: Element, pickups: FloatArray) -> FloatArray:
    """Severities at which pickups, as set (volts or points, any shape), may already operate."""
    return _severity(element, pickups) - element.accuracy.pickup_error(pickups)


def pickups_least_sensitive(element: Element, pickups: FloatArray) -> FloatArray:
    """Severities from which pickups, as set (volts or points, any shape), surely operate."""
    return _severity(element, pickups) + element.accuracy.pickup_error(pickups)


def pickup_at_most_sensitive(element: Element, severity: float) -> float:
    """The pickup as set (volts or points) whose most sensitive end is ``severity``; inverse of the above."""
    share, fixed = element.accuracy.pickup_percent / 100, element.accuracy.pickup_abs
    if element.function is Function.UNDERVOLTAGE:
        volts = -severity
        if element.accuracy.combine == "sum":
            return (volts - fixed) / (1 + share)
        return min(volts / (1 + share), volts - fixed)
    if element.accuracy.combine == "sum":
        return (severity + fixed) / (1 - share)
    return max(severity / (1 - share), severity + fixed)


def pickup_at_least_sensitive(element: Element, severity: float) -> float:
    """The pickup as set (volts or points) whose least sensitive end is ``severity``."""
    share, fixed = element.accuracy.pickup_percent / 100, element.accuracy.pickup_abs
    if element.function is Function.UNDERVOLTAGE:
        volts = -severity
        if element.accuracy.combine == "sum":
            return (volts + fixed) / (1 - share)
        return max(volts / (1 - share), volts + fixed)
    if element.accuracy.combine == "sum":
        return (severity - fixed) / (1 + share)
    return min(severity / (1 + share), severity - fixed)


def shortest_delay(element: Element, delay_s: FloatArray) -> FloatArray:
    """Set delays [s] less their timing error, not below zero."""
    return np.maximum(delay_s - element.accuracy.time_error(delay_s), 0.0)


def longest_delay(element: Element, delay_s: FloatArray) -> FloatArray:
    """Set delays [s] plus their timing error."""
    return delay_s + element.accuracy.time_error(delay_s)


def total_clearing(
    element: Element, delay_s: FloatArray, device: Device, relay: Relay, frequency_hz: float
) -> FloatArray:
    """Longest time [s] from the voltage at the tap to the open switch, for set delays of any shape."""
    return (
        longest_delay(element, delay_s) + measuring_s(device, frequency_hz) + relay.output_s + relay.coil_and_breaker_s
    )


def measuring_s(device: Device, frequency_hz: float) -> float:
    """Longest time [s] a change takes to show, or an excursion stays in what is measured: window and refresh."""
    return window_s(device, frequency_hz) + refresh_s(device, frequency_hz)


def window_s(device: Device, frequency_hz: float) -> float:
    """Length of the measuring window [s]."""
    return device.window_cycles / frequency_hz


def refresh_s(device: Device, frequency_hz: float) -> float:
    """Longest wait for the next measured value [s]."""
    return device.refresh_cycles / frequency_hz


def _severity(element: Element, pickups: FloatArray) -> FloatArray:
    return -pickups if element.function is Function.UNDERVOLTAGE else pickups
