"""Causes, first checks and cautions that go with each pattern of meter readings."""

import numpy as np

from relaycfg.model.geometry import FloatArray
from relaycfg.model.reading import Cause
from relaycfg.study.reading_patterns import Known

TIME_TELLS = "it would be cleared within seconds; a lasting reading rules it out"
NEUTRAL_SOUND = "without displacement the readings cannot tell a sound neutral from a lost one under equal loads"

LOST = "lost or loose neutral, source side of this board"
FAULT = "short circuit from a line to neutral"
UNEVEN = "lines uneven in the supply, neutral sound"
WEAK = "one line weak or overloaded, neutral sound"

SHIFTED_CAUSES: dict[tuple[str, Known], tuple[Cause, ...]] = {
    ("shifted", "lines even"): (
        Cause(LOST, "very likely", "the volts between lines are even: only N has moved"),
        Cause(FAULT, "unlikely", TIME_TELLS),
    ),
    ("shifted", "lines unknown"): (
        Cause(LOST, "likely", "all three fit one moved neutral and a usual source"),
        Cause(WEAK, "less likely", "even volts between lines rule it out"),
        Cause(FAULT, "unlikely", TIME_TELLS),
    ),
    ("shifted", "none high"): (
        Cause(WEAK, "possible", "no reading is high"),
        Cause(LOST, "possible", "even volts between lines prove it"),
        Cause(FAULT, "unlikely", TIME_TELLS),
    ),
    ("shifted", "supply may"): (
        Cause(LOST, "possible", "all three fit one moved neutral; even volts between lines would decide for it"),
        Cause(UNEVEN, "possible", "a public supply may differ so much by line; uneven ones would decide for it"),
        Cause(FAULT, "unlikely", TIME_TELLS),
    ),
    ("slight", "lines even"): (
        Cause(
            "healthy, with the usual drop in the neutral or a displacement from the network",
            "possible",
            "the shift is small",
        ),
        Cause(
            "lost neutral with nearly equal loads, or a loose joint",
            "possible",
            "it grows when a large load on one line is switched",
        ),
    ),
}
for _known in ("lines unknown", "none high", "supply may"):
    SHIFTED_CAUSES["slight", _known] = SHIFTED_CAUSES["slight", "lines even"]

CAUSES = {
    "dead": (Cause("no supply, or a tester that does not work", "very likely", "nothing to judge the neutral by"),),
    "two lines low": (
        Cause("two lines lost, or their sensing fuses open", "likely", "one line alone is fed"),
        Cause("neutral lost as well", "possible", "with one line fed nothing shows it"),
    ),
    "one line low": (),
    "lines uneven": (
        Cause(
            "a line weak, lost or fed backwards through motors",
            "likely",
            "volts between lines are uneven; a lost neutral leaves them even",
        ),
        Cause("neutral lost as well", "possible", "judge it again once the lines are even"),
    ),
    "no fit": (
        Cause(
            "readings that do not belong together",
            "likely",
            "no even source of plausible volts has a point at these three distances: "
            "taken one after another, wrong terminal, wrong nominal volts",
        ),
        Cause("a line weak or fed backwards through motors", "possible", "the volts between lines tell"),
    ),
    "shifted": (),
    "slight": (),
    "even": (Cause("healthy, or balanced", "no finding", NEUTRAL_SOUND),),
}

PROVE_TESTER = "Prove the tester before and after; stray volts fool an instrument that draws no current."
MEASURE_LINES = "Measure the three volts between lines: even ones speak for the neutral, uneven ones for a line."
LINES_DECIDE = (
    "Measure the three volts between lines, they decide: even ones mean the neutral, then open the lines of this "
    "board; uneven ones mean the supply."
)
KEEP_AWAY = "Keep off metalwork: where earth and neutral are joined it may be live, even with lines open."
OPEN_LINES = "Open the lines of this board, equipment is at risk; then look for the break towards the source."
CALL = "Call the network operator if the break may lie in the service or beyond it."
AFTERWARDS = "After repair prove the neutral dead (ohms), then under a test load, before equipment goes back on."
LOAD_IT = "Switch a large load on one line on and off: volts that move against each other betray a poor neutral."
LOADED = "A healthy reading without load proves nothing: repeat it with a large load on one line."
FUSES = "Check sensing fuses and test leads of the low line, then its supply fuse or conductor upstream."

NEUTRAL_FIRST = (KEEP_AWAY, OPEN_LINES, PROVE_TESTER, CALL, AFTERWARDS)
LINE_FIRST = (
    PROVE_TESTER,
    MEASURE_LINES,
    FUSES,
    "Treat the neutral as unproved until the lines are back and even.",
    CALL,
)
UNDECIDED_FIRST = (KEEP_AWAY, LINES_DECIDE, PROVE_TESTER, LOAD_IT, CALL)
"""A shift that the supply itself may bring, as long as the volts between lines are not known."""
CHECK_FIRST = {
    "dead": (PROVE_TESTER, "Measure again on the supply side; until then treat every conductor, neutral too, as live."),
    "two lines low": LINE_FIRST,
    "one line low": LINE_FIRST,
    "lines uneven": LINE_FIRST,
    "no fit": (PROVE_TESTER, "Repeat all six readings at one time, true RMS, with the load steady.", KEEP_AWAY),
    "shifted": (*NEUTRAL_FIRST[:2], MEASURE_LINES, *NEUTRAL_FIRST[2:]),
    "slight": (LOAD_IT, MEASURE_LINES, PROVE_TESTER, CALL),
    "even": (LOADED, LOAD_IT, PROVE_TESTER),
}

NO_RESET = "Do not reset or reclose until the neutral is proved, dead and under load."
NO_OPENING = "Do not open a neutral on a live loaded board, not even as a test: lines open first and close last."
NO_ROD = "Do not switch a PEN, and do not count on an earth electrode in place of the neutral."
NO_TRUST = "Do not conclude that people are protected: these volts say nothing about shock protection."
DO_NOT = {
    "dead": (NO_OPENING, NO_TRUST),
    "two lines low": (NO_RESET, NO_OPENING),
    "one line low": (NO_RESET, NO_OPENING),
    "lines uneven": (NO_RESET, NO_OPENING),
    "no fit": (NO_RESET, NO_OPENING),
    "shifted": (NO_RESET, NO_OPENING, NO_ROD, NO_TRUST),
    "slight": (NO_OPENING, NO_ROD, NO_TRUST),
    "even": (NO_OPENING, NO_TRUST),
}


def one_line_low(volts: FloatArray, l_l: tuple[float, ...] | None, even_share: float) -> tuple[Cause, ...]:
    """Causes where one line reads next to nothing: only the volts between lines tell them apart."""
    line = f"L{int(np.argmin(volts)) + 1}"
    lost = f"{line} lost on the supply side"
    fuse = f"sensing fuse or test lead of {line} open"
    also = Cause("neutral lost as well", "possible", "the absent line hides it; judge again once it is back")
    if l_l is None:
        unknown = "volts between lines tell: low ones at this line mean the line, even ones the fuse or lead"
        return Cause(lost, "possible", unknown), Cause(fuse, "possible", unknown), also
    if max(abs(v / (sum(l_l) / len(l_l)) - 1) for v in l_l) > even_share:
        return Cause(lost, "very likely", "the volts between lines are uneven"), also
    return Cause(fuse, "very likely", "the volts between lines are even, so the line itself is there"), also


def supply_level(source_v: float, percent: float) -> Cause:
    """A supply that is high or low as a whole."""
    side = "high" if percent > 0 else "low"
    return Cause(
        f"supply {side} as a whole", "likely", f"the source stands at {source_v:.1f} V, {percent:+.1f} % of nominal"
    )
