"""Ride-through R: how long the must-hold cases keep an element picked up, for every pickup at once."""

from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from relaycfg.model.cases import Case, Course
from relaycfg.model.device import Device, Element
from relaycfg.model.geometry import FloatArray, Geometry
from relaycfg.relay import measuring_s, severities, trip_table

STANDING = -1
NOTHING = -2


@dataclass(frozen=True)
class Runs:
    """The courses of all hold cases as severities of one element, embedded in the worst standing severity.

    ``severity`` [courses, segments, channels] and ``duration_s`` [courses, segments], padded with zero seconds;
    ``names`` one a course, ``cases`` its case number, ``case_names`` one a case.
    """

    severity: FloatArray
    duration_s: FloatArray
    names: tuple[str, ...]
    cases: tuple[int, ...]
    case_names: dict[int, str]
    standing: float
    standing_name: str
    lag_s: float
    """Window and refresh of the device: how long an excursion stays in what it measures."""
    shared: bool
    every: bool = False
    """One counter that runs only while all channels are picked up (a stage set to all phases)."""

    @cached_property
    def front(self) -> NDArray[np.intp]:
        """Indices of the courses that can stand behind R: none of them is milder and shorter than another.

        Only courses of one piece are compared; where one is as severe on every channel and lasts as long as another,
        whatever the other picks up it picks up too, and holds longer.
        """
        single = (self.duration_s > 0).sum(axis=1) == 1
        piece = np.argmax(self.duration_s > 0, axis=1)
        severity = self.severity[np.arange(len(single)), piece]
        seconds = self.duration_s[np.arange(len(single)), piece]
        kept: list[int] = []
        for k in np.lexsort((np.arange(len(single)), -seconds, -severity.max(axis=-1))):
            rivals = [j for j in kept if single[j]]
            beaten = (seconds[rivals] >= seconds[k]) & (severity[rivals] >= severity[k]).all(axis=-1)
            if not (single[k] and beaten.any()):
                kept.append(int(k))
        return np.sort(np.array(kept, np.intp))

    def only(self, courses: NDArray[np.intp]) -> "Runs":
        """The same with some of the courses."""
        return replace(
            self,
            severity=self.severity[courses],
            duration_s=self.duration_s[courses],
            names=tuple(self.names[k] for k in courses),
            cases=tuple(self.cases[k] for k in courses),
        )


@dataclass(frozen=True)
class RideThrough:
    """R [s] for each pickup asked for (inf: never resets), and the course behind it (an index, or STANDING)."""

    seconds: FloatArray
    behind: NDArray[np.intp]


def stack(
    courses: list[Course], element: Element, geometry: Geometry, displacement_from: str
) -> tuple[FloatArray, FloatArray]:
    """Severities [courses, segments, channels] and durations [courses, segments] of courses of unequal length."""
    longest = max(len(c.segments) for c in courses)
    width = len(geometry.names) + 1
    taps = np.zeros((len(courses), longest, width), complex)
    seconds = np.zeros((len(courses), longest))
    for k, course in enumerate(courses):
        for j, segment in enumerate(course.segments):
            taps[k, j] = segment.tap
            seconds[k, j] = segment.duration_s
    return severities(element, geometry, taps, displacement_from), seconds


def runs_of(cases: tuple[Case, ...], element: Element, device: Device, geometry: Geometry, frequency_hz: float) -> Runs:
    """The hold cases as seen by one element; standing cases become the value all others are embedded in."""
    held = [(case, course) for case in cases if case.expect == "hold" for course in case.courses]
    lasting = [(case, course) for case, course in held if case.standing]
    passing = [(case, course) for case, course in held if not case.standing]
    still, _ = stack([c for _, c in lasting], element, geometry, device.displacement_from)
    worst = int(np.argmax(still.max(axis=(1, 2))))
    severity, seconds = stack([c for _, c in passing], element, geometry, device.displacement_from)
    return Runs(
        severity,
        seconds,
        tuple(course_name(case, course) for case, course in passing),
        tuple(case.number for case, _ in passing),
        {case.number: f"case {case.number}, {case.name}" for case, _ in passing},
        float(still[worst].max()),
        course_name(*lasting[worst]),
        measuring_s(device, frequency_hz),
        device.timers == "shared",
    )


def course_name(case: Case, course: Course) -> str:
    """How a course is named wherever it stands behind a figure."""
    variant = f" ({course.label})" if len(case.courses) > 1 else ""
    return f"case {case.number}, {case.name}{variant}"


def run_lengths(runs: Runs, pickup: FloatArray, dropout: FloatArray, hold_s: float = 0.0) -> FloatArray:
    """How long each course keeps the timer running [courses, pickups], window and refresh included.

    ``pickup`` and ``dropout`` [pickups] are severities already on their sensitive side. Each course ends in the
    standing severity for ever: infinite where that keeps it from dropping out.
    """
    courses, _, channels = runs.severity.shape
    return trip_table(
        np.append(runs.severity, np.full((courses, 1, channels), runs.standing), axis=1),
        np.append(runs.duration_s, np.full((courses, 1), np.inf), axis=1),
        pickup,
        dropout,
        "held",
        hold_s,
        "shared" if runs.shared else "per phase",
        "all" if runs.every else "any",
        runs.lag_s,
    ).longest_s.T


def ride_through(runs: Runs, pickup: FloatArray, dropout: FloatArray, hold_s: float = 0.0) -> RideThrough:
    """R of the severities ``pickup`` with drop-out ``dropout``: the longest run of any course.

    Infinite where the standing severity itself picks up.
    """
    each = run_lengths(runs.only(runs.front), pickup, dropout, hold_s)
    worst = np.argmax(each, axis=0)
    seconds = each[worst, np.arange(len(pickup))]
    behind = np.where(seconds > 0, runs.front[worst], NOTHING)
    stands = runs.standing >= pickup
    return RideThrough(np.where(stands, np.inf, seconds), np.where(stands, STANDING, behind))


def behind_name(runs: Runs, index: int) -> str:
    """The case behind one value of R in words."""
    if index == STANDING:
        return runs.standing_name
    return "no case picks it up" if index == NOTHING else runs.names[index]
