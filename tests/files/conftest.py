"""A small sound site, and a way to read variants of it from a folder of their own."""

from pathlib import Path

import pytest

from relaycfg.errors import InputError
from relaycfg.files import read_site

SITE = """\
[supply]
nominal_v = 230
earthing = "TN-S"

[[source]]
name = "grid"
kind = "transformer"
rating_kva = 400
impedance_percent = 4

[[board]]
name = "MB"
fed_from = "source"

[[board]]
name = "Workshop"
fed_from = "MB"

[board.cable]
length_m = 40
line_mm2 = 25
neutral_mm2 = 25
pe_mm2 = 16

[[load]]
board = "MB"
name = "Kiln"
between = "L1-N"
kw = 2
"""
RELAY = """
[[relay]]
name = "R1"
measures_at = "MB"
device = "relay.toml"
"""
DEVICE = """\
schema = 1
name = "Test device"
measures = ["l-n"]

[[element]]
function = "59"
stages = 2
pickup = { min = 240, max = 300, step = 1, unit = "v" }
delay_s = { min = 0.05, max = 30, step = 0.01 }
dropout_ratio = [0.95, 0.97]
accuracy = { pickup_percent = 1, time_s = 0.03 }

[[element]]
function = "59N"
pickup = { min = 2, max = 60, step = 0.5, unit = "percent", base_v = 230 }
delay_s = { min = 0.05, max = 30, step = 0.01 }
dropout_ratio = [0.95]
accuracy = { pickup_percent = 1, time_s = 0.03 }
"""


class Bench:
    """Files in a folder of their own, read as the current folder."""

    site, relay, device = SITE, RELAY, DEVICE

    def put(self, name, content):
        Path(name).write_bytes(content if isinstance(content, bytes) else content.encode("utf-8"))
        return Path(name)

    def with_(self, old, new):
        """The sound site with one piece replaced."""
        assert SITE.count(old) == 1, old
        return SITE.replace(old, new)

    def read(self, text=SITE, need_relay=False):
        return read_site(self.put("site.toml", text), need_relay=need_relay)

    def sentences(self, text, need_relay=False):
        """What is said of a bad site."""
        with pytest.raises(InputError) as caught:
            self.read(text, need_relay)
        return [p.sentence() for p in caught.value.problems]


@pytest.fixture
def bench(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    return Bench()
