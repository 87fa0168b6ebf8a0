"""Which pattern readings belong to: where the neutral stands, what the lines say; any number of readings at once."""

from dataclasses import dataclass
from typing import Literal, get_args

import numpy as np
from numpy.typing import NDArray

from relaycfg.model.geometry import BoolArray, ComplexArray, FloatArray, three_phase

Pattern = Literal["dead", "two lines low", "one line low", "lines uneven", "no fit", "shifted", "slight", "even"]
PATTERNS: tuple[Pattern, ...] = get_args(Pattern)
Known = Literal["lines even", "lines unknown", "none high", "supply may"]
"""What the readings say about the lines themselves, where the neutral looks moved."""
KNOWN: tuple[Known, ...] = get_args(Known)

ABSENT_SHARE = 0.2
"""Share of nominal below which a line counts as absent (own choice)."""
EVEN_SHARE = 0.03
"""Largest deviation from their mean of line-to-line volts that still count as even (own choice)."""
SLIGHT_SHARE, SHIFTED_SHARE = 0.03, 0.07
"""Displacement over nominal: below the first nothing is shown; a sound supply may reach the second (15 V at 230 V)."""
ALLOWED_SHARE = 0.087
"""Displacement over nominal, the lines taken as a third of a turn apart, that the supply itself may bring: 15 V from
207/253/253 V, inside EN 50160's +/-10 % of 230 V, and a little more (20 V; own choice)."""
PLAUSIBLE = (0.8, 1.2)
"""Source volts over nominal between which a supply with a moved neutral is believed (own choice)."""


@dataclass(frozen=True)
class Shifts:
    """A balanced source and the neutral position that give each of the readings [V]; arrays [readings]."""

    source_v: FloatArray
    neutral_v: ComplexArray
    misfit_v: FloatArray


def locate(volts: FloatArray, source_v: FloatArray | None) -> Shifts:
    """Neutral position from three magnitudes [readings, 3]; the source's volts too where they are not given.

    Of the two sources that fit, the higher one: its neutral stands nearer to the star point. Where none fits, the
    nearest, with its misfit. Source volts of 0: there is nothing to place.
    """
    phasors = three_phase().phasors
    square = np.square(volts)
    mean_square = square.mean(axis=-1)
    moment = -(square @ phasors) / len(phasors)
    if source_v is None:
        root = np.maximum(0.0, mean_square**2 / 4 - np.abs(moment) ** 2)
        source_v = np.sqrt(mean_square / 2 + np.sqrt(root))
    neutral_v = moment / np.where(source_v > 0, source_v, np.inf)
    fitted = np.abs(source_v[:, None] * phasors - neutral_v[:, None])
    return Shifts(source_v, neutral_v, np.abs(fitted - volts).max(axis=-1))


def even_lines(l_l: FloatArray) -> BoolArray:
    """Whether line-to-line volts [readings, 3] are even."""
    mean = l_l.mean(axis=-1, keepdims=True)
    spread = np.abs(l_l / np.where(mean > 0, mean, np.inf) - 1).max(axis=-1)
    even: BoolArray = spread <= EVEN_SHARE
    return even


def pattern_of(volts: FloatArray, l_l: FloatArray | None, nominal_v: float, shifts: Shifts) -> NDArray[np.intp]:
    """Position in ``PATTERNS`` of each reading [readings, 3]."""
    number = {name: k for k, name in enumerate(PATTERNS)}
    absent = (volts < ABSENT_SHARE * nominal_v).sum(axis=-1)
    uneven = np.zeros(len(volts), bool) if l_l is None else ~even_lines(l_l)
    level = shifts.source_v / nominal_v
    still = np.abs(shifts.neutral_v) < SLIGHT_SHARE * shifts.source_v
    believed = still | ((level >= PLAUSIBLE[0]) & (level <= PLAUSIBLE[1]))
    fits = believed & (shifts.misfit_v <= EVEN_SHARE * nominal_v) & ~uneven
    share = np.abs(shifts.neutral_v) / nominal_v
    return np.select(
        [
            absent == volts.shape[-1],
            ~fits & (absent == 1),
            ~fits & (absent > 1),
            ~fits & uneven,
            ~fits,
            share < SLIGHT_SHARE,
            share < SHIFTED_SHARE,
        ],
        [
            number["dead"],
            number["one line low"],
            number["two lines low"],
            number["lines uneven"],
            number["no fit"],
            number["even"],
            number["slight"],
        ],
        number["shifted"],
    )


def known_of(volts: FloatArray, l_l: FloatArray | None, nominal_v: float) -> NDArray[np.intp]:
    """Position in ``KNOWN`` of each reading [readings, 3]."""
    if l_l is not None:
        return np.full(len(volts), KNOWN.index("lines even"))
    as_even = np.abs(volts @ three_phase().phasors) / volts.shape[-1]
    return np.select(
        [volts.max(axis=-1) < (1 + SLIGHT_SHARE) * nominal_v, as_even < ALLOWED_SHARE * nominal_v],
        [KNOWN.index("none high"), KNOWN.index("supply may")],
        KNOWN.index("lines unknown"),
    )
