"""The section "After a break": every figure of the study stands there, and so does its course."""

import io
from dataclasses import replace

import pypdf
import pytest

from relaycfg.files.places import templates_dir
from relaycfg.sheet import render
from relaycfg.study import derive
from tests.study import yard

KEYS = 'kind = "electronics"\ncutout_pu = 0.5\nrestart_s = 1.0\nband_pu = [0.7, 1.2]\nthird_harmonic_percent = 30\n'


@pytest.fixture(scope="module")
def page(tmp_path_factory):
    tables = [yard.load("Main", f"L{k + 1}-N", kw, f"load {k}", usage=1.0) for k, kw in enumerate((9.0, 1.0, 2.0))]
    loads = tables[0] + KEYS + tables[1] + "damage_pu = 1.2\n" + tables[2]
    study = derive(yard.site(tmp_path_factory.mktemp("page"), loads=loads), 40, 1)
    pages = pypdf.PdfReader(io.BytesIO(render(study, templates_dir(), "0.0.0"))).pages
    return study, " ".join(" ".join(p.extract_text() for p in pages).split())


def test_every_part_has_its_title(page):
    _, text = page
    for title in (
        "After a break",
        "One course: break at",
        "When each stage trips in these courses",
        "Loads that fail open one after another",
        "If nothing trips: the minutes after",
        "How far the lower band edge of electronics moves the shares",
        "Balanced electronic load on a lost neutral",
    ):
        assert title in text


def test_the_course_names_its_loads_and_the_stages_that_trip_in_it(page):
    study, text = page
    picture = study.after_break.picture
    assert picture.happenings
    assert picture.trips
    first = picture.happenings[0]
    assert f"{first.at_s:.2f} s {first.load} {first.does}" in text
    for stage, seconds in picture.trips:
        assert f"{stage} {seconds:.2f} s" in text


def test_lost_loads_stand_with_their_volts_in_order(page):
    study, text = page
    cascade = next(c for p in study.after_break.places for c in p.cascades if c.lost)
    assert "; ".join(f"{lost.load} at {lost.highest_v:.1f} V" for lost in cascade.lost) in text


def test_states_in_which_nothing_fails_take_no_row_and_are_said_once(page):
    study, text = page
    places = tuple(
        replace(p, cascades=tuple(replace(c, lost=(), resolved=True) for c in p.cascades))
        for p in study.after_break.places
    )
    none = replace(study, after_break=replace(study.after_break, places=places))
    pages = pypdf.PdfReader(io.BytesIO(render(none, templates_dir(), "0.0.0"))).pages
    bare = " ".join(" ".join(p.extract_text() for p in pages).split())
    assert bare.count("is a load with a stated damage voltage above it") == 1
    assert "In this order, at the highest volts anywhere" not in bare
    assert "is a load with a stated damage voltage above it" not in text


def test_the_sheet_no_longer_calls_cycling_loads_unexamined(page):
    assert "Loads that drop out, restart or cycle" not in page[1]
