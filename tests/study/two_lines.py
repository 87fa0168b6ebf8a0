"""Invented sites of two lines and N, written as the files a user would write: split phase, and two lines of a star."""

from pathlib import Path

from relaycfg.files import read_site
from relaycfg.model.site import Site

SITE = """
[supply]
system = "{system}"
nominal_v = 120
frequency_hz = 60
earthing = "TN-S"
band = "ANSI C84.1 Range B, 120 V service"
band_at = "source"
{supply}
[[source]]
kind = "impedance"
line_ohm = [0.01, 0.01]
neutral_ohm = [0.0, 0.0]
electrode_ohm = 2
[[board]]
name = "Panel"
fed_from = "source"
[board.cable]
line_ohm = [0.02, 0.01]
neutral_ohm = [0.03, 0.01]
pe_ohm = [0.03, 0.01]
[[fault]]
board = "Panel"
circuit_ohm = [0.2, 0.01]
clearing_s = 0.05
[equipment]
points = [[144, 15], [156, 5], [182, 0.75], [208, 0.2]]
sustained_high_v = 133
[[relay]]
name = "R1"
measures_at = "Panel"
device = "relay.toml"
trips = "Panel"
supply = {{ from = "auxiliary" }}
trip_coil = {{ from = "auxiliary" }}
output_s = 0.01
coil_and_breaker_s = 0.03
"""

ELEMENT = """
[[element]]
function = "{function}"
stages = {stages}
pickup = {{ min = {low}, max = {high}, step = 0.5, unit = "{unit}" }}
delay_s = {{ min = 0.05, max = 30.0, step = 0.01 }}
dropout_ratio = {ratios}
accuracy = {{ pickup_percent = 1.0, time_percent = 1.0, time_s = 0.01 }}
{more}
"""
OVER = ELEMENT.format(function="59", stages=3, low=121, high=250, unit="v", ratios="[0.97, 0.99]", more="")
UNDER = ELEMENT.format(function="27", stages=2, low=30, high=119, unit="v", ratios="[1.01, 1.03]", more="")
DISPLACEMENT = ELEMENT.format(function="59N", stages=2, low=4, high=100, unit="v", ratios="[0.95, 0.97]", more="")
UNBALANCE = ELEMENT.format(
    function="47", stages=1, low=2, high=90, unit="percent", ratios="[0.95]", more='definition = "DEFINITION"'
)
DEVICE = """
schema = 1
name = "Two-line relay"
measures = ["l-n"]
detector = "rms"
window_cycles = 1.0
refresh_cycles = 0.5
displacement_from = "{displacement_from}"
displacement_quantity = "{quantity}"
"""


def load(between: str, kw: float, name: str, usage: float = 0.6, more: str = "") -> str:
    """One resistive [[load]] of the panel."""
    law = 'pf = 1.0\nkind = "constant impedance"\n'
    table = f'[[load]]\nboard = "Panel"\nname = "{name}"\nbetween = "{between}"\nkw = {kw}\n{law}'
    return f"{table}usage = {usage}\nthird_harmonic_percent = 0\n{more}"


LOADS = "".join(
    load(f"L{1 + k % 2}-N", kw, f"circuit {k}") for k, kw in enumerate((2.0, 1.2, 1.5, 0.8, 0.6, 1.8))
) + load("L1-L2", 4.0, "heater", 0.3)


def site(
    folder: Path,
    system: str,
    loads: str = LOADS,
    elements: str = OVER + UNDER + DISPLACEMENT,
    supply: str = "",
    displacement_from: str = "l-n",
    quantity: str = "v0",
    more: str = "",
) -> Site:
    """The site, read as a user's files would be."""
    folder.mkdir(exist_ok=True)
    device = DEVICE.format(displacement_from=displacement_from, quantity=quantity) + elements
    (folder / "relay.toml").write_text(device)
    path = folder / "site.toml"
    path.write_text(SITE.format(system=system, supply=supply) + loads + more)
    return read_site(path, need_relay=True)
