"""Files that use every key of the published contract parse and resolve; so do the shipped examples."""

from pathlib import Path

import pytest

from relaycfg.files import read_settings, read_site
from relaycfg.model.device import Function

EXAMPLES = Path(__file__).parents[2] / "examples"
SITE = """\
[document]
title = "Settings of the incoming relay"
number = "QH-7"
revision = "C"
status = "for comment"
date = 2026-11-30
site = "Quay hall"
paper = "Letter"
fault_contact = "see the plate"

[document.prepared]
name = "A. Nobody"
role = "engineer"

[supply]
system = "3ph-4w"
nominal_v = 230
frequency_hz = 50
phase_order = "L1-L2-L3"
earthing = "TN-C-S"
band = "EN 50160 all"
band_at = "Hall"
unbalance_percent = 2
displacement_percent = 0

[[source]]
name = "grid"
kind = "transformer"
no_load_v = 235
rating_kva = 400
impedance_percent = 4
x_over_r = 3.3
zero_sequence_ratio = 0.95
vector_group = "Dyn11"
electrode_ohm = 2
earth_at = "neutral-bar"

[[board]]
name = "Hall"
fed_from = "source"
neutral_earth_link = true
electrode_ohm = 20

[board.cable]
length_m = 150
line_mm2 = 95
neutral_mm2 = 50
metal = "Cu"
temperature_c = 70
reactance_ohm_per_km = 0.08

[[board]]
name = "Shed"
fed_from = "Hall"

[board.cable]
length_m = 40
line_mm2 = 25
neutral_mm2 = 25
pe_mm2 = 16
metal = "Al"
temperature_c = 70

[loads]
file = "loads.csv"

[[load]]
board = "Hall"
name = "Lamps"
between = "L1-N"
kw = 2.4
pf = 0.95
reactive = "lagging"
kind = "led lighting"
usage = 0.7
demand = 0.8
group = "day"
third_harmonic_percent = 15
minds_low_v = false
count = 1

[[load]]
board = "Shed"
name = "Charger"
between = "L2-L3"
current_a = 12
zip_p = [0.1, 0.2, 0.7]
zip_q = [1, 0, 0]
band_pu = [0.7, 1.2]

[[motor]]
board = "Shed"
name = "Saw"
shaft_kw = 7.5
pf = 0.84
efficiency = 0.88
usage = 0.3

[motor.start]
current_ratio = 6.5
pf = 0.3
duration_s = 4

[[fault]]
board = "Shed"
circuit_ohm = [0.15, 0.01]
clearing_s = 0.4

[[relay]]
name = "R1"
measures_at = "Hall"
device = "relay.toml"
trips = "Hall"
poles = "lines and neutral"
supply = { from = "L1-L2", range_v = [300, 460] }
trip_coil = { kind = "shunt", from = "auxiliary", range_v = [19, 29] }
output_s = 0.01
coil_and_breaker_s = 0.05

[equipment]
overvoltage = "household overvoltage envelope"
sustained_low_v = 184

[must_hold]
sets = ["public supply"]

[[case]]
name = "Crane"
expect = "hold"
source = "logger"

[[case.segment]]
duration_s = 0.8
l_n_v = [214.0, 226.0, 231.0]
angle_deg = [0.0, -120.0, 120.0]

[[evidence]]
of = "supply.nominal_v"
tag = "measured"
note = "logger, 7 days"
"""
DEVICE = """\
schema = 1
name = "Device Q"
measures = ["l-n"]
detector = "rms"
window_cycles = 1.0
refresh_cycles = 0.5
timers = "shared"
displacement_from = "l-n"
displacement_quantity = "3v0"

[[element]]
function = "59"
stages = 2
pickup = { min = 240.0, max = 300.0, step = 1.0, unit = "v" }
delay_s = { min = 0.05, max = 30.0, step = 0.01 }
dropout_ratio = [0.97]
reset = ["instantaneous"]
curves = ["definite"]
accuracy = { pickup_percent = 1.0, pickup_v = 1.0, time_percent = 1.0, time_s = 0.03, combine = "greater" }
terminal = "11, 12"
knob = "U>"

[[element]]
function = "27"
pickup = { min = 50, max = 100, step = 1, unit = "percent", base_v = 230 }
delay_s = { min = 0.05, max = 30, step = 0.01 }
dropout_ratio = [1.03]
reset = ["instantaneous", "held"]
hold_s = 0.5
accuracy = { pickup_percent = 1, time_s = 0.03, combine = "sum" }

[[element]]
function = "59N"
pickup = { min = 10, max = 300, step = 1, unit = "v" }
delay_s = { min = 0.05, max = 30, step = 0.01 }
accuracy = { pickup_percent = 1, time_s = 0.03 }
"""
SETTINGS = """\
schema = 1
for_relay = "R1"
device = "Device Q"
input_digest = "sha256:0"

[[overvoltage]]
stage = 1
on = true
pickup_v = 264.5
delay_s = 0.6
dropout_ratio = 0.97
reset = "instantaneous"
phases = "any"
action = "trip"

[[overvoltage]]
stage = 2
on = true
pickup_v = 340.0
delay_s = 0.08

[[undervoltage]]
stage = 1
on = false

[[displacement]]
stage = 1
on = true
quantity = "3v0"
pickup_v = 66.0
delay_s = 1.0
action = "trip"

[[unbalance]]
stage = 1
on = false
definition = "line-to-neutral deviation"

[start_up]
inhibit_s = 0.5

[reconnect]
after_any_trip = "by hand"
"""


@pytest.fixture
def site(bench):
    bench.put("relay.toml", DEVICE)
    bench.put("loads.csv", "board,name,between,kw,ohm,reactive,evidence\nShed,Heater,L3-N,,40 0,,letter\n")
    return bench.read(SITE, need_relay=True)


def test_every_part_of_the_site_arrives(site):
    assert (site.document.number, site.document.date, site.document.paper) == ("QH-7", "2026-11-30", "Letter")
    assert site.document.prepared.role == "engineer"
    assert site.document.checked.name == ""
    assert (site.supply.low_v, site.supply.high_v, site.supply.band_at) == pytest.approx((195.5, 253.0, "Hall"))
    assert site.source.neutral_ohm == pytest.approx(site.source.line_ohm * -0.05 / 3)
    assert [load.name for load in site.loads] == ["Heater", "Lamps", "Charger"]
    assert site.loads[2].zip_q == (1, 0, 0)
    assert (site.relay.supply.between, site.relay.supply.low_v, site.relay.trip_coil.between) == (
        "L1-L2", 300, "auxiliary"
    )  # fmt: skip
    assert site.conductor("Hall") == "PEN"
    assert site.conductor("Shed") == "N"
    assert site.places == ("source", "Hall", "Shed")
    assert site.warnings == ("Equipment: sustained_low_v has no effect, for no load states minds_low_v.",)


def test_the_device_counts_as_it_is_marked(site):
    over, under = (site.relay.device.element(f) for f in (Function.OVERVOLTAGE, Function.UNDERVOLTAGE))
    assert (over.pickup.low, over.pickup.high, over.unit, over.marked(264.0)) == (240, 300, "v", 264.0)
    assert (under.pickup.low, under.pickup.step, under.marked(115.0)) == pytest.approx((115.0, 2.3, 50.0))
    assert (under.hold_s, under.accuracy.combine) == (0.5, "sum")
    shift = site.relay.device.element(Function.DISPLACEMENT)
    assert (shift.quantity, shift.dropout_ratio) == ("3v0", (0.95,))
    assert site.relay.device.timers == "shared"


def test_the_settings_take_what_they_leave_out_from_the_device(bench, site):
    settings = read_settings(bench.put("settings.toml", SETTINGS), site)
    second = settings.of(Function.OVERVOLTAGE)[1]
    assert (second.pickup, second.delay_s, second.dropout_ratio, second.action) == (340.0, 0.08, 0.97, "trip")
    shift = settings.of(Function.DISPLACEMENT)[0]
    assert (shift.pickup, shift.quantity) == (66.0, "3v0")
    assert [s.label for s in settings.active] == ["59 stage 1", "59 stage 2", "59N stage 1"]
    assert (settings.inhibit_s, settings.after_any_trip) == (0.5, "by hand")


def test_a_minimal_site_runs_on_defaults(bench):
    minimal = """\
[supply]
nominal_v = 230
earthing = "TN-S"
[[source]]
kind = "transformer"
rating_kva = 100
[[board]]
name = "B"
fed_from = "source"
[[load]]
board = "B"
between = "L1-N"
kw = 1
"""
    site = bench.read(minimal)
    assert (site.loads[0].name, site.source.emf_v, site.supply.band_at) == ("load 1", 230, "source")
    assert site.places == ("source",)


@pytest.mark.parametrize("path", sorted(EXAMPLES.glob("*/site*.toml")), ids=lambda p: p.name)
def test_an_example_reads_without_a_warning_and_teaches_enough(path):
    site = read_site(path, need_relay=True)
    assert site.warnings == ()
    assert len([load for load in site.loads if len(load.lines) == 1]) >= 25
    assert len(site.motors) == 3
    assert len(site.boards) >= 3
    assert {"measured", "nameplate", "letter", "assumed", "default"} <= {i.tag for i in site.inputs}
    assert sum(i.tag == "default" for i in site.inputs) < 15


def test_the_site_as_found_differs_in_the_feed_of_the_coil_alone():
    folder = EXAMPLES / "workshop"
    new, found = (folder.joinpath(name).read_text("utf-8").splitlines() for name in ("site.toml", "site-as-found.toml"))
    changed = [line for line in found if line not in new and not line.startswith("#")]
    assert len(changed) == 1
    assert changed[0].startswith("trip_coil = ")
    feed = read_site(folder / "site-as-found.toml").relay.trip_coil
    assert (feed.between, feed.low_v, feed.high_v) == ("L1-N", 195, 253)


def test_the_existing_settings_fit_the_example_and_hold_the_flaws_they_promise():
    site = read_site(EXAMPLES / "workshop" / "site-as-found.toml")
    settings = read_settings(EXAMPLES / "workshop" / "existing-settings.toml", site)
    over, shift = settings.of(Function.OVERVOLTAGE)[0], settings.of(Function.DISPLACEMENT)[0]
    assert over.pickup == pytest.approx(site.supply.high_v)
    assert over.delay_s == 0.1
    assert (shift.pickup, shift.delay_s, shift.base_v) == (115.0, 10.0, 230.0)
