"""Mistakes in device and settings files, word for word; odd settings are kept for a check to find."""

import pytest

from relaycfg.errors import InputError
from relaycfg.files import read_settings

DEVICE_CASES = {
    "unknown function": (
        'function = "59N"', 'function = "59G"', 'relay.toml:14:1: element.59G.function is "59G"; did you mean "59"?'
    ),
    "function twice": (
        'function = "59N"', 'function = "59"',
        'relay.toml:14:1: element.59.function is "59", given before; keep one element a function, with its stages',
    ),
    "range upside down": (
        "max = 300", "max = 200", "relay.toml:8:23: element.59.pickup.max is 200, below min; give 240 or more"
    ),
    "step of zero": (
        "step = 1,", "step = 0,",
        "relay.toml:8:34: element.59.pickup.step is 0; give a number in the unit of the knob, above 0 to 1000",
    ),
    "too many steps": (
        "max = 300, step = 1,", "max = 300, step = 0.0001,",
        "relay.toml:8:34: element.59.pickup.step is 0.0001; give a step with at most 100000 values in the range",
    ),
    "percent of nothing": (
        ", base_v = 230", "",
        "relay.toml:15:1: element.59N.pickup.base_v is missing; give the volts that are 100 percent",
    ),
    "drop-out above pickup": (
        "[0.95, 0.97]", "[0.95, 1.05]", "relay.toml:10:24: element.59.dropout_ratio is 1.05; give a ratio below 1"
    ),
    "no accuracy": (
        "accuracy = { pickup_percent = 1, time_s = 0.03 }\n\n", "\n",
        "relay.toml:5:1: element.59.accuracy is missing; give { pickup_percent, pickup_v, time_percent, time_s }",
    ),
    "perfect device": (
        "accuracy = { pickup_percent = 1, time_s = 0.03 }\n\n", "accuracy = { time_s = 0.03 }\n\n",
        "relay.toml:11:1: element.59.accuracy is without a pickup error; "
        "give pickup_percent or the absolute error as declared",
    ),
    "dependent only": (
        "stages = 2", 'stages = 2\ncurves = ["dependent"]',
        'relay.toml:8:1: element.59.curves is "dependent" only, not yet available; '
        'add "definite" if the device has it',
    ),
    "held without its time": (
        "stages = 2", 'stages = 2\nreset = ["held"]',
        "relay.toml:5:1: element.59.hold_s is missing; give the seconds for which a held timer keeps its time",
    ),
    "quantity it does not measure": (
        "stages = 2", 'stages = 2\nquantity = "l-l"',
        'relay.toml:8:1: element.59.quantity is "l-l", which the device does not measure; correct it or measures',
    ),
    "displacement from what it does not measure": (
        'measures = ["l-n"]', 'measures = ["l-l"]',
        'relay.toml:14:1: element.59N.function is "59N" from l-n, which the device does not measure; '
        "correct it or measures",
    ),
    "another version": ("schema = 1", "schema = 2", "relay.toml:1:1: schema is 2; give 1"),
    "definition of a 59": (
        "stages = 2", 'stages = 2\ndefinition = "spread"',
        "relay.toml:8:1: element.59.definition is not used by a 59; remove it: it is for 47",
    ),
    "points of a 59": (
        "accuracy = { pickup_percent = 1, time_s = 0.03 }\n\n",
        "accuracy = { pickup_percent = 1, pickup_points = 1, time_s = 0.03 }\n\n",
        "relay.toml:11:34: element.59.accuracy.pickup_points is not used by a 59; remove it: it is for 47",
    ),
    "base of volts": (
        'max = 300, step = 1, unit = "v"', 'max = 300, step = 1, unit = "v", base_v = 230',
        'relay.toml:8:56: element.59.pickup.base_v is not used by unit = "v"; remove it, or write unit = "percent"',
    ),
    "hold without held": (
        "stages = 2", "stages = 2\nhold_s = 1",
        'relay.toml:8:1: element.59.hold_s is not used without held; remove it, or add "held" to reset',
    ),
}  # fmt: skip
SETTINGS = """\
schema = 1
for_relay = "R1"
device = "Test device"

[[overvoltage]]
stage = 1
on = true
pickup_v = 264
delay_s = 0.6
"""
SETTINGS_CASES = {
    "another relay": ('"R1"', '"R2"', 'settings.toml:2:1: for_relay is "R2"; give one of "R1"'),
    "another device": (
        '"Test device"', '"Best device"',
        'settings.toml:3:1: device is "Best device", not the device of R1; give settings of "Test device"',
    ),
    "no pickup": (
        "pickup_v = 264\n", "",
        "settings.toml:5:1: overvoltage.1.pickup_v is missing; give the pickup of a stage that is on",
    ),
    "no delay": (
        "delay_s = 0.6\n", "",
        "settings.toml:5:1: overvoltage.1.delay_s is missing; give the delay of a stage that is on",
    ),
    "volts and percent": (
        "pickup_v = 264", "pickup_v = 264\npickup_percent = 110",
        "settings.toml:9:1: overvoltage.1.pickup_percent is given beside pickup_v; keep one of them",
    ),
    "percent of nothing": (
        "pickup_v = 264", "pickup_percent = 110",
        "settings.toml:5:1: overvoltage.1.base_v is missing; give the volts that are 100 percent",
    ),
    "base beside volts": (
        "pickup_v = 264", "pickup_v = 264\nbase_v = 230",
        "settings.toml:9:1: overvoltage.1.base_v is not used with pickup_v; remove it, or give pickup_percent",
    ),
    "stage twice": (
        "delay_s = 0.6\n", "delay_s = 0.6\n[[overvoltage]]\nstage = 1\non = false\n",
        "settings.toml:11:1: overvoltage.1.stage is 1, given before; give every stage once",
    ),
    "other count of displacement": (
        "delay_s = 0.6\n", 'delay_s = 0.6\n[[displacement]]\nstage = 1\non = false\nquantity = "3v0"\n',
        'settings.toml:13:1: displacement.1.quantity is "3v0"; the device counts "v0": write it so',
    ),
    "unknown key": (
        "delay_s = 0.6", "delay = 0.6",
        "settings.toml:9:1: overvoltage.1.delay is not a known key; did you mean delay_s?",
    ),
}  # fmt: skip


@pytest.mark.parametrize("name", DEVICE_CASES)
def test_a_mistake_in_a_device_is_answered_word_for_word(bench, name):
    old, new, sentence = DEVICE_CASES[name]
    assert bench.device.count(old) == 1
    bench.put("relay.toml", bench.device.replace(old, new))
    assert bench.sentences(bench.site + bench.relay) == [sentence]


@pytest.mark.parametrize(
    ("elements", "sentence"),
    [
        ("", "relay.toml: element is missing; write an [[element]] table"),
        ("element = []\n", "relay.toml:5:1: element is empty; write an [[element]] table"),
        ("[[elemnt]]\n", "relay.toml:5:1: elemnt is not a known key; did you mean element?"),
    ],
)
def test_a_device_without_elements_is_asked_for_one(bench, elements, sentence):
    bench.put("relay.toml", bench.device.split("\n[[element]]")[0] + "\n" + elements)
    assert bench.sentences(bench.site + bench.relay) == [sentence]


def test_site_loads_and_device_report_together_the_site_first(bench):
    bench.put("relay.toml", bench.device.replace("max = 300", "max = 200"))
    bench.put("loads.csv", "board,between,kw\nMB,L1-N,x\n")
    text = bench.with_("230", "400") + '[loads]\nfile = "loads.csv"\n' + bench.relay
    assert [s.split(":")[0] for s in bench.sentences(text)] == ["site.toml", "loads.csv", "relay.toml"]


@pytest.mark.parametrize("name", SETTINGS_CASES)
def test_a_mistake_in_settings_is_answered_word_for_word(bench, name):
    old, new, sentence = SETTINGS_CASES[name]
    bench.put("relay.toml", bench.device)
    site = bench.read(bench.site + bench.relay)
    path = bench.put("settings.toml", SETTINGS.replace(old, new))
    with pytest.raises(InputError) as caught:
        read_settings(path, site)
    assert [p.sentence() for p in caught.value.problems] == [sentence]


def test_settings_for_a_site_without_a_relay_are_refused(bench):
    site = bench.read()
    with pytest.raises(InputError) as caught:
        read_settings(bench.put("settings.toml", SETTINGS), site)
    assert caught.value.problems[0].sentence() == (
        'settings.toml:2:1: for_relay is "R1", and the site has no [[relay]]; add it there'
    )


def test_settings_outside_the_device_and_of_another_digest_are_read_as_they_are(bench):
    bench.put("relay.toml", bench.device)
    site = bench.read(bench.site + bench.relay)
    odd = SETTINGS.replace("264", "999.5").replace("0.6", "0.001") + "\n[[undervoltage]]\nstage = 7\non = false\n"
    settings = read_settings(bench.put("settings.toml", odd), site)
    assert [(s.label, s.pickup, s.delay_s, s.on) for s in settings.stages] == [
        ("59 stage 1", 999.5, 0.001, True),
        ("27 stage 7", 0.0, 0.0, False),
    ]
    assert settings.input_digest == ""
