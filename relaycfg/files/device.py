"""A device file read and resolved: what the relay can measure and be set to."""

from pathlib import Path

from relaycfg.errors import InputError, Problem
from relaycfg.files.checks import fill
from relaycfg.files.device_form import DelayForm, DeviceForm, ElementForm, RangeForm
from relaycfg.files.ledger import Ledger
from relaycfg.files.text import TomlFile, decode, read_bytes
from relaycfg.model.device import Accuracy, Device, Element, Function, SettableRange

MOST_STEPS = 100_000


def read_device(path: Path, problems: list[Problem]) -> tuple[TomlFile, DeviceForm] | None:
    """The device file of that path, checked; None with problems added where it fails."""
    shown = str(path)
    try:
        data = read_bytes(path, shown, "give the path of a device file, from the folder of the site")
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
    if is_47 and accuracy.pickup_v:
        add("accuracy.pickup_v", "given for a 47", "give pickup_points")
    if not accuracy.pickup_percent and not (accuracy.pickup_points if is_47 else accuracy.pickup_v):
        add("accuracy", "without a pickup error", "give pickup_percent or the absolute error as declared")
    allowed = {"59": ("l-n", "l-l"), "27": ("l-n", "l-l"), "59N": ("v0", "3v0"), "47": ()}[element.function]
    if element.quantity is not None and element.quantity not in allowed:
        remedy = f"give {' or '.join(allowed)}" if allowed else "give definition instead"
        add("quantity", f'"{element.quantity}" for a {element.function}', remedy)
    elif element.quantity in ("l-n", "l-l") and element.quantity not in form.measures:
        add("quantity", f'"{element.quantity}", which the device does not measure', "correct it or measures")
    needs_l_n = element.function == "59N" and form.displacement_from == "l-n"
    if element.function == "47" and element.definition == "line-to-neutral deviation":
        needs_l_n = True
    if needs_l_n and "l-n" not in form.measures:
        add("function", f'"{element.function}" from l-n, which the device does not measure', "correct it or measures")
    if "held" in element.reset and element.hold_s == 0:
        add("hold_s", "missing", "give the seconds for which a held timer keeps its time")


def resolve_device(form: DeviceForm, at: str, ledger: Ledger) -> Device:
    """The device with pickups in volts; its declared figures enter the ledger as nameplate data."""
    return Device(
        name=form.name,
        measures=tuple(form.measures),
        detector=ledger.pick(at + "detector", form.detector, "default-device-detector"),
        window_cycles=ledger.pick(at + "window_cycles", form.window_cycles, "default-device-window", "cycles"),
        refresh_cycles=ledger.pick(at + "refresh_cycles", form.refresh_cycles, "default-device-refresh", "cycles"),
        timers=ledger.pick(at + "timers", form.timers, "default-device-timers"),
        displacement_from=form.displacement_from,
        elements=tuple(_element(form, element, f"{at}element.{element.function}.", ledger) for element in form.element),
    )


def _element(form: DeviceForm, element: ElementForm, at: str, ledger: Ledger) -> Element:
    knob, delay, accuracy = element.pickup, element.delay_s, element.accuracy
    unit = "%" if knob.unit == "percent" else "V"
    base = f" of {knob.base_v:g} V" if knob.base_v is not None and knob.unit == "percent" else ""
    ledger.given(
        at + "pickup", f"{knob.min:g} to {knob.max:g} in {knob.step:g}{base}", unit, f"{element.stages} stages"
    )
    ledger.given(at + "delay_s", f"{delay.min:g} to {delay.max:g} in {delay.step:g}", "s")
    absolute = accuracy.pickup_points if element.function == "47" else accuracy.pickup_v
    declared = f"{accuracy.pickup_percent:g} %, {absolute:g}; {accuracy.time_percent:g} %, {accuracy.time_s:g} s"
    ledger.given(at + "accuracy", declared, "", f"pickup; time; the {accuracy.combine} of percent and absolute")
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
        accuracy=Accuracy(accuracy.pickup_percent, absolute, accuracy.time_percent, accuracy.time_s, accuracy.combine),
        quantity=_quantity(form, element),
        terminal=element.terminal,
        knob=element.knob,
    )


def _quantity(form: DeviceForm, element: ElementForm) -> str:
    if element.function == "47":
        usual = "line-to-neutral deviation" if "l-n" in form.measures else "line-to-line deviation"
        return element.definition or usual
    return element.quantity or (form.displacement_quantity if element.function == "59N" else form.measures[0])
