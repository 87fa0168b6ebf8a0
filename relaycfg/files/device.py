"""A device file read and resolved: what the relay can measure and be set to."""

from dataclasses import replace
from itertools import product
from pathlib import Path

from relaycfg.errors import InputError, Problem
from relaycfg.files.checks import fill
from relaycfg.files.device_form import DelayForm, DeviceForm, ElementForm, RangeForm
from relaycfg.files.ledger import Ledger, figure
from relaycfg.files.text import TomlFile, Trace, decode, read_bytes
from relaycfg.files.unused import ELEMENT_KEYS, unused
from relaycfg.model.device import Accuracy, Device, Element, Function, LeftOut, SettableRange, why_left_out
from relaycfg.model.geometry import Geometry
from relaycfg.model.site import Supply

MOST_STEPS = 100_000
SAME_V = 0.05
"""Declared errors are rounded to a tenth of a volt."""


def read_device(folder: Path, named: str, problems: list[Problem], trace: Trace) -> tuple[TomlFile, DeviceForm] | None:
    """The device file that a site in ``folder`` names, checked; None with problems added where it fails.

    ``trace`` makes a problem of the site's key that names it.
    """
    path = folder / named
    shown = str(path)
    try:
        data = read_bytes(path, named, "give the path of a device file, from the folder of the site", trace)
        file = TomlFile.parse(shown, decode(data, shown))
    except InputError as reason:
        problems.extend(reason.problems)
        return None
    before = len(problems)
    form = fill(DeviceForm, dict(file.data), file, (), problems)
    if form is not None:
        for index, element in enumerate(form.element):
            _check_element(form, element, index, file, problems)
    return None if form is None or len(problems) > before else (file, form)


def _check_element(form: DeviceForm, element: ElementForm, index: int, file: TomlFile, problems: list[Problem]) -> None:
    def add(key: str, given: str, remedy: str) -> None:
        problems.append(file.problem(("element", index, *key.split(".")), given, remedy))

    if element.function in [e.function for e in form.element[:index]]:
        add("function", f'"{element.function}", given before', "keep one element a function, with its stages")
    ranges: tuple[tuple[str, RangeForm | DelayForm], ...] = (("pickup", element.pickup), ("delay_s", element.delay_s))
    for key, span in ranges:
        if span.min > span.max:
            add(f"{key}.max", f"{span.max:g}, below min", f"give {span.min:g} or more")
        elif (span.max - span.min) / span.step > MOST_STEPS:
            add(f"{key}.step", f"{span.step:g}", f"give a step with at most {MOST_STEPS} values in the range")
    is_47 = element.function == "47"
    if is_47 and element.pickup.unit == "v":
        add("pickup.unit", '"v" for a 47', 'write unit = "percent": percent points')
    if not is_47 and element.pickup.unit == "percent" and element.pickup.base_v is None:
        add("pickup.base_v", "missing", "give the volts that are 100 percent")
    under = element.function == "27"
    for place, ratio in enumerate(element.dropout_ratio or []):
        if (ratio > 1) != under or ratio == 1:
            side = "above 1: a 27 drops out on rising volts" if under else "below 1"
            loc = ("element", index, "dropout_ratio", place)
            problems.append(file.problem(loc, f"{ratio:g}", f"give a ratio {side}"))
    if "definite" not in element.curves:
        add("curves", '"dependent" only, not yet available', 'add "definite" if the device has it')
    accuracy = element.accuracy
    for key, functions in unused(element, ELEMENT_KEYS, element.function):
        add(key, f"not used by a {element.function}", f"remove it: it is for {' and '.join(functions)}")
    if not is_47 and element.pickup.unit == "v" and element.pickup.base_v is not None:
        add("pickup.base_v", 'not used by unit = "v"', 'remove it, or write unit = "percent"')
    if "held" not in element.reset and element.hold_s:
        add("hold_s", "not used without held", 'remove it, or add "held" to reset')
    if not accuracy.pickup_percent and not (accuracy.pickup_points if is_47 else accuracy.pickup_v):
        add("accuracy", "without a pickup error", "give pickup_percent or the absolute error as declared")
    allowed = ("v0", "3v0") if element.function == "59N" else ("l-n", "l-l")
    if not is_47 and element.quantity is not None and element.quantity not in allowed:
        add("quantity", f'"{element.quantity}" for a {element.function}', f"give {' or '.join(allowed)}")
    elif element.quantity in ("l-n", "l-l") and element.quantity not in form.measures:
        add("quantity", f'"{element.quantity}", which the device does not measure', "correct it or measures")
    needs_l_n = element.function == "59N" and form.displacement_from == "l-n"
    if element.function == "47" and element.definition == "line-to-neutral deviation":
        needs_l_n = True
    if needs_l_n and "l-n" not in form.measures:
        add("function", f'"{element.function}" from l-n, which the device does not measure', "correct it or measures")
    if "held" in element.reset and element.hold_s == 0:
        add("hold_s", "missing", "give the seconds for which a held timer keeps its time")


def resolve_device(form: DeviceForm, supply: Supply, at: str, ledger: Ledger, warnings: list[str]) -> Device:
    """The device with pickups in volts; its declared figures enter the ledger as given."""
    elements = []
    for element in form.element:
        place = f"{at}element.{element.function}."
        declared = _accuracy(element)
        resolved = _element(form, element, place, declared, ledger)
        if element.function == "59N" and form.displacement_from == "l-n" and supply.geometry.has_displacement:
            floor = channel_floor(form, supply, resolved.quantity)
            resolved = replace(resolved, accuracy=_with_floor(element, declared, floor, place, ledger, warnings))
        elements.append(resolved)
    reasons = [why_left_out(element, form.displacement_from, supply.geometry) for element in elements]
    left_out = tuple(LeftOut(e, why) for e, why in zip(elements, reasons, strict=True) if why)
    warnings.extend(f"Device: its {left.element.function.value} has to be off: {left.why}." for left in left_out)
    return Device(
        name=form.name,
        measures=tuple(form.measures),
        detector=ledger.pick(at + "detector", form.detector, "default-device-detector"),
        window_cycles=ledger.pick(at + "window_cycles", form.window_cycles, "default-device-window", "cycles"),
        refresh_cycles=ledger.pick(at + "refresh_cycles", form.refresh_cycles, "default-device-refresh", "cycles"),
        timers=ledger.pick(at + "timers", form.timers, "default-device-timers"),
        displacement_from=form.displacement_from,
        elements=tuple(e for e, why in zip(elements, reasons, strict=True) if not why),
        left_out=left_out,
    )


def displacement_share(geometry: Geometry) -> float:
    """Largest error of V0 over the error of each channel, where the channels err independently.

    Source: own algebra; V0 is the mean of the phasors, so the worst signs of equal errors make the largest sum.
    """
    units = [complex(u) for u in geometry.phasors]
    signs = product((1, -1), repeat=len(units))
    return max(abs(sum(s * u for s, u in zip(way, units, strict=True))) for way in signs) / len(units)


def channel_floor(form: DeviceForm, supply: Supply, quantity: str) -> tuple[float, str]:
    """Least absolute error [V] of a displacement computed from L-N channels, and its arithmetic.

    The channels err as the device's 59 element declares at nominal voltage, else its 27; 0 V where it has neither.
    """
    declared = {e.function: e for e in form.element}
    channel = declared.get("59") or declared.get("27")
    if channel is None:
        return 0.0, ""
    error = float(_accuracy(channel).pickup_error(supply.nominal_v))
    share = displacement_share(supply.geometry)
    counted = "V0"
    if quantity == "3v0":
        share, counted = share * len(supply.geometry.names), "3V0"
    arithmetic = f"{counted}: {figure(share)} of the {figure(error)} V of a {channel.function} channel at U0"
    return share * error, arithmetic


def _with_floor(
    element: ElementForm, declared: Accuracy, floor: tuple[float, str], at: str, ledger: Ledger, warnings: list[str]
) -> Accuracy:
    """The accuracy of a 59N: the least its channels allow where it declares no absolute error, else as declared."""
    volts, arithmetic = floor
    if element.accuracy.pickup_v is None and volts > 0:
        row = ledger.tables.row("displacement-from-l-n")
        ledger.default(at + "accuracy.pickup_v", volts, "V", f"{arithmetic}; {row.source}", row.status)
        return replace(declared, pickup_abs=volts)
    if declared.pickup_abs < volts - SAME_V:
        warnings.append(
            f"Device: its 59N declares {figure(declared.pickup_abs)} V, less than its channels allow "
            f"({arithmetic} is {figure(volts)} V). The declared figure is kept: ask the maker."
        )
    return declared


def _accuracy(element: ElementForm) -> Accuracy:
    form = element.accuracy
    absolute = form.pickup_points if element.function == "47" else form.pickup_v or 0.0
    return Accuracy(form.pickup_percent, absolute, form.time_percent, form.time_s, form.combine)


def _declared(accuracy: Accuracy, unit: str) -> str:
    """Declared errors in words, such as "pickup 1 % or 1.6 V, time 0.5 % or 0.01 s; the greater"."""
    joint = " + " if accuracy.combine == "sum" else " or "
    pickup = [f"{figure(v)} {u}" for v, u in ((accuracy.pickup_percent, "%"), (accuracy.pickup_abs, unit)) if v]
    time = [f"{figure(v)} {u}" for v, u in ((accuracy.time_percent, "%"), (accuracy.time_s, "s")) if v]
    greater = "; the greater" if accuracy.combine == "greater" and max(len(pickup), len(time)) > 1 else ""
    return f"pickup {joint.join(pickup)}, time {joint.join(time) or 'exact'}{greater}"


def _element(form: DeviceForm, element: ElementForm, at: str, accuracy: Accuracy, ledger: Ledger) -> Element:
    knob, delay = element.pickup, element.delay_s
    unit = "%" if knob.unit == "percent" else "V"
    base = f" of {figure(knob.base_v)} V" if knob.base_v is not None and knob.unit == "percent" else ""
    span = f"{figure(knob.min)} to {figure(knob.max)} {unit}{base}, step {figure(knob.step)} {unit}"
    ledger.given(at + "pickup", span, note="1 stage" if element.stages == 1 else f"{element.stages} stages")
    ledger.given(at + "delay_s", f"{figure(delay.min)} to {figure(delay.max)} s, step {figure(delay.step)} s")
    ledger.given(at + "accuracy", _declared(accuracy, "points" if element.function == "47" else "V"))
    under = element.function == "27"
    ratios = ledger.pick(
        at + "dropout_ratio", element.dropout_ratio, f"default-device-dropout-{'under' if under else 'over'}"
    )
    scale = knob.base_v / 100 if knob.unit == "percent" and knob.base_v is not None else 1.0
    return Element(
        function=Function(element.function),
        stages=element.stages,
        pickup=SettableRange(knob.min * scale, knob.max * scale, knob.step * scale),
        unit=knob.unit,
        base_v=knob.base_v if element.function != "47" else None,
        delay_s=SettableRange(delay.min, delay.max, delay.step),
        dropout_ratio=tuple(sorted(ratios)),
        reset=tuple(element.reset),
        hold_s=element.hold_s,
        accuracy=accuracy,
        quantity=_quantity(form, element),
        terminal=element.terminal,
        knob=element.knob,
    )


def _quantity(form: DeviceForm, element: ElementForm) -> str:
    if element.function == "47":
        usual = "line-to-neutral deviation" if "l-n" in form.measures else "line-to-line deviation"
        return element.definition or usual
    return element.quantity or (form.displacement_quantity if element.function == "59N" else form.measures[0])
