"""Figures as text: every printed number is rounded here, once."""

import math

ABSENT = "-"
FOR_EVER = "for ever"
MANY_OHM = 999.5
"""From here on three digits would need an exponent."""
FEW_SECONDS = 0.1
"""Below this, seconds get a third decimal [s]."""


def volts(value: float | None) -> str:
    """Volts to one decimal."""
    return _decimals(value, 1)


def whole_volts(value: float | None) -> str:
    """Volts to whole volts, where several share a cell."""
    return _decimals(value, 0)


def degrees(value: float | None) -> str:
    """An angle to whole degrees."""
    return _decimals(value, 0)


def amperes(value: float | None) -> str:
    """Amperes to one decimal."""
    return _decimals(value, 1)


def watts(value: float | None) -> str:
    """Watts to whole watts, thousands apart."""
    return ABSENT if _absent(value) else count(round(value or 0.0))


def ohms(value: float | None) -> str:
    """Ohms to three significant digits, from a thousand on to whole ohms."""
    if value is None or _absent(value):
        return ABSENT
    return count(round(value)) if abs(value) >= MANY_OHM else f"{value:.3g}"


def percent(value: float | None) -> str:
    """Percent (or percent points) to one decimal."""
    return _decimals(value, 1)


def seconds(value: float | None) -> str:
    """Seconds to two decimals, three below 0.1 s; infinite is "for ever"."""
    if value is not None and math.isinf(value):
        return FOR_EVER
    return _decimals(value, 3 if value is not None and abs(value) < FEW_SECONDS else 2)


def parts(value: float | None) -> str:
    """One part of a ratio such as 2.0 : 1.0 : 1.0, to one decimal."""
    return _decimals(value, 1)


def asymmetry(value: float | None) -> str:
    """The k of loads k:1:1, to two decimals."""
    return _decimals(value, 2)


def load_ratio(value: float, lines: int, between: str = ":") -> str:
    """Loads of which one is k times each other, such as 1.33:1:1."""
    return between.join([asymmetry(value), *["1"] * (lines - 1)])


def ratio(value: float | None) -> str:
    """A ratio such as drop-out over pickup: up to three decimals, no trailing zeros."""
    return ABSENT if _absent(value) else f"{value:.3f}".rstrip("0").rstrip(".")


def count(value: int) -> str:
    """A whole number with its thousands apart."""
    return f"{value:,}".replace(",", " ")


def plain(value: float | None) -> str:
    """A figure of any other unit, four significant digits."""
    return ABSENT if _absent(value) else f"{value:.4g}"


def with_unit(value: float | None, unit: str) -> str:
    """A figure rounded as its unit asks, followed by the unit; a lone dash where there is none."""
    figure = {"V": volts, "s": seconds, "%": percent, "A": amperes, "W": watts, "ohm": ohms, "units": percent}
    rounded = figure.get(unit, plain)(value)
    return rounded if rounded in (ABSENT, FOR_EVER) else f"{rounded} {unit}".rstrip()


def _absent(value: float | None) -> bool:
    return value is None or not math.isfinite(value)


def _decimals(value: float | None, digits: int) -> str:
    if value is None or not math.isfinite(value):
        return ABSENT
    text = f"{value:.{digits}f}"
    return text.lstrip("-") if float(text) == 0 else text
