"""A judged meter reading as terminal text: the likely cause first, then figures, checks and cautions."""

import cmath
import math

from relaycfg import units
from relaycfg.model.reading import Reading
from relaycfg.text.layout import wrapped

SMALL_SHARE = 0.1
"""Smallest share of load that still serves as the 1 of a ratio."""


def reading_text(reading: Reading) -> str:
    """At most 35 lines."""
    lines = wrapped(_given(reading))
    lines += ["", "What it means"]
    for cause in reading.causes:
        lines += wrapped(f"{cause.confidence}: {cause.name} ({cause.because})", "* ", "  ")
    if reading.v0_v is not None:
        lines += ["", "Figures", *_figures(reading)]
    lines += ["", "Check first"]
    for number, step in enumerate(reading.check_first, 1):
        lines += wrapped(step, f"{number}. ")
    lines += ["", "Do not"]
    for caution in reading.do_not:
        lines += wrapped(caution, "* ")
    return "\n".join(lines) + "\n"


def _given(reading: Reading) -> str:
    line_to_line = f", between lines {_volts(reading.l_l_v)}" if reading.l_l_v is not None else ""
    return f"Read: line to neutral {_volts(reading.l_n_v)}{line_to_line}; nominal {units.plain(reading.nominal_v)} V."


def _volts(values: tuple[float, ...]) -> str:
    return " / ".join(units.plain(v) for v in values) + " V"


def _figures(reading: Reading) -> list[str]:
    neutral = reading.neutral_v or 0j
    size, residual = units.volts(abs(neutral)), units.volts(3 * abs(neutral))
    band = f"{units.volts(reading.v0_low_v)} to {units.volts(reading.v0_high_v)} V {reading.band_from}"
    names = [f"L{k + 1}" for k in range(len(reading.l_n_v))]
    two = len(names) == 2
    lines = wrapped(f"Neutral displaced by {size} V; {band}." if two else f"V0 {size} V (3V0 {residual} V); {band}.")
    lines += wrapped(f"Source {units.volts(reading.source_v)} V to its star point, from {reading.source_from}.")
    if reading.load_shares is not None:
        angle = units.degrees(math.degrees(cmath.phase(neutral)))
        if not two:
            lines += wrapped(
                f"Neutral moved {size} V at {angle} degrees from the source volts of L1 (rotation L1-L2-L3)."
            )
        loads = f"{_ratio(reading.load_shares)} on {' : '.join(names)}"
        lines += wrapped(f"Resistive loads of about {loads} would put it there.")
    for sentence in reading.arithmetic:
        lines += wrapped(f"Check: {sentence}.")
    return lines


def _ratio(shares: tuple[float, ...]) -> str:
    least = min(shares)
    unit = least if least >= SMALL_SHARE * max(shares) else max(shares)
    return " : ".join(units.parts(s / unit) for s in shares)
