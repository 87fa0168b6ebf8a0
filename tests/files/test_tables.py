"""Published values: no row without its source, none used without being noted."""

import ast
from pathlib import Path

import pytest

from relaycfg.files.tables import STATUSES, TableError, Tables, load_rows, names, shipped

FILES = Path(__file__).parents[2]

ROW = """
family = "f"
[[row]]
id = "x"
value = 1.0
unit = "1"
applies_to = "a test"
source = "nobody"
clause = "none"
status = "own"
"""


def test_every_shipped_row_says_where_it_is_from():
    assert len(shipped()) > 100
    assert all(row.status in STATUSES and row.content["source"] and row.content["clause"] for row in shipped().values())


def written_in_code():
    """Every text that stands in the code, docstrings left out."""
    for path in (FILES / "relaycfg").rglob("*.py"):
        tree = ast.parse(path.read_text("utf-8"))
        docs = {id(node.value) for node in ast.walk(tree) if isinstance(node, ast.Expr)}
        yield from (
            node.value
            for node in ast.walk(tree)
            if isinstance(node, ast.Constant) and isinstance(node.value, str) and id(node) not in docs
        )


def test_every_value_of_a_row_is_read_somewhere():
    texts = set(written_in_code())
    said = {"id", "name", "also", "value", "values", "columns", "points", "unit", "applies_to", "source", "clause"}
    for row in shipped().values():
        assert set(row.content) - said - {"status", "note"} <= texts, row.id
        assert set(row.content.get("values", ())) <= texts, row.id


def test_a_band_in_volts_and_in_percent_says_the_same():
    for row in shipped().values():
        if row.family == "supply-bands" and "low_percent" in row.values:
            nominal = row.values["nominal_v"]
            for side in ("low", "high"):
                share = 1 + row.values[f"{side}_percent"] / 100
                assert row.values[f"{side}_v"] == pytest.approx(nominal * share, abs=0.05), row.id


@pytest.mark.parametrize("lack", ["family", "id", "unit", "applies_to", "source", "clause", "status"])
def test_a_row_that_lacks_its_origin_does_not_load(tmp_path, lack):
    kept = "".join(line for line in ROW.splitlines(keepends=True) if not line.startswith(f"{lack} ="))
    (tmp_path / "t.toml").write_text(kept, "utf-8")
    with pytest.raises(TableError, match=f"lacks (a )?{lack}"):
        load_rows(tmp_path)
    (tmp_path / "t.toml").write_text(ROW, "utf-8")
    assert load_rows(tmp_path)["x"].value == 1.0


def test_a_row_of_unknown_status_or_a_second_of_one_id_does_not_load(tmp_path):
    (tmp_path / "t.toml").write_text(ROW.replace('"own"', '"sure"'), "utf-8")
    with pytest.raises(TableError, match="known status"):
        load_rows(tmp_path)
    (tmp_path / "t.toml").write_text(ROW + ROW.replace('family = "f"', ""), "utf-8")
    with pytest.raises(TableError, match="id of its own"):
        load_rows(tmp_path)


def test_a_source_stands_apart_from_how_it_is_known():
    row = shipped()["household-overvoltage-break-times"]
    assert row.source == "EN 50550:2011; IEC 63052:2019 believed equal, Table 1"
    assert row.cited == f"{row.source}, from memory, verify"
    assert shipped()["disconnection-tt"].cited == "IEC 60364-4-41, Table 41.1, read"
    assert shipped()["default-load-usage"].cited == "own assumption, ours"


def test_a_clause_known_from_memory_is_left_out_where_the_value_was_seen():
    assert shipped()["en-50160-unbalance"].content["clause"] == "4.2.4 (clause number from memory)"
    assert shipped()["en-50160-unbalance"].cited == "EN 50160 (2010 numbering), as quoted"
    for row in shipped().values():
        assert (row.source + row.cited).count("memory") == (row.status == "memory"), row.id


def test_names_and_other_names_find_their_row_and_mark_it_used():
    tables = Tables()
    assert tables.named("supply-bands", " EN 50160 all ").id == "en-50160-all-means"
    assert tables.named("supply-bands", "led lighting") is None
    assert list(tables.used) == ["en-50160-all-means"]


def test_a_name_stands_for_one_row_of_its_family():
    for family in ("supply-bands", "load-kinds", "withstand-curves", "generator"):
        found = names(family)
        assert len(found) == len(set(found))
