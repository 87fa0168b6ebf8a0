"""An invented site and device for the study's tests, written as the files a user would write."""

from pathlib import Path

from relaycfg.files import read_site
from relaycfg.model.site import Site

SUPPLY = """
[document]
title = "Study test"
number = "T-1"
revision = "A"
[supply]
system = "3ph-4w"
nominal_v = 230
earthing = "{earthing}"
band = "EN 50160 all"
band_at = "source"
[[source]]
kind = "impedance"
line_ohm = [0.01, 0.01]
neutral_ohm = [0.0, 0.0]
electrode_ohm = 2
"""

MAIN = """
[[board]]
name = "Main"
fed_from = "source"
{link}
[board.cable]
line_ohm = [0.02, 0.01]
neutral_ohm = [0.02, 0.01]
{pe}
[[board]]
name = "Shed"
fed_from = "Main"
[board.cable]
line_ohm = [0.05, 0.01]
neutral_ohm = [0.05, 0.01]
pe_ohm = [0.05, 0.01]
"""

RELAY = """
[[relay]]
name = "R1"
measures_at = "Main"
device = "relay.toml"
trips = "Main"
supply = { from = "auxiliary", range_v = [19, 29] }
trip_coil = { kind = "shunt", from = "auxiliary", range_v = [19, 29] }
output_s = 0.01
coil_and_breaker_s = 0.03
[[fault]]
board = "Main"
circuit_ohm = [0.3, 0.01]
clearing_s = 0.1
"""

ELEMENT = """
[[element]]
function = "{function}"
stages = {stages}
pickup = {{ min = {low}, max = {high}, step = {step}, unit = "v" }}
delay_s = {{ min = 0.05, max = 30.0, step = 0.01 }}
dropout_ratio = {ratios}
reset = ["instantaneous"]
accuracy = {{ pickup_percent = 1.0, pickup_v = 0.5, time_percent = 1.0, time_s = 0.01, combine = "greater" }}
{more}
"""

DEVICE = """
schema = 1
name = "Test relay"
measures = ["{measures}"]
detector = "rms"
window_cycles = 1.0
refresh_cycles = 0.5
timers = "per phase"
displacement_from = "{displacement_from}"
displacement_quantity = "v0"
"""

OVER = ELEMENT.format(function="59", stages=3, low=231.0, high=420.0, step=1.0, ratios="[0.97, 0.99]", more="")
UNDER = ELEMENT.format(function="27", stages=1, low=60.0, high=229.0, step=1.0, ratios="[1.02, 1.03]", more="")
DISPLACEMENT = ELEMENT.format(function="59N", stages=2, low=4.0, high=150.0, step=0.5, ratios="[0.95]", more="")


def load(board: str, between: str, kw: float, name: str, usage: float = 0.6) -> str:
    """One [[load]] table."""
    return f'[[load]]\nboard = "{board}"\nname = "{name}"\nbetween = "{between}"\nkw = {kw}\nusage = {usage}\n'


UNEQUAL = "".join(
    load(board, f"L{k + 1}-N", kw, f"{board} {k} {n}")
    for board, kws in (("Main", (6.0, 4.0, 3.0)), ("Shed", (2.0, 3.0, 1.0)))
    for k, kw in enumerate(kws)
    for n in range(2)
)
BALANCED = "".join(load("Main", f"L{k + 1}-N", 4.0, f"heater {k}", usage=1.0) for k in range(3))


def write(
    folder: Path,
    loads: str = UNEQUAL,
    earthing: str = "TN-S",
    elements: str = OVER + UNDER + DISPLACEMENT,
    measures: str = "l-n",
    displacement_from: str = "l-n",
    relay: str = RELAY,
    more: str = "",
) -> Path:
    """Write site.toml and relay.toml and return the site's path."""
    combined = earthing == "TN-C-S"
    main = MAIN.format(
        link="neutral_earth_link = true" if combined else "", pe="" if combined else "pe_ohm = [0.02, 0.01]"
    )
    site = folder / "site.toml"
    site.write_text(SUPPLY.format(earthing=earthing) + main + loads + relay + more)
    (folder / "relay.toml").write_text(DEVICE.format(measures=measures, displacement_from=displacement_from) + elements)
    return site


def site(folder: Path, **changes: str) -> Site:
    """The invented site, read as a user's files would be."""
    return read_site(write(folder, **changes))


def read(folder: Path) -> Site:
    """The site in a folder as it stands now."""
    return read_site(folder / "site.toml")
