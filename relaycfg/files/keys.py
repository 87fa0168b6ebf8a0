"""How a key of an input file is declared: what it is, its unit, its range, and where its default comes from."""

import unicodedata
from typing import Annotated, Any

from pydantic import AfterValidator, BaseModel, ConfigDict, Field
from pydantic_core import PydanticCustomError

RESERVED = ("source", "none")
OHMS = "[r, x] in ohms"
STEERING = ("Cc", "Cf", "Cs", "Zl", "Zp")
"""Unicode categories of control characters, of those that set the direction of writing, and of line breaks."""
JOINERS = "\u200c\u200d"
"""They join letters of some scripts and are part of their spelling."""
Pair = Annotated[list[float], Field(min_length=2, max_length=2)]


class Form(BaseModel):
    """A table of an input file: strict types, no unknown keys, no infinite numbers."""

    model_config = ConfigDict(strict=True, frozen=True, extra="forbid", allow_inf_nan=False, populate_by_name=False)


def key(
    about: str,
    *,
    unit: str = "",
    ask: str = "",
    row: str = "",
    otherwise: str = "",
    default: Any = ...,
    alias: str | None = None,
    length: int | tuple[int, int] | None = None,
    gt: float | None = None,
    ge: float | None = None,
    lt: float | None = None,
    le: float | None = None,
) -> Any:
    """A pydantic field with what the key table and the error sentences need.

    ``ask`` completes "give ..."; ``row`` is the table row behind the default, ``otherwise`` a default in words.
    Fields with either are None when not given; those with neither and without ``default`` are required.
    """
    shortest, longest = length if isinstance(length, tuple) else (length, length)
    extra: dict[str, Any] = {"unit": unit}
    extra |= {name: text for name, text in (("ask", ask), ("row", row), ("otherwise", otherwise)) if text}
    if default is ... and (row or otherwise):
        default = None
    return Field(
        default, description=about, json_schema_extra=extra, alias=alias, min_length=shortest, max_length=longest,
        gt=gt, ge=ge, lt=lt, le=le,
    )  # fmt: skip


def _plain(text: str) -> str:
    """Text without blanks around it, composed; refuses characters that steer a terminal or hide in print."""
    text = unicodedata.normalize("NFC", text.strip())
    for character in text:
        if unicodedata.category(character) in STEERING and character not in JOINERS:
            code = f"U+{ord(character):04X}"
            called = unicodedata.name(character, "").lower()
            raise PydanticCustomError(
                "control_character", "{character}", {"character": f"{code} {called}" if called else code}
            )
    if len(text) > 200:
        raise PydanticCustomError("too_long_text", "too long")
    return text


def _filled(text: str) -> str:
    if not text:
        raise PydanticCustomError("empty_name", "empty")
    return text


def _free(text: str) -> str:
    if text in RESERVED:
        raise PydanticCustomError("reserved_name", "reserved")
    return text


Text = Annotated[str, AfterValidator(_plain)]
Name = Annotated[Text, AfterValidator(_filled)]
OwnName = Annotated[Name, AfterValidator(_free)]
