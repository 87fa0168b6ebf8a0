"""Results as plain JSON values: null for what is absent or infinite, keys named as in the model and the files."""

import dataclasses
import math
from enum import Enum
from typing import Any

from relaycfg.model.break_results import BreakRow, BreakStudy
from relaycfg.model.device import Function
from relaycfg.model.results import StageResult, Study
from relaycfg.model.settings import Settings, Stage

SCHEMA = 1
"""Number of the published form (its JSON Schema is result.schema.json beside this file)."""


def breaks_dict(study: BreakStudy, program: str, input_digest: str, seed: int, samples: int) -> dict[str, Any]:
    """Result of ``breaks``; ``program`` is name and version."""
    head = {"schema": SCHEMA, "program": program, "input_digest": input_digest, "seed": seed, "samples": samples}
    return head | _breaks(study)


def study_dict(study: Study, program: str, explain: bool = False) -> dict[str, Any]:
    """Result of ``derive`` or ``check``; ``explain`` adds the corridors (curves R and W) and the V0 plane.

    Every field of the study stands under its own name, but site and device (the inputs), breaks (its rows, with the
    summaries beside them) and stages (in the settings).
    """
    result = breaks_dict(study.breaks, program, study.input_digest, study.seed, study.samples)
    result |= {
        "kind": study.kind,
        "exceptions": study.exceptions,
        "findings": plain(study.findings),
        "settings": _settings(study.settings) | {"stages": [_stage(r) for r in study.stages]},
        "bounds": [{"stage": r.stage.label} | plain(b) for r in study.stages for b in r.bounds],
        "cases": plain(study.cases),
        "coverage": plain(study.coverage),
        "smallest_asymmetry": plain(study.smallest_asymmetry),
        "place_asymmetry": plain(study.place_asymmetry),
        "elsewhere": plain(study.elsewhere),
        "together": plain(study.together),
        "uncleared": study.uncleared,
        "blocked": study.blocked,
        "closed": plain(study.closed),
        "displacement_standing_v": plain(study.displacement_standing_v),
        "feed_range_v": [
            {"feed": what, "lowest_v": plain(lowest), "highest_v": plain(highest)}
            for what, lowest, highest in study.feed_range_v
        ],
        "worked": plain(study.worked),
        "tests": plain(study.tests),
        "early_warning": plain(study.early_warning),
        "touch": plain(study.touch),
        "earth_choice": plain(study.earth_choice),
        "own_life": plain(study.own_life),
        "reconnection": plain(study.reconnection),
        "companions": plain(study.companions),
        "after_break": plain(study.after_break),
    }
    if explain:
        result |= {"corridors": plain(study.corridors), "plane": plain(study.plane)}
    return result


def plain(value: Any) -> Any:
    """Any result as JSON values: complex as [real, imaginary], no NaN and no infinity."""
    if dataclasses.is_dataclass(value) and not isinstance(value, type):
        return {field.name: plain(getattr(value, field.name)) for field in dataclasses.fields(value)}
    if isinstance(value, dict):
        return {str(key): plain(item) for key, item in value.items()}
    if isinstance(value, tuple | list):
        return [plain(item) for item in value]
    if isinstance(value, Enum):
        return value.value
    if isinstance(value, complex):
        return [plain(value.real), plain(value.imag)]
    if isinstance(value, float) and not math.isfinite(value):
        return None
    return value


def _breaks(study: BreakStudy) -> dict[str, Any]:
    return {
        "seen_places": study.seen_places,
        "places": study.places,
        "notes": list(study.notes),
        "breaks": [_row(row) for row in study.rows],
        "summary": plain(study.summaries),
        "joints": plain(study.joints),
        "highest": plain(study.highest),
    }


def _row(row: BreakRow) -> dict[str, Any]:
    """A break row with its joint figures in one object, and the companion inside."""
    form: dict[str, Any] = plain(dataclasses.replace(row, all_impedance=None))
    form["joint"] = {"a": form.pop("joint_a"), "v": form.pop("joint_v"), "w": form.pop("joint_w")}
    form["all_impedance"] = None if row.all_impedance is None else _row(row.all_impedance)
    return form


def _settings(settings: Settings) -> dict[str, Any]:
    """All of the settings but their stages, with the digest that tells two sets of one site apart."""
    form: dict[str, Any] = plain(settings)
    del form["stages"]
    return form | {"digest": settings.digest}


def _stage(result: StageResult) -> dict[str, Any]:
    """A judged stage as one flat object, named as in a settings file; its bounds stand in a list of their own.

    ``pickup_v`` is there for all but 47, whose points are its ``pickup_percent``; other stages have that and
    ``base_v`` where they are set so. Figures of a stage that is off are null where it keeps none.
    """
    stage = result.stage
    points = stage.function is Function.UNBALANCE
    pickup, delay_s, dropout = plain(stage.pickup), plain(stage.delay_s), plain(stage.dropout_ratio)
    hold_s = plain(stage.hold_s)
    form: dict[str, Any] = plain(result)
    if not stage.on:
        pickup, delay_s, hold_s = pickup or None, delay_s or None, hold_s or None
        dropout = None if dropout == Stage.dropout_ratio else dropout
        form |= dict.fromkeys(("pickup_low", "pickup_high", "clearing_s", "secure", "clears_percent"))
    for apart in ("stage", "bounds"):
        del form[apart]
    return {
        "function": stage.function.value,
        "stage": stage.number,
        "on": stage.on,
        "pickup_v": None if points else pickup,
        "pickup_percent": pickup if points else plain(stage.pickup_percent),
        "base_v": plain(stage.base_v),
        "quantity": None if points else stage.quantity,
        "definition": stage.quantity if points else None,
        "delay_s": delay_s,
        "dropout_ratio": dropout,
        "reset": stage.reset,
        "hold_s": hold_s,
        "phases": stage.phases,
        "action": stage.action,
        "percent_of_base": form.pop("pickup_percent"),
    } | form
