"""What meter readings of two or three lines on a board with a neutral mean."""

from dataclasses import dataclass


@dataclass(frozen=True)
class Cause:
    """One explanation of the readings: how sure (in words), and what speaks for or against it."""

    name: str
    confidence: str
    because: str


@dataclass(frozen=True)
class Reading:
    """A judged meter reading; figures that the readings do not allow are None.

    ``neutral_v`` is where the board's neutral stands against the source's star point [V], angle against the source
    volts of L1, for rotation L1-L2-L3 (its mirror image for the other). ``load_shares`` are the shares of a purely
    resistive load on each line that would put it there, summing to 1.
    """

    l_n_v: tuple[float, ...]
    l_l_v: tuple[float, ...] | None
    nominal_v: float
    source_v: float | None
    source_from: str
    neutral_v: complex | None
    v0_low_v: float | None
    v0_high_v: float | None
    band_from: str
    load_shares: tuple[float, ...] | None
    arithmetic: tuple[str, ...]
    causes: tuple[Cause, ...]
    check_first: tuple[str, ...]
    do_not: tuple[str, ...]

    @property
    def v0_v(self) -> float | None:
        """Magnitude of the displacement [V]."""
        return None if self.neutral_v is None else abs(self.neutral_v)
