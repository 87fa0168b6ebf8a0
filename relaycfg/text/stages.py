"""Stages as terminal text: the settings table, reasons, bounds and margins both ways."""

from collections.abc import Sequence

from relaycfg import units
from relaycfg.model.device import Function
from relaycfg.model.results import StageResult, Study
from relaycfg.text import figures
from relaycfg.text.layout import heading, listing, table, wrapped


def identity(study: Study) -> list[str]:
    """Which relay, where, on which document."""
    relay, document = study.site.relay, study.site.document
    placed = f", measuring at {relay.measures_at}, opening {relay.trips}" if relay is not None else ""
    name = " ".join(part for part in (document.number, document.revision and f"rev. {document.revision}") if part)
    lines = wrapped(f"{study.settings.for_relay}, {study.device.name}{placed}")
    return [*lines, *wrapped(", ".join(part for part in (document.site, name, document.status) if part))]


def verdict(study: Study) -> list[str]:
    """How many exceptions there are, and how much of the input is not the user's own."""
    found = figures.counted(study.exceptions, "exception") if study.exceptions else "No exception"
    inputs = study.site.inputs
    unowned = ", ".join(f"{n} {tag}" for tag in ("assumed", "default") if (n := sum(i.tag == tag for i in inputs)))
    known = f" Inputs: {unowned} of {len(inputs)}." if unowned else ""
    return wrapped(
        f"{found} found against the stated criteria, over {units.count(study.samples)} sampled load states "
        f"(seed {study.seed}).{known}"
    )


def settings_table(study: Study) -> list[str]:
    """Every stage judged, those that are off listed as OFF."""
    heads = ["Element", "Pickup", "% base", "On device", "Delay s", "Drop-out", "Reset", "Phases", "Action"]
    rows = [_row(result) for result in study.stages]
    inhibit = f"Start-up inhibit {units.seconds(study.settings.inhibit_s)} s on 27 and 47 only."
    back = f"Reconnection {study.settings.after_any_trip} after any trip."
    return [*heading("Settings"), *table(heads, rows), *_bases(study.stages), f"{inhibit} {back}"]


def _bases(stages: Sequence[StageResult]) -> list[str]:
    """The named base of the percentages and what 47 measures."""
    on = [r for r in stages if r.stage.on]
    named: dict[str, list[str]] = {}
    for result in on:
        labels = named.setdefault(result.base, []) if result.pickup_percent is not None else []
        labels += [] if result.stage.function.value in labels else [result.stage.function.value]
    parts = [f"Base of {', '.join(labels)}: {base}." for base, labels in named.items()]
    measured = dict.fromkeys(r.stage.quantity for r in on if r.stage.function is Function.UNBALANCE)
    return wrapped(" ".join([*parts, *(f"47 measures {name}." for name in measured if name)]))


def _row(result: StageResult) -> list[str]:
    stage = result.stage
    if not stage.on:
        return [stage.label, "OFF", *[units.ABSENT] * 7]
    pickup, base, device = figures.pickup(result), units.percent(result.pickup_percent), figures.on_device(result)
    delay, dropout = units.seconds(stage.delay_s), units.ratio(stage.dropout_ratio)
    return [stage.label, pickup, base, device, delay, dropout, figures.reset(result), stage.phases, stage.action]


def reasons(stages: Sequence[StageResult]) -> list[str]:
    """The reason of each stage in one sentence."""
    rows = [[r.stage.label, r.reason] for r in stages if r.reason]
    return [*heading("Reasons"), *listing(["Element", "Why"], rows, 1)] if rows else []


def bounds(stages: Sequence[StageResult]) -> list[str]:
    """What each figure may not go beyond, with the case behind it and the arithmetic."""
    lines: list[str] = []
    for result in stages:
        for b in result.bounds:
            label = f"{result.stage.label} {b.of}"
            lines += wrapped(f"{label} {b.side} {units.with_unit(b.value, b.unit)}: {b.case}")
            arithmetic = f"{b.arithmetic} [{b.source}]" if b.source else b.arithmetic
            lines += wrapped(arithmetic, "    ") if b.arithmetic else []
    return [*heading("Bounds"), *lines] if lines else []


def margins(stages: Sequence[StageResult], alone: bool = False) -> list[str]:
    """Distance of each stage to the nearest must-hold case and to the nearest state it must clear.

    ``alone`` adds what the stage clears on its own, which its reason says already.
    """
    lines: list[str] = []
    for result in stages:
        m, unit = result.margins, figures.unit_of(result.stage.function)
        if m is None:
            continue
        held = figures.margin(m.security_units, m.security_v, unit, m.security_s)
        cleared = figures.margin(m.dependability_units, m.dependability_v, unit, m.dependability_s)
        share = ""
        if alone and result.clears_percent is not None:
            share = f"; alone it clears {units.percent(result.clears_percent)} % of the harmful states in time"
        clearing = f"total clearing {units.seconds(result.clearing_s)} s{share}"
        lines += wrapped(f"{result.stage.label}: {clearing}")
        lines += wrapped(f"{held} ({m.security_case})" if m.security_case else held, "    holds by   ")
        lines += wrapped(f"{cleared} ({m.dependability_case})" if m.dependability_case else cleared, "    clears by  ")
    note = "One unit is 1 % of nominal volts (1 point for 47) together with 10 % of time."
    return [*heading("Margins"), *lines, note] if lines else []
