"""Results as short words: shares, pickups, places, margins; all rounding is that of ``units``."""

from relaycfg import units
from relaycfg.model.device import Function
from relaycfg.model.results import Share, StageResult
from relaycfg.model.site import NONE, SOURCE

PLACES = {SOURCE: "star link", NONE: "no break"}


def place(name: str) -> str:
    """A break place in words."""
    return PLACES.get(name, name)


def share(value: Share) -> str:
    """A share with its 95 % interval; nothing in n states is less than 3/n, not zero."""
    if not value.of:
        return units.ABSENT
    if not value.count:
        return f"0 (< 3/{value.of})"
    return f"{units.percent(value.percent)} % ({units.percent(100 * value.low)}-{units.percent(100 * value.high)})"


def unit_of(function: Function) -> str:
    """Unit of an element's pickup."""
    return "%" if function is Function.UNBALANCE else "V"


QUANTITIES = {"v0": "V0", "3v0": "3V0", "l-l": "L-L"}
"""Quantities named beside a pickup; the others are line to neutral, or points of 47."""


def pickup(result: StageResult) -> str:
    """The pickup as set, with its unit, and its quantity where that is not line to neutral."""
    text = units.with_unit(result.stage.pickup, unit_of(result.stage.function))
    quantity = QUANTITIES.get(result.stage.quantity)
    return f"{text} {quantity}" if quantity else text


def on_device(result: StageResult) -> str:
    """The figure on the device's own scale."""
    return units.ABSENT if result.marked is None else f"{units.plain(result.marked)} {result.marked_unit}".rstrip()


def reset(result: StageResult) -> str:
    """Reset mode, with the hold time where there is one."""
    stage = result.stage
    return f"held {units.seconds(stage.hold_s)} s" if stage.reset == "held" else stage.reset


def margin(in_units: float | None, distance: float | None, unit: str, time_s: float | None) -> str:
    """A margin in units, volts and seconds; those that nothing limits are left out."""
    every = [units.with_unit(in_units, "units"), units.with_unit(distance, unit), units.with_unit(time_s, "s")]
    return ", ".join(figure for figure in every if figure != units.ABSENT) or "nothing limits it"
