"""What happens in the seconds and minutes after a break when loads are no impedances, as plain figures."""

from dataclasses import dataclass
from typing import Literal

from relaycfg.model.break_results import Share
from relaycfg.model.device import Function


@dataclass(frozen=True)
class Tripping:
    """In how many courses a stage (or any) trips, and when the switch is open [s]; None where it never is."""

    what: str
    share: Share
    median_s: float | None
    late_s: float | None
    """95 percent of those that trip are open by then."""
    possible: bool = True
    """False where the course ends before it could have cleared: its share then says nothing."""


@dataclass(frozen=True)
class Lost:
    """One round of a cascade: the load that fails open, and the highest volts at any board before it does."""

    load: str
    highest_v: float


@dataclass(frozen=True)
class Cascade:
    """Over-volted loads fail open one after another, to the end; ``highest_v`` is what then stands."""

    state: str
    lost: tuple[Lost, ...]
    highest_v: float
    resolved: bool
    """Whether every round has a solution; where one has none the cascade ends there, not because it is over."""


@dataclass(frozen=True)
class Met:
    """When an element first picks up and first trips while loads are switched [s from the break]."""

    function: Function
    picked_up: Share
    pickup_median_s: float | None
    tripped: Share
    trip_median_s: float | None


@dataclass(frozen=True)
class Drift:
    """The minutes after a break if nothing trips, loads switched by their usage; volts are of V0 at the relay."""

    minutes: float
    courses: int
    unresolved: int
    """Courses with a state that has no solution: left out of the volts and the changes, counted as not seen."""
    lowest_v: float
    median_v: float
    highest_v: float
    changes_per_minute: float
    largest_step_percent: float
    step_several: bool
    """Whether a state beside that step has another solution: another course would step otherwise."""
    elements: tuple[Met, ...]


@dataclass(frozen=True)
class BandEdge:
    """Shares of states with the lower band edge of electronic load as stated, and at both ends of its range."""

    edges_pu: tuple[float, float]
    harmful: tuple[Share, Share, Share]
    """As stated, at the lower end, at the upper end; so are the others."""
    core: tuple[Share, Share, Share]
    """States that have to be cleared whatever else."""
    seen: tuple[Share, Share, Share]
    unresolved: tuple[int, int, int]
    moved_v: tuple[tuple[float, float], tuple[float, float]]
    """At either end: how far the volts of any line at any board move, median and most; shares may hide it."""


@dataclass(frozen=True)
class Balanced:
    """V0 at a lost neutral whose load is balanced and partly rectifiers: 59N by its detector."""

    rectifier_percent: float
    """Peak rectifiers that would draw the third harmonic the loads state, of all load to neutral behind the break."""
    rms_v: float
    fundamental_v: float
    third_v: float
    detector: str
    pickup_v: float | None
    """Lowest pickup of 59N at its least sensitive end; None where it has no stage on."""
    verdict: Literal["sees", "borderline", "misses", "off"]
    """What 59N does; borderline where the figure is too near the pickup for an idealised rectifier to decide."""


@dataclass(frozen=True)
class PlaceAfterBreak:
    """One seen break place after the break."""

    at: str
    electronic_percent: float
    courses: int
    fluctuating: Share
    """Courses in which a load drops out, starts again, stalls or is taken off."""
    silent: int
    """Fluctuating courses in which no stage trips."""
    unresolved: int
    several: int
    """Courses whose first state is not the only solution; the one connected to the sound neutral is taken."""
    stages: tuple[Tripping, ...]
    any_stage: Tripping
    cascades: tuple[Cascade, ...]
    drift: Drift | None
    edge: BandEdge | None
    balanced: Balanced | None


@dataclass(frozen=True)
class Happening:
    """What a load does in a course."""

    at_s: float
    load: str
    does: str


@dataclass(frozen=True)
class CoursePicture:
    """One seeded course at the relay's tap: pieces of constant volts with their begins, and what happens when."""

    at: str
    state: str
    ends_s: float
    begins_s: tuple[float, ...]
    l_n_v: tuple[tuple[float, ...], ...]
    v0_v: tuple[float, ...]
    happenings: tuple[Happening, ...]
    trips: tuple[tuple[str, float], ...]
    """Stage and second at which the switch is open; without a switch the course would go on as shown."""


@dataclass(frozen=True)
class AfterBreak:
    """The seconds and minutes after a break at every place the relay sees."""

    course_s: float
    places: tuple[PlaceAfterBreak, ...]
    picture: CoursePicture | None
