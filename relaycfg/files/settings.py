"""Settings files: read against the relay of a site, and written so that reading gives the same again."""

import json
from collections.abc import Iterator
from pathlib import Path

from relaycfg.errors import InputError, Problem
from relaycfg.files.checks import fill
from relaycfg.files.draft import Entry
from relaycfg.files.settings_form import (
    DisplacementStageForm,
    SettingsForm,
    StageForm,
    UnbalanceStageForm,
    VoltStageForm,
)
from relaycfg.files.text import TomlFile, choose, decode, read_bytes
from relaycfg.model.device import Element, Function
from relaycfg.model.settings import Settings, Stage
from relaycfg.model.site import Relay, Site

TABLES = {
    "overvoltage": Function.OVERVOLTAGE,
    "undervoltage": Function.UNDERVOLTAGE,
    "displacement": Function.DISPLACEMENT,
    "unbalance": Function.UNBALANCE,
}
USUAL_QUANTITY = {
    Function.OVERVOLTAGE: "l-n",
    Function.UNDERVOLTAGE: "l-n",
    Function.DISPLACEMENT: "v0",
    Function.UNBALANCE: "line-to-neutral deviation",
}


def read_settings(path: Path, site: Site) -> Settings:
    """The settings of a file for the relay of ``site``.

    Raises InputError for a malformed file or one for another relay or device. Values that the device cannot be set
    to are kept: finding them is the business of a check.
    """
    shown = str(path)
    advice = "give the path of a settings file, or write one with: relaycfg derive"
    file = TomlFile.parse(shown, decode(read_bytes(path, shown, advice), shown))
    problems: list[Problem] = []
    form = fill(SettingsForm, dict(file.data), file, (), problems)
    if form is None:
        raise InputError(problems)
    relay = site.relay
    if relay is None:
        problems.append(
            file.problem(("for_relay",), f'"{form.for_relay}", and the site has no [[relay]]', "add it there")
        )
        raise InputError(problems)
    if form.for_relay != relay.name:
        other = form.for_relay in [r.name for r in site.relays]
        given = f'"{form.for_relay}"' + (f", and {relay.name} is judged" if other else "")
        remedy = f'add --relay "{form.for_relay}"' if other else choose(form.for_relay, (relay.name,))
        problems.append(file.problem(("for_relay",), given, remedy))
    if form.device != relay.device.name:
        given = f'"{form.device}", not the device of {relay.name}'
        problems.append(file.problem(("device",), given, f'give settings of "{relay.device.name}"'))
    stages = tuple(
        _stage(entry, function, relay, file, problems)
        for function, entries in _entries(form, file, problems)
        for entry in entries
    )
    if problems:
        raise InputError(problems)
    return Settings(
        for_relay=form.for_relay,
        device=form.device,
        input_digest=form.input_digest,
        stages=stages,
        inhibit_s=form.start_up.inhibit_s,
        after_any_trip=form.reconnect.after_any_trip,
        reconnect_delay_s=form.reconnect.delay_s,
        reconnect_attempts=form.reconnect.attempts,
    )


def _entries(
    form: SettingsForm, file: TomlFile, problems: list[Problem]
) -> Iterator[tuple[Function, list[Entry[StageForm]]]]:
    for table, function in TABLES.items():
        entries: list[Entry[StageForm]] = [Entry((table, i), s) for i, s in enumerate(getattr(form, table))]
        numbers = [e.form.stage for e in entries]
        for entry in entries:
            if numbers.index(entry.form.stage) != entry.loc[1]:
                loc = (*entry.loc, "stage")
                problems.append(file.problem(loc, f"{entry.form.stage}, given before", "give every stage once"))
        yield function, entries


def _stage(entry: Entry[StageForm], function: Function, relay: Relay, file: TomlFile, problems: list[Problem]) -> Stage:
    form, element = entry.form, relay.device.element(function)
    named: str | None = None
    if isinstance(form, DisplacementStageForm):
        named = form.quantity
    elif isinstance(form, UnbalanceStageForm):
        named = form.definition
    quantity = element.quantity if element is not None else named or USUAL_QUANTITY[function]
    if named is not None and named != quantity:
        key = "quantity" if function is Function.DISPLACEMENT else "definition"
        problems.append(file.problem((*entry.loc, key), f'"{named}"', f'the device counts "{quantity}": write it so'))
    pickup, percent, base = _pickup(entry, element, file, problems)
    if form.on and form.delay_s is None:
        problems.append(file.problem((*entry.loc, "delay_s"), "missing", "give the delay of a stage that is on"))
    dropout = form.dropout_ratio
    if dropout is None and form.on and element is not None:
        dropout = min(element.dropout_ratio, key=lambda r: abs(r - 1))
    hold = form.hold_s
    if hold is None:
        hold = element.hold_s if element is not None and form.reset == "held" else 0.0
    return Stage(
        function=function, number=form.stage, on=form.on, pickup=pickup, delay_s=form.delay_s or 0.0,
        dropout_ratio=1.0 if dropout is None else dropout, reset=form.reset, hold_s=hold, phases=form.phases,
        action=form.action, quantity=quantity, pickup_percent=percent, base_v=base,
    )  # fmt: skip


def _pickup(
    entry: Entry[StageForm], element: Element | None, file: TomlFile, problems: list[Problem]
) -> tuple[float, float | None, float | None]:
    """Pickup in volts or points, and the percent and base it was given in."""
    form, loc = entry.form, entry.loc
    if not isinstance(form, VoltStageForm):
        if form.on and form.pickup_percent is None:
            problems.append(file.problem((*loc, "pickup_percent"), "missing", "give the pickup of a stage that is on"))
        return form.pickup_percent or 0.0, None, None
    if form.pickup_v is not None and form.pickup_percent is not None:
        problems.append(file.problem((*loc, "pickup_percent"), "given beside pickup_v", "keep one of them"))
    if form.pickup_v is not None and form.pickup_percent is None and form.base_v is not None:
        problems.append(file.problem((*loc, "base_v"), "not used with pickup_v", "remove it, or give pickup_percent"))
    if form.pickup_v is not None:
        return form.pickup_v, None, None
    if form.pickup_percent is None:
        if form.on:
            problems.append(file.problem((*loc, "pickup_v"), "missing", "give the pickup of a stage that is on"))
        return 0.0, None, None
    base = form.base_v if form.base_v is not None else element.base_v if element is not None else None
    if base is None:
        problems.append(file.problem((*loc, "base_v"), "missing", "give the volts that are 100 percent"))
        return 0.0, form.pickup_percent, None
    return form.pickup_percent * base / 100, form.pickup_percent, base


def settings_text(settings: Settings, site: Site, comments: dict[str, str] | None = None) -> str:
    """The settings as TOML, with ``comments`` (by stage label, such as "59 stage 2") above their stages."""
    comments = comments or {}
    lines = [f"# Settings of relay {_plain(settings.for_relay)}, {_plain(site.document.site or 'site')}."]
    lines += ["# Pickups in volts unless a key says percent; delays in seconds.", ""]
    lines += ["schema = 1", f"for_relay = {_text(settings.for_relay)}", f"device = {_text(settings.device)}"]
    lines += [f"input_digest = {_text(settings.input_digest)}"]
    for table, function in TABLES.items():
        for stage in settings.of(function):
            lines += ["", *_comment(comments.get(stage.label, "")), f"[[{table}]]  # {function.value}"]
            lines += [f"{key} = {value}" for key, value in _keys(stage)]
    lines += ["", "[start_up]  # 27 and 47 only; never 59 or 59N", f"inhibit_s = {settings.inhibit_s!r}"]
    lines += ["", "[reconnect]", f"after_any_trip = {_text(settings.after_any_trip)}"]
    if settings.reconnect_delay_s:
        lines.append(f"delay_s = {settings.reconnect_delay_s!r}")
    if settings.reconnect_attempts is not None:
        lines.append(f"attempts = {settings.reconnect_attempts}")
    return "\n".join(lines) + "\n"


def _keys(stage: Stage) -> Iterator[tuple[str, str]]:
    yield "stage", str(stage.number)
    yield "on", "true" if stage.on else "false"
    if stage.function is Function.DISPLACEMENT:
        yield "quantity", _text(stage.quantity)
    if stage.function is Function.UNBALANCE:
        yield "definition", _text(stage.quantity)
        if stage.on or stage.pickup:
            yield "pickup_percent", _figure(stage.pickup)
    elif stage.pickup_percent is not None:
        yield "pickup_percent", _figure(stage.pickup_percent)
        if stage.base_v is not None:
            yield "base_v", _figure(stage.base_v)
    elif stage.on or stage.pickup:
        yield "pickup_v", _figure(stage.pickup)
    if stage.on or stage.delay_s:
        yield "delay_s", _figure(stage.delay_s)
    if stage.on or stage.dropout_ratio != 1.0:
        yield "dropout_ratio", _figure(stage.dropout_ratio)
    if stage.on or stage.reset != "instantaneous":
        yield "reset", _text(stage.reset)
    if stage.reset == "held" or stage.hold_s:
        yield "hold_s", _figure(stage.hold_s)
    if stage.on or stage.phases != "any":
        yield "phases", _text(stage.phases)
    if stage.on or stage.action != "trip":
        yield "action", _text(stage.action)


def _figure(value: float) -> str:
    return repr(float(value))


def _text(value: str) -> str:
    """A TOML basic string; JSON escapes are a subset of TOML's, but for the delete character."""
    return json.dumps(value, ensure_ascii=False).replace("\x7f", "\\u007F")


def _comment(text: str) -> list[str]:
    return [f"# {_plain(line)}" for line in text.splitlines() if line.strip()]


def _plain(text: str) -> str:
    return "".join(c if c.isprintable() else " " for c in text)
