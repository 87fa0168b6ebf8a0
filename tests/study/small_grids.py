"""Small random corridors and every set of settings on them, judged by the definitions: no code of the choice is used.

A state is cleared where its severity is at or beyond p+ and t+ is within its deadline; a stage is secure where the
plain step machine, at p- and t-, holds through every course embedded in the standing severity. Own inventions.
"""

from dataclasses import dataclass
from itertools import combinations
from typing import Literal

import numpy as np

from relaycfg.model.device import Accuracy, Device, Element, Function, Reset, SettableRange
from relaycfg.model.geometry import BoolArray, FloatArray
from relaycfg.model.judgement import Judgement
from relaycfg.model.settings import Stage
from relaycfg.model.site import Feed, Relay
from relaycfg.relay import run
from relaycfg.study.ladder import Ladder
from relaycfg.study.ride_through import Runs
from relaycfg.study.scenarios import Scenarios

FREQUENCY_HZ = 50.0
BEFORE_S = 9.0
"""The standing severity before a course, longer than any delay or hold."""
SPANS = {
    Function.OVERVOLTAGE: (240.0, 18.0, 233.0, 345.0),
    Function.UNDERVOLTAGE: (130.0, 18.0, 120.0, 227.0),
    Function.DISPLACEMENT: (8.0, 14.0, 3.0, 80.0),
}
"""Lowest pickup and step, then the least and greatest volts of courses and states."""


@dataclass(frozen=True)
class Grid:
    """One element with every (pickup, delay, drop-out ratio, reset) it can be set to."""

    ladder: Ladder

    @property
    def function(self) -> Function:
        """Its element."""
        return self.ladder.element.function

    def knobs(self) -> list[tuple[float, float]]:
        """Every pickup with every delay, as set."""
        element = self.ladder.element
        return [(p, t) for p in element.pickup.values.tolist() for t in element.delay_s.values.tolist()]

    def holds(self, pickup: float, delay_s: float, ratio: float, reset: Reset, hold_s: float) -> bool:
        """Whether the step machine, at its most sensitive, rides through every course."""
        element, runs = self.ladder.element, self.ladder.runs
        count, _, channels = runs.severity.shape
        around = np.full((count, 1, channels), runs.standing)
        sensitive = _sign(element) * pickup - pickup_error(element, pickup)
        trips = run(
            np.concatenate([around, runs.severity, around], axis=1),
            np.concatenate([np.full((count, 1), BEFORE_S), runs.duration_s, np.full((count, 1), np.inf)], axis=1),
            sensitive,
            ratio * sensitive,
            max(delay_s - time_error(element, delay_s), 0.0),
            reset,
            hold_s,
            self.ladder.relay.device.timers,
            lag_s=window_and_refresh_s(self.ladder.relay.device),
        )
        return bool(np.isinf(trips).all())

    def secure(self) -> np.ndarray:
        """Pairs of pickup and delay [knobs] that are secure with some drop-out ratio and some reset."""
        element = self.ladder.element
        return np.array(
            [
                any(
                    self.holds(p, t, ratio, reset, element.hold_s if reset == "held" else 0.0)
                    for ratio in element.dropout_ratio
                    for reset in element.reset
                )
                for p, t in self.knobs()
            ]
        )

    def clears(self, pickup: float, delay_s: float, states: Scenarios) -> np.ndarray:
        """States [states] that one stage clears in time, at its least sensitive and slowest."""
        element, relay = self.ladder.element, self.ladder.relay
        insensitive = _sign(element) * pickup + pickup_error(element, pickup)
        slowest_s = delay_s + time_error(element, delay_s) + window_and_refresh_s(relay.device)
        slowest_s += relay.output_s + relay.coil_and_breaker_s
        within = (slowest_s <= states.deadline_s) & np.isfinite(states.deadline_s)
        cleared: BoolArray = (states.severity[self.function] >= insensitive) & within
        return cleared

    def stage_clears(self, stages: list[Stage], scenarios: tuple[Scenarios, ...]) -> np.ndarray:
        """States of all scenario sets in one row that any of the stages clears."""
        cleared = [np.zeros(len(joined(scenarios, "deadline_s")), bool)]
        cleared += [np.concatenate([self.clears(s.pickup, s.delay_s, x) for x in scenarios]) for s in stages]
        any_of_them: BoolArray = np.logical_or.reduce(cleared)
        return any_of_them

    def every_clears(self, scenarios: tuple[Scenarios, ...]) -> np.ndarray:
        """The same [knobs, states] for each pair of pickup and delay."""
        return np.array([np.concatenate([self.clears(p, t, x) for x in scenarios]) for p, t in self.knobs()])


def pickup_error(element: Element, pickup: float) -> float:
    """Half-width of the pickup's error band, as declared."""
    share, fixed = pickup * element.accuracy.pickup_percent / 100, element.accuracy.pickup_abs
    return max(share, fixed) if element.accuracy.combine == "greater" else share + fixed


def time_error(element: Element, delay_s: float) -> float:
    """Half-width of the delay's error band, as declared."""
    share, fixed = delay_s * element.accuracy.time_percent / 100, element.accuracy.time_s
    return max(share, fixed) if element.accuracy.combine == "greater" else share + fixed


def window_and_refresh_s(device: Device) -> float:
    """One window and one refresh."""
    return (device.window_cycles + device.refresh_cycles) / FREQUENCY_HZ


def joined(scenarios: tuple[Scenarios, ...], name: str) -> np.ndarray:
    """One array of all scenario sets in one row."""
    return np.concatenate([getattr(s, name) for s in scenarios])


def sets_of(knobs: int, stages: int) -> list[np.ndarray]:
    """Every set of up to ``stages`` knobs: one array [sets, count] a count, the empty set first."""
    return [np.array(list(combinations(range(knobs), n)), int) for n in range(stages + 1)]


def drawn_grids(
    rng: np.random.Generator, functions: tuple[Function, ...], pickups: int, delays: int, stages: int
) -> tuple[Grid, ...]:
    """Elements of one random device on one random site's must-hold courses."""
    timers: Literal["per phase", "shared"] = "shared" if rng.random() < 0.5 else "per phase"
    elements = tuple(_element(rng, f, pickups, delays, int(rng.integers(1, stages + 1))) for f in functions)
    window, refresh = float(rng.choice([0.5, 1.0, 2.0])), float(rng.choice([0.0, 0.5]))
    device = Device("grid", ("l-n",), "rms", window, refresh, timers, "l-n", elements)
    feed = Feed("auxiliary", 20.0, 30.0)
    relay = Relay("R", "B", "B", "lines and neutral", device, feed, "shunt", feed, 0.01, float(rng.uniform(0.02, 0.1)))
    judgement = Judgement(
        margin_cap_units=float(rng.choice([0.0, 1.0, 2.0])),
        cover_kept=float(rng.choice([0.9, 0.98, 1.0])),
        deadline_kept_units=float(rng.choice([0.0, 1.0])),
    )
    return tuple(
        Grid(Ladder(e, relay, FREQUENCY_HZ, 230.0, 3**0.5, _courses(rng, e, device), judgement)) for e in elements
    )


def drawn_states(rng: np.random.Generator, functions: tuple[Function, ...], count: int) -> Scenarios:
    """Break states of one place: severities, deadlines, some of the core, some harmless, some unresolved."""
    deadline_s = np.where(rng.random(count) < 0.85, rng.choice(rng.uniform(0.1, 4.0, 5), count), np.inf)
    harmful = np.isfinite(deadline_s)
    severity: dict[Function, FloatArray] = {f: _sign_of(f) * rng.uniform(*SPANS[f][2:], count) for f in functions}
    return Scenarios(
        "B",
        "nominal",
        "as modelled",
        severity,
        deadline_s,
        harmful & (rng.random(count) < 0.35),
        harmful,
        np.zeros(count, bool),
        np.full(count, 230.0),
        np.zeros(count, int),
        rng.random(count) < 0.95,
        np.zeros(count, complex),
        np.zeros((count, 4), complex),
    )


def _element(rng: np.random.Generator, function: Function, pickups: int, delays: int, stages: int) -> Element:
    first, step, _, _ = SPANS[function]
    shortest_s, delay_step_s = float(rng.choice([0.1, 0.2])), float(rng.choice([0.3, 0.4, 0.7]))
    over = function is Function.UNDERVOLTAGE
    ratios = [(1.01,), (1.03,), (1.01, 1.05)] if over else [(0.99,), (0.95,), (0.93, 0.98)]
    resets: list[tuple[Reset, ...]] = [("instantaneous",), ("held",), ("held", "instantaneous")]
    low = first + float(rng.integers(0, 8))
    return Element(
        function,
        stages,
        SettableRange(low, low + step * (pickups - 1), step),
        "v",
        None,
        SettableRange(shortest_s, shortest_s + delay_step_s * (delays - 1), delay_step_s),
        ratios[rng.integers(len(ratios))],
        resets[rng.integers(len(resets))],
        float(rng.choice([0.1, 0.5])),
        Accuracy(
            float(rng.choice([0.5, 1.0, 2.0])),
            float(rng.choice([0.2, 1.0, 3.0])),
            float(rng.choice([1.0, 5.0])),
            0.02,
            "greater" if rng.random() < 0.5 else "sum",
        ),
        "v0" if function is Function.DISPLACEMENT else "l-n",
    )


def _courses(rng: np.random.Generator, element: Element, device: Device) -> Runs:
    """A few courses of several pieces; every third piece at the standing volts, some of no duration (padding)."""
    count, pieces = int(rng.integers(1, 5)), int(rng.integers(1, 5))
    channels = 1 if element.function is Function.DISPLACEMENT else 3
    low, high = SPANS[element.function][2:]
    standing = {Function.OVERVOLTAGE: (233, 262), Function.UNDERVOLTAGE: (190, 227), Function.DISPLACEMENT: (3, 20)}
    still = float(rng.uniform(*standing[element.function]))
    # Squared, so that mild courses are more frequent: severe and long ones would close every corridor.
    share = rng.random((count, pieces, channels)) ** 2
    volts = high - share * (high - low) if element.function is Function.UNDERVOLTAGE else low + share * (high - low)
    volts = np.where(rng.random((count, pieces, channels)) < 1 / 3, still, volts)
    seconds = rng.choice([0.0, 0.0513, 0.2071, 0.6037, 1.3019], (count, pieces))
    names = tuple(f"case {k}" for k in range(count))
    sign, numbers = _sign(element), tuple(range(count))
    lag_s, shared = window_and_refresh_s(device), device.timers == "shared"
    return Runs(sign * volts, seconds, names, numbers, dict(enumerate(names)), sign * still, "standing", lag_s, shared)


def _sign(element: Element) -> float:
    return _sign_of(element.function)


def _sign_of(function: Function) -> float:
    return -1.0 if function is Function.UNDERVOLTAGE else 1.0
