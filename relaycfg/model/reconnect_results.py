"""What happens after a trip: volts that look healthy without load, pumping, and what must hold before closing again."""

from dataclasses import dataclass
from typing import Literal

from relaycfg.model.break_results import Share


@dataclass(frozen=True)
class Pumping:
    """One break place, begun in one state and closed again and again by itself for an hour."""

    at: str
    start: Literal["worst", "median"]
    """Of the harmful states that are tripped, by their highest volts."""
    state: int
    """Number of the sampled state."""
    highest_v: float
    first_stage: str
    trip_s: float
    """Longest time from closing to the open switch in that state."""
    looks_healthy: bool
    """Whether the volts at the relay let every stage drop out once the switch is open; else it never closes again."""
    alike_per_hour: float
    """Trips an hour where the same loads come back each time."""
    chance_per_hour: float
    """Median trips in the hour where loads come back by chance."""
    chance_most: int
    harmful_closings: float
    """Median closings onto a state that harms."""
    on_voltage_s: float
    """Median seconds in the hour, switch closed on a state that harms."""
    ends: dict[str, int]
    """How the courses end: hour over, locked out, stays open, left connected unseen; they add up to all of them."""


@dataclass(frozen=True)
class Condition:
    """One condition of closing again by itself, and how far it is met here."""

    asks: str
    met: Literal["yes", "no", "not known"]
    because: str


@dataclass(frozen=True)
class Reconnection:
    """Judgement of closing again after a trip."""

    set_to: Literal["by hand", "automatic"]
    wait_s: float
    """As set, or taken to show what closing by itself would do."""
    attempts: int | None
    """Closings before it locks out; None without limit."""
    courses: int
    looks_healthy: Share
    """Tripped states (nominal supply, places seen) in which the volts look healthy once the switch is open."""
    v0_stayed: Share
    """Tripped states in which the displacement stayed below its pickup, so that it alone would not forbid closing."""
    fooled: Share
    """Those of all tripped scenarios in which also the volts between lines moved with the others: both checks met."""
    pumping: tuple[Pumping, ...]
    conditions: tuple[Condition, ...]

    @property
    def allowed(self) -> bool:
        """Whether every condition is known to be met; closing by hand is asked for otherwise."""
        return all(c.met == "yes" for c in self.conditions)

    @property
    def most_per_hour(self) -> float:
        """Most trips an hour over places and states, the same loads coming back."""
        return max((p.alike_per_hour for p in self.pumping), default=0.0)
