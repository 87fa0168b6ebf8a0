"""The seconds and minutes after a break as text and on the sheet: few lines, what nothing trips in first."""

import json
from dataclasses import replace
from importlib import resources

import jsonschema
import pytest

from relaycfg.model.after_break_results import Cascade, Lost
from relaycfg.model.break_results import Share
from relaycfg.study import derive
from relaycfg.text import study_dict
from relaycfg.text.after_break import after_break
from relaycfg.text.layout import WIDTH
from tests.study import yard

KEYS = 'kind = "electronics"\ncutout_pu = 0.5\nrestart_s = 1.0\nband_pu = [0.7, 1.2]\nthird_harmonic_percent = 30\n'


@pytest.fixture(scope="module")
def study(tmp_path_factory):
    tables = [yard.load("Main", f"L{k + 1}-N", kw, f"load {k}", usage=0.8) for k, kw in enumerate((9.0, 1.0, 2.0))]
    loads = tables[0] + KEYS + "".join(table + "damage_pu = 1.2\n" for table in tables[1:])
    return derive(yard.site(tmp_path_factory.mktemp("after"), loads=loads), 60, 1)


def with_places(study, *places):
    return replace(study, after_break=replace(study.after_break, places=places))


def said(study):
    return " ".join(" ".join(after_break(study)).split())


def test_two_places_take_at_most_ten_lines_of_the_terminals_width(study):
    lines = after_break(study)
    assert len(study.after_break.places) == 2
    assert len(lines) <= 10
    assert max(map(len, lines)) <= WIDTH


def test_more_places_are_counted_and_not_listed(study):
    one = study.after_break.places[0]
    lines = after_break(with_places(study, *(replace(one, at=f"board {k}") for k in range(5))))
    assert len(lines) <= 11
    assert lines[-1].startswith("and 3 more places")


def test_the_place_with_the_most_courses_that_nothing_trips_in_stands_first(study):
    one = study.after_break.places[0]
    blind = replace(one, at="blind", any_stage=replace(one.any_stage, share=Share(1, 60, 0.0, 0.1)))
    seen = replace(one, at="seen", any_stage=replace(one.any_stage, share=Share(60, 60, 0.9, 1.0)))
    rows = after_break(with_places(study, seen, blind))[5:7]
    assert rows[0].split()[:2] == ["blind", "59"]
    assert rows[1].split()[:2] == ["seen", "0"]


def test_without_places_nothing_is_printed(study):
    assert after_break(replace(study, after_break=None)) == []
    assert after_break(with_places(study)) == []


def test_the_text_says_when_a_figure_is_too_near_the_pickup_to_decide(study):
    one = study.after_break.places[0]
    for verdict, words in (("borderline", "too near to say"), ("misses", "misses it"), ("off", "59N is off")):
        changed = with_places(study, replace(one, balanced=replace(one.balanced, verdict=verdict)))
        assert words in said(changed)


def test_a_cascade_that_ends_without_a_solution_says_so(study):
    one = study.after_break.places[0]
    for resolved in (True, False):
        cascade = Cascade("sample 7", (Lost("lamp", 300.0), Lost("fan", 310.0)), 320.0, resolved)
        text = said(with_places(study, replace(one, cascades=(cascade,))))
        assert "sample 7: 2 loads fail open one after another, 300 to 320 V" in text
        assert ("then no solution" in text) is not resolved


def test_the_real_result_fits_the_published_schema(study):
    schema = json.loads(resources.files("relaycfg.text").joinpath("result.schema.json").read_text("utf-8"))
    form = study_dict(study, "relaycfg 0.0.0")["after_break"]
    whole = {"$ref": "#/$defs/after_break", "$defs": schema["$defs"]}
    jsonschema.Draft202012Validator(whole).validate(json.loads(json.dumps(form)))
    assert [p["at"] for p in form["places"]] == ["source", "Main"]
