"""Results as plain JSON values: null for what is absent or infinite, keys named as in the model."""

import dataclasses
import math
from enum import Enum
from typing import Any

from relaycfg.model.results import BreakRow, BreakStudy, Study

SCHEMA = 1
"""Number of the published form (its JSON Schema is result.schema.json beside this file)."""


def breaks_dict(study: BreakStudy, program: str, input_digest: str, seed: int, samples: int) -> dict[str, Any]:
    """Result of ``breaks``; ``program`` is name and version."""
    head = {"schema": SCHEMA, "program": program, "input_digest": input_digest, "seed": seed, "samples": samples}
    return head | _breaks(study)


def study_dict(study: Study, program: str, explain: bool = False) -> dict[str, Any]:
    """Result of ``derive`` or ``check``; ``explain`` adds the curves R and W."""
    settings = study.settings
    result = breaks_dict(study.breaks, program, study.input_digest, study.seed, study.samples)
    result |= {
        "kind": study.kind,
        "exceptions": study.exceptions,
        "findings": plain(study.findings),
        "settings": {
            "for_relay": settings.for_relay,
            "device": settings.device,
            "inhibit_s": plain(settings.inhibit_s),
            "after_any_trip": settings.after_any_trip,
            "stages": [_stage(plain(result)) for result in study.stages],
        },
        "bounds": [{"stage": r.stage.label} | plain(b) for r in study.stages for b in r.bounds],
        "cases": plain(study.cases),
        "coverage": {name: plain(share) for name, share in study.coverage.items()},
        "smallest_asymmetry": plain(study.smallest_asymmetry),
        "never_cleared": study.never_cleared,
        "closed": plain(study.closed),
        "tests": plain(study.tests),
    }
    if explain:
        result["curves"] = plain(study.corridors)
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
    }


def _row(row: BreakRow) -> dict[str, Any]:
    """A break row with its joint figures in one object, and the companion inside."""
    form: dict[str, Any] = plain(dataclasses.replace(row, all_impedance=None))
    form["joint"] = {"a": form.pop("joint_a"), "v": form.pop("joint_v"), "w": form.pop("joint_w")}
    form["all_impedance"] = None if row.all_impedance is None else _row(row.all_impedance)
    return form


def _stage(form: dict[str, Any]) -> dict[str, Any]:
    """A judged stage as one flat object; its bounds stand in a list of their own."""
    del form["bounds"]
    stage: dict[str, Any] = form.pop("stage")
    base = {"pickup_percent": form.pop("pickup_percent"), "base": form.pop("base")}
    del stage["pickup_percent"]
    return stage | base | form
