"""The lines of a supply and the angles of their voltages: the only place where their number and angles stand."""

from dataclasses import dataclass
from functools import cached_property
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

ComplexArray = NDArray[np.complexfloating[Any, Any]]
FloatArray = NDArray[np.floating[Any]]
BoolArray = NDArray[np.bool_]
System = Literal["3ph-4w", "1ph-3w", "2ph-3w"]
"""Three lines of a star; split phase, two legs of one winding; two lines of a star; each with its neutral."""

ADDS_TO_NOTHING = 1e-9
"""Sum of unit phasors that is rounding only."""


@dataclass(frozen=True)
class Geometry:
    """Line names and the angle of each line-to-neutral source voltage [degrees].

    Arrays elsewhere have one column a line, in the order of ``names``; line-to-line arrays follow ``pairs``.
    """

    names: tuple[str, ...]
    angles_deg: tuple[float, ...]
    source_lines: int | None = None
    """Lines of the source, where the site takes only some of them (two lines of a star: three)."""

    @cached_property
    def windings(self) -> int:
        """Windings that the source's rating is of, and that share its neutral."""
        return self.source_lines or len(self.names)

    @cached_property
    def phasors(self) -> ComplexArray:
        """Unit phasor of each line's source voltage, shape [lines]."""
        phasors: ComplexArray = np.exp(1j * np.deg2rad(np.array(self.angles_deg)))
        return phasors

    @cached_property
    def pairs(self) -> tuple[tuple[int, int], ...]:
        """Line index pairs in the order L1-L2, L2-L3, L3-L1 (two lines: the one pair)."""
        count = len(self.names)
        return tuple((k, (k + 1) % count) for k in range(count if count > 2 else count - 1))

    @cached_property
    def pair_names(self) -> tuple[str, ...]:
        """Names of ``pairs``, such as L1-L2."""
        return tuple(f"{self.names[i]}-{self.names[j]}" for i, j in self.pairs)

    @cached_property
    def line_to_line_ratio(self) -> float:
        """Line-to-line over line-to-neutral voltage of the sound source (sqrt 3 for three lines)."""
        i, j = self.pairs[0]
        return float(abs(self.phasors[i] - self.phasors[j]))

    @cached_property
    def of_star(self) -> bool:
        """Whether the source is a star with three lines, of which the site may take two."""
        return self.windings > 2

    @cached_property
    def base_ratio(self) -> float:
        """Volts whose square over the source's rating is the base impedance of a line, over line-to-neutral volts.

        Own algebra: a rating of n windings is n U0 I, so U0 / I = n U0^2 / S. Line to line for three lines.
        """
        return float(np.sqrt(self.windings))

    @cached_property
    def has_displacement(self) -> bool:
        """Whether the volts of a sound source add to nothing: only then is their mean the neutral's displacement.

        Two lines of a star 120 degrees apart have a mean of half of U0 with nothing broken.
        """
        return bool(abs(self.phasors.sum()) < ADDS_TO_NOTHING)

    @cached_property
    def has_sequences(self) -> bool:
        """Whether positive and negative sequence can be told apart: it takes three lines."""
        return len(self.names) > 2

    def displacement(self, l_n: ComplexArray) -> ComplexArray:
        """V0 of line-to-neutral phasors (lines last), the mean of them; nan where the system has no displacement."""
        mean: ComplexArray = l_n.mean(axis=-1)
        return mean if self.has_displacement else np.full_like(mean, np.nan)

    def neutral_shift(self, l_n: ComplexArray) -> ComplexArray:
        """The neutral against the star of a source with even lines, from line-to-neutral phasors (lines last).

        Minus V0 where there is one. Of two lines, the volts between them say where the star is: E1 - E2 = V1 - V2.
        Source: own algebra; valid as far as the lines are even, so that an uneven source looks like a shift.
        """
        shift: ComplexArray = -l_n.mean(axis=-1)
        if not self.has_displacement:
            i, j = self.pairs[0]
            shift = shift + (l_n[..., i] - l_n[..., j]) * self.phasors.mean() / (self.phasors[i] - self.phasors[j])
        return shift

    def line_to_line(self, l_n: ComplexArray) -> ComplexArray:
        """Line-to-line phasors from line-to-neutral ones; lines are the last axis of both."""
        first = [i for i, _ in self.pairs]
        second = [j for _, j in self.pairs]
        return l_n[..., first] - l_n[..., second]

    def sequences(self, l_n: ComplexArray) -> tuple[ComplexArray, ComplexArray, ComplexArray]:
        """V0, V1, V2 of line-to-neutral phasors (lines last). Source: symmetrical components, definition.

        V0 and V2 mean what they say only where the system ``has_displacement`` and ``has_sequences``; V1 is the mean
        of the lines' volts turned to the first one, in any system.
        """
        return (
            l_n.mean(axis=-1),
            (l_n * self.phasors.conj()).mean(axis=-1),
            (l_n * self.phasors).mean(axis=-1),
        )


def three_phase(phase_order: str = "L1-L2-L3") -> Geometry:
    """Three lines a third of a turn apart; ``phase_order`` L1-L3-L2 turns the other way."""
    lag = -120.0 if phase_order == "L1-L2-L3" else 120.0
    return Geometry(("L1", "L2", "L3"), (0.0, lag, -lag))


def split_phase() -> Geometry:
    """Two legs of one centre-tapped winding, half a turn apart: 120/240 V."""
    return Geometry(("L1", "L2"), (0.0, 180.0))


def two_of_star(phase_order: str = "L1-L2-L3") -> Geometry:
    """Two lines of a star with three and its neutral: 120/208 V."""
    star = three_phase(phase_order)
    return Geometry(star.names[:2], star.angles_deg[:2], len(star.names))


def geometry_of(system: System, phase_order: str = "L1-L2-L3") -> Geometry:
    """The lines of a kind of system; split phase has no order of its lines."""
    if system == "1ph-3w":
        return split_phase()
    return three_phase(phase_order) if system == "3ph-4w" else two_of_star(phase_order)
