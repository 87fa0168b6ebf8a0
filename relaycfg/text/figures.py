"""Results in words: shares, pickups, places, margins, states; all rounding is that of ``units``."""

from collections.abc import Sequence

from relaycfg import units
from relaycfg.model.break_results import Flag, Share
from relaycfg.model.device import Function
from relaycfg.model.results import CaseResult, Operated, StageResult
from relaycfg.model.site import NONE, SOURCE

PLACES = {SOURCE: "star link", NONE: "no break"}


def place(name: str) -> str:
    """A break place in words."""
    return PLACES.get(name, name)


def or_dash(text: str) -> str:
    """The text, or a dash where there is none."""
    return text or units.ABSENT


def counted(number: int, one: str, several: str = "") -> str:
    """A number with its noun, such as 1 scenario or 2 scenarios."""
    return f"{units.count(number)} {one if number == 1 else several or one + 's'}"


def together(values: Sequence[float]) -> str:
    """The volts of all lines in one cell."""
    return or_dash("/".join(units.whole_volts(v) for v in values))


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


def waiting(seconds: float | None) -> str:
    """Seconds of a curve, where none is without end."""
    return units.FOR_EVER if seconds is None else units.seconds(seconds)


def margin(in_units: float | None, distance: float | None, unit: str, time_s: float | None) -> str:
    """A margin in units, volts and seconds; those that nothing limits are left out."""
    every = [units.with_unit(in_units, "units"), units.with_unit(distance, unit), units.with_unit(time_s, "s")]
    return ", ".join(figure for figure in every if figure != units.ABSENT) or "nothing limits it"


def class_words(name: str) -> str:
    """A class of break states, such as "high volts / in time", in words."""
    harm, _, operation = name.partition(" / ")
    does = "tripped" if harm == "none" else "cleared"
    done = {"in time": f"{does} in time", "late": f"{does} late", "none": f"not {does}"}[operation]
    return f"{'no harm yet' if harm == 'none' else harm}, {done}"


STATUSES = {
    "read": "read",
    "quoted": "as quoted",
    "memory": "from memory, verify",
    "own": "own",
    "user": "given by the user",
    "computed": "computed",
    "assumed": "assumed",
}
"""How well a figure is known, in words."""


def cited(source: str, status: str) -> str:
    """Source and status in brackets, to stand behind a figure; nothing where neither is known."""
    known = "; ".join(part for part in (source, STATUSES.get(status, status)) if part)
    return f" [{known}]" if known else ""


def operated(case: CaseResult) -> str:
    """Which stages operated in a case, when, and in which of its courses."""
    return "; ".join(_operated(one) for one in case.operated) or "nothing operates"


def _operated(one: Operated) -> str:
    course = f" ({one.course})" if one.course else ""
    return f"{one.stage} after {units.with_unit(one.seconds, 's')}{course}"


UNBALANCES = {
    "l_n_deviation": "line-to-neutral deviation",
    "l_l_deviation": "line-to-line deviation",
    "v2_v1": "V2/V1",
    "spread": "spread",
}
"""The four unbalance figures by their names in the results."""
FLAGS: dict[Flag, str] = {
    "below band": "some load gets less than the volts its law holds for; it is a constant impedance there",
    "above band": "some load gets more than the volts its law holds for; it is a constant impedance there",
    "unstable": "the loads would run away from this state",
    "several solutions": "the loads allow another state too; the one reached from the sound neutral is shown",
}
