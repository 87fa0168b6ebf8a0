"""One mistake is one problem: what only follows from it is not reported, what stands beside it is."""

import pytest

MAIN = """\
[supply]
nominal_v = 230
earthing = "TN-C-S"

[[source]]
name = "grid"
kind = "transformer"
rating_kva = 400
no_load_v = 235

[[board]]
name = "MB"
fed_from = "source"
neutral_earth_link = true

[board.cable]
length_m = 150
line_mm2 = 95

[[board]]
name = "Workshop"
fed_from = "MB"

[[board]]
name = "Office"
fed_from = "MB"

[[load]]
board = "MB"
name = "Kiln"
between = "L1-N"
kw = 2

[[load]]
board = "Workshop"
name = "Saw"
between = "L2-N"
kw = 2

[[motor]]
board = "Office"
name = "Lift"
shaft_kw = 2

[[relay]]
name = "R1"
measures_at = "MB"
device = "relay.toml"
"""
METRES = "give metres, above 0 to 20000"
CASES = {
    "negative length": (
        "length_m = 150", "length_m = -150", f"site.toml:17:1: board.MB.cable.length_m is -150; {METRES}"
    ),
    "no length": ("length_m = 150", "length_m = 0", f"site.toml:17:1: board.MB.cable.length_m is 0; {METRES}"),
    "endless": ("length_m = 150", "length_m = inf", f"site.toml:17:1: board.MB.cable.length_m is inf; {METRES}"),
    "line-to-line volts": (
        "nominal_v = 230", "nominal_v = 400",
        "site.toml:2:1: supply.nominal_v is 400, which looks like a line-to-line voltage; "
        "give volts from line to neutral, 230",
    ),
    "misspelt required key": (
        "earthing =", "earthign =", "site.toml:3:1: supply.earthign is not a known key; did you mean earthing?"
    ),
    "misspelt key of a cable": (
        "length_m =", "lenght_m =",
        "site.toml:17:1: board.MB.cable.lenght_m is not a known key; did you mean length_m?",
    ),
    "misspelt link": (
        "neutral_earth_link", "neutral_earth_lnik",
        "site.toml:14:1: board.MB.neutral_earth_lnik is not a known key; did you mean neutral_earth_link?",
    ),
    "misspelt name": (
        'name = "Workshop"', 'nmae = "Workshop"',
        "site.toml:21:1: board.2.nmae is not a known key; did you mean name?",
    ),
    "name of another type": ('name = "Workshop"', "name = 7", "site.toml:21:1: board.7.name is 7; give text in quotes"),
    "name used before": (
        'name = "Office"', 'name = "Workshop"',
        'site.toml:25:1: board.Workshop.name is "Workshop", used before; give every one a name of its own',
    ),
    "main board fed from nowhere": (
        'fed_from = "source"', 'fed_from = "grid"',
        'site.toml:13:1: board.MB.fed_from is "grid", an unknown board; '
        'give one of "source", "MB", "Workshop", "Office"',
    ),
    "main board fed from itself": (
        'fed_from = "source"', 'fed_from = "MB"',
        'site.toml:13:1: board.MB.fed_from is "MB", a loop (MB from MB); '
        'feed one of them from "source" or another board',
    ),
    "misspelt table": (
        "[supply]", "[suply]", "site.toml:1:1: suply is not a known table; did you mean supply?"
    ),
    "misspelt array": (
        "[[source]]", "[[sorce]]", "site.toml:5:1: sorce is not a known table; did you mean source?"
    ),
    "misspelt relay": ("[[relay]]", "[[relya]]", "site.toml:45:1: relya is not a known table; did you mean relay?"),
    "rating of the wrong type": (
        "rating_kva = 400", 'rating_kva = "400"',
        'site.toml:8:1: source.grid.rating_kva is "400"; give kVA, above 0 to 10000',
    ),
}  # fmt: skip


@pytest.mark.parametrize("name", CASES)
def test_only_the_root_cause_is_reported(bench, name):
    old, new, sentence = CASES[name]
    assert MAIN.count(old) == 1
    bench.put("relay.toml", bench.device)
    assert bench.sentences(MAIN.replace(old, new), need_relay=True) == [sentence]


def test_boards_under_a_misspelt_table_are_one_problem(bench):
    bench.put("relay.toml", bench.device)
    text = MAIN.replace("[[board]]", "[[bord]]").replace("[board.cable]", "[bord.cable]")
    assert bench.sentences(text, need_relay=True) == ["site.toml:11:1: bord is not a known table; did you mean board?"]


def test_a_mistake_beside_another_is_reported_with_it(bench):
    bench.put("relay.toml", bench.device)
    text = MAIN.replace("nominal_v = 230", "nominal_v = 400").replace("no_load_v = 235", "no_load_v = 410")
    assert bench.sentences(text) == [
        "site.toml:2:1: supply.nominal_v is 400, which looks like a line-to-line voltage; "
        "give volts from line to neutral, 230",
        "site.toml:9:1: source.grid.no_load_v is 410, which looks like a line-to-line voltage; "
        "give volts from line to neutral, 184 to 287.5",
    ]
    text = MAIN.replace("length_m = 150", "length_m = 0").replace('board = "Workshop"', 'board = "Workshp"')
    assert bench.sentences(text) == [
        f"site.toml:17:1: board.MB.cable.length_m is 0; {METRES}",
        'site.toml:35:1: load.Saw.board is "Workshp", an unknown board; did you mean "Workshop"?',
    ]


def test_a_device_file_that_is_not_there_is_traced_to_its_key(bench):
    bench.put("relays.toml", bench.device)
    assert bench.sentences(MAIN) == [
        'site.toml:48:1: relay.R1.device is "relay.toml", not there; did you mean "relays.toml"?'
    ]
    assert bench.sentences(MAIN.replace("relay.toml", "..")) == [
        'site.toml:48:1: relay.R1.device is "..", a folder; give the path of a file in it'
    ]
