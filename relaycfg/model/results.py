"""What a study found, as plain figures: the only thing that text, JSON and the sheet are made from."""

from dataclasses import dataclass
from typing import Literal

from relaycfg.model.after_break_results import AfterBreak
from relaycfg.model.break_results import BreakStudy, Harm, Operation
from relaycfg.model.companion_results import Companions
from relaycfg.model.device import Device, Function
from relaycfg.model.joint_results import EarlyWarning
from relaycfg.model.own_life_results import OwnLife
from relaycfg.model.place_results import Elsewhere, PlaceAsymmetry, Together
from relaycfg.model.reconnect_results import Reconnection
from relaycfg.model.settings import Settings, Stage
from relaycfg.model.site import Site
from relaycfg.model.touch_results import EarthChoice, PlaceTouch


@dataclass(frozen=True)
class Bound:
    """One bound of one setting: what it may not go below or above, why, and the arithmetic to follow by hand."""

    of: Literal["pickup", "delay"]
    side: Literal["not below", "not above"]
    value: float
    unit: str
    case: str
    arithmetic: str
    source: str


@dataclass(frozen=True)
class Margins:
    """Distances of one stage to its nearest failing must-hold case and to the nearest state it must clear.

    One unit is 1 percent of U0 (1 point for 47) together with 10 percent of time. None where nothing limits.
    """

    security_v: float | None
    security_s: float | None
    security_units: float | None
    security_case: str
    dependability_v: float | None
    dependability_s: float | None
    dependability_units: float | None
    dependability_case: str


@dataclass(frozen=True)
class StageResult:
    """A stage as judged: figures in volts and percent, bounds, margins and the reason in one sentence."""

    stage: Stage
    pickup_percent: float | None
    base: str
    marked: float | None
    """The figure on the device's own scale."""
    marked_unit: str
    pickup_low: float
    pickup_high: float
    """Error band of the pickup."""
    clearing_s: float
    """Longest total time: delay, timing error, window, refresh, output, coil and breaker."""
    secure: bool
    bounds: tuple[Bound, ...]
    margins: Margins | None
    clears_percent: float | None
    """Share of the harmful load states at nominal supply, places seen, that it clears in time on its own."""
    reason: str


@dataclass(frozen=True)
class Operated:
    """A stage that operated in a case: its label, seconds from the start of the case, and in which course."""

    stage: str
    seconds: float
    course: str


@dataclass(frozen=True)
class CaseResult:
    """A must-hold (or must-trip) case played through the relay."""

    number: int
    name: str
    expect: Literal["hold", "trip", "either"]
    outcome: Literal["hold", "trip"]
    passed: bool
    figures: str
    source: str
    status: str
    operated: tuple[Operated, ...]
    """Stages that operated, the fastest first."""
    highest_l_n_v: float
    lowest_l_n_v: float
    highest_v0_v: float
    margin_v: float | None
    margin_s: float | None
    nearest_v: str
    nearest_s: str
    """Labels of the stages whose margins these are."""


@dataclass(frozen=True)
class CurveStep:
    """One step of a ride-through or withstand curve and the case or state behind it."""

    pickup: float
    seconds: float | None
    behind: str
    case: int | None = None
    """Number of the case behind it, where it is one."""


@dataclass(frozen=True)
class Corridor:
    """The corridor of one element: R from must-hold cases, W from break states, and the states as dots."""

    function: Function
    unit: str
    ride_through: tuple[CurveStep, ...]
    """R at the stage's nominal pickup, errors included; rising pickup severity. None seconds: for ever."""
    withstand: tuple[CurveStep, ...]
    """Time left to the relay at that severity (deadline less measuring, output, coil and breaker)."""
    cases: tuple[CurveStep, ...]
    """Each must-hold case as one dot: severity, seconds, number and name."""
    standing: float
    standing_case: str


@dataclass(frozen=True)
class ClosedGroup:
    """Harmful scenarios that no secure setting clears, grouped by what blocks them."""

    blockers: dict[str, str]
    """Element to the case (or limit) that blocks it."""
    scenarios: int
    core: bool
    place: str
    worst_l_n_v: float
    overlap_v: float | None
    overlap_s: float | None
    sentence: str


@dataclass(frozen=True)
class Finding:
    """Something to act on. ``exception`` findings make the exit code 1."""

    severity: Literal["exception", "warning", "note"]
    about: str
    sentence: str
    do: str
    if_left: str

    @property
    def exception(self) -> bool:
        """Whether this is an exception against the stated criteria."""
        return self.severity == "exception"


@dataclass(frozen=True)
class TestPoint:
    """One line of the test schedule, from the settable values."""

    element: str
    line: str
    inject: str
    expect: str
    accept_low: float
    accept_high: float
    unit: str
    avoid: str


@dataclass(frozen=True)
class WorkedBreak:
    """One break worked by hand: a line's admittances, the displacement and the volts; cables are left out.

    ``state`` is the load state, every load taken as the constant impedance of its rating; ``path_s`` the admittance
    of the way back through electrodes (0 where there is none).
    """

    place: str
    state: str
    admittance_s: tuple[complex, ...]
    path_s: complex
    emf_v: float
    shift_v: complex
    l_n_v: tuple[float, ...]
    solver_l_n_v: tuple[float, ...]


@dataclass(frozen=True)
class Cover:
    """What a set of elements does at nominal supply over the places the relay sees, both load models agreeing.

    ``cleared_percent`` of the harmful states are cleared in time (None: none is harmful); in ``seen_percent`` of all
    states some stage operates.
    """

    elements: str
    cleared_percent: float | None
    seen_percent: float


@dataclass(frozen=True)
class PlanePoint:
    """A break state on the neutral-displacement plane: V0 phasor [V] and whether it is cleared in time."""

    v0: complex
    harm: Harm
    operation: Operation


@dataclass(frozen=True)
class Study:
    """The whole result of derive or check on one site."""

    site: Site
    device: Device
    kind: Literal["derive", "check"]
    seed: int
    samples: int
    settings: Settings
    stages: tuple[StageResult, ...]
    cases: tuple[CaseResult, ...]
    breaks: BreakStudy
    corridors: tuple[Corridor, ...]
    closed: tuple[ClosedGroup, ...]
    uncleared: int
    """Harmful scenarios that these settings do not clear in time."""
    blocked: int
    """Those of them that no secure setting clears; the others were given up for security margin, or are not set."""
    findings: tuple[Finding, ...]
    tests: tuple[TestPoint, ...]
    worked: WorkedBreak | None
    plane: tuple[PlanePoint, ...]
    displacement_standing_v: float
    feed_range_v: tuple[tuple[str, float, float], ...]
    """Auxiliary feeds taken from the system: what, lowest and highest volts over the break states."""
    smallest_asymmetry: dict[str, float | None]
    """Element set to the smallest load ratio k in k:1:1 that it sees behind a stiff source, None where never."""
    coverage: tuple[Cover, ...]
    input_digest: str
    place_asymmetry: tuple[PlaceAsymmetry, ...] = ()
    elsewhere: tuple[Elsewhere, ...] = ()
    together: tuple[Together, ...] = ()
    early_warning: EarlyWarning | None = None
    touch: tuple[PlaceTouch, ...] = ()
    earth_choice: EarthChoice | None = None
    """Only where the device takes displacement from N to earth."""
    own_life: OwnLife | None = None
    reconnection: Reconnection | None = None
    companions: Companions | None = None
    after_break: AfterBreak | None = None

    @property
    def exceptions(self) -> int:
        """Number of exceptions against the stated criteria."""
        return sum(f.exception for f in self.findings)
