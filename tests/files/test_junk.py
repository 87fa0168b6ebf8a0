"""Whatever stands in a file, the answer is a site or an InputError, never anything else."""

import contextlib
import re

from hypothesis import HealthCheck, given, settings, strategies

from relaycfg.errors import InputError
from relaycfg.files import read_settings, read_site

CALM = settings(max_examples=150, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
VALUES = strategies.recursive(
    strategies.none().map(lambda _: "true")
    | strategies.integers().map(str)
    | strategies.floats().map(lambda f: repr(f).replace("e+", "e"))
    | strategies.text(strategies.characters(codec="utf-8"), max_size=8).map(
        lambda t: '"' + re.sub(r'["\\\x00-\x1f\x7f]', "", t) + '"'
    )
    | strategies.sampled_from(['"MB"', '"L1-N"', '"source"', "1979-05-27", "07:32:00", "{ from = 1 }"]),
    lambda inner: strategies.lists(inner, max_size=4).map(lambda items: f"[{', '.join(items)}]"),
    max_leaves=6,
)


def answered(read):
    with contextlib.suppress(InputError):
        read()


@given(strategies.binary(max_size=300))
@CALM
def test_junk_bytes_as_site_loads_and_device(bench, data):
    bench.put("site.toml", data)
    answered(lambda: read_site(bench.put("site.toml", data)))
    bench.put("loads.csv", data)
    bench.put("loads.xlsx", data)
    bench.put("relay.toml", data)
    answered(lambda: bench.read(bench.site + '[loads]\nfile = "loads.csv"\n' + bench.relay))
    answered(lambda: bench.read(bench.site + '[loads]\nfile = "loads.xlsx"\n'))


@given(strategies.text(max_size=300))
@CALM
def test_junk_text_on_standard_input(text):
    answered(lambda: read_site(None, text=text))


@given(strategies.data(), VALUES)
@CALM
def test_any_value_in_place_of_any_other(bench, data, value):
    bench.put("relay.toml", bench.device)
    whole = bench.site + bench.relay
    lines = whole.splitlines()
    keyed = [i for i, line in enumerate(lines) if " = " in line]
    at = data.draw(strategies.sampled_from(keyed))
    lines[at] = f"{lines[at].split(' = ')[0]} = {value}"
    answered(lambda: bench.read("\n".join(lines), need_relay=True))


@given(strategies.data(), VALUES)
@CALM
def test_any_value_in_a_device_and_in_settings(bench, data, value):
    lines = bench.device.splitlines()
    at = data.draw(strategies.sampled_from([i for i, line in enumerate(lines) if " = " in line]))
    bench.put("relay.toml", "\n".join([*lines[:at], f"{lines[at].split(' = ')[0]} = {value}", *lines[at + 1 :]]))
    answered(lambda: bench.read(bench.site + bench.relay))
    bench.put("relay.toml", bench.device)
    site = bench.read(bench.site + bench.relay)
    key = data.draw(strategies.sampled_from(["stage", "on", "pickup_v", "pickup_percent", "delay_s", "action"]))
    head = 'schema = 1\nfor_relay = "R1"\ndevice = "Test device"\n'
    text = f"{head}[[overvoltage]]\nstage = 1\non = true\n{key} = {value}\n"
    answered(lambda: read_settings(bench.put("settings.toml", text), site))


@given(strategies.lists(strategies.lists(strategies.text(max_size=6), max_size=6), max_size=6))
@CALM
def test_any_cells_in_a_csv(bench, rows):
    bench.put("loads.csv", "board,name,between,kw,pf\n" + "\n".join(",".join(row) for row in rows))
    answered(lambda: bench.read(bench.site + '[loads]\nfile = "loads.csv"\n'))
