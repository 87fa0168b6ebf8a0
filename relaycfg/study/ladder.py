"""The settable pickups and delays of one element, with the fastest secure delay of each pickup."""

from dataclasses import dataclass, field
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from relaycfg.model.device import Element, Function, Reset
from relaycfg.model.geometry import FloatArray, three_phase
from relaycfg.model.judgement import Judgement
from relaycfg.model.site import Relay
from relaycfg.relay import pickups_least_sensitive, pickups_most_sensitive, shortest_delay, total_clearing
from relaycfg.relay.machine import GRAIN_S
from relaycfg.study.ride_through import RideThrough, Runs, ride_through

UNIT_TIME = 1.1
"""One unit of margin is 10 percent of time together with 1 percent of U0 (or one point of unbalance)."""


@dataclass(frozen=True)
class Ladder:
    """One element on one relay: rungs are settable pickups in order of rising severity (27: falling volts)."""

    element: Element
    relay: Relay
    frequency_hz: float
    nominal_v: float
    line_to_line_ratio: float
    runs: Runs
    judgement: Judgement = field(default_factory=Judgement)
    lines: int = len(three_phase().names)

    @cached_property
    def pickups(self) -> FloatArray:
        """Settable pickups [rungs], volts or points as set."""
        values = self.element.pickup.values
        return values[::-1] if self.element.function is Function.UNDERVOLTAGE else values

    @cached_property
    def sensitive(self) -> FloatArray:
        """Severities [rungs] at which each rung may already operate."""
        return pickups_most_sensitive(self.element, self.pickups)

    @cached_property
    def insensitive(self) -> FloatArray:
        """Severities [rungs] from which each rung surely operates."""
        return pickups_least_sensitive(self.element, self.pickups)

    @cached_property
    def delays(self) -> FloatArray:
        """Settable delays [steps], rising."""
        return self.element.delay_s.values

    @cached_property
    def shortest(self) -> FloatArray:
        """Delays [steps] at their shortest."""
        return shortest_delay(self.element, self.delays)

    @cached_property
    def clearing(self) -> FloatArray:
        """Total clearing time [steps + 1] of each delay; a last entry of inf stands for "no delay is secure"."""
        return np.append(self.clearing_of(self.delays), np.inf)

    def clearing_of(self, delay_s: FloatArray) -> FloatArray:
        """Longest total clearing time of set delays [s]."""
        return total_clearing(self.element, delay_s, self.relay.device, self.relay, self.frequency_hz)

    @property
    def unit(self) -> float:
        """One unit of margin in the element's own severity: 1 percent of U0 as it counts volts, 1 point for 47."""
        if self.element.function is Function.UNBALANCE:
            return 1.0
        factor = {"3v0": self.lines, "l-l": self.line_to_line_ratio}.get(self.element.quantity, 1.0)
        return 0.01 * self.nominal_v * factor

    @property
    def dropout_ratio(self) -> float:
        """The settable drop-out ratio nearest to 1: it resets soonest, so it is the most secure."""
        return min(self.element.dropout_ratio, key=lambda r: abs(r - 1))

    @property
    def reset(self) -> Reset:
        """Instantaneous where the device offers it: a kept count only adds to what must be waited for."""
        return "instantaneous" if "instantaneous" in self.element.reset else "held"

    @property
    def hold_s(self) -> float:
        """The hold time of the chosen reset."""
        return self.element.hold_s if self.reset == "held" else 0.0

    @cached_property
    def _reaches(self) -> dict[float, RideThrough]:
        """R by margin: the choice asks for the same few margins many times."""
        return {}

    def ride_through(self, margin_units: float = 0.0) -> RideThrough:
        """R [rungs] of the most sensitive pickups, moved by ``margin_units`` towards normal volts."""
        if margin_units not in self._reaches:
            pickup = self.sensitive - margin_units * self.unit
            self._reaches[margin_units] = ride_through(self.runs, pickup, pickup * self.dropout_ratio, self.hold_s)
        return self._reaches[margin_units]

    def fastest(self, margin_units: float = 0.0) -> NDArray[np.intp]:
        """Index of the shortest delay [rungs] that stays secure at ``margin_units`` (len(delays): none does).

        A stage is secure iff its delay at its shortest is longer than R.
        """
        seconds = self.ride_through(margin_units).seconds
        return np.searchsorted(self.shortest / UNIT_TIME**margin_units, seconds + GRAIN_S, side="right")
