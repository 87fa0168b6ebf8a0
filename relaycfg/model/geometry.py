"""The lines of a supply and the angles of their voltages: the only place where their number and angles stand."""

from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

ComplexArray = NDArray[np.complexfloating[Any, Any]]
FloatArray = NDArray[np.floating[Any]]
BoolArray = NDArray[np.bool_]


@dataclass(frozen=True)
class Geometry:
    """Line names and the angle of each line-to-neutral source voltage [degrees].

    Arrays elsewhere have one column a line, in the order of ``names``; line-to-line arrays follow ``pairs``.
    """

    names: tuple[str, ...]
    angles_deg: tuple[float, ...]

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

    def line_to_line(self, l_n: ComplexArray) -> ComplexArray:
        """Line-to-line phasors from line-to-neutral ones; lines are the last axis of both."""
        first = [i for i, _ in self.pairs]
        second = [j for _, j in self.pairs]
        return l_n[..., first] - l_n[..., second]

    def sequences(self, l_n: ComplexArray) -> tuple[ComplexArray, ComplexArray, ComplexArray]:
        """V0, V1, V2 of line-to-neutral phasors (lines last). Source: symmetrical components, definition."""
        return (
            l_n.mean(axis=-1),
            (l_n * self.phasors.conj()).mean(axis=-1),
            (l_n * self.phasors).mean(axis=-1),
        )


def three_phase(phase_order: str = "L1-L2-L3") -> Geometry:
    """Three lines a third of a turn apart; ``phase_order`` L1-L3-L2 turns the other way."""
    lag = -120.0 if phase_order == "L1-L2-L3" else 120.0
    return Geometry(("L1", "L2", "L3"), (0.0, lag, -lag))
