"""What every break place adds to its summary: the highest possible volts, another relay's seat, relays together."""

from dataclasses import dataclass
from typing import Literal

from relaycfg.model.break_results import Share

How = Literal["closed form", "branch and bound", "nothing to switch"]


@dataclass(frozen=True)
class HighestVoltage:
    """The highest line-to-neutral volts that any on/off combination of the loads behind one break can give.

    ``stiff_v`` and ``bound_v`` hold on one stiff bar with every load a constant impedance: the highest found, and what
    no combination exceeds (inf: nothing is proved, as where generation or capacitors can cancel the load). The same
    combination solved in the network: ``impedance_v`` with constant impedances, ``modelled_v`` with the loads' own
    laws; None where no solution was found.
    """

    at: str
    stiff_v: float
    bound_v: float
    line: str
    how: How
    switchable: int
    """Loads, motors and groups that are switched independently of each other."""
    boxes: int
    """Boxes that branch and bound looked at; 0 for the closed form."""
    loads_on: tuple[str, ...]
    """Loads and motors on besides those that are always on; ``breaks --state "on: A; B"`` shows the state again."""
    board: str
    """Where the volts of the network are highest."""
    impedance_v: float | None
    modelled_v: float | None


@dataclass(frozen=True)
class Seat:
    """One board behind a break as the seat of a relay with the same device and settings, opening that board.

    ``cleared``: of the harmful load states, those in which it disconnects every harmed board in time. ``operates``: of
    all states, those in which some stage operates. Whether it would hold through what must hold there is not judged.
    """

    board: str
    cleared: Share
    operates: Share


@dataclass(frozen=True)
class Elsewhere:
    """Where another relay would have to sit to see a break: the best seat, and what the relay itself clears there."""

    at: str
    seen: bool
    own_cleared: Share
    best: Seat
    relays: tuple[str, ...]
    """Relays of the site that see this place already."""


@dataclass(frozen=True)
class Together:
    """What several relays cover at one place: of the harmful states, those in which each relay alone disconnects
    every harmed board in time, and those in which they do so between them."""

    at: str
    harmful: Share
    alone: dict[str, Share]
    cleared: Share


@dataclass(frozen=True)
class PlaceAsymmetry:
    """Smallest k of resistive loads k:1:1 behind one break that a set of elements sees, whichever line is heavy."""

    at: str
    load_w: float
    """What the loads behind the break take on average, split k:1:1 on each board for this figure."""
    ratios: dict[str, float | None]
    """Element set to k; None: not even 100:1:1."""
