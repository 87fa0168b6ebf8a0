"""Quantities a relay forms from the phasors at its tap, and the rising severity each element compares."""

from typing import TypedDict

import numpy as np

from relaycfg.model.device import THREE_LINE_UNBALANCE, Element, Function
from relaycfg.model.geometry import ComplexArray, FloatArray, Geometry

LIVE_V = 10.0
"""Mean line-to-neutral volts below which unbalance is not formed (own choice, 4 to 8 percent of usual star volts)."""


class Measured(TypedDict):
    """Magnitudes [V] with lines or pairs last, V0 [V], and unbalance [percent] by the name of its definition."""

    l_n_v: FloatArray
    l_l_v: FloatArray
    v0_v: FloatArray
    unbalance_percent: dict[str, FloatArray]


def severities(element: Element, geometry: Geometry, tap: ComplexArray, displacement_from: str) -> FloatArray:
    """What the element compares with its pickup, rising towards operation.

    ``tap`` [..., lines + 1]: line-to-neutral phasors [V], then the neutral against the local PE [V]. Returns
    [..., channels] in the element's own unit: 59 volts a line (a pair where it measures line to line), 27 the
    negative of those, 59N one channel (V0, or the sum of the lines, 3V0, where the element counts so; from the
    neutral against PE as measured, 0 where there is no PE), 47 one channel in percent points. Source: definitions.
    """
    l_n = tap[..., :-1]
    if element.function is Function.DISPLACEMENT:
        if displacement_from == "n-to-earth":
            return np.nan_to_num(np.abs(tap[..., -1:]), nan=0.0)
        factor = len(geometry.names) if element.quantity == "3v0" else 1
        displacement: FloatArray = factor * np.abs(geometry.displacement(l_n))[..., np.newaxis]
        return displacement
    if element.function is Function.UNBALANCE:
        return unbalance_percent(element.quantity, geometry, l_n)[..., np.newaxis]
    volts = np.abs(geometry.line_to_line(l_n) if element.quantity == "l-l" else l_n)
    return -volts if element.function is Function.UNDERVOLTAGE else volts


def measured_quantities(geometry: Geometry, tap: ComplexArray) -> Measured:
    """All quantities of a tap [..., lines + 1], as printed in break tables; leading axes are kept.

    V0 and unbalance are nan where the system has none: see ``Geometry.has_displacement`` and ``definitions``.
    """
    l_n = tap[..., :-1]
    return {
        "l_n_v": np.abs(l_n),
        "l_l_v": np.abs(geometry.line_to_line(l_n)),
        "v0_v": np.abs(geometry.displacement(l_n)),
        "unbalance_percent": {name: unbalance_percent(name, geometry, l_n) for name in DEFINITIONS},
    }


def unbalance_percent(definition: str, geometry: Geometry, l_n: ComplexArray) -> FloatArray:
    """Unbalance [percent] of line-to-neutral phasors (lines last) by a named definition; 0 on a dead system.

    Nan where the definition takes three lines and the system has two.

    Source: P. Pillay and M. Manyage, Definitions of voltage unbalance (letter), and IEC 60034-26 for V2/V1, read;
    the spread is a field form without a standard.
    """
    if definition not in definitions(geometry):
        return np.full(l_n.shape[:-1], np.nan)
    live = np.abs(l_n).mean(axis=-1) >= LIVE_V
    return np.where(live, DEFINITIONS[definition](geometry, l_n), 0.0)


def _line_to_neutral_deviation(_: Geometry, l_n: ComplexArray) -> FloatArray:
    return _deviation(np.abs(l_n))


def _line_to_line_deviation(geometry: Geometry, l_n: ComplexArray) -> FloatArray:
    return _deviation(np.abs(geometry.line_to_line(l_n)))


def _negative_over_positive(geometry: Geometry, l_n: ComplexArray) -> FloatArray:
    _, positive, negative = geometry.sequences(l_n)
    return 100 * np.abs(negative) / _floor(np.abs(positive))


def _spread(_: Geometry, l_n: ComplexArray) -> FloatArray:
    volts = np.abs(l_n)
    width: FloatArray = volts.max(axis=-1) - volts.min(axis=-1)
    return 100 * width / _floor(volts.mean(axis=-1))


def _deviation(volts: FloatArray) -> FloatArray:
    mean = volts.mean(axis=-1)
    largest: FloatArray = np.abs(volts - mean[..., np.newaxis]).max(axis=-1)
    return 100 * largest / _floor(mean)


def _floor(volts: FloatArray) -> FloatArray:
    """A divisor that keeps a ratio finite where nothing is left to divide by."""
    return np.maximum(volts, 1e-3)


DEFINITIONS = {
    "line-to-neutral deviation": _line_to_neutral_deviation,
    "line-to-line deviation": _line_to_line_deviation,
    "V2/V1": _negative_over_positive,
    "spread": _spread,
}


def definitions(geometry: Geometry) -> tuple[str, ...]:
    """Names of the definitions of unbalance that mean something in a system."""
    return tuple(n for n in DEFINITIONS if geometry.has_sequences or n not in THREE_LINE_UNBALANCE)
