"""What three line-to-neutral readings (and, if given, three line-to-line ones) say about neutral, lines and supply."""

from dataclasses import dataclass

import numpy as np

from relaycfg.model.geometry import FloatArray, three_phase
from relaycfg.model.reading import Cause, Reading
from relaycfg.study import reading_patterns as patterns
from relaycfg.study import reading_words as words
from relaycfg.study.reading_patterns import EVEN_SHARE, SLIGHT_SHARE, Known, Pattern

Volts3 = tuple[float, float, float]

METER_SHARE = 0.01
"""Error of a hand meter allowed for in the band of the displacement (own choice)."""
SUPPLY_SHARE = 0.10
"""Half-width of the supply band assumed where no line-to-line volts are given (own choice, after EN 50160)."""


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
    pattern = _pattern(volts, l_l, nominal_v)
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
    """One reading [3] placed by ``reading_patterns.locate``; None without any volts."""
    given = None if source_v is None else np.array([source_v])
    found = patterns.locate(volts[None], given)
    if found.source_v[0] == 0:
        return None
    return Shift(float(found.source_v[0]), complex(found.neutral_v[0]), float(found.misfit_v[0]))


def first_causes(l_n: FloatArray, l_l: FloatArray | None, nominal_v: float) -> list[str]:
    """The first cause ``read_meter`` names for each of many readings [readings, 3].

    Readings that agree in all that the first cause depends on are judged once.
    """
    source_v = None if l_l is None else np.sqrt(np.square(l_l).mean(axis=-1)) / three_phase().line_to_line_ratio
    shifts = patterns.locate(l_n, source_v)
    keys = np.stack(
        [
            patterns.pattern_of(l_n, l_l, nominal_v, shifts),
            patterns.known_of(l_n, l_l, nominal_v),
            np.ones(len(l_n), int) if l_l is None else patterns.even_lines(l_l),
            np.argmin(l_n, axis=-1),
            np.abs(shifts.source_v / nominal_v - 1) > SUPPLY_SHARE,
            shifts.source_v > nominal_v,
        ],
        axis=-1,
    )
    _, first, kind = np.unique(keys, axis=0, return_index=True, return_inverse=True)
    names = []
    for k in first:
        lines = None if l_l is None else _volts3(l_l[k])
        names.append(read_meter(_volts3(l_n[k]), lines, nominal_v).causes[0].name)
    return [names[k] for k in kind.ravel()]


def _volts3(values: FloatArray) -> Volts3:
    first, second, third = (float(v) for v in values)
    return first, second, third


def _pattern(volts: FloatArray, l_l: Volts3 | None, nominal_v: float) -> Pattern:
    """Which of the patterns one reading belongs to."""
    lines = None if l_l is None else np.array([l_l])
    source_v = None if lines is None else np.sqrt(np.square(lines).mean(axis=-1)) / three_phase().line_to_line_ratio
    shifts = patterns.locate(volts[None], source_v)
    return patterns.PATTERNS[int(patterns.pattern_of(volts[None], lines, nominal_v, shifts)[0])]


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


def _known(volts: FloatArray, l_l: Volts3 | None, nominal_v: float) -> Known:
    """What the readings say about the lines themselves."""
    lines = None if l_l is None else np.array([l_l])
    return patterns.KNOWN[int(patterns.known_of(volts[None], lines, nominal_v)[0])]


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
