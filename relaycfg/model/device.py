"""What a relay can measure and be set to."""

from dataclasses import dataclass
from enum import StrEnum
from typing import Literal

import numpy as np

from relaycfg.model.geometry import FloatArray, Geometry


class Function(StrEnum):
    """Function numbers of the elements (IEEE C37.2 numbers; the suffix N is a convention)."""

    OVERVOLTAGE = "59"
    UNDERVOLTAGE = "27"
    DISPLACEMENT = "59N"
    UNBALANCE = "47"


Reset = Literal["instantaneous", "held"]
THREE_LINE_UNBALANCE = {
    "V2/V1": "positive and negative sequence take three lines",
    "line-to-line deviation": "the one voltage between two lines has no other to deviate from",
}
"""Definitions of unbalance that mean nothing with two lines, and why."""
NO_DISPLACEMENT = (
    "two lines of a star add to half of U0 with nothing broken, so their sum is no displacement of the neutral; "
    "only measured from N to earth is there one"
)
"""Why 59N from line-to-neutral volts has no use where the sound lines do not add to nothing."""


@dataclass(frozen=True)
class SettableRange:
    """Values a knob can take: ``low`` to ``high`` in ``step``, in volts, percent points or seconds."""

    low: float
    high: float
    step: float

    @property
    def values(self) -> FloatArray:
        """All settable values, rising."""
        count = int(np.floor((self.high - self.low) / self.step + 1e-6)) + 1
        values: FloatArray = np.round(self.low + self.step * np.arange(count), 9)
        return values

    def holds(self, value: float) -> bool:
        """Whether ``value`` is settable: within range and on a step."""
        steps = (value - self.low) / self.step
        return self.low - 1e-9 <= value <= self.high + 1e-9 and abs(steps - round(steps)) < 1e-6


@dataclass(frozen=True)
class Accuracy:
    """Declared errors: percent of setting and absolute, the greater of both or their sum."""

    pickup_percent: float
    pickup_abs: float
    time_percent: float
    time_s: float
    combine: Literal["greater", "sum"]

    def pickup_error(self, pickup: float | FloatArray) -> FloatArray:
        """Half-width of the pickup error band in the pickup's own unit."""
        share = np.abs(np.asarray(pickup, float)) * self.pickup_percent / 100
        error: FloatArray = np.maximum(share, self.pickup_abs) if self.combine == "greater" else share + self.pickup_abs
        return error

    def time_error(self, delay_s: float | FloatArray) -> FloatArray:
        """Half-width of the timing error band [s]."""
        share = np.asarray(delay_s, float) * self.time_percent / 100
        return np.maximum(share, self.time_s) if self.combine == "greater" else share + self.time_s


@dataclass(frozen=True)
class Element:
    """One element of a device. Pickups are in volts (percent points for 47); ``unit`` and ``base_v`` say how the
    device itself is marked, so that volts = percent * base_v / 100. For a 59N that is marked in 3V0 the pickups
    here are 3V0 volts as set; ``quantity`` says so."""

    function: Function
    stages: int
    pickup: SettableRange
    unit: Literal["v", "percent"]
    base_v: float | None
    delay_s: SettableRange
    dropout_ratio: tuple[float, ...]
    reset: tuple[Reset, ...]
    hold_s: float
    accuracy: Accuracy
    quantity: str
    """59 and 27: "l-n" or "l-l"; 59N: "v0" or "3v0"; 47: the name of its unbalance definition."""
    terminal: str = ""
    knob: str = ""

    @property
    def line_to_line_only(self) -> bool:
        """Whether its quantity is made of line-to-line volts, which a shifted neutral does not move."""
        return self.quantity in ("l-l", "line-to-line deviation", "V2/V1")

    def marked(self, pickup: float) -> float:
        """The figure on the device's own scale for a pickup in volts (or points)."""
        return pickup if self.unit == "v" or self.base_v is None else 100 * pickup / self.base_v


@dataclass(frozen=True)
class LeftOut:
    """An element that the device has and the site's system has no quantity for: to be off, and why."""

    element: Element
    why: str


def why_left_out(element: Element, displacement_from: str, geometry: Geometry) -> str:
    """Why an element can do nothing in a system; empty where it can."""
    if element.function is Function.DISPLACEMENT and displacement_from == "l-n" and not geometry.has_displacement:
        return NO_DISPLACEMENT
    return "" if geometry.has_sequences else THREE_LINE_UNBALANCE.get(element.quantity, "")


@dataclass(frozen=True)
class Device:
    """A relay type: what it measures and which elements it has."""

    name: str
    measures: tuple[Literal["l-n", "l-l"], ...]
    detector: Literal["rms", "fundamental"]
    window_cycles: float
    refresh_cycles: float
    timers: Literal["per phase", "shared"]
    displacement_from: Literal["l-n", "n-to-earth"]
    elements: tuple[Element, ...]
    left_out: tuple[LeftOut, ...] = ()
    """Elements of the device that are none of ``elements``: the system has no quantity for them."""

    @property
    def owned(self) -> tuple[Element, ...]:
        """All elements the device has, whether the system has a use for them or not."""
        return (*self.elements, *(left.element for left in self.left_out))

    def why_off(self, function: Function) -> str:
        """Why the element of that function has to be off in this system; empty where it need not."""
        return next((left.why for left in self.left_out if left.element.function is function), "")

    def element(self, function: Function) -> Element | None:
        """The element with that function number, or None where the device lacks it."""
        return next((e for e in self.elements if e.function is function), None)
