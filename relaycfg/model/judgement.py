"""Yardsticks of our own that words and tests of a result rest on; no key of a file changes them."""

from dataclasses import dataclass


@dataclass(frozen=True)
class Unsteady:
    """Figures of loads that drop out, stall, fail or are switched while the neutral is lost; neutral: none of it."""

    electronic_share: float = 1.0
    """Share of electronic load behind a break above which a stage has to trip in the fluctuating course."""
    band_edge_pu: tuple[float, float] | None = None
    """Range of the lower band edge of electronic load."""
    switching_s: float = float("inf")
    """Mean time from one switching on of a load to its next."""
    step_percent: float = 0.0
    """Change of a line's volts, of nominal, that is counted."""
    stall_after_s: float = 0.0
    stall_trip_s: tuple[float, float] = (float("inf"), float("inf"))
    """A stalled motor's own protection takes it off after so long: shortest, longest."""


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
    hot_joint_w: float = float("inf")
    """Watts from which a joint counts as hot."""
    unsteady: Unsteady = Unsteady()
    reconnect_shown_s: float = 0.0
    """Wait taken to show what closing again by itself would do."""
    dip_shown_pu: float = 1.0
    """Residual volts of the dips shown beside a lost neutral."""
    high_shown_pu: float = 1.0
    """Supply over nominal shown beside a lost neutral."""
