"""One board on a stiff source, written as a user's files, so that every figure of a caution can be worked by hand."""

import json
from pathlib import Path

from relaycfg.files import read_settings, read_site
from relaycfg.model.break_results import BreakRow, RelayVolts
from relaycfg.model.settings import Settings
from relaycfg.model.site import Site
from relaycfg.study import breaks
from tests.study import yard

SITE = """
[supply]
nominal_v = {nominal_v}
earthing = "TN-S"
{supply}
[[source]]
kind = "impedance"
no_load_v = {no_load_v}
line_ohm = [0.0, 0.0]
electrode_ohm = 2
[[board]]
name = "Main"
fed_from = "source"
"""

STAGE_DEFAULTS = {"overvoltage": 0.97, "undervoltage": 1.02, "displacement": 0.95, "unbalance": 0.95}


def shares(*kw: float) -> str:
    """Always-on resistive loads of those kW at 230 V on L1, L2 and L3."""
    return "".join(yard.load("Main", f"L{k + 1}-N", p, f"heater {k + 1}", usage=1.0) for k, p in enumerate(kw))


TWO_ONE_ONE = shares(4.0, 2.0, 2.0)
"""Neutral open behind a stiff 230 V source: 172.5 / 263.5 / 263.5 V, V0 57.5 V (reference table, own arithmetic)."""


def star(
    folder: Path,
    loads: str = TWO_ONE_ONE,
    *,
    nominal_v: float = 230.0,
    no_load_v: float = 230.0,
    supply: str = "",
    elements: str = yard.OVER + yard.UNDER + yard.DISPLACEMENT,
    quantity: str = "v0",
    relay: str = yard.RELAY,
    more: str = "",
) -> Site:
    """The site; the neutral breaks at its star link only, and the relay sits on the one board."""
    folder.mkdir(exist_ok=True)
    path = yard.write(folder, elements=elements)
    site = SITE.format(nominal_v=nominal_v, no_load_v=no_load_v, supply=supply)
    path.write_text(site + loads + relay + more)
    device = folder / "relay.toml"
    device.write_text(
        device.read_text().replace('displacement_quantity = "v0"', f'displacement_quantity = "{quantity}"')
    )
    return read_site(path)


def stage(table: str, number: int, pickup: float, delay_s: float, **more: object) -> str:
    """One stage of a settings file that is on."""
    keys: dict[str, object] = {"pickup_percent" if table == "unbalance" else "pickup_v": pickup, "delay_s": delay_s}
    keys |= {"dropout_ratio": STAGE_DEFAULTS[table]} | more
    lines = "".join(f"{k} = {json.dumps(v)}\n" for k, v in keys.items() if v is not None)
    return f"[[{table}]]\nstage = {number}\non = true\n{lines}"


def settings(site: Site, *stages: str, rest: str = "") -> Settings:
    """Settings written to a file beside the site's and read back."""
    path = Path(site.files[0]).with_name("settings.toml")
    path.write_text('schema = 1\nfor_relay = "R1"\ndevice = "Test relay"\n' + "".join(stages) + rest)
    return read_settings(path, site)


def broken(site: Site, at: str = "source") -> BreakRow:
    """The break at a place with every load on, as ``breaks`` shows it."""
    study = breaks(site, samples=10, seed=1, state="connected")
    return next(row for row in study.rows if row.at == at)


def at_relay(site: Site, at: str = "source") -> RelayVolts:
    """What the relay's terminals carry in that state."""
    return broken(site, at).relays["R1"]
