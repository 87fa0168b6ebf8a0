"""Yardsticks of our own that words and tests of a result rest on; no key of a file changes them."""

from dataclasses import dataclass


@dataclass(frozen=True)
class Judgement:
    """Own choices handed in from the tables; a site made by hand has the neutral ones below, which allow nothing."""

    balanced_pu: float = 0.0
    """Displacement over nominal below which a load behind a break is called balanced."""
    test_beyond: float = 1.0
    """Level at which a delay is tested, over the pickup (27: under it)."""
    margin_cap_units: float = 0.0
    """Security margin up to which stages are raised."""
    cover_kept: float = 1.0
    """Share of an element's greatest cover that is kept while stages are saved and margins raised."""
    deadline_kept_units: float = 0.0
    """Most units of time kept towards the deadlines of the core while margins are raised."""
    inhibit_s: float = 0.0
    """Start-up inhibit that derived settings ask for."""
