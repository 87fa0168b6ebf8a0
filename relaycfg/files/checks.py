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
from relaycfg.files.text import Overlong, TomlFile, choose, near
from relaycfg.model.geometry import three_phase

AForm = TypeVar("AForm", bound=Form)


def fill(form: type[AForm], data: Any, file: TomlFile, loc: Loc, problems: list[Problem]) -> AForm | None:
    """The form filled with ``data`` that stands at ``loc`` of ``file``; None, with problems added, where it fails."""
    try:
        return form.model_validate(data)
    except ValidationError as reason:
        errors = reason.errors(include_url=False)
        meant = {(*e["loc"][:-1], _meant(form, e["loc"])) for e in errors if e["type"] == "extra_forbidden"}
        for error in errors:
            if error["type"] == "missing" and error["loc"] in meant:
                continue
            given, remedy, allowed = explain(form, error)
            problems.append(file.problem((*loc, *error["loc"]), given, remedy, allowed))
        return None


def explain(form: type[Form], error: ErrorDetails) -> tuple[str, str, str]:
    """What was given, what to do and what is allowed, for one pydantic error of a form."""
    loc = error["loc"]
    field = field_at(form, loc)
    if error["type"] == "extra_forbidden":
        match = _meant(form, loc)
        known = f"keys here are {', '.join(_keys_at(form, loc[:-1]))}"
        return "not a known key", f"did you mean {match}?" if match else known, ""
    if error["type"] in ("missing", "too_short") and _is_array(field):
        article = "an" if str(loc[-1])[0] in "aeiou" else "a"
        return "missing" if error["type"] == "missing" else "empty", f"write {article} [[{_table(loc)}]] table", ""
    if error["type"] == "missing":
        return "missing", f"give {asked(field)}", limits(field)
    if error["type"] == "reserved_name":
        return f"{shown(error['input'])}, a reserved place name", "give another name", ""
    if error["type"] == "empty_name":
        return "empty", "give a name", ""
    if error["type"] == "control_character":
        character = error.get("ctx", {}).get("character", "a control character")
        return f"{shown(error['input'])}, with the control character {character}", "write plain text", ""
    if error["type"] == "too_long_text":
        return "too long", "write at most 200 characters", ""
    if error["type"] == "literal_error":
        return shown(error["input"]), _choice(error["input"], field, loc), ""
    if error["type"] in ("model_type", "model_attributes_type", "dict_type"):
        return shown(error["input"]), "write a table with keys", ""
    if error["type"] == "list_type" and model_at(form, loc) is not None:
        return shown(error["input"]), f"write [[{loc[-1]}]] tables", ""
    return shown(error["input"]), f"give {asked(field)}", limits(field)


def _keys_at(form: type[Form], loc: Loc) -> list[str]:
    holder = model_at(form, loc)
    return [info.alias or name for name, info in holder.model_fields.items()] if holder else []


def _meant(form: type[Form], loc: Loc) -> str | None:
    """The key that was meant by the unknown one at ``loc``; None where none is near."""
    return near(str(loc[-1]), _keys_at(form, loc[:-1]))


def _table(loc: Loc) -> str:
    return ".".join(step for step in loc if isinstance(step, str))


def _is_array(field: FieldInfo | None) -> bool:
    """Whether the key is an array of tables."""
    return field is not None and typing.get_origin(field.annotation) is list and bool(_models(field.annotation))


def _choice(given: Any, field: FieldInfo | None, loc: Loc) -> str:
    choices = [str(c) for c in literals(field.annotation if field else None)]
    if len(choices) == 1:
        return f"give {choices[0]}"
    if loc and loc[-1] == "between" and isinstance(given, str):
        turned = "-".join(reversed(given.split("-")))
        lines = ", ".join(three_phase().names)
        return f'write "{turned}"' if turned in choices else f"lines are {lines}; give one of {', '.join(choices)}"
    return choose(str(given), choices)


def shown(value: Any) -> str:
    """A value as the user wrote it, shortened."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, Mapping):
        return "a table"
    if isinstance(value, Overlong):
        return value.written
    if isinstance(value, float):
        return f"{value:g}" if float(f"{value:g}") == value else str(value)
    try:
        text = _listed(value) if isinstance(value, list) else _quoted(value) if isinstance(value, str) else str(value)
    except ValueError:
        text = "a number that is too long"
    return text if len(text) <= 60 else text[:57] + "..."


def _listed(values: list[Any]) -> str:
    return "[" + ", ".join(_listed(v) if isinstance(v, list) else shown(v) for v in values[:30]) + "]"


def _quoted(text: str) -> str:
    """Text in quotes, what does not print as its escape."""
    return "".join(c if c.isprintable() else f"\\u{ord(c):04x}" for c in json.dumps(text, ensure_ascii=False))


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
