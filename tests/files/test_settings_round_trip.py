"""Settings written and read again are the same settings."""

import tomllib
import unicodedata

from hypothesis import HealthCheck, given, settings, strategies

from relaycfg.files import read_settings, settings_text
from relaycfg.model.device import Function
from relaycfg.model.settings import Settings, Stage

VOLTS = strategies.floats(0.5, 999, allow_nan=False)
SECONDS = strategies.floats(0, 3600)
WORDS = strategies.text(
    strategies.characters(codec="utf-8", exclude_categories=["Cc", "Cf", "Cs", "Zl", "Zp"]), max_size=20
).map(lambda text: unicodedata.normalize("NFC", text.strip()))


@strategies.composite
def stages(draw):
    function = draw(strategies.sampled_from([Function.OVERVOLTAGE, Function.DISPLACEMENT]))
    percent = draw(strategies.none() | strategies.floats(1, 200))
    base = None if percent is None else draw(strategies.floats(50, 400))
    reset = draw(strategies.sampled_from(["instantaneous", "held"]))
    return Stage(
        function=function,
        number=0,
        on=draw(strategies.booleans()),
        pickup=draw(VOLTS) if percent is None else percent * base / 100,
        delay_s=draw(SECONDS),
        dropout_ratio=draw(strategies.floats(0.5, 0.99)),
        reset=reset,
        hold_s=draw(SECONDS) if reset == "held" else 0.0,
        phases=draw(strategies.sampled_from(["any", "all"])),
        action=draw(strategies.sampled_from(["trip", "alarm"])),
        quantity={"59": "l-n", "59N": "v0"}[function.value],
        pickup_percent=percent,
        base_v=base,
    )


@given(
    several=strategies.lists(stages(), max_size=6),
    digest=WORDS,
    inhibit=strategies.floats(0, 60),
    automatic=strategies.booleans(),
    wait=SECONDS,
)
@settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
def test_a_round_trip_is_exact(bench, several, digest, inhibit, automatic, wait):
    bench.put("relay.toml", bench.device)
    site = bench.read(bench.site + bench.relay)
    ordered = sorted(several, key=lambda s: list(Function).index(s.function))
    numbered = []
    for stage in ordered:
        number = 1 + sum(s.function is stage.function for s in numbered)
        numbered.append(Stage(**{**stage.__dict__, "number": number}))
    written = Settings(
        "R1", "Test device", digest, tuple(numbered), inhibit, "automatic" if automatic else "by hand", wait
    )
    text = settings_text(written, site)
    read = read_settings(bench.put("settings.toml", text), site)
    assert set(read.stages) == set(written.stages)
    assert Settings(**{**read.__dict__, "stages": written.stages}) == written


def test_reasons_stand_above_their_stage_and_cannot_break_the_file(bench):
    bench.put("relay.toml", bench.device)
    site = bench.read(bench.site + bench.relay)
    stage = Stage(Function.OVERVOLTAGE, 1, True, 264.0, 0.6, 0.97, quantity="l-n")
    text = settings_text(
        Settings("R1", "Test device", "", (stage,), 0.0, "by hand"),
        site,
        {"59 stage 1": "above 253 V\nby 4 %\r\x1b[2J\x00", "27 stage 9": "nobody"},
    )
    lines = text.splitlines()
    at = lines.index("[[overvoltage]]  # 59")
    assert lines[at - 3 : at - 1] == ["# above 253 V", "# by 4 %"]
    assert "nobody" not in text
    assert tomllib.loads(text)["overvoltage"][0]["pickup_v"] == 264.0


def test_a_device_marked_in_percent_is_the_base_of_its_settings(bench):
    bench.put("relay.toml", bench.device)
    site = bench.read(bench.site + bench.relay)
    text = (
        'schema = 1\nfor_relay = "R1"\ndevice = "Test device"\n'
        "[[displacement]]\nstage = 1\non = true\npickup_percent = 10\ndelay_s = 1\n"
    )
    stage = read_settings(bench.put("settings.toml", text), site).stages[0]
    assert (stage.pickup, stage.pickup_percent, stage.base_v) == (23.0, 10.0, 230.0)
    assert stage.dropout_ratio == 0.95


def test_unbalance_is_set_in_points(bench):
    element = (
        '\n[[element]]\nfunction = "47"\npickup = { min = 2, max = 30, step = 1, unit = "percent" }\n'
        "delay_s = { min = 0, max = 9, step = 1 }\naccuracy = { pickup_points = 0.5, time_s = 0 }\n"
    )
    bench.put("relay.toml", bench.device + element)
    site = bench.read(bench.site + bench.relay)
    stage = Stage(Function.UNBALANCE, 1, True, 12.0, 5.0, 0.95, quantity="line-to-neutral deviation")
    written = Settings("R1", "Test device", "", (stage,), 0.0, "by hand")
    assert read_settings(bench.put("settings.toml", settings_text(written, site)), site) == written
