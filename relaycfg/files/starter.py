"""A starter site: commented files on which every other command runs at once."""

import json
import math
import os
from pathlib import Path
from typing import Any

from relaycfg.errors import InputError, Problem
from relaycfg.files.cross_checks import cross_check, meant_star_voltage
from relaycfg.files.device import displacement_share
from relaycfg.files.draft import draft_site, placed_loads
from relaycfg.files.limits import NOMINAL_V
from relaycfg.files.loads import is_workbook, read_loads
from relaycfg.files.places import templates_dir
from relaycfg.files.schema import site_schema
from relaycfg.files.tables import Tables
from relaycfg.files.text import TomlFile
from relaycfg.files.writing import check_new, write_new
from relaycfg.model.geometry import System, geometry_of

SCHEMA = "site.schema.json"
BASE_V = 230.0
"""Voltage for which the figures of the templates are written."""
MAIN, SECOND = "MB", "Workshop"
AMERICAN_V = 120.0
"""Leg-to-neutral voltage whose usual band has a name."""
CYCLES_60 = (120.0, 127.0, 277.0)
"""Star voltages that are usual at 60 Hz only; every other starter is one of 50 Hz."""
NO_LOAD_PU = 1.02
"""A tap set a little high, as is usual."""
ABOVE_BETWEEN, UNDER_PU = 1.04, (0.3, 1.0)
"""Knobs of 59 from nominal to just above the line-to-line voltage, of 27 from deep dips up to nominal."""
SHIFT_PU = (0.02, 0.6)
"""Knob of 59N from the standing displacement to a neutral that stands on a line, nearly."""
FEED_PU = (0.75, 1.155)
"""Range of a relay fed between lines, around the line-to-line voltage."""
SUSTAINED_LOW_PU = 0.8
"""What motors are usually said to stand for long."""
CHANNEL_PERCENT = 1.0
"""Pickup error of the invented device."""


def write_starter(
    folder: Path,
    volts: float = 230.0,
    earthing: str = "TN-S",
    loads_file: Path | None = None,
    force: bool = False,
    system: System = "3ph-4w",
) -> tuple[Path, ...]:
    """Writes site.toml, loads, relay.toml and the JSON Schema into ``folder``, made where it is not there.

    ``loads_file``: own loads (CSV or .xlsx), copied beside the site, with a board for every name in it. Raises
    InputError, before anything is written, for bad arguments or files that are there already.
    """
    boards, loads_name, loads = [MAIN, SECOND], "loads.csv", b""
    _check(volts, earthing, system)
    if loads_file is not None:
        boards, loads_name, loads = _own_loads(loads_file)
    figures = {
        **_figures(volts, earthing, system),
        "boards": boards,
        "loads_file": json.dumps(loads_name, ensure_ascii=False),
    }
    if loads_file is not None:
        _check_loads(loads_file, figures)
    texts: dict[str, bytes] = {"site.toml": _render("site.toml.j2", figures)}
    texts[loads_name] = loads or _render("loads.csv.j2", figures)
    texts["relay.toml"] = _render("relay.toml.j2", figures)
    texts[SCHEMA] = (json.dumps(site_schema(), indent=1) + "\n").encode()
    try:
        written = _to_write(folder, tuple(texts), loads_name if loads_file is not None else "", loads_file, force)
        folder.mkdir(parents=True, exist_ok=True)
    except FileExistsError:
        raise _bad(str(folder), "a file", "give a new folder") from None
    except OSError as reason:
        raise _bad(str(folder), f"not to be made ({(reason.strerror or '').lower()})", "give another folder") from None
    except ValueError:
        raise _bad(str(folder), "not a usable path", "give another folder") from None
    for name in written:
        write_new(folder / name, texts[name], force)
    return tuple(folder / name for name in texts)


def _to_write(folder: Path, names: tuple[str, ...], own: str, loads_file: Path | None, force: bool) -> tuple[str, ...]:
    """Names of the files to write, after a look at what is there; own loads that lie in place already are left."""
    if not folder.is_dir():
        return names
    if loads_file is not None and (folder / own).exists() and (folder / own).samefile(loads_file):
        names = tuple(name for name in names if name != own)
    there = [name for name in names if os.path.lexists(folder / name)]
    if there and not force:
        raise _bad(str(folder), f"a folder that holds {', '.join(there)}", "give a new folder, or add --force")
    for name in names:
        check_new(folder / name, force, () if loads_file is None else (loads_file,))
    return names


def _check(volts: float, earthing: str, system: System) -> None:
    if earthing not in ("TN-S", "TN-C-S", "TT"):
        raise _bad("--earthing", f'"{earthing}"', "give TN-S, TN-C-S or TT")
    star = meant_star_voltage(volts, Tables(), geometry_of(system))
    if star is not None:
        looks = f"{volts:g}, which looks like a line-to-line voltage"
        raise _bad("--volts", looks, f"give volts from line to neutral, {star:g}")
    low, high = NOMINAL_V
    if not low <= volts <= high:
        raise _bad("--volts", f"{volts:g}", f"give volts from line to neutral, {low:g} to {high:g}")


def _own_loads(path: Path) -> tuple[list[str], str, bytes]:
    problems: list[Problem] = []
    rows = read_loads(path, str(path), None, problems)
    if problems:
        raise InputError(problems)
    names = list(dict.fromkeys(row.form.board for row in rows))
    suffix = path.suffix.lower() if is_workbook(path.name) else ".csv"
    return [MAIN, *(n for n in names if n != MAIN)], f"loads{suffix}", path.read_bytes()


def _check_loads(path: Path, figures: dict[str, Any]) -> None:
    """Holds own loads against the starter site as it will be."""
    text = _render("site.toml.j2", {**figures, "loads_file": json.dumps(str(path), ensure_ascii=False)})
    draft = draft_site(TomlFile.parse("site.toml", text.decode("utf-8")), Path())
    cross_check(draft, placed_loads(draft), Tables(), need_relay=True)
    if draft.problems:
        raise InputError(draft.problems)


def _figures(volts: float, earthing: str, system: System) -> dict[str, Any]:
    """Voltages of the templates at the site's nominal voltage."""
    scale = volts / BASE_V
    low, high = Tables().row("default-equipment-nominal-range").value
    curve = Tables().row("household-overvoltage-break-times")
    geometry = geometry_of(system)
    between_pu = geometry.line_to_line_ratio
    shift_error = displacement_share(geometry) * CHANNEL_PERCENT / 100 * volts
    share = displacement_share(geometry)
    return {
        "system": system,
        "lines": len(geometry.names),
        "of_star": geometry.of_star,
        "has_displacement": geometry.has_displacement,
        "between": f"{between_pu:.3g} times line to neutral",
        "share": "2/3" if system == "3ph-4w" else f"{share:g}",
        "volts": volts,
        "line_to_line": round(volts * between_pu),
        "earthing": earthing,
        "scale": scale,
        "frequency": 60 if volts in CYCLES_60 else 50,
        "named_band": volts == BASE_V,
        "american_band": system != "3ph-4w" and volts == AMERICAN_V,
        "no_load": round(NO_LOAD_PU * volts, 1),
        "named_curve": low <= volts <= high,
        "points": [[round(v * scale), s] for v, s in curve.points],
        "sustained": round(curve.content["sustained_v"] * scale, 1),
        "sustained_low": round(SUSTAINED_LOW_PU * volts),
        "high": [round(pu * volts) for pu in (1.0, ABOVE_BETWEEN * between_pu)],
        "low": [round(pu * volts) for pu in UNDER_PU],
        "shift": [round(2 * pu * volts) / 2 for pu in SHIFT_PU],
        "coil": [round(pu * between_pu * volts) for pu in FEED_PU],
        "channel_percent": f"{CHANNEL_PERCENT:g}",
        "shift_error": math.ceil(10 * shift_error) / 10,
    }


def _render(name: str, figures: dict[str, Any]) -> bytes:
    import jinja2

    loader = jinja2.FileSystemLoader(templates_dir() / "starter")
    room = jinja2.Environment(
        loader=loader, undefined=jinja2.StrictUndefined, autoescape=False, trim_blocks=True, lstrip_blocks=True,
        keep_trailing_newline=True,
    )  # fmt: skip
    room.filters["quoted"] = lambda text: json.dumps(text, ensure_ascii=False)
    return room.get_template(name).render(figures).encode("utf-8")


def _bad(what: str, given: str, remedy: str) -> InputError:
    return InputError([Problem(what, None, None, "", given, "", remedy)])
