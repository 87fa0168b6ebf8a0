"""Courses of voltage at the relay's tap: what the relay must hold through, and what it must clear."""

from dataclasses import dataclass
from typing import Literal

from relaycfg.model.geometry import ComplexArray

Expect = Literal["hold", "trip", "either"]


@dataclass(frozen=True)
class Segment:
    """A piece of a course: its duration [s] (inf: for ever) and the tap's phasors.

    ``tap`` has one line-to-neutral phasor [V] a line and, last, the neutral against the local PE (nan where the
    tap has no PE); shape [lines + 1].
    """

    duration_s: float
    tap: ComplexArray


@dataclass(frozen=True)
class Course:
    """One variant of a case, such as a fault at the upper or lower limit of the supply."""

    label: str
    segments: tuple[Segment, ...]


@dataclass(frozen=True)
class Case:
    """A case by number: what happens at the tap, what is expected of the relay, and who says so.

    ``standing`` cases last for ever and are not embedded in others. ``status`` is that of the figures' source
    (read, quoted, memory, own, user, computed).
    """

    number: int
    name: str
    expect: Expect
    source: str
    status: str
    standing: bool
    courses: tuple[Course, ...]
    figures: str
    """The course in words with its main figures, as printed in the table of cases."""
    begins_s: float = 0.0
    """When the case itself begins within its courses; before that the system is dead."""
    deadline_s: float = float("inf")
    """A case that must trip: the switch has to be open by then, counted from ``begins_s``."""
