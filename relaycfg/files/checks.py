"""Forms filled from parsed data: what pydantic finds wrong becomes sentences."""

import json
import types
import typing
from collections.abc import Mapping
from typing import Any, TypeVar

import annotated_types
from pydantic import BaseModel, ValidationError
from pydantic.fields import FieldInfo
from pydantic_core import ErrorDetails

from relaycfg.errors import Problem
from relaycfg.files.keys import Form
from relaycfg.files.positions import Loc
from relaycfg.files.text import TomlFile, choose, near

AForm = TypeVar("AForm", bound=Form)


def fill(form: type[AForm], data: Any, file: TomlFile, loc: Loc, problems: list[Problem]) -> AForm | None:
    """The form filled with ``data`` that stands at ``loc`` of ``file``; None, with problems added, where it fails."""
    try:
        return form.model_validate(data)
    except ValidationError as reason:
        for error in reason.errors(include_url=False):
            given, remedy, allowed = explain(form, error)
            problems.append(file.problem((*loc, *error["loc"]), given, remedy, allowed))
        return None


def explain(form: type[Form], error: ErrorDetails) -> tuple[str, str, str]:
    """What was given, what to do and what is allowed, for one pydantic error of a form."""
    loc = error["loc"]
    field = field_at(form, loc)
    if error["type"] == "extra_forbidden":
        holder = model_at(form, loc[:-1])
        known = [info.alias or name for name, info in holder.model_fields.items()] if holder else []
        match = near(str(loc[-1]), known)
        return "not a known key", f"did you mean {match}?" if match else f"keys here are {', '.join(known)}", ""
    if error["type"] == "missing":
        return "missing", f"give {asked(field)}", limits(field)
    if error["type"] == "reserved_name":
        return f"{shown(error['input'])}, a reserved place name", "give another name", ""
    if error["type"] == "empty_name":
        return "empty", "give a name", ""
    if error["type"] == "control_character":
        return f"{shown(error['input'])}, with a control character", "write plain text", ""
    if error["type"] == "too_long_text":
        return "too long", "write at most 200 characters", ""
    if error["type"] == "literal_error":
        return shown(error["input"]), _choice(error["input"], field, loc), ""
    if error["type"] in ("model_type", "model_attributes_type", "dict_type"):
        return shown(error["input"]), "write a table with keys", ""
    if error["type"] == "list_type" and model_at(form, loc) is not None:
        return shown(error["input"]), f"write [[{loc[-1]}]] tables", ""
    return shown(error["input"]), f"give {asked(field)}", limits(field)


def _choice(given: Any, field: FieldInfo | None, loc: Loc) -> str:
    choices = [str(c) for c in literals(field.annotation if field else None)]
    if len(choices) == 1:
        return f"give {choices[0]}"
    if loc and loc[-1] == "between" and isinstance(given, str):
        turned = "-".join(reversed(given.split("-")))
        return f'write "{turned}"' if turned in choices else f"lines are L1, L2, L3; give one of {', '.join(choices)}"
    return choose(str(given), choices)


def shown(value: Any) -> str:
    """A value as the user wrote it, shortened."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, Mapping):
        return "a table"
    if isinstance(value, float):
        return f"{value:g}" if float(f"{value:g}") == value else str(value)
    try:
        text = json.dumps(value, ensure_ascii=False) if isinstance(value, (str, list)) else str(value)
    except (TypeError, ValueError):
        text = "a number that is too long" if isinstance(value, int) else "a list"
    return text if len(text) <= 60 else text[:57] + "..."


def asked(field: FieldInfo | None) -> str:
    """What to give: the words of the key, or its choices, or its type."""
    extra = extras(field)
    if "ask" in extra:
        return str(extra["ask"])
    choices = literals(field.annotation if field else None)
    if choices:
        return " or ".join(f'"{c}"' for c in choices)
    if field is not None and field.annotation is bool:
        return "true or false"
    if field is not None and _models(field.annotation):
        return "this table"
    return "text in quotes"


def limits(field: FieldInfo | None) -> str:
    """The range of a number in words: "-30 to 0", "above 0 to 20000"; empty where there is none."""
    if field is None:
        return ""
    low = high = ""
    marks = list(field.metadata)
    for mark in _inner_metadata(field.annotation):
        marks.append(mark)
    for mark in marks:
        if isinstance(mark, annotated_types.Ge):
            low = f"{mark.ge:g}"
        elif isinstance(mark, annotated_types.Gt):
            low = f"above {mark.gt:g}"
        elif isinstance(mark, annotated_types.Le):
            high = f"{mark.le:g}"
        elif isinstance(mark, annotated_types.Lt):
            high = f"below {mark.lt:g}"
    if low and high:
        return f"{low} to {high}"
    return f"{low} or more" if low else high


def extras(field: FieldInfo | None) -> dict[str, Any]:
    """Unit, ask, row and otherwise of a key."""
    return dict(field.json_schema_extra) if field is not None and isinstance(field.json_schema_extra, dict) else {}


def literals(annotation: Any) -> tuple[Any, ...]:
    """All choices of the Literal inside an annotation, through None, lists and Annotated."""
    if typing.get_origin(annotation) is typing.Literal:
        return typing.get_args(annotation)
    return tuple(c for part in _parts(annotation) for c in literals(part))


def model_at(form: type[Form], loc: Loc) -> type[Form] | None:
    """The form that stands at ``loc``."""
    current: type[Form] | None = form
    for step in loc:
        if isinstance(step, int):
            continue
        info = _field(current, step) if current else None
        found = _models(info.annotation) if info else []
        current = found[0] if found else None
    return current


def field_at(form: type[Form], loc: Loc) -> FieldInfo | None:
    """The key that stands at ``loc``, a list position being part of its key."""
    names = [i for i, step in enumerate(loc) if isinstance(step, str)]
    if not names:
        return None
    holder = model_at(form, loc[: names[-1]])
    return _field(holder, str(loc[names[-1]])) if holder else None


def _field(form: type[Form] | None, name: str) -> FieldInfo | None:
    fields = form.model_fields.items() if form else ()
    return next((info for own, info in fields if name == (info.alias or own)), None)


def _models(annotation: Any) -> list[type[Form]]:
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return [typing.cast(type[Form], annotation)]
    return [m for part in _parts(annotation) for m in _models(part)]


def _inner_metadata(annotation: Any) -> list[Any]:
    own = list(getattr(annotation, "__metadata__", ()))
    marks = [m for mark in own for m in (mark.metadata if isinstance(mark, FieldInfo) else [mark])]
    return marks + [m for part in _parts(annotation) for m in _inner_metadata(part)]


def _parts(annotation: Any) -> tuple[Any, ...]:
    origin = typing.get_origin(annotation)
    if origin in (typing.Union, types.UnionType, list, typing.Annotated):
        args = typing.get_args(annotation)
        return args[:1] if origin is typing.Annotated else args
    return ()
