"""A figure known from memory only is never printed as if its source had been read: every print asks to verify it."""

import json
import re
from dataclasses import replace
from io import BytesIO

import pdfplumber
import pytest

from relaycfg.files import key_table, name_lists
from relaycfg.files.places import templates_dir
from relaycfg.files.tables import shipped
from relaycfg.model.device import Function
from relaycfg.model.settings import Stage
from relaycfg.sheet import render
from relaycfg.sheet.ink import Ink
from relaycfg.study import check, derive
from relaycfg.text import check_text, derive_text, study_dict
from tests.files.sweep import bare, read_bare, recorded

VERIFY = "from memory, verify"
SITES = {
    "transformer": bare(
        volts=220,
        supply='band = "China, 220 V"',
        source='kind = "transformer"\nrating_kva = 100\nvector_group = "Yzn5"',
        more='[[motor]]\nboard = "MB"\nname = "Fan"\nshaft_kw = 3\n',
    ),
    "generator": bare(source='kind = "generator"\nrating_kva = 30\nclass = "G3"'),
}


@pytest.fixture(scope="module", params=SITES)
def judged(request, tmp_path_factory):
    """A site that rests on many rows from memory: its derived study, one with a stage that trips everywhere, rows."""
    with recorded() as used:
        site = read_bare(tmp_path_factory.mktemp(request.param), SITES[request.param])
    derived = derive(site, 20, 1)
    touchy = Stage(Function.OVERVOLTAGE, 1, True, 240.0, 0.05, 0.95, quantity="l-n")
    lively = Stage(Function.UNDERVOLTAGE, 1, True, 215.0, 0.05, 1.05, quantity="l-n")
    checked = check(site, replace(derived.settings, stages=(touchy, lively)), 20, 1)
    remembered = {shipped()[i].source for i in used if shipped()[i].status == "memory"}
    return derived, checked, remembered


@pytest.fixture(scope="module")
def printed(judged):
    """The derived sheet: rows of its tables as printed, and the words of all its pages."""
    rows = []
    plain = Ink.table

    def table(ink, heads, content, *more, **named):
        rows.extend(re.sub(r"<[^>]*>", "", " | ".join(str(c) for c in line)) for line in content)
        return plain(ink, heads, content, *more, **named)

    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(Ink, "table", table)
        pdf = render(judged[0], templates_dir(), "0")
    with pdfplumber.open(BytesIO(pdf)) as pages:
        return rows, " ".join(" ".join(page.extract_text() for page in pages.pages).split())


def naming(source, texts):
    """Texts that name the source itself, and not a longer one that begins alike."""
    return [t for t in texts if re.search(re.escape(source) + r"(?!, no source|[\w/-])", t)]


def test_sites_rest_on_several_sources_from_memory(judged):
    assert len(judged[2]) >= 3


def test_inputs_and_cases_carry_the_status_of_what_they_rest_on(judged):
    derived, _, remembered = judged
    for source in remembered:
        notes = [i for i in derived.site.inputs if naming(source, [i.note])]
        cases = [c for c in derived.cases if naming(source, [c.source])]
        assert notes, source
        assert {x.status for x in (*notes, *cases)} == {"memory"}, source


def test_what_is_taken_from_a_remembered_curve_is_no_better_than_it(judged):
    status = {i.field: i.status for i in judged[0].site.inputs}
    assert status["equipment.sustained_high_v"] == status["equipment.sustained_high_s"] == "memory"


def test_terminal_text_asks_to_verify_behind_every_such_source(judged):
    derived, checked, remembered = judged
    said = 0
    for text in (derive_text(derived), check_text(checked)):
        joined = " ".join(text.split())
        for source in remembered:
            for match in re.finditer(re.escape(source) + r"(?!, no source)", joined):
                assert joined[match.end() : joined.find("]", match.end())].endswith(VERIFY), joined[
                    match.start() - 80 :
                ]
                said += 1
    assert said >= 2


def test_json_gives_the_status_beside_every_such_source(judged):
    derived, _, remembered = judged
    result = json.loads(json.dumps(study_dict(derived, "relaycfg 0")))
    named = [c for c in result["cases"] if any(naming(source, [c["source"]]) for source in remembered)]
    assert named
    assert {c["status"] for c in named} == {"memory"}


def test_every_row_of_the_sheet_that_names_such_a_source_asks_to_verify_it(judged, printed):
    rows, _ = printed
    for source in judged[2]:
        named = naming(source, rows)
        assert named, source
        assert [row for row in named if VERIFY not in row] == []


def test_the_sheet_says_so_of_the_withstand_curve_and_counts_it_all_on_page_1(judged, printed):
    derived, (rows, words) = judged[0], printed
    assert f"source of the curve: {derived.site.equipment.source} ({VERIFY})" in words
    inputs = sum(i.status == "memory" for i in derived.site.inputs)
    cases = sum(c.status == "memory" for c in derived.cases)
    assert f"Inputs from memory, to be verified | {inputs}" in rows
    assert f"Cases with figures from memory | {cases}" in rows


def test_the_lists_for_users_say_so_too():
    remembered = [row for row in shipped().values() if row.status == "memory"]
    lines = [line for line in (key_table() + name_lists()).splitlines() if line.startswith("|")]
    named = [line for row in remembered for line in lines if f"| {row.name} |" in line or f"`{row.name}`" in line]
    assert named
    for line in named:
        assert VERIFY in line
