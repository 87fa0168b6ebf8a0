"""After a trip: volts without load, closing again onto the same break, and when closing by itself may be allowed."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from relaycfg.model.break_results import Share
from relaycfg.model.device import Function
from relaycfg.model.geometry import BoolArray, FloatArray
from relaycfg.model.reconnect_results import Condition, Pumping, Reconnection
from relaycfg.model.settings import Settings
from relaycfg.network import LoadStates, Solved, tap
from relaycfg.network.states import OFF
from relaycfg.study.evidence import Evidence
from relaycfg.study.levels import NOMINAL
from relaycfg.study.reactions import dropped_out, first_of, opening_s
from relaycfg.study.scenarios import AS_MODELLED, Scenarios, seen_places
from relaycfg.study.shares import share
from relaycfg.study.stages import ActiveStage, operating_s

HOUR_S = 3600.0
COURSES = 200
"""Courses of an hour, with loads that come back by chance."""
MOST_STEPS = 4000
"""Closings followed in one hour; faster pumping is not told apart."""
ENDS = ("hour over", "locked out", "stays open", "left connected unseen")
STREAM = 7
"""Number of the random stream of these courses, apart from that of the load states."""


def after_trip(evidence: Evidence) -> dict[str, Solved]:
    """Every seen place at nominal supply with all loads behind the relay's switch off and its neutral still lost."""
    site, states = evidence.site, evidence.states
    behind = set(site.behind(evidence.relay.trips))
    loads, motors = states.loads.copy(), states.motors.copy()
    loads[[k for k, load in enumerate(site.loads) if load.board in behind]] = 0.0
    motors[[k for k, motor in enumerate(site.motors) if motor.board in behind]] = OFF
    open_states = LoadStates(loads, motors, states.names)
    places = seen_places(site, evidence.relay)
    return {place: evidence.network.solve(place, open_states, evidence.levels.nominal) for place in places}


def reconnection(
    evidence: Evidence, active: tuple[ActiveStage, ...], settings: Settings, after: dict[str, Solved]
) -> Reconnection:
    """Pumping at every seen place, and the conditions of closing again by itself.

    ``after`` is ``after_trip``. The relay is taken to measure on the supply side of the open switch. All loads behind
    the switch go off and come back together; by chance: as another sampled state.
    """
    automatic = settings.after_any_trip == "automatic"
    wait_s = settings.reconnect_delay_s if automatic else evidence.site.judgement.reconnect_shown_s
    attempts = settings.reconnect_attempts if automatic else None
    pumping: list[Pumping] = []
    healthy = tripped = 0
    for number, scenario in enumerate(s for s in evidence.scenarios if s.level == NOMINAL and s.model == AS_MODELLED):
        place = _Place.of(evidence, active, scenario, after[scenario.place])
        hit = place.harmful & np.isfinite(place.trip_s)
        healthy, tripped = healthy + int((hit & place.healthy).sum()), tripped + int(hit.sum())
        pumping += _pumping(evidence, active, place, hit, wait_s, attempts, number)
    stayed, fooled = _checks(evidence, active)
    return Reconnection(
        settings.after_any_trip,
        wait_s,
        attempts,
        COURSES,
        share(healthy, tripped),
        stayed,
        fooled,
        tuple(pumping),
        _conditions(evidence, stayed, fooled),
    )


@dataclass(frozen=True)
class _Place:
    """One seen place at nominal supply as modelled; arrays [states]."""

    scenario: Scenarios
    trip_s: FloatArray
    healthy: BoolArray
    harmful: BoolArray

    @staticmethod
    def of(evidence: Evidence, active: tuple[ActiveStage, ...], scenario: Scenarios, after: Solved) -> "_Place":
        relay = evidence.relay
        open_taps = tap(after, evidence.network.boards.index(relay.measures_at), relay.earth_reference)
        healthy = dropped_out(evidence, active, open_taps) & after.converged
        trip_s = np.where(scenario.resolved, operating_s(active, scenario, evidence), np.inf)
        return _Place(scenario, trip_s, healthy, scenario.harmful & scenario.resolved)


def _pumping(
    evidence: Evidence,
    active: tuple[ActiveStage, ...],
    place: _Place,
    hit: BoolArray,
    wait_s: float,
    attempts: int | None,
    number: int,
) -> list[Pumping]:
    """The worst and the median of the states that are harmful and tripped."""
    states = np.flatnonzero(hit)
    if not len(states):
        return []
    rising = states[np.argsort(place.scenario.highest_v[states], kind="stable")]
    found = []
    for start, state in (("worst", int(rising[-1])), ("median", int(rising[(len(rising) - 1) // 2]))):
        cycle_s = place.trip_s[state] + wait_s
        alike = HOUR_S / cycle_s if place.healthy[state] else 0.0
        if attempts is not None:
            alike = min(alike, attempts + 1.0)
        stream = np.random.default_rng(np.random.SeedSequence(evidence.seed, spawn_key=(STREAM, number)))
        course = hour(place, state, wait_s, attempts, stream)
        seconds = opening_s(evidence, active, place.scenario.taps[state : state + 1])[:, 0]
        found.append(
            Pumping(
                place.scenario.place,
                "worst" if start == "worst" else "median",
                state,
                float(place.scenario.highest_v[state]),
                first_of(active, seconds),
                float(place.trip_s[state]),
                bool(place.healthy[state]),
                float(alike),
                float(np.median(course.trips)),
                int(course.trips.max()),
                float(np.median(course.harmful)),
                float(np.median(course.harmed_s)),
                {name: int((course.end == k).sum()) for k, name in enumerate(ENDS)},
            )
        )
    return found


@dataclass(frozen=True)
class Course:
    """What happened in each course of an hour, arrays [courses]; ``end`` is a position in ``ENDS``."""

    trips: NDArray[np.intp]
    harmful: NDArray[np.intp]
    harmed_s: FloatArray
    end: NDArray[np.intp]


def hour(place: _Place, start: int, wait_s: float, attempts: int | None, stream: np.random.Generator) -> Course:
    """Courses of one hour: trip, wait, close onto a state drawn anew, until one of ``ENDS``.

    A state that no stage trips leaves the board connected for the rest of the hour; one whose open volts do not look
    healthy keeps the switch open.
    """
    trips, harmful, end = (np.zeros(COURSES, np.intp) for _ in range(3))
    time_s, harmed_s = np.zeros(COURSES), np.zeros(COURSES)
    state = np.full(COURSES, start)
    going = np.arange(COURSES)
    for _ in range(MOST_STEPS):
        here = state[going]
        trip_s = place.trip_s[here]
        left_s = HOUR_S - time_s[going]
        harmed_s[going] += np.where(place.harmful[here], np.minimum(trip_s, left_s), 0.0)
        over, unseen = trip_s > left_s, ~np.isfinite(trip_s)
        end[going[unseen]] = ENDS.index("left connected unseen")
        going = going[~over]
        trips[going] += 1
        time_s[going] += place.trip_s[state[going]] + wait_s
        locked = np.zeros(len(going), bool) if attempts is None else trips[going] > attempts
        stays = ~locked & ~place.healthy[state[going]]
        end[going[locked]], end[going[stays]] = ENDS.index("locked out"), ENDS.index("stays open")
        going = going[~locked & ~stays & (time_s[going] <= HOUR_S)]
        if not len(going):
            break
        state[going] = stream.integers(0, len(place.trip_s), len(going))
        harmful[going] += place.harmful[state[going]]
    return Course(trips, harmful, harmed_s, end)


def _checks(evidence: Evidence, active: tuple[ActiveStage, ...]) -> tuple[Share, Share]:
    """Tripped states whose V0 stayed below its pickup; tripped scenarios that also pass the check between lines.

    That check: some pair of lines lies beyond the pickup of an active 59 or 27, taken between lines.
    """
    displaced = [a for a in active if a.function is Function.DISPLACEMENT]
    stayed = tripped = fooled = every = 0
    for scenario in evidence.scenarios:
        hit = scenario.resolved & scenario.harmful & np.isfinite(operating_s(active, scenario, evidence))
        below = hit.copy()
        for stage in displaced:
            below &= stage.severity(scenario, evidence) < stage.insensitive.pickup
        if scenario.level == NOMINAL and scenario.model == AS_MODELLED:
            stayed, tripped = stayed + int(below.sum()), tripped + int(hit.sum())
        fooled += int((below & _lines_moved(evidence, active, scenario)).sum())
        every += int(hit.sum())
    return share(stayed, tripped), share(fooled, every)


def _lines_moved(evidence: Evidence, active: tuple[ActiveStage, ...], scenario: Scenarios) -> BoolArray:
    """States in which volts between lines lie beyond a pickup of 59 or 27, times their ratio to line to neutral."""
    geometry = evidence.site.supply.geometry
    l_l = np.abs(geometry.line_to_line(scenario.taps[:, :-1]))
    moved = np.zeros(len(l_l), bool)
    for stage in active:
        ratio = 1.0 if stage.ladder.element.quantity == "l-l" else geometry.line_to_line_ratio
        if stage.function is Function.OVERVOLTAGE:
            moved |= (l_l >= ratio * stage.stage.pickup).any(axis=-1)
        elif stage.function is Function.UNDERVOLTAGE:
            moved |= (l_l <= ratio * stage.stage.pickup).any(axis=-1)
    return moved


def _conditions(evidence: Evidence, stayed: Share, fooled: Share) -> tuple[Condition, ...]:
    """The conditions of closing again by itself; all of them must hold."""
    relay, site = evidence.relay, evidence.site
    behind = site.behind(relay.trips)
    measures = "l-l" in relay.device.measures and relay.device.element(Function.DISPLACEMENT) is not None
    motors = [m.name for m in site.motors if m.board in behind]
    return (
        Condition(
            "the device measures displacement and volts between lines",
            "yes" if measures else "no",
            f"it measures {', '.join(relay.device.measures)}"
            + ("" if relay.device.element(Function.DISPLACEMENT) else " and has no 59N"),
        ),
        Condition(
            "displacement stayed below its pickup through the whole event",
            "no",
            f"closing after any trip includes trips with displacement; it stays below in {stayed.count} of {stayed.of} "
            "tripped break states",
        ),
        Condition(
            "volts between lines moved with those to neutral",
            "not known",
            f"the device has to compare them; with the condition above met it is fooled by {fooled.count} of "
            f"{fooled.of} tripped break scenarios",
        ),
        Condition("volts are inspected on the supply side of the open switch", "not known", "the site does not say"),
        Condition(
            "no machine restarts unasked",
            "not known",
            f"behind the switch: {len(motors)} listed motors" if motors else "no motor is listed behind the switch",
        ),
        Condition("the owner asked for it in writing", "not known", "no letter is part of the inputs"),
    )
