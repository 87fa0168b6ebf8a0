"""The JSON Schema and the key table come from the same forms as the checks."""

import datetime
import json
import tomllib
from pathlib import Path

import jsonschema
import pytest

from relaycfg.files import key_table, name_lists, site_schema
from relaycfg.files.device_form import DeviceForm
from relaycfg.files.settings_form import SettingsForm
from relaycfg.files.site_form import SiteForm
from relaycfg.files.tables import is_high_curve, names

EXAMPLES = Path(__file__).parents[2] / "examples"


def plain(data):
    """Parsed TOML with dates as JSON has them."""
    return json.loads(json.dumps(data, default=datetime.date.isoformat))


def leaves(schema):
    """Every property of a schema with the table it stands in."""
    tables = {"": schema, **schema.get("$defs", {})}
    return [(t, name, field) for t, table in tables.items() for name, field in table.get("properties", {}).items()]


@pytest.mark.parametrize("form", [SiteForm, DeviceForm, SettingsForm])
def test_every_key_is_described(form):
    assert all(field.get("description") for _, _, field in leaves(form.model_json_schema(by_alias=True)))


def test_every_number_that_has_a_unit_in_its_name_states_that_unit():
    endings = {"_v": "V", "_s": "s", "_percent": "%", "_ohm": "ohm", "_kw": "kW", "_kva": "kVA", "_m": "m", "_hz": "Hz"}
    for form in (SiteForm, DeviceForm, SettingsForm):
        for table, name, field in leaves(form.model_json_schema(by_alias=True)):
            for ending, unit in endings.items():
                if name.endswith(ending) and name not in ("minds_low_v", "pickup_points"):
                    assert field.get("unit") or (unit if "$ref" in field else None) == unit, (table, name)


@pytest.mark.parametrize("path", sorted(EXAMPLES.glob("*/site*.toml")), ids=lambda p: p.name)
def test_the_examples_agree_with_the_schema(path):
    jsonschema.Draft202012Validator(site_schema()).validate(plain(tomllib.loads(path.read_text("utf-8"))))


@pytest.mark.parametrize(
    "wrong",
    [
        {"supply": {"nominal_v": "230", "earthing": "TN-S"}},
        {"supply": {"nominal_v": 230, "earthing": "IT"}},
        {"supply": {"nominal_v": 230, "earthing": "TN-S", "colour": "red"}},
    ],
)
def test_the_schema_refuses_what_the_program_refuses(wrong):
    found = jsonschema.Draft202012Validator(site_schema()).iter_errors(wrong)
    assert any(list(error.absolute_path)[:1] == ["supply"] for error in found)


def test_the_schema_knows_no_null_which_toml_does_not_have():
    assert "null" not in json.dumps(site_schema())


def test_the_lists_hold_every_name_that_is_accepted():
    lists = name_lists()
    for family, keep in (("supply-bands", None), ("load-kinds", None), ("withstand-curves", is_high_curve)):
        for name in names(family, keep or (lambda _: True)):
            assert f"`{name}`" in lists
    for name in ("G1", "G2", "G3", "public supply", "dips class 2", "dips class 3"):
        assert f"| `{name}` |" in lists
    assert [line for line in lists.splitlines() if line.startswith("#")] == [
        "### supply.band", "### load.kind", "### equipment.overvoltage", "### source.class", "### must_hold.sets"
    ]  # fmt: skip
    assert "| `United Kingdom statutory` | -6.0 to +10.0 % of 230 V |" in lists


def test_the_key_table_has_a_line_for_every_key_with_its_default():
    table = key_table()
    for line in (
        "| `supply.nominal_v` | nominal voltage, line to neutral | number | V | 50 to 600 | required |",
        "| `load.usage` | share of time it is on | number |  | 0 to 1 | 0.5; own assumption, ours |",
        "| `source.class` | generator: performance class of ISO 8528-5 | `G1`, `G2`, `G3` |  |  "
        "| generating set class G2; own assumption, ours |",
        "| `source.line_ohm` | impedance: each line | `[r, x]` | ohm |  | required for that kind |",
        "| `element.delay_s.step` | step | number | s | above 0 to 600 | required |",
        "| `start_up.inhibit_s` | 27 and 47 wait so long; never 59 or 59N | number | s | 0 to 60 | 0 |",
    ):
        assert line in table.splitlines()
    rows = [line for line in table.splitlines() if line.startswith("| `")]
    assert len(rows) == len(set(rows)) + 1 > 130  # both written files carry the same key schema
    assert all(line.count(" | ") == 5 for line in rows)
