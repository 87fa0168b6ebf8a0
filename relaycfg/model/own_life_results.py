"""What a lost neutral does to the relay itself: its supply, its coil, its own neutral wire and the poles it opens."""

from dataclasses import dataclass

from relaycfg.model.break_results import Share


@dataclass(frozen=True)
class HeldLoss:
    """A case that must hold in which the switch opens by itself, because the volts that hold it in are gone."""

    case: int
    name: str
    lowest_v: float
    seconds: float | None
    """How long the volts stay below the range; None for ever."""


@dataclass(frozen=True)
class FeedLife:
    """One feed taken from the system itself, over all break states; shares are of the harmful states at nominal
    supply over the places seen, under the load model that is worse."""

    what: str
    between: str
    lowest_v: float
    highest_v: float
    allowed: tuple[float, float] | None
    """None where the range is not stated: nothing can be judged."""
    below: Share
    above: Share
    above_s: float | None
    """Longest time above the range before the switch is open; None where no stage opens it, or nothing is above."""
    opens_itself: bool
    """Held in by these volts: below its range it opens without the relay."""
    held_losses: tuple[HeldLoss, ...]
    judged: str
    """How a feed out of its range is judged, in one sentence."""


@dataclass(frozen=True)
class SensingNeutral:
    """The relay's own neutral wire loose, its three inputs alike: what it then reads of a sound and a broken neutral.

    ``sound_*`` is the loaded sound network, ``broken_*`` the harmful state of most volts among the places seen.
    """

    sound_l_n_v: tuple[float, ...]
    sound_v0_v: float
    sound_operates: tuple[str, ...]
    broken_true_v: tuple[float, ...]
    broken_l_n_v: tuple[float, ...]
    broken_v0_v: float
    cleared: Share
    """Harmful states (nominal supply, places seen, both load models) still cleared in time."""
    cleared_before: Share
    """The same with the wire in place."""
    fed_l_n_v: tuple[float, ...] | None
    """What a relay fed from a line to the same terminal reads on the sound board, its star drawn to that line; None
    where it is fed otherwise."""
    fed_operates: tuple[str, ...]


@dataclass(frozen=True)
class Poles:
    """The switch: what its neutral pole does out of order, and what stays tied where only the lines open."""

    opens_neutral: bool
    spread_s: float
    """Spread of the poles taken."""
    early_v: float | None
    """Highest line-to-neutral volts behind the switch while its neutral pole alone is open; None where it has no
    cable of its own to compare with."""
    early_harmful: Share | None
    """Load states at nominal supply in which that harms within the spread itself."""
    after_pe_v: float | None
    """Largest volts of metalwork behind the switch to remote earth after it has opened, neutral still lost upstream,
    over the PENs that break where there are any; None where nothing is tied to earth, or nothing else is modelled."""
    not_modelled_at: tuple[str, ...]
    """Places of a broken PEN whose other users are not in the model: nothing there says what the metalwork carries."""


@dataclass(frozen=True)
class OwnLife:
    """All of it; no feeds where an auxiliary source feeds relay and coil."""

    feeds: tuple[FeedLife, ...]
    trip_fails: Share
    """Harmful states (nominal supply, places seen) in which supply or coil keeps the switch closed."""
    self_opening_fails: Share
    """The same with an output relay energised while healthy, and an undervoltage release on the coil's feed."""
    sensing: SensingNeutral | None
    poles: Poles
