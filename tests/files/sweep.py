"""Sites by which the program hands out every row it has: all starters, the example, and one for each choice."""

from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import pytest

from relaycfg.files import read_settings, read_site, write_starter
from relaycfg.files.tables import Row, Tables, is_high_curve, names
from relaycfg.model.site import Site

EXAMPLE = Path(__file__).parents[2] / "examples" / "workshop"
STARTERS = [(230.0, "TN-S"), (230.0, "TN-C-S"), (230.0, "TT"), (120.0, "TN-S"), (277.0, "TN-C-S"), (500.0, "TT")]
DEVICE = """
schema = 1
name = "Bare device"
measures = ["l-n"]
""" + "".join(
    f"""
[[element]]
function = "{function}"
pickup = {{ min = {low}, max = {high}, step = 1, unit = "v" }}
delay_s = {{ min = 0.05, max = 30, step = 0.01 }}
accuracy = {{ pickup_percent = 1 }}
"""
    for function, low, high in (("59", 240, 300), ("27", 100, 220), ("59N", 5, 100))
)
SUPPLY = '[supply]\nnominal_v = {volts}\nearthing = "{earthing}"\n{supply}\n'
SOURCE = '[[source]]\nname = "grid"\n{source}\n'
REST = """
[[board]]
name = "MB"
fed_from = "source"
{cable}
[[relay]]
name = "R1"
measures_at = "MB"
device = "relay.toml"
{more}
"""
TO_EARTH = "to-earth.toml"
RODS = """
[[board]]
name = "Barn"
fed_from = "MB"
electrode = { rod_length_m = 3, rod_diameter_mm = 16, soil_ohm_m = 100, rods = 2, spacing_m = 6 }
"""
LOAD = '[[load]]\nboard = "MB"\nname = "{name}"\nbetween = "L1-N"\nkw = 1\n{more}\n'
TRANSFORMER = 'kind = "transformer"\nrating_kva = 100'
CASE = '[[case]]\nname = "{name}"\nexpect = "hold"\n[[case.segment]]\nduration_s = 1\nl_n_v = {volts}\n'


@contextmanager
def recorded() -> Iterator[set[str]]:
    """The ids of all rows that the loader hands out while this is open."""
    handed: set[str] = set()
    plain = Tables.row

    def row(tables: Tables, row_id: str) -> Row:
        handed.add(row_id)
        return plain(tables, row_id)

    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(Tables, "row", row)
        yield handed


def example(name: str) -> Site:
    """The shipped example or its as-found variant."""
    return read_site(EXAMPLE / name, need_relay=True)


def read_shipped(folder: Path) -> list[Site]:
    """Every starter and both examples, with the settings that come with them."""
    sites = []
    for number, (volts, earthing) in enumerate(STARTERS):
        write_starter(folder / str(number), volts, earthing)
        sites.append(read_site(folder / str(number) / "site.toml", need_relay=True))
    found = example("site-as-found.toml")
    read_settings(EXAMPLE / "existing-settings.toml", found)
    return [*sites, example("site.toml"), found]


def choices() -> list[str]:
    """Texts of a bare site for everything a user may name or leave out, and just inside every threshold."""
    return [
        bare(),
        bare(supply="frequency_hz = 60"),
        bare(earthing="TT"),
        bare(volts=500),
        bare(volts=500, earthing="TT"),
        *(bare(supply=f'band = "{name}"') for name in names("supply-bands")),
        *(bare(source=f'{TRANSFORMER}\nvector_group = "{group}"') for group in ("Dyn11", "Yzn5", "Yyn0")),
        *(bare(source=f'kind = "generator"\nrating_kva = 100\nclass = "{c}"') for c in ("G1", "G2", "G3")),
        bare(source='kind = "generator"\nrating_kva = 100'),
        bare(volts=120, supply='system = "1ph-3w"', source=f"{TRANSFORMER}\nimpedance_percent = 2\nx_over_r = 1.5"),
        *(bare(cable=_cable(section, metal)) for section in (50, 51) for metal in ("Cu", "Al")),
        bare(cable="[board.cable]\nlength_m = 50\nline_mm2 = 25"),
        bare(more='[[board]]\nname = "Shed"\nfed_from = "MB"\n[board.cable]\nline_ohm = [0.1, 0]\n'),
        *(bare(more=f'[equipment]\novervoltage = "{name}"') for name in names("withstand-curves", is_high_curve)),
        bare(more="[equipment]\nsustained_low_v = 180"),
        *(bare(more=f'[must_hold]\nsets = ["{name}"]') for name in ("public supply", "dips class 2", "dips class 3")),
        bare(more="".join(LOAD.format(name=n, more=f'kind = "{n}"') for n in names("load-kinds"))),
        bare(more=LOAD.format(name="own law", more="zip_p = [0.2, 0.3, 0.5]")),
        bare(more=RODS),
        bare().replace("relay.toml", TO_EARTH),
        bare(more='[[motor]]\nboard = "MB"\nname = "Fan"\nshaft_kw = 3\n'),
        bare(more=CASE.format(name="moved, at 1.14", volts=[196.6, 300.4, 300.4])),
        bare(more=CASE.format(name="even, nearly", volts=[115, 115, 117.27])),
        bare(supply="frequency_hz = 54"),
        bare(volts=238),
        bare(volts=464),
        bare(source=f"{TRANSFORMER}\nno_load_v = 285"),
    ]


def read_bare(folder: Path, text: str) -> Site:
    """A site of ``bare`` as read from a folder, with a device that states nothing it need not."""
    (folder / "relay.toml").write_text(DEVICE, "utf-8")
    to_earth = DEVICE.replace('measures = ["l-n"]', 'measures = ["l-n"]\ndisplacement_from = "n-to-earth"')
    (folder / TO_EARTH).write_text(to_earth, "utf-8")
    (folder / "site.toml").write_text(text, "utf-8")
    return read_site(folder / "site.toml", need_relay=True)


def bare(
    volts: float = 230, earthing: str = "TN-S", supply: str = "", source: str = TRANSFORMER, cable: str = "",
    more: str = "",
) -> str:  # fmt: skip
    """Text of a site that leaves out all it can, with pieces of its tables as given."""
    head = SUPPLY.format(volts=volts, earthing=earthing, supply=supply) + SOURCE.format(source=source)
    return head + REST.format(cable=cable, more=more) + LOAD.format(name="plain", more="")


def _cable(section: int, metal: str) -> str:
    return f'[board.cable]\nlength_m = 50\nline_mm2 = {section}\nmetal = "{metal}"'
