"""The whole sheet: same bytes, pages in order, type embedded, nothing outside the margins or on top of another."""

import os
import shutil
import subprocess
import sys
from dataclasses import replace
from io import BytesIO
from pathlib import Path

import pytest
from pypdf import PdfReader

from relaycfg.errors import InputError
from relaycfg.sheet import fonts, render
from relaycfg.sheet.ink import Ink
from relaycfg.sheet.render import BOTTOM, SECTIONS, SIDE, TOP
from relaycfg.sheet.wording import Wording

KINDS = ("plain", "letter", "large")
HEADS = ("No. Case,", "Field Value", "Break at", "Of Bound", "Level Time", "Weight Finding", "Source Status")


def test_the_same_study_gives_the_same_bytes(sheets, sample, templates):
    assert render(sample.study(), templates, "0.1.0") == sheets["plain"]


def test_another_process_with_another_hash_seed_gives_the_same_bytes(sheets, tmp_path):
    here, out = Path(__file__).parent, tmp_path / "sheet.pdf"
    code = (
        "import sys; from pathlib import Path; import sample; from relaycfg.sheet import render;"
        "Path(sys.argv[1]).write_bytes(render(sample.study(), Path(sys.argv[2]), '0.1.0'))"
    )
    root = here.parent.parent
    path = os.pathsep.join((str(root), str(here)))
    environment = {k: v for k, v in os.environ.items() if k != "SOURCE_DATE_EPOCH"}
    environment |= {"PYTHONPATH": path, "PYTHONHASHSEED": "7"}
    subprocess.run([sys.executable, "-c", code, str(out), str(root / "templates")], check=True, env=environment)
    assert out.read_bytes() == sheets["plain"]


def test_the_sections_come_in_the_approvers_order(sheets):
    titles = [item.title for item in PdfReader(BytesIO(sheets["plain"])).outline if not isinstance(item, list)]
    assert titles[:5] == [
        "Decision",
        "Installer's card",
        "What it sees and what not",
        "Test schedule",
        "Inputs with their evidence",
    ]
    assert len(titles) == len(SECTIONS)


def test_decision_card_sight_and_tests_are_the_first_four_pages(lines):
    heads = [
        "Lost-neutral relay of the main board, Example House",
        "Installer's card",
        "What it sees and what not",
        "Test schedule",
    ]
    assert [page[1] for page in lines["plain"][:4]] == heads


@pytest.mark.parametrize("kind", KINDS)
def test_the_card_is_page_two_and_sight_begins_page_three_however_large_the_site(lines, kind):
    card = "Derived with exceptions, NOT to be set" if kind == "large" else "Installer's card"
    assert [page[1] for page in lines[kind][1:3]] == [card, "What it sees and what not"]


@pytest.mark.parametrize("kind", KINDS)
def test_every_page_says_which_sheet_it_is_of(lines, sample, kind):
    pages = lines[kind]
    for number, page in enumerate(pages, 1):
        assert page[0].endswith("VR-0017 · revision B · status: draft")
        digest = sample.study().settings.digest
        foot = "VR-0017 · revision B · inputs sha256:4b1f0c9a7d2e · settings {} · relaycfg 0.1.0 · seed 20 · 400 states"
        assert page[-1] == f"{foot.format(digest[:19])} page {number} of {len(pages)}"


@pytest.mark.parametrize("kind", KINDS)
def test_no_word_stands_outside_the_margins(pages, kind):
    for number, page in enumerate(pages[kind], 1):
        for word in page.words:
            inside = word["x0"] > SIDE - 0.5 and word["x1"] < page.width - SIDE + 0.5
            inside &= word["top"] > 18 and word["bottom"] < page.height - 18
            assert inside, (number, word)


@pytest.mark.parametrize("kind", KINDS)
def test_the_body_keeps_clear_of_head_and_foot(pages, kind):
    for number, page in enumerate(pages[kind], 1):
        low = page.height - BOTTOM
        between = [w for w in page.words if w["bottom"] > TOP - 14 and w["top"] < TOP - 1]
        between += [w for w in page.words if low + 1 < w["bottom"] and w["top"] < low + 7]
        assert not between, (number, between)


@pytest.mark.parametrize("kind", KINDS)
def test_no_word_stands_on_another(pages, kind):
    for number, page in enumerate(pages[kind], 1):
        ordered = sorted(page.words, key=lambda w: w["x0"])
        for k, a in enumerate(ordered):
            for b in ordered[k + 1 :]:
                if b["x0"] > a["x1"]:
                    break
                across = min(a["x1"], b["x1"]) - b["x0"]
                down = min(a["bottom"], b["bottom"]) - max(a["top"], b["top"])
                assert across < 0.6 or down < 1.5, (number, a["text"], b["text"])


@pytest.mark.parametrize("kind", KINDS)
def test_no_heading_and_no_table_head_is_the_last_line_of_a_page(lines, sheets, kind):
    titles = {str(i.title) for i in _flat(PdfReader(BytesIO(sheets[kind])).outline)}
    for page in lines[kind]:
        assert page[-2] not in titles
        assert not page[-2].startswith(HEADS)


def _flat(outline):
    for item in outline:
        yield from _flat(item) if isinstance(item, list) else (item,)


def test_a_row_moves_to_the_next_page_whole_and_only_one_taller_than_a_page_is_split(sample, templates):
    fonts.register()
    ink = Ink(sample.study(), Wording(templates / "sheet"), "0.1.0", 500.0, 700.0)
    short = ink.table(["a", "b"], [["word " * 60, "x"], ["word " * 60, "y"]], (30, 70), "ll")[0]
    _, height = short.wrap(500, 700)
    assert short.split(500, 40) == []
    first, second = short.split(500, height - 10)
    assert (len(first._cellvalues), len(second._cellvalues)) == (2, 2)
    tall = ink.table(["a", "b"], [["word " * 3000, "x"]], (30, 70), "ll")[0]
    tall.wrap(500, 700)
    assert tall.split(500, 300) == []
    assert len(tall.split(500, 700)) == 2


@pytest.mark.parametrize("kind", KINDS)
def test_all_type_is_embedded(sheets, kind):
    reader = PdfReader(BytesIO(sheets[kind]))
    for page in reader.pages:
        stack, fonts = [page["/Resources"]], {}
        while stack:
            resources = stack.pop()
            fonts |= {str(f.get_object()["/BaseFont"]): f.get_object() for f in resources["/Font"].values()}
            forms = resources.get("/XObject", {})
            stack += [f.get_object()["/Resources"] for f in forms.values() if "/Resources" in f.get_object()]
        assert fonts
        for name, font in fonts.items():
            assert "DejaVuSans" in name
            assert "/FontFile2" in font["/FontDescriptor"]
    assert b"Helvetica" not in sheets[kind]


def test_charts_are_lines_not_pictures(pages, sheets):
    assert all(page.images == 0 for page in pages["plain"])
    assert b"/Subtype /Image" not in sheets["plain"]


@pytest.mark.parametrize(("kind", "size"), [("plain", (595, 842)), ("letter", (612, 792))])
def test_the_paper_is_the_one_asked_for(sheets, kind, size):
    box = PdfReader(BytesIO(sheets[kind])).pages[0].mediabox
    assert (round(box.width), round(box.height)) == size


def test_title_subject_and_language_are_stated(sheets):
    reader = PdfReader(BytesIO(sheets["plain"]))
    assert reader.metadata.title == "Lost-neutral relay of the main board, Example House"
    assert reader.metadata.subject == "Settings of the voltage relay K1 at Example House, north wing"
    assert reader.trailer["/Root"]["/Lang"] == "en"


def test_nothing_is_called_safe_or_compliant(lines):
    text = "\n".join(line for page in lines["plain"] for line in page).lower()
    assert " safe" not in text
    assert "complies" not in text
    assert "compliant" not in text


def test_names_that_look_like_markup_print_as_they_are(lines, sample):
    text = "\n".join(line for page in lines["plain"] for line in page)
    assert sample.EVIL in text


def test_a_character_without_a_glyph_names_field_and_character(sample, templates):
    with pytest.raises(InputError) as caught:
        render(sample.with_title(sample.study(), "Relay 電 and \u0007"), templates, "0.1.0")
    problems = caught.value.problems
    assert [p.field for p in problems] == ["document.title"] * 2
    assert problems[0].given == "'Relay 電 and \\x07' with '電' (U+96FB), which the sheet's typeface cannot print"


def test_every_section_stands_in_the_order_file_exactly_once(sample, templates, tmp_path):
    shutil.copytree(templates / "sheet", tmp_path / "sheet")
    order = tmp_path / "sheet" / "order.toml"
    order.write_text(order.read_text("utf-8").replace('"cautions", ', ""), "utf-8")
    with pytest.raises(InputError, match="sections is at odds over cautions; list every section exactly once"):
        render(sample.study(), tmp_path, "0.1.0")


def test_a_template_that_asks_for_an_unknown_name_is_refused_by_key(sample, templates, tmp_path):
    shutil.copytree(templates / "sheet", tmp_path / "sheet")
    (tmp_path / "sheet" / "frame.toml").write_text(
        (templates / "sheet" / "frame.toml").read_text("utf-8").replace("{{ relay }}", "{{ rely }}"), "utf-8"
    )
    with pytest.raises(InputError, match=r"frame\.subject is 'rely' is undefined"):
        render(sample.study(), tmp_path, "0.1.0")


def test_a_template_cannot_reach_into_python(sample, templates, tmp_path):
    shutil.copytree(templates / "sheet", tmp_path / "sheet")
    digest = tmp_path / "sheet" / "digest.toml"
    digest.write_text('title = "Digest"\nlead = "{{ study.__class__.__mro__ }}"\nrows = []\n', "utf-8")
    with pytest.raises(InputError, match=r"digest\.lead"):
        render(sample.study(), tmp_path, "0.1.0")


def test_a_long_title_is_set_smaller_not_cut(sample, templates):
    title = "A title of many words " * 12
    study = sample.with_title(sample.study(), title.strip())
    first = PdfReader(BytesIO(render(study, templates, "0.1.0"))).pages[0].extract_text()
    assert first.replace("\n", " ").count("A title of many words") == 24


def test_a_study_without_breaks_corridors_and_findings_still_prints(sample, templates):
    study = sample.study()
    bare = replace(
        study,
        corridors=(),
        closed=(),
        findings=(),
        tests=(),
        worked=None,
        plane=(),
        feed_range_v=(),
        cases=(),
        breaks=replace(study.breaks, summaries=(), notes=()),
        smallest_asymmetry={},
        coverage=(),
    )
    text = "\n".join(page.extract_text() for page in PdfReader(BytesIO(render(bare, templates, "0.1.0"))).pages)
    assert "No findings." in text
    assert "Verdict: no exceptions" in text


def test_the_build_date_of_the_environment_does_not_change_the_bytes(sheets, sample, templates, monkeypatch):
    monkeypatch.setenv("SOURCE_DATE_EPOCH", "1000000000")
    assert render(sample.study(), templates, "0.1.0") == sheets["plain"]
    assert os.environ["SOURCE_DATE_EPOCH"] == "1000000000"
