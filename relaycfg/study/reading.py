"""What three line-to-neutral readings (and, if given, three line-to-line ones) say about neutral, lines and supply."""

from dataclasses import dataclass
from typing import Literal

import numpy as np

from relaycfg.model.geometry import FloatArray, three_phase
from relaycfg.model.reading import Cause, Reading
from relaycfg.study import reading_words as words

Volts3 = tuple[float, float, float]
Pattern = Literal["dead", "two lines low", "one line low", "lines uneven", "no fit", "shifted", "slight", "even"]

METER_SHARE = 0.01
"""Error of a hand meter allowed for in the band of the displacement (own choice)."""
SUPPLY_SHARE = 0.10
"""Half-width of the supply band assumed where no line-to-line volts are given (own choice, after EN 50160)."""
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
"""Source volts over nominal between which a supply is believed (own choice)."""


@dataclass(frozen=True)
class Shift:
    """A balanced source and the neutral position that give the three readings [V]."""

    source_v: float
    neutral_v: complex
    misfit_v: float


def read_meter(l_n: Volts3, l_l: Volts3 | None, nominal_v: float) -> Reading:
    """Judge readings [V] taken on one board at one time; ``nominal_v`` is line to neutral.

    A lost neutral behind a stiff source moves the neutral and nothing else: the mean square of the line-to-neutral
    volts is source squared plus displacement squared, and the differences of the squares say where the neutral is.
    Valid for three lines a third of a turn apart and RMS readings. Source: own algebra (circles about the source
    phasors).
    """
    volts = np.array(l_n, float)
    source_v = None if l_l is None else float(np.sqrt(np.mean(np.square(l_l)))) / three_phase().line_to_line_ratio
    shift = locate(volts, source_v)
    pattern = pattern_of(volts, l_l, nominal_v, shift)
    shown = shift if pattern in ("shifted", "slight", "even") else None
    low_v, high_v = _band(volts, shown, source_v, nominal_v)
    return Reading(
        l_n_v=l_n,
        l_l_v=l_l,
        nominal_v=nominal_v,
        source_v=None if shown is None else shown.source_v,
        source_from="the three readings themselves" if l_l is None else "the line-to-line readings",
        neutral_v=None if shown is None else shown.neutral_v,
        v0_low_v=low_v,
        v0_high_v=high_v,
        band_from="with a supply within 10 % of nominal and 1 % meter error" if l_l is None else "with 1 % meter error",
        load_shares=None if shown is None or pattern != "shifted" else _shares(shown),
        arithmetic=() if shown is None else _arithmetic(volts, shown),
        causes=_causes(pattern, volts, l_l, nominal_v, shown),
        check_first=_steps(pattern, volts, l_l, nominal_v),
        do_not=words.DO_NOT[pattern],
    )


def locate(volts: FloatArray, source_v: float | None) -> Shift | None:
    """Neutral position from three magnitudes [V]; the source's volts too where they are not given.

    Of the two sources that fit, the higher one: its neutral stands nearer to the star point. Where none fits, the
    nearest, with its misfit. None without any volts.
    """
    phasors = three_phase().phasors
    square = np.square(volts)
    mean_square = float(square.mean())
    moment = complex(-(phasors * square).mean())
    if source_v is None:
        root = max(0.0, mean_square**2 / 4 - abs(moment) ** 2)
        source_v = float(np.sqrt(mean_square / 2 + np.sqrt(root)))
    if source_v == 0:
        return None
    neutral_v = moment / source_v
    misfit_v = float(np.max(np.abs(np.abs(source_v * phasors - neutral_v) - volts)))
    return Shift(source_v, neutral_v, misfit_v)


def pattern_of(volts: FloatArray, l_l: Volts3 | None, nominal_v: float, shift: Shift | None) -> Pattern:
    """Which of the patterns the readings belong to."""
    absent = int((volts < ABSENT_SHARE * nominal_v).sum())
    if absent == len(volts):
        return "dead"
    uneven = l_l is not None and np.max(np.abs(np.array(l_l) / np.mean(l_l) - 1)) > EVEN_SHARE
    believed = shift is not None and PLAUSIBLE[0] <= shift.source_v / nominal_v <= PLAUSIBLE[1]
    fits = believed and shift is not None and shift.misfit_v <= EVEN_SHARE * nominal_v
    if shift is None or not fits or uneven:
        if absent:
            return "one line low" if absent == 1 else "two lines low"
        return "lines uneven" if uneven else "no fit"
    share = abs(shift.neutral_v) / nominal_v
    if share < SLIGHT_SHARE:
        return "even"
    return "slight" if share < SHIFTED_SHARE else "shifted"


def _band(
    volts: FloatArray, shift: Shift | None, source_v: float | None, nominal_v: float
) -> tuple[float | None, float | None]:
    """Lowest and highest displacement [V] that meter error and an unknown supply allow."""
    if shift is None:
        return None, None
    moment = abs(shift.neutral_v) * shift.source_v
    meter_v = 2 / 3 * METER_SHARE * float(volts.max())
    stiff = (shift.source_v, shift.source_v)
    highest, lowest = stiff if source_v else ((1 + SUPPLY_SHARE) * nominal_v, (1 - SUPPLY_SHARE) * nominal_v)
    return max(0.0, moment / highest - meter_v), moment / lowest + meter_v


def _shares(shift: Shift) -> Volts3 | None:
    """Resistive load on each line as a share of the whole; None where the neutral lies outside the triangle."""
    along = (shift.neutral_v * three_phase().phasors.conj()).real / shift.source_v
    first, second, third = (1 + 2 * along) / len(along)
    return None if min(first, second, third) < -SLIGHT_SHARE else (float(first), float(second), float(third))


def _arithmetic(volts: FloatArray, shift: Shift) -> tuple[str, ...]:
    size, squares = abs(shift.neutral_v), np.square(volts)
    return (
        f"mean of the squared readings {squares.mean():.0f}; "
        f"{shift.source_v:.1f} squared + {size:.1f} squared = {shift.source_v**2 + size**2:.0f} V2",
    )


def _steps(pattern: Pattern, volts: FloatArray, l_l: Volts3 | None, nominal_v: float) -> tuple[str, ...]:
    """What to check first; volts between lines are not asked for where they are given."""
    if pattern == "shifted" and _known(volts, l_l, nominal_v) == "supply may":
        return words.UNDECIDED_FIRST
    return tuple(step for step in words.CHECK_FIRST[pattern] if l_l is None or step != words.MEASURE_LINES)


def _known(volts: FloatArray, l_l: Volts3 | None, nominal_v: float) -> words.Known:
    """What the readings say about the lines themselves."""
    if l_l is not None:
        return "lines even"
    if volts.max() < (1 + SLIGHT_SHARE) * nominal_v:
        return "none high"
    as_even = abs(three_phase().phasors @ volts) / len(volts)
    return "supply may" if as_even < ALLOWED_SHARE * nominal_v else "lines unknown"


def _causes(
    pattern: Pattern, volts: FloatArray, l_l: Volts3 | None, nominal_v: float, shift: Shift | None
) -> tuple[Cause, ...]:
    causes = list(words.CAUSES[pattern])
    if pattern in ("shifted", "slight"):
        causes = list(words.SHIFTED_CAUSES[pattern, _known(volts, l_l, nominal_v)])
    if pattern == "one line low":
        causes = list(words.one_line_low(volts, l_l, EVEN_SHARE))
    if shift is not None:
        level = shift.source_v / nominal_v - 1
        if abs(level) > SUPPLY_SHARE:
            causes.insert(0 if pattern == "even" else len(causes), words.supply_level(shift.source_v, 100 * level))
    return tuple(causes)
