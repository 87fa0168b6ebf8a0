"""Every row of the tables is used and listed, and none changes without its source."""

from types import MappingProxyType

import pytest

from relaycfg.files.tables import Row, shipped
from relaycfg.study import check, derive
from tests.files.standard_rows import LIST, complaints, entry, listed
from tests.files.sweep import choices, example, read_bare, read_shipped, recorded

CONTENT = {
    "id": "x", "value": 0.4, "unit": "s", "applies_to": "a test", "source": "IEC 1", "clause": "Table 1",
    "status": "quoted", "note": "One text.",
}  # fmt: skip


@pytest.fixture(scope="module")
def handed_out(tmp_path_factory):
    """Rows handed out while the shipped sites are read; and by each choice, with its site."""
    with recorded() as by_shipped:
        read_shipped(tmp_path_factory.mktemp("shipped"))
    folder, by_choice = tmp_path_factory.mktemp("choices"), {}
    for text in choices():
        with recorded() as used:
            by_choice[text] = read_bare(folder, text), used
    return by_shipped, by_choice


def row(**changes):
    return Row("x", "f", MappingProxyType({**CONTENT, **changes}))


def said(text, **changes):
    """The one complaint about the row with changes, against a list that knows it without."""
    (sentence,) = complaints({"x": row(**changes)}, text)
    return sentence


LISTED = entry(row()).lines("x")


def test_no_row_changed_without_its_source_and_the_list_knows_all_of_them():
    assert complaints(shipped(), LIST.read_text("utf-8")) == []


def test_every_listed_row_is_used_and_every_used_row_is_listed(handed_out):
    by_shipped, by_choice = handed_out
    assert by_shipped.union(*(used for _, used in by_choice.values())) == set(listed(LIST.read_text("utf-8")))


def test_the_shipped_sites_rest_on_rows_of_every_status(handed_out):
    assert {shipped()[i].status for i in handed_out[0]} == {"read", "quoted", "memory", "own"}


def test_a_study_asks_for_no_row_beyond_those_of_its_site():
    site = example("site.toml")
    with recorded() as handed:
        settings = derive(site, 20, 1).settings
        check(site, settings, 20, 1)
    assert handed == set()


def test_a_value_that_changes_while_its_source_stays_is_refused():
    sentence = said(LISTED, value=0.5)
    assert sentence.startswith("x: value changed from 0.4 s to 0.5 s, but its source did not")
    assert "seal" not in sentence
    assert said(LISTED, unit="ms").startswith("x: value changed from 0.4 s to 0.4 ms, but its source did not")
    assert said(LISTED, value=0.5, note="Two texts.").startswith("x: value changed")


def test_a_value_that_changes_with_its_source_needs_a_new_entry_in_the_list():
    sentence = said(LISTED, value=0.5, clause="Table 2")
    assert sentence.startswith("x: value and source changed; the list needs the new value")
    assert complaints({"x": row(value=0.5, clause="Table 2")}, sentence.partition("\n")[2]) == []


def test_a_source_that_changes_alone_has_to_be_looked_at():
    for change in ({"source": "IEC 2"}, {"clause": "Table 2"}, {"status": "read"}):
        assert said(LISTED, **change).startswith("x: source changed; see that it says 0.4")


def test_a_figure_of_our_own_changes_only_with_its_reason():
    text = entry(row(status="own", note="A cycle.")).lines("x")
    assert "but its source did not" in said(text, status="own", note="A cycle.", value=0.5)
    assert "the list needs the new value" in said(text, status="own", note="Two cycles.", value=0.5)


def test_an_entry_edited_without_its_seal_is_refused():
    assert "edited without its seal" in said(LISTED.replace("0.4", "0.5"), value=0.5)


def test_rows_missing_on_either_side_are_told():
    assert said("") == f"x: not in the list; check it against its source, then add\n{LISTED}"
    assert complaints({}, LISTED) == ["x: in the list and not in the tables; take it out"]


def test_every_figure_of_a_row_stands_in_its_entry():
    many = row(points=[[1.0, 2.0]], values={"low_v": 3.0}, sustained_v=255.0)
    assert entry(many).value == "0.4; low_v 3.0; points [[1.0, 2.0]]; sustained_v 255.0"
