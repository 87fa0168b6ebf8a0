"""JSON of the results against the published schema."""

import json
import math
from dataclasses import replace
from importlib import resources

import jsonschema
import pytest

from relaycfg.text import breaks_dict, study_dict
from relaycfg.text.json_form import plain

PROGRAM = "relaycfg 0.0.0"


@pytest.fixture(scope="module")
def validator():
    schema = json.loads(resources.files("relaycfg.text").joinpath("result.schema.json").read_text("utf-8"))
    jsonschema.Draft202012Validator.check_schema(schema)
    return jsonschema.Draft202012Validator(schema)


def test_breaks_fit_the_schema(validator, break_study):
    result = breaks_dict(break_study, PROGRAM, "sha256:abc", 1, 200)
    validator.validate(result)
    assert result["schema"] == 1
    assert result["program"] == PROGRAM
    row = result["breaks"][0]
    assert row["joint"] == {"a": 0, "v": 57.5, "w": 0}
    assert row["relays"]["R1"]["unbalance_percent"]["l_n_deviation"] == 26.0
    assert row["all_impedance"]["flags"] == []
    assert row["all_impedance"]["all_impedance"] is None


@pytest.mark.parametrize("explain", [False, True])
def test_a_study_fits_the_schema(validator, study, explain):
    result = study_dict(study, PROGRAM, explain)
    validator.validate(result)
    assert result["exceptions"] == 1
    assert result["findings"][0]["do"] == "turn U< from 207 to 182 V"
    assert result["settings"]["stages"][0]["pickup"] == 265.0
    assert result["bounds"][0]["stage"] == "59 stage 1"
    assert ("curves" in result) is explain


def test_it_is_strict_json_with_null_for_what_is_absent(study):
    endless = replace(study, displacement_standing_v=math.nan, smallest_asymmetry={"59": math.inf})
    text = json.dumps(study_dict(endless, PROGRAM), allow_nan=False)
    assert json.loads(text)["smallest_asymmetry"] == {"59": None}
    assert json.loads(text)["breaks"][0]["boards"]["MB"]["neutral_a"] is None


def test_phasors_become_pairs():
    assert plain({"shift_v": 3 - 4j, "worst": (math.nan,)}) == {"shift_v": [3.0, -4.0], "worst": [None]}


def test_the_schema_refuses_what_it_does_not_know(validator, study):
    result = study_dict(study, PROGRAM)
    for broken in (
        result | {"extra": 1},
        {k: v for k, v in result.items() if k != "cases"},
        result | {"settings": result["settings"] | {"stages": [{"function": "59"}]}},
    ):
        assert not validator.is_valid(broken)
