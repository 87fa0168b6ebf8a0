"""JSON of the results against the published schema."""

import dataclasses
import json
import math
from dataclasses import replace
from importlib import resources

import jsonschema
import pytest

from relaycfg.model import (
    after_break_results,
    break_results,
    companion_results,
    joint_results,
    own_life_results,
    reconnect_results,
    results,
    touch_results,
)
from relaycfg.model.device import Function
from relaycfg.model.settings import Settings, Stage
from relaycfg.text import breaks_dict, study_dict
from relaycfg.text.json_form import plain

PROGRAM = "relaycfg 0.0.0"
ELSEWHERE = {"site", "device", "stages"}
"""Fields of a study that are no key of the JSON: the inputs, and the stages, which stand in the settings."""
EXPLAINED = {"corridors", "plane"}
"""Fields that only --explain shows."""
SHAPES = {
    "finding": results.Finding,
    "case": results.CaseResult,
    "operated": results.Operated,
    "cover": results.Cover,
    "closed": results.ClosedGroup,
    "worked": results.WorkedBreak,
    "test": results.TestPoint,
    "corridor": results.Corridor,
    "step": results.CurveStep,
    "point": results.PlanePoint,
    "margins": results.Margins,
    "summary": break_results.PlaceSummary,
    "board": break_results.BoardVolts,
    "relay": break_results.RelayVolts,
    "joint_point": joint_results.JointPoint,
    "joint_sight": joint_results.JointSight,
    "joint_state": joint_results.JointState,
    "joint_sweep": joint_results.JointSweep,
    "early_warning": joint_results.EarlyWarning,
    "board_touch": touch_results.BoardTouch,
    "relay_touch": touch_results.RelayTouch,
    "place_touch": touch_results.PlaceTouch,
    "earth_sight": touch_results.EarthSight,
    "earth_choice": touch_results.EarthChoice,
    "own_life": own_life_results.OwnLife,
    "feed_life": own_life_results.FeedLife,
    "held_loss": own_life_results.HeldLoss,
    "sensing_neutral": own_life_results.SensingNeutral,
    "poles": own_life_results.Poles,
    "reconnection": reconnect_results.Reconnection,
    "pumping": reconnect_results.Pumping,
    "condition": reconnect_results.Condition,
    "companions": companion_results.Companions,
    "companion": companion_results.Companion,
    "opening": companion_results.Opening,
    "confusion": companion_results.Confusion,
    "after_break": after_break_results.AfterBreak,
    "place_after_break": after_break_results.PlaceAfterBreak,
    "tripping": after_break_results.Tripping,
    "cascade": after_break_results.Cascade,
    "lost_load": after_break_results.Lost,
    "drift": after_break_results.Drift,
    "met": after_break_results.Met,
    "band_edge": after_break_results.BandEdge,
    "balanced": after_break_results.Balanced,
    "course_picture": after_break_results.CoursePicture,
    "happening": after_break_results.Happening,
}


def names(shape):
    return {field.name for field in dataclasses.fields(shape)}


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
    assert result["settings"]["stages"][0]["pickup_v"] == 265.0
    assert result["bounds"][0]["stage"] == "59 stage 1"
    assert EXPLAINED & set(result) == (EXPLAINED if explain else set())


def test_every_field_of_a_study_is_a_key_of_the_same_name(study):
    result = study_dict(study, PROGRAM, explain=True)
    assert names(results.Study) - set(result) == ELSEWHERE
    assert names(results.Study) - set(study_dict(study, PROGRAM)) == ELSEWHERE | EXPLAINED
    assert names(break_results.BreakStudy) - {"rows", "summaries"} <= set(result)
    assert (len(result["breaks"]), len(result["summary"])) == (len(study.breaks.rows), len(study.breaks.summaries))
    assert names(Settings) | {"digest"} == set(result["settings"])


@pytest.mark.parametrize("name", SHAPES)
def test_the_schema_names_every_field_of_the_model(name, validator):
    assert set(validator.schema["$defs"][name]["properties"]) == names(SHAPES[name])


def test_what_the_sheet_prints_is_there_with_its_figures(study):
    result = study_dict(study, PROGRAM)
    assert result["settings"]["reconnect_delay_s"] == 5.0
    assert result["settings"]["digest"] == study.settings.digest
    assert result["feed_range_v"] == [{"feed": "supply", "lowest_v": 300.0, "highest_v": 344.0}]
    assert result["coverage"][1] == {"elements": "47", "cleared_percent": None, "seen_percent": 0.0}
    assert (result["uncleared"], result["blocked"], result["displacement_standing_v"]) == (7, 3, 3.2)
    assert result["worked"]["admittance_s"][0] == [0.2, 0.0]
    assert result["tests"][0]["element"] == "59 stage 1"
    assert result["cases"][1]["operated"] == [{"stage": "27 stage 1", "seconds": 0.15, "course": "all lines"}]


def staged(study, **changes):
    """The JSON of the first stage, changed."""
    first = study.stages[0]
    changed = replace(first, stage=replace(first.stage, **changes))
    return study_dict(replace(study, stages=(changed,)), PROGRAM)["settings"]["stages"][0]


def test_a_stage_is_named_as_in_a_settings_file(study):
    stage = staged(study)
    model = names(Stage) - {"number", "pickup"} | {"stage", "pickup_v", "definition"}
    assert model <= set(stage)
    assert (stage["function"], stage["stage"], stage["quantity"], stage["definition"]) == ("59", 1, "l-n", None)
    assert (stage["pickup_v"], stage["pickup_percent"], stage["base_v"]) == (265.0, None, None)
    assert (stage["percent_of_base"], stage["clears_percent"]) == (115.2, 49.5)
    set_so = staged(study, pickup=22.0, pickup_percent=10.0, base_v=220.0)
    assert (set_so["pickup_v"], set_so["pickup_percent"], set_so["base_v"]) == (22.0, 10.0, 220.0)
    points = staged(study, function=Function.UNBALANCE, pickup=7.0, quantity="V2/V1")
    assert (points["pickup_v"], points["pickup_percent"]) == (None, 7.0)
    assert (points["quantity"], points["definition"]) == (None, "V2/V1")


def test_the_figures_of_a_stage_that_is_off_are_null_where_it_keeps_none(study, validator):
    off = replace(study.stages[0], stage=Stage(Function.OVERVOLTAGE, 3, False), pickup_low=0.0, clearing_s=0.0)
    result = study_dict(replace(study, stages=(off,)), PROGRAM)
    validator.validate(result)
    (stage,) = result["settings"]["stages"]
    absent = ("pickup_v", "pickup_percent", "delay_s", "dropout_ratio", "hold_s")
    judged = ("pickup_low", "pickup_high", "clearing_s", "secure", "clears_percent")
    assert [name for name in (*absent, *judged) if stage[name] is not None] == []
    kept = staged(study, on=False, pickup=265.0, delay_s=4.0, dropout_ratio=0.97)
    assert (kept["on"], kept["pickup_v"], kept["delay_s"], kept["dropout_ratio"]) == (False, 265.0, 4.0, 0.97)
    assert (kept["clearing_s"], kept["secure"]) == (None, None)


def blank(value):
    """A result with every float that is no input made NaN."""
    if dataclasses.is_dataclass(value) and not isinstance(value, (Settings, Stage)):
        fields = {f.name: blank(getattr(value, f.name)) for f in dataclasses.fields(value)}
        return replace(value, **fields)
    if isinstance(value, tuple):
        return tuple(blank(item) for item in value)
    if isinstance(value, dict):
        return {key: blank(item) for key, item in value.items()}
    return math.nan if isinstance(value, float) else complex(math.nan, 0) if isinstance(value, complex) else value


def test_no_figure_however_absent_becomes_nan(study):
    parts = ("stages", "cases", "breaks", "corridors", "closed", "worked", "plane", "feed_range_v", "coverage")
    empty = replace(study, **{name: blank(getattr(study, name)) for name in parts})
    text = json.dumps(study_dict(empty, PROGRAM, explain=True), allow_nan=False)
    assert "NaN" not in text


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
