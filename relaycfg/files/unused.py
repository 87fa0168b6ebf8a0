"""Keys that another choice leaves without effect: one table of choices, read for sources and for device elements."""

from collections.abc import Collection, Mapping

from relaycfg.files.keys import Form

SOURCE_KEYS: Mapping[str, tuple[str, ...]] = {
    "transformer": ("rating_kva", "impedance_percent", "x_over_r", "zero_sequence_ratio", "vector_group"),
    "generator": ("rating_kva", "reactance_percent", "x_over_r", "class", "neutral_ohm"),
    "impedance": ("line_ohm", "neutral_ohm"),
}
"""Keys of [[source]] that its kind decides on; all others are used by every kind."""
ELEMENT_KEYS: Mapping[str, tuple[str, ...]] = {
    "59": ("quantity", "pickup.base_v", "accuracy.pickup_v"),
    "27": ("quantity", "pickup.base_v", "accuracy.pickup_v"),
    "59N": ("quantity", "pickup.base_v", "accuracy.pickup_v"),
    "47": ("definition", "accuracy.pickup_points"),
}
"""Keys of a device's [[element]] that its function decides on."""


def unused(form: Form, uses: Mapping[str, tuple[str, ...]], choice: str) -> list[tuple[str, tuple[str, ...]]]:
    """Keys that ``form`` states and its choice does not use, each with the choices that would use it."""
    decided = dict.fromkeys(key for keys in uses.values() for key in keys)
    return [
        (key, tuple(other for other, keys in uses.items() if key in keys))
        for key in decided
        if key not in uses[choice] and _states(form, key.split("."))
    ]


def _states(form: Form, path: Collection[str]) -> bool:
    """Whether the key at that path was written."""
    head, *rest = path
    own = next((n for n, info in type(form).model_fields.items() if head == (info.alias or n)), head)
    if own not in form.model_fields_set:
        return False
    inner = getattr(form, own)
    return _states(inner, rest) if rest and isinstance(inner, Form) else not rest


def quoted(choices: Collection[str]) -> str:
    """Choices in quotes, joined by or."""
    return " or ".join(f'"{c}"' for c in choices)
