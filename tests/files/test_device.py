"""What a device can measure: a displacement computed from three channels is no better than they are."""

import itertools

import pytest

from relaycfg.files.device import displacement_share
from relaycfg.model.device import Function
from relaycfg.model.geometry import three_phase

NO_59 = """\
schema = 1
name = "Test device"
measures = ["l-n"]

[[element]]
function = "59N"
pickup = { min = 5, max = 100, step = 0.5, unit = "v" }
delay_s = { min = 0.05, max = 30, step = 0.01 }
accuracy = { pickup_percent = 1, time_s = 0.03 }
"""


def read(bench, device):
    """The 59N of that device, its input and the warnings."""
    bench.put("relay.toml", device)
    site = bench.read(bench.site + bench.relay)
    field = "relay.R1.device.element.59N.accuracy.pickup_v"
    entry = next((i for i in site.inputs if i.field == field), None)
    return site.relay.device.element(Function.DISPLACEMENT).accuracy, entry, site.warnings


def with_absolute(device, volts):
    head, tail = device.rsplit("pickup_percent = 1", 1)
    return f"{head}pickup_percent = 1, pickup_v = {volts}{tail}"


def test_independent_gain_errors_shift_v0_by_two_thirds_of_one():
    # Own arithmetic: corridor definitions, (2/3) e U0; held against every corner of the box of errors
    units = [complex(u) for u in three_phase().phasors]
    corners = itertools.product((-1, 0, 1), repeat=3)
    most = max(abs(sum(e * u for e, u in zip(c, units, strict=True))) / 3 for c in corners)
    assert displacement_share(three_phase()) == pytest.approx(most) == pytest.approx(2 / 3)


def test_a_59n_without_an_absolute_error_has_that_of_its_channels_as_a_counted_default(bench):
    accuracy, entry, warnings = read(bench, bench.device)
    assert accuracy.pickup_abs == pytest.approx(2 / 3 * 2.3)
    assert (entry.value, entry.unit, entry.tag, entry.status) == ("1.53", "V", "default", "own")
    assert entry.note == "V0: 0.6667 of the 2.3 V of a 59 channel at U0; own arithmetic"
    assert warnings == ()


def test_3v0_errs_three_times_as_much(bench):
    triple = bench.device.replace('measures = ["l-n"]', 'measures = ["l-n"]\ndisplacement_quantity = "3v0"')
    assert read(bench, triple)[0].pickup_abs == pytest.approx(2 * 2.3)


def test_the_27_stands_in_where_there_is_no_59_and_nothing_where_there_is_neither(bench):
    under = bench.device.replace('"59"', '"27"').replace("[0.95, 0.97]", "[1.03]").replace(
        "pickup_percent = 1, time_s", "pickup_percent = 2, time_s", 1
    )  # fmt: skip
    accuracy, entry, _ = read(bench, under)
    assert accuracy.pickup_abs == pytest.approx(2 / 3 * 4.6)
    assert "of a 27 channel" in entry.note
    assert read(bench, NO_59)[0].pickup_abs == 0


def test_a_declared_absolute_error_is_kept_and_doubted_where_it_is_smaller(bench):
    accuracy, entry, warnings = read(bench, with_absolute(bench.device, 0.5))
    assert (accuracy.pickup_abs, entry) == (0.5, None)
    assert warnings == (
        "Device: its 59N declares 0.5 V, less than its channels allow (V0: 0.6667 of the 2.3 V of a 59 channel at U0 "
        "is 1.53 V). The declared figure is kept: ask the maker.",
    )
    assert read(bench, with_absolute(bench.device, 2.0))[2] == ()
    assert read(bench, with_absolute(bench.device, 0))[2] != ()


def test_a_displacement_measured_at_the_neutral_has_its_own_error(bench):
    to_earth = bench.device.replace('measures = ["l-n"]', 'measures = ["l-n"]\ndisplacement_from = "n-to-earth"')
    accuracy, entry, warnings = read(bench, to_earth)
    assert (accuracy.pickup_abs, entry, warnings) == (0, None, ())


def test_the_ranges_of_a_device_are_printed_as_people_say_them(bench):
    bench.put("relay.toml", bench.device)
    found = {i.field: i.value for i in bench.read(bench.site + bench.relay).inputs}
    at = "relay.R1.device.element."
    assert found[at + "59.pickup"] == "240 to 300 V, step 1 V"
    assert found[at + "59N.pickup"] == "2 to 60 % of 230 V, step 0.5 %"
    assert found[at + "59.delay_s"] == "0.05 to 30 s, step 0.01 s"
    assert found[at + "59.accuracy"] == "pickup 1 %, time 0.03 s"
    bench.put("relay.toml", with_absolute(bench.device, 2))
    found = {i.field: i.value for i in bench.read(bench.site + bench.relay).inputs}
    assert found[at + "59N.accuracy"] == "pickup 1 % or 2 V, time 0.03 s; the greater"
