"""What a lost neutral does, as plain figures: single states as rows, places over all states."""

from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal

from relaycfg.model.device import Function

if TYPE_CHECKING:
    from relaycfg.model.joint_results import JointSweep
    from relaycfg.model.place_results import HighestVoltage

Status = Literal["converged", "unresolved"]
Flag = Literal["below band", "above band", "unstable", "several solutions"]
Harm = Literal["none", "high volts", "low volts", "both"]
Operation = Literal["in time", "late", "none"]


@dataclass(frozen=True)
class BoardVolts:
    """One board in one state: magnitudes [V], angles [deg] against the EMF of L1, neutral current [A]."""

    l_n_v: tuple[float, ...]
    l_n_deg: tuple[float, ...]
    l_l_v: tuple[float, ...]
    v0_v: float
    n_earth_v: float | None
    pe_earth_v: float | None
    neutral_a: float | None


@dataclass(frozen=True)
class RelayVolts:
    """What the relay's terminals carry in one state [V]; unbalance in percent by definition name.

    ``n_reference_v`` is the neutral against the earth the relay measures against: the local PE again, or remote earth.
    """

    l_n_v: tuple[float, ...]
    l_l_v: tuple[float, ...]
    v0_v: float
    n_pe_v: float | None
    unbalance_percent: dict[str, float]
    n_reference_v: float | None = None


@dataclass(frozen=True)
class BreakRow:
    """One break place, joint and load state; where unresolved without relays, boards and figures of the joint."""

    at: str
    conductor: str
    joint_ohm: float | None
    state: str
    status: Status
    flags: tuple[Flag, ...]
    joint_a: float
    joint_v: float
    joint_w: float
    relays: dict[str, RelayVolts]
    boards: dict[str, BoardVolts]
    all_impedance: "BreakRow | None"


@dataclass(frozen=True)
class Percentiles:
    """5, 50, 95 and 100 percent points over the sampled states (highest L-N of any board, V0 at the tap, ...)."""

    name: str
    unit: str
    p5: float
    p50: float
    p95: float
    largest: float


@dataclass(frozen=True)
class Share:
    """A share of modelled load states with its 95 percent Wilson interval in 0..1; not a probability of damage."""

    count: int
    of: int
    low: float
    high: float

    @property
    def percent(self) -> float:
        """The share in percent."""
        return 100 * self.count / self.of if self.of else 0.0


@dataclass(frozen=True)
class WorstState:
    """A sampled state by its number (``breaks --state "sample 17"`` shows it again), and what it does."""

    index: int
    board: str
    line: str
    volts: float
    loads_on: int


@dataclass(frozen=True)
class ElementSight:
    """How one element sees the states of one place: share seen at its settings, and the first delay that trips."""

    function: Function
    share: Share
    fastest_s: float | None


@dataclass(frozen=True)
class PlaceSummary:
    """One break place over all sampled states."""

    at: str
    conductor: str
    seen: bool
    """Whether the relay's tap lies downstream of the break and the relay measures a quantity that moves."""
    why_not: str
    samples: int
    unresolved: int
    flags: dict[str, int]
    classes: dict[str, Share]
    """Keys "harm / operation", such as "high volts / in time"; only with settings."""
    harmful: Share
    undetected: Share
    """Under some load model no harm and no operation: an undetected break, never a pass."""
    percentiles: tuple[Percentiles, ...]
    worst: tuple[WorstState, ...]
    elements: tuple[ElementSight, ...]
    boards_harmed: tuple[str, ...]
    boards_healthy: tuple[str, ...]
    not_disconnected: tuple[str, ...]
    """Boards harmed by this break that the relay's switch does not disconnect."""
    touch_v: float | None
    """Largest PE-to-remote-earth voltage of any board over the states."""


@dataclass(frozen=True)
class BreakStudy:
    """Everything ``breaks`` shows."""

    rows: tuple[BreakRow, ...]
    summaries: tuple[PlaceSummary, ...]
    seen_places: int
    places: int
    notes: tuple[str, ...]
    joints: tuple["JointSweep", ...] = ()
    """Every place with a loose joint in place of the open break."""
    highest: tuple["HighestVoltage", ...] = ()
    """The highest volts over all on/off combinations of the loads behind each open break."""
