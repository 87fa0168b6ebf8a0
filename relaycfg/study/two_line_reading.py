"""What two line-to-neutral readings (and, if given, the volts between the lines) say: split phase, two of a star."""

from dataclasses import dataclass
from itertools import product

import numpy as np

from relaycfg.model.geometry import Geometry, System, geometry_of, split_phase, three_phase, two_of_star
from relaycfg.model.reading import Reading
from relaycfg.study import two_line_words as words
from relaycfg.study.reading import read_meter
from relaycfg.study.reading_patterns import ABSENT_SHARE, EVEN_SHARE, PLAUSIBLE, SHIFTED_SHARE, SLIGHT_SHARE
from relaycfg.study.two_line_words import Pattern

Volts2 = tuple[float, float]

METER_SHARE = 0.01
"""Error of a hand meter (own choice, as for three lines)."""
SUPPLY_SHARE = 0.10
"""Half-width of the supply band assumed where the volts between the lines are not given (own choice)."""
OTHER_SHARE = 0.05
"""How near to the ratio of the other two-line system sound readings have to be to look like it (own choice)."""


@dataclass(frozen=True)
class Place:
    """A source with even lines and the neutral's place that give the readings [V]; ``misfit_v``: what is left over."""

    source_v: float
    neutral_v: complex
    misfit_v: float


def read_board(l_n: tuple[float, ...], l_l: tuple[float, ...] | None, system: System, nominal_v: float) -> Reading:
    """Judge the readings [V] of a board of any system; ``l_l`` has one voltage of two lines and three of three."""
    if len(l_n) == len(three_phase().names):
        return read_meter(_three(l_n), None if l_l is None else _three(l_l), nominal_v)
    first, second = l_n
    return read_two_lines((first, second), None if l_l is None else l_l[0], geometry_of(system), nominal_v)


def _three(volts: tuple[float, ...]) -> tuple[float, float, float]:
    first, second, third = volts
    return first, second, third


def read_two_lines(l_n: Volts2, l_l: float | None, geometry: Geometry, nominal_v: float) -> Reading:
    """Judge readings [V] taken on one board at one time; ``nominal_v`` is line to neutral.

    Volts of both lines and between them are the three sides of a triangle with the neutral at its tip. Without the
    third side, the neutral of split phase is taken on the straight line between the legs, where loads of one angle
    put it; two lines of a star are then judged, but not placed: a sound neutral is not on that line.
    """
    given = None if l_l is None else place(l_n, l_l, geometry)
    assumed = place(l_n, sum(l_n), geometry)
    pattern = pattern_of(l_n, l_l, geometry, nominal_v, given or assumed)
    located = given if given is not None or not geometry.has_displacement else assumed
    shown = located if pattern in ("shifted", "slight", "even") else None
    low_v, high_v = (None, None) if shown is None else _band(l_n, l_l, geometry, nominal_v)
    between = "the volts between the lines" if l_l is not None else "the two readings, the neutral straight between"
    return Reading(
        l_n_v=l_n,
        l_l_v=None if l_l is None else (l_l,),
        nominal_v=nominal_v,
        source_v=None if shown is None else shown.source_v,
        source_from=between,
        neutral_v=None if shown is None else shown.neutral_v,
        v0_low_v=low_v,
        v0_high_v=high_v,
        band_from="with 1 % meter error"
        if l_l is not None
        else "with a supply within 10 % of nominal, 1 % meter error",
        load_shares=_shares(l_n, sum(l_n) if l_l is None else l_l) if shown and pattern == "shifted" else None,
        arithmetic=() if shown is None else _arithmetic(l_n, shown, geometry),
        causes=words.causes(pattern, l_n, l_l, geometry, nominal_v, shown.source_v if shown else None),
        check_first=tuple(s for s in words.CHECK_FIRST[pattern] if l_l is None or s != words.MEASURE_BETWEEN),
        do_not=words.DO_NOT[pattern],
    )


def place(l_n: Volts2, between_v: float, geometry: Geometry) -> Place:
    """Where the neutral stands: the tip of the triangle of the readings, against the star of the source.

    Of the two tips the one nearer to the star. Where the sides close no triangle, the tip lies on the line between
    and what is missing is the misfit. Source: own algebra (law of cosines).
    """
    first, second = l_n
    source_v = between_v / geometry.line_to_line_ratio
    if between_v == 0:
        return Place(0.0, 0j, max(l_n))
    corners = source_v * geometry.phasors[:2]
    middle, across = corners.mean(), (corners[0] - corners[1]) / between_v
    along_v = (second**2 - first**2) / (2 * between_v)
    aside_v = float(np.sqrt(max(0.0, first**2 - (between_v / 2 - along_v) ** 2)))
    up = 1j * across
    towards = -1.0 if (middle.conjugate() * up).real > 0 else 1.0
    misfit_v = max(0.0, between_v - first - second, abs(first - second) - between_v)
    return Place(source_v, complex(middle + along_v * across + towards * aside_v * up), misfit_v)


def pattern_of(l_n: Volts2, l_l: float | None, geometry: Geometry, nominal_v: float, found: Place) -> Pattern:
    """Which of the patterns the readings belong to."""
    absent = sum(v < ABSENT_SHARE * nominal_v for v in l_n)
    if absent == len(l_n):
        return "dead"
    sound = all(abs(v / nominal_v - 1) <= SUPPLY_SHARE for v in l_n)
    if l_l is None and not geometry.has_displacement:
        lost = abs(found.source_v / nominal_v - 1) <= SUPPLY_SHARE
        if lost or sound:
            return "either" if lost and sound else "shifted" if lost else "even"
        return "one line low" if absent else "no fit"
    if l_l is not None and sound and abs(l_l / np.mean(l_n) / _other(geometry).line_to_line_ratio - 1) < OTHER_SHARE:
        return "other system"
    believed = PLAUSIBLE[0] <= found.source_v / nominal_v <= PLAUSIBLE[1]
    if not believed or found.misfit_v > EVEN_SHARE * nominal_v:
        return "one line low" if absent else "no fit"
    share = abs(found.neutral_v) / nominal_v
    if share < SLIGHT_SHARE:
        return "even"
    return "slight" if share < SHIFTED_SHARE else "shifted"


def _other(geometry: Geometry) -> Geometry:
    """The two-line system that this is not."""
    return two_of_star() if geometry.has_displacement else split_phase()


def _band(l_n: Volts2, l_l: float | None, geometry: Geometry, nominal_v: float) -> tuple[float, float]:
    """Lowest and highest displacement [V] that meter error and an unknown supply allow.

    Every reading is moved by its error both ways. Without the volts between the lines those of a supply inside the
    assumed band are tried too, as far as the two readings reach them.
    """
    between = (sum(l_n), max(2 * (1 - SUPPLY_SHARE) * nominal_v, abs(l_n[0] - l_n[1]))) if l_l is None else (l_l,)
    ends = (1 - METER_SHARE, 1.0, 1 + METER_SHARE)
    sizes = [
        abs(place((first * l_n[0], second * l_n[1]), min(third * across, sum(l_n) * ends[-1]), geometry).neutral_v)
        for across in between
        for first, second, third in product(ends, repeat=3)
    ]
    return min(sizes), max(sizes)


def _shares(l_n: Volts2, between_v: float) -> tuple[float, ...] | None:
    """Resistive load on each line as a share of both; None where the neutral stands off the line between them."""
    if sum(l_n) - between_v > EVEN_SHARE * between_v:
        return None
    return l_n[1] / sum(l_n), l_n[0] / sum(l_n)


def _arithmetic(l_n: Volts2, shown: Place, geometry: Geometry) -> tuple[str, ...]:
    if not geometry.has_displacement:
        return ()
    size, squares = abs(shown.neutral_v), float(np.mean(np.square(l_n)))
    return (
        f"mean of the squared readings {squares:.0f}; "
        f"{shown.source_v:.1f} squared + {size:.1f} squared = {shown.source_v**2 + size**2:.0f} V2",
    )
