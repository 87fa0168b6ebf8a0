"""The starter site reads back without a complaint, for every voltage and earthing, and overwrites nothing."""

import json
import tomllib
from pathlib import Path

import jsonschema
import pytest

from relaycfg.errors import InputError
from relaycfg.files import read_site, site_schema, write_starter
from relaycfg.model.device import Function
from relaycfg.study import derive

NAMES = ["loads.csv", "relay.toml", "site.schema.json", "site.toml"]


@pytest.mark.parametrize("volts", [120.0, 127.0, 220.0, 230.0, 240.0, 277.0])
@pytest.mark.parametrize("earthing", ["TN-S", "TN-C-S", "TT"])
def test_a_starter_reads_back_with_ranges_in_proportion(tmp_path, volts, earthing):
    paths = write_starter(tmp_path / "new", volts, earthing, None)
    assert sorted(p.name for p in paths) == NAMES
    site = read_site(tmp_path / "new" / "site.toml", need_relay=True)
    assert (site.supply.nominal_v, site.supply.earthing, site.warnings) == (volts, earthing, ())
    assert {load.lines for load in site.loads} == {(0,), (1,), (2,)}
    over = site.relay.device.element(Function.OVERVOLTAGE)
    assert (over.stages, over.pickup.low, over.pickup.step) == (3, volts, 1)
    assert over.pickup.high == pytest.approx(1.8 * volts, abs=1)
    shift = site.relay.device.element(Function.DISPLACEMENT)
    assert shift.pickup.low == pytest.approx(0.02 * volts, abs=0.5)
    assert shift.pickup.high == pytest.approx(0.6 * volts, abs=0.5)
    under = site.relay.device.element(Function.UNDERVOLTAGE)
    assert under.dropout_ratio == (1.01, 1.02, 1.03, 1.05)
    assert shift.accuracy.pickup_abs == pytest.approx(2 / 3 * 0.01 * volts, abs=0.1)
    assert shift.accuracy.pickup_abs >= 2 / 3 * 0.01 * volts
    thirds = {load.kind: load.third_harmonic_percent for load in site.loads}
    assert (thirds["led lighting"], thirds["electronics"], thirds["water heater"]) == (15, 25, 0)
    scale = 1 if 220 <= volts <= 240 else volts / 230
    assert site.equipment.sustained_high_v == pytest.approx(255 * scale, 0.01)


@pytest.mark.parametrize("volts", [50, 63.5, 100, 120, 127, 173, 220, 230, 254, 277, 346, 500, 600])
@pytest.mark.parametrize("earthing", ["TN-S", "TN-C-S", "TT"])
def test_settings_can_be_derived_for_a_starter_without_an_exception(tmp_path, volts, earthing):
    write_starter(tmp_path, float(volts), earthing, None)
    assert derive(read_site(tmp_path / "site.toml", need_relay=True), 100, 1).exceptions == 0


@pytest.mark.parametrize("earthing", ["TN-S", "TN-C-S", "TT"])
@pytest.mark.parametrize(("system", "between_v"), [("1ph-3w", 240.0), ("2ph-3w", 207.85)])
def test_a_starter_of_two_lines_reads_back_and_is_derived_without_an_exception(tmp_path, system, between_v, earthing):
    """Source: own arithmetic: a lost neutral brings up to the volts between the lines, and a feed takes these."""
    write_starter(tmp_path, 120.0, earthing, None, system=system)
    site = read_site(tmp_path / "site.toml", need_relay=True)
    assert site.warnings == ()
    assert {load.lines for load in site.loads} == {(0,), (1,), (0, 1)}
    assert site.relay.device.element(Function.OVERVOLTAGE).pickup.high >= between_v
    assert site.relay.supply.low_v < 0.8 * between_v < 1.1 * between_v < site.relay.supply.high_v
    assert (site.relay.device.element(Function.DISPLACEMENT) is not None) == (system == "1ph-3w")
    assert derive(site, 100, 1).exceptions == 0


@pytest.mark.parametrize(("system", "volts", "meant"), [("2ph-3w", 208.0, 120), ("2ph-3w", 400.0, 230)])
def test_a_starter_of_two_lines_refuses_the_volts_between_them(tmp_path, system, volts, meant):
    with pytest.raises(InputError, match=f"looks like a line-to-line voltage; .* line to neutral, {meant}"):
        write_starter(tmp_path / "new", volts, "TN-S", None, system=system)


def test_the_schema_comes_with_it_and_the_site_agrees_with_it(tmp_path):
    write_starter(tmp_path, 230.0, "TN-C-S", None)
    text = (tmp_path / "site.toml").read_text("utf-8")
    assert text.startswith("#:schema ./site.schema.json\n")
    schema = json.loads((tmp_path / "site.schema.json").read_text("utf-8"))
    assert schema == json.loads(json.dumps(site_schema()))
    jsonschema.Draft202012Validator(schema).validate(tomllib.loads(text))


def test_a_starter_takes_over_loads_with_a_board_for_each_name(tmp_path):
    own = tmp_path / "mine.csv"
    own.write_text('board,name,between,kw\nHall,Saw,L1-N,1\nMB,Fan,L2-N,1\n"Hut ""7""",Lamp,L3-N,1\n', "utf-8")
    write_starter(tmp_path / "new", 230.0, "TN-S", own)
    site = read_site(tmp_path / "new" / "site.toml")
    assert [b.name for b in site.boards] == ["MB", "Hall", 'Hut "7"']
    assert [load.name for load in site.loads] == ["Saw", "Fan", "Lamp"]


def test_bad_loads_stop_the_starter_before_it_writes(tmp_path):
    own = tmp_path / "mine.csv"
    own.write_text("board,name,between,kw\nMB,Saw,L9-N,1\n", "utf-8")
    with pytest.raises(InputError, match='between is "L9-N"'):
        write_starter(tmp_path / "new", 230.0, "TN-S", own)
    assert not (tmp_path / "new").exists()


def test_own_loads_are_held_against_each_other_before_anything_is_written(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    Path("mine.csv").write_text("board,name,between,kw\nMB,Saw,L1-N,1\nMB,Saw,L2-N,1\n", "utf-8")
    with pytest.raises(InputError) as caught:
        write_starter(Path("new"), 230.0, "TN-S", Path("mine.csv"))
    assert [p.sentence() for p in caught.value.problems] == [
        'mine.csv:3:2 (name): name is "Saw", used before; give every load a name of its own'
    ]
    assert not Path("new").exists()


def test_a_folder_that_holds_a_site_is_left_alone(tmp_path):
    (tmp_path / "site.toml").write_text("mine", "utf-8")
    with pytest.raises(InputError) as caught:
        write_starter(tmp_path, 230.0, "TN-S", None)
    assert caught.value.text() == (f"{tmp_path}: a folder that holds site.toml; give a new folder, or add --force")
    assert [p.name for p in tmp_path.iterdir()] == ["site.toml"]
    write_starter(tmp_path, 230.0, "TN-S", None, force=True)
    assert read_site(tmp_path / "site.toml").loads


def test_own_loads_that_lie_in_place_stay_as_they_are(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    Path("loads.csv").write_text("# mine\nboard,name,between,kw\nMB,Saw,L1-N,1\n", "utf-8")
    write_starter(Path(), 230.0, "TN-S", Path("loads.csv"))
    assert Path("loads.csv").read_text("utf-8").startswith("# mine\n")
    assert [load.name for load in read_site(Path("site.toml")).loads] == ["Saw"]


def test_own_loads_by_the_name_of_another_file_are_not_written_over(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    Path("site.toml").write_text("board,name,between,kw\nMB,Saw,L1-N,1\n", "utf-8")
    with pytest.raises(InputError) as caught:
        write_starter(Path(), 230.0, "TN-S", Path("site.toml"), force=True)
    assert caught.value.text() == (
        "site.toml: one of the files read for it; give another name: an input is never replaced"
    )
    assert [p.name for p in Path().iterdir()] == ["site.toml"]


def test_a_folder_that_cannot_be_is_answered(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    Path("file").write_text("", "utf-8")
    for folder, sentence in (
        ("file", "file: a file; give a new folder"),
        ("a" * 300, f"{'a' * 300}: not to be made (file name too long); give another folder"),
        ("a\0b", "a b: not a usable path; give another folder"),
    ):
        with pytest.raises(InputError) as caught:
            write_starter(Path(folder), 230.0, "TN-S", None)
        assert caught.value.text() == sentence


@pytest.mark.parametrize(
    ("volts", "earthing", "sentence"),
    [
        (400.0, "TN-S", "--volts: 400, which looks like a line-to-line voltage; give volts from line to neutral, 230"),
        (391.0, "TN-S", "--volts: 391, which looks like a line-to-line voltage; give volts from line to neutral, 230"),
        (12.0, "TN-S", "--volts: 12; give volts from line to neutral, 50 to 600"),
        (230.0, "IT", '--earthing: "IT"; give TN-S, TN-C-S or TT'),
    ],
)
def test_bad_arguments_are_answered(tmp_path, volts, earthing, sentence):
    with pytest.raises(InputError) as caught:
        write_starter(tmp_path / "new", volts, earthing, None)
    assert caught.value.text() == sentence
    assert not (tmp_path / "new").exists()
