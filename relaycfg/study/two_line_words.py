"""Causes, first checks and cautions that go with each pattern of two readings."""

from typing import Literal

from relaycfg.model.geometry import Geometry
from relaycfg.model.reading import Cause
from relaycfg.study import reading_words as words
from relaycfg.study.reading_words import FAULT, KEEP_AWAY, LOST, PROVE_TESTER, TIME_TELLS

Pattern = Literal["dead", "one line low", "other system", "no fit", "either", "shifted", "slight", "even"]

SUPPLY_SHARE = 0.10
"""A supply farther from nominal is named as a cause (own choice, as for three lines)."""

MEASURE_BETWEEN = "Measure the volts between the lines too: with them the readings say where the neutral stands."
LINE_FIRST = (PROVE_TESTER, MEASURE_BETWEEN, words.FUSES, words.CALL)
NEUTRAL_FIRST = (KEEP_AWAY, words.OPEN_LINES, MEASURE_BETWEEN, PROVE_TESTER, words.CALL, words.AFTERWARDS)
CHECK_FIRST: dict[Pattern, tuple[str, ...]] = {
    "dead": words.CHECK_FIRST["dead"],
    "one line low": LINE_FIRST,
    "other system": ("Find out which service this is, from the transformer or the operator.", PROVE_TESTER),
    "no fit": (PROVE_TESTER, "Repeat all readings at one time, true RMS, with the load steady.", KEEP_AWAY),
    "either": (KEEP_AWAY, MEASURE_BETWEEN, PROVE_TESTER, words.LOAD_IT, words.CALL),
    "shifted": NEUTRAL_FIRST,
    "slight": (words.LOAD_IT, MEASURE_BETWEEN, PROVE_TESTER, words.CALL),
    "even": words.CHECK_FIRST["even"],
}
DO_NOT: dict[Pattern, tuple[str, ...]] = {
    "dead": words.DO_NOT["dead"],
    "one line low": words.DO_NOT["one line low"],
    "other system": words.DO_NOT["no fit"],
    "no fit": words.DO_NOT["no fit"],
    "either": words.DO_NOT["shifted"],
    "shifted": words.DO_NOT["shifted"],
    "slight": words.DO_NOT["slight"],
    "even": words.DO_NOT["even"],
}


def causes(
    pattern: Pattern,
    l_n: tuple[float, float],
    l_l: float | None,
    geometry: Geometry,
    nominal_v: float,
    source_v: float | None,
) -> tuple[Cause, ...]:
    """Causes of a pattern, the likeliest first; ``source_v`` where the readings place the source."""
    found = list(_causes(pattern, l_n, l_l, geometry, nominal_v))
    level = 0.0 if source_v is None else source_v / nominal_v - 1
    if source_v is not None and abs(level) > SUPPLY_SHARE:
        found.insert(0 if pattern == "even" else len(found), words.supply_level(source_v, 100 * level))
    return tuple(found)


def _causes(
    pattern: Pattern, l_n: tuple[float, float], l_l: float | None, geometry: Geometry, nominal_v: float
) -> tuple[Cause, ...]:
    if pattern == "even" and not geometry.has_displacement:
        return (Cause("healthy", "no finding", "a lost neutral would put the loads in series across the two lines"),)
    if pattern in ("dead", "even"):
        return words.CAUSES[pattern]
    if pattern == "one line low":
        return _one_line_low(l_n, l_l, nominal_v)
    if pattern == "shifted":
        return _shifted(l_l, geometry)
    return _OTHERS[pattern] if pattern != "other system" else (_other_system(geometry),)


def _shifted(l_l: float | None, geometry: Geometry) -> tuple[Cause, ...]:
    fault = Cause(FAULT, "unlikely", TIME_TELLS)
    if l_l is not None:
        return Cause(LOST, "very likely", "the volts between the lines are as they should be: only N has moved"), fault
    if geometry.has_displacement:
        because = "one line is high by about what the other is low: both in series across the volts between them"
        weak = Cause(words.UNEVEN, "less likely", "the volts between the lines tell")
        return Cause(LOST, "likely", because), weak, fault
    because = "the two add up to the usual volts between the lines, as loads in series do"
    return Cause(LOST, "likely", because), Cause(words.UNEVEN, "less likely", "the volts between them tell"), fault


_OTHERS: dict[str, tuple[Cause, ...]] = {
    "slight": words.SHIFTED_CAUSES["slight", "lines even"],
    "either": (
        Cause("a low supply, neutral sound", "possible", "both lines are inside the usual band"),
        Cause(LOST, "possible", "the two also add up to the usual volts between the lines, as loads in series do"),
    ),
    "no fit": (
        Cause(
            "readings that do not belong together",
            "likely",
            "no source of plausible volts has a point at these distances: taken one after another, wrong terminal, "
            "wrong nominal volts or another system",
        ),
        Cause("a line weak or lost", "possible", "the volts between the lines tell"),
    ),
}


def _other_system(geometry: Geometry) -> Cause:
    """Sound volts of the two-line system that was not asked for."""
    if geometry.has_displacement:
        return Cause(
            "two lines of a star, not split phase",
            "likely",
            "the volts between the lines are 1.73 times each, not twice",
        )
    return Cause(
        "split phase, not two lines of a star", "likely", "the volts between the lines are twice each, not 1.73"
    )


def _one_line_low(l_n: tuple[float, float], l_l: float | None, nominal_v: float) -> tuple[Cause, ...]:
    """Causes where one line reads next to nothing and the other does not carry the volts between both."""
    low, high = sorted((0, 1), key=lambda k: l_n[k])
    line = f"L{low + 1}"
    lost, fuse = f"{line} lost on the supply side", f"sensing fuse or test lead of {line} open"
    also = Cause("neutral lost as well", "possible", "the absent line hides it; judge again once it is back")
    if l_l is None:
        unknown = "the volts between the lines tell: usual ones mean the fuse or lead, low ones the line"
        return Cause(lost, "possible", unknown), Cause(fuse, "possible", unknown), also
    if abs(l_l - l_n[high]) <= abs(l_l - l_n[high] - nominal_v):
        return Cause(lost, "very likely", "the volts between the lines are those of the other line alone"), also
    return Cause(fuse, "very likely", "the volts between the lines are usual, so the line itself is there"), also
