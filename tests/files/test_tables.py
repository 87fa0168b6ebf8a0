"""Published values: no row without its source, none used without being noted."""

import pytest

from relaycfg.files.tables import STATUSES, TableError, Tables, load_rows, names, shipped

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


@pytest.mark.parametrize("lack", ["id", "unit", "applies_to", "source", "clause", "status"])
def test_a_row_that_lacks_its_origin_does_not_load(tmp_path, lack):
    kept = "".join(line for line in ROW.splitlines(keepends=True) if not line.startswith(f"{lack} ="))
    (tmp_path / "t.toml").write_text(kept.replace("status", "\nstatus"), "utf-8")
    with pytest.raises((TableError, KeyError)):
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


def test_sources_are_printed_with_how_they_are_known():
    assert shipped()["household-overvoltage-break-times"].source == (
        "EN 50550:2011; IEC 63052:2019 believed equal, Table 1 (from memory, verify)"
    )
    assert shipped()["disconnection-tt"].source == "IEC 60364-4-41, Table 41.1 (read)"
    assert shipped()["default-load-usage"].source == "own assumption (ours)"


def test_names_and_other_names_find_their_row_and_mark_it_used():
    tables = Tables()
    assert tables.named("supply-bands", " EN 50160 all ").id == "en-50160-all-means"
    assert tables.named("supply-bands", "led lighting") is None
    assert list(tables.used) == ["en-50160-all-means"]


def test_a_name_stands_for_one_row_of_its_family():
    for family in ("supply-bands", "load-kinds", "withstand-curves", "generator"):
        found = names(family)
        assert len(found) == len(set(found))
