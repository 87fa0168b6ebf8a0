"""The keys of all files as a JSON Schema and as a table for people; both come from the forms."""

import re
import types
import typing
from typing import Any

from pydantic.fields import FieldInfo

from relaycfg.files.checks import extras, limits, literals
from relaycfg.files.device_form import DeviceForm
from relaycfg.files.keys import Form
from relaycfg.files.ledger import printed
from relaycfg.files.settings_form import SettingsForm
from relaycfg.files.site_form import SiteForm
from relaycfg.files.tables import shipped

FILES: tuple[tuple[str, type[Form]], ...] = (
    ("site.toml", SiteForm),
    ("relay.toml (a device)", DeviceForm),
    ("settings.toml", SettingsForm),
)


def site_schema() -> dict[str, Any]:
    """JSON Schema of site.toml, for editors that complete and check as one types."""
    schema = SiteForm.model_json_schema(by_alias=True)
    schema["$schema"] = "https://json-schema.org/draft/2020-12/schema"
    schema["title"] = "site.toml of relaycfg"
    _strip(schema)
    return schema


def _strip(node: Any) -> None:
    """Takes out what only our own sentences need, and the nulls that TOML does not have."""
    if isinstance(node, list):
        for part in node:
            _strip(part)
    elif isinstance(node, dict):
        for name in ("ask", "row", "otherwise"):
            if isinstance(node.get(name), str):
                del node[name]
        if node.get("unit") == "":
            del node["unit"]
        choices = node.get("anyOf")
        if isinstance(choices, list) and {"type": "null"} in choices:
            node["anyOf"] = [c for c in choices if c != {"type": "null"}]
            node.pop("default", None)
        if "default" in node and not isinstance(node["default"], (str, int, float)):
            del node["default"]
        for part in node.values():
            _strip(part)


def key_table() -> str:
    """Markdown: every key of every file with type, unit, range, and whether it is required or what stands in."""
    lines: list[str] = []
    for title, form in FILES:
        lines += [f"### {title}", "", "| key | what | type | unit | range | required or default |"]
        lines += ["|---|---|---|---|---|---|"]
        lines += _rows(form, "")
        lines.append("")
    return "\n".join(lines)


def _rows(form: type[Form], at: str) -> list[str]:
    rows: list[str] = []
    for own_name, field in form.model_fields.items():
        name = at + (field.alias or own_name)
        inner, many = _inner_form(field.annotation)
        if inner is not None:
            table = f"[[{name}]]" if many else f"[{name}]"
            rows.append(f"| **{table}** | {field.description} | table | | | {_need(field)} |")
            rows += _rows(inner, name + ".")
        else:
            unit = extras(field).get("unit") or ""
            cells = (f"`{name}`", field.description, _type(field), unit, limits(field), _need(field))
            rows.append("| " + " | ".join(str(c) for c in cells) + " |")
    return rows


def _inner_form(annotation: Any) -> tuple[type[Form] | None, bool]:
    if isinstance(annotation, type) and issubclass(annotation, Form):
        return annotation, False
    for part in typing.get_args(annotation):
        inner, many = _inner_form(part)
        if inner is not None:
            return inner, many or typing.get_origin(annotation) is list
    return None, False


def _type(field: FieldInfo) -> str:
    choices = literals(field.annotation)
    kinds = [field.annotation, *_members(field.annotation)]
    is_list = any(typing.get_origin(kind) is list for kind in kinds)
    if choices:
        words = ", ".join(f"`{c}`" for c in choices)
        return f"list of {words}" if is_list else words
    if is_list:
        return f"`{_shape(field)}`"
    for kind, word in ((bool, "true or false"), (int, "whole number"), (float, "number"), (str, "text")):
        if kind in kinds:
            return word
    return "date"


def _shape(field: FieldInfo) -> str:
    """A list of numbers as people write it, such as [r, x]; taken from what the error sentences ask for."""
    asked_for = re.match(r"\[.*\]", str(extras(field).get("ask", "")))
    return asked_for[0] if asked_for else "[number, ...]"


def _members(annotation: Any) -> list[Any]:
    if typing.get_origin(annotation) in (typing.Union, types.UnionType, typing.Annotated):
        return [m for part in typing.get_args(annotation) for m in (part, *_members(part))]
    return []


def _need(field: FieldInfo) -> str:
    if field.is_required():
        return "required"
    extra = extras(field)
    if "row" in extra:
        row = shipped()[str(extra["row"])]
        return f"{printed(row.value)}; {row.cited}"
    if "otherwise" in extra:
        return str(extra["otherwise"])
    if isinstance(field.default, (str, int, float, list)):
        shown = printed(field.default)
        return shown if shown not in ("", "[]") else "empty"
    return "optional"
