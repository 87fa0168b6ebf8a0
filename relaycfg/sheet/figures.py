"""The sheet's figures, rounded once by ``units``: an absent one is an en dash, a share has its interval."""

import re

from relaycfg import units
from relaycfg.model.break_results import Share
from relaycfg.model.device import Function
from relaycfg.model.results import StageResult

ABSENT = "–"
SHORT_DIGITS, LONG_DIGITS = 12, 6
NUMBERS = re.compile(r"[-+\d.,\sj\[\]]+")
"""A number, a complex one, or a list of them."""


def _shown(rounded: str) -> str:
    return ABSENT if rounded == units.ABSENT else rounded


def volts(value: float | None) -> str:
    """Volts, without their unit."""
    return _shown(units.volts(value))


def seconds(value: float | None) -> str:
    """Seconds, without their unit."""
    return _shown(units.seconds(value))


def percent(value: float | None) -> str:
    """Percent or percent points, without their unit."""
    return _shown(units.percent(value))


def ratio(value: float | None) -> str:
    """A ratio such as drop-out over pickup."""
    return _shown(units.ratio(value))


def plain(value: float | None) -> str:
    """A figure of another unit."""
    return _shown(units.plain(value))


def by_unit(value: float | None, unit: str) -> str:
    """A figure rounded as its unit asks, followed by the unit."""
    return _shown(units.with_unit(value, unit))


def dial(value: float | None) -> str:
    """A figure to be set: one decimal, or two where the device's own step needs them."""
    if value is None:
        return ABSENT
    return f"{value:.1f}" if abs(value - round(value, 1)) < 1e-6 else f"{value:.2f}"


def given(value: str) -> str:
    """An input as written; computed figures of six and more digits to four significant ones."""

    def rounded(match: re.Match[str]) -> str:
        number, whole = float(match.group()), len(match.group().partition(".")[0])
        if len(match.group().lstrip("0.").replace(".", "")) < LONG_DIGITS:
            return match.group()
        return f"{number:.4g}" if number < 1 else f"{number:.{max(0, 4 - whole)}f}"

    return re.sub(r"\d+\.\d+", rounded, value) if NUMBERS.fullmatch(value) else value


def short(digest: str) -> str:
    """The head of a digest, enough to tell two sheets apart, with the name of its kind."""
    kind, colon, digits = digest.rpartition(":")
    return f"{kind}{colon}{digits[:SHORT_DIGITS]}"


def unit_of(function: Function) -> str:
    """Unit of an element's pickup."""
    return "%" if function is Function.UNBALANCE else "V"


def pickup(result: StageResult, value: float | None = None) -> str:
    """A pickup of this stage (the one set, or ``value``) with its unit; absent where the stage is off."""
    if not result.stage.on:
        return ABSENT
    return by_unit(result.stage.pickup if value is None else value, unit_of(result.stage.function))


def share(value: Share) -> str:
    """A share with its 95 % interval; nothing hit in n states is printed as less than 3/n."""
    if not value.of:
        return ABSENT
    if not value.count:
        return f"0 (< 3/{value.of})"
    return f"{percent(value.percent)}\u00a0% ({percent(100 * value.low)} to {percent(100 * value.high)})"
