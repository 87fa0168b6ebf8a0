"""Metalwork against remote earth while a neutral is lost, and what a relay that measures against earth sees of it."""

from dataclasses import dataclass

from relaycfg.model.break_results import Share
from relaycfg.model.site import EarthReference


@dataclass(frozen=True)
class BoardTouch:
    """PE of one board against remote earth over the load states, as modelled, at nominal supply."""

    board: str
    limit_v: float
    largest_v: float
    state: str
    above: Share
    """States above the board's limit."""


@dataclass(frozen=True)
class RelayTouch:
    """What the relay does about touch volts above a limit: information, no protection against electric shock.

    ``within``, ``late`` and ``never`` are shares of the states above: the switch is open within the table's time for
    that voltage, later, not at all. ``left`` is what stays with the switch open: boards it does not disconnect keep
    the metalwork up. It is None, not nothing, where the model has no other user of a PEN that is broken.
    """

    within: Share
    late: Share
    never: Share
    left_v: float | None
    left_board: str
    left: Share | None


@dataclass(frozen=True)
class PlaceTouch:
    """One break place: its boards with PE, the highest first, and the share of states with any above its limit.

    ``unresolved`` states have no figure; ``without_pe`` are boards whose metalwork has no conductor in the model.
    ``relay`` is None without settings and where the relay cannot see the break.
    """

    at: str
    conductor: str
    boards: tuple[BoardTouch, ...]
    above: Share
    unresolved: int
    without_pe: tuple[str, ...]
    relay: RelayTouch | None


@dataclass(frozen=True)
class EarthSight:
    """N of the relay's board against the local PE and against remote earth, over the states of one break place."""

    at: str
    conductor: str
    local_v: float
    own_v: float
    local: Share
    own: Share
    """States in which the displacement element surely picks up."""


@dataclass(frozen=True)
class EarthChoice:
    """What the choice of earth changes for a relay that takes displacement from N to earth, at one pickup.

    The ``standing`` figures are the largest of the sound network at nominal supply: what a pickup has to stay above.
    """

    chosen: EarthReference
    stage: str
    pickup_v: float
    standing_local_v: float
    standing_own_v: float
    places: tuple[EarthSight, ...]
