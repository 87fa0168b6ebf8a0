"""A starter site: commented files on which every other command runs at once."""

import json
from pathlib import Path
from typing import Any

from relaycfg.errors import InputError, Problem
from relaycfg.files.cross_checks import cross_check, star_voltage
from relaycfg.files.draft import draft_site, placed_loads
from relaycfg.files.loads import read_loads
from relaycfg.files.places import templates_dir
from relaycfg.files.schema import site_schema
from relaycfg.files.tables import Tables
from relaycfg.files.text import TomlFile
from relaycfg.files.writing import check_new, write_new

SCHEMA = "site.schema.json"
BASE_V = 230.0
"""Voltage for which the figures of the templates are written."""
MAIN, SECOND = "MB", "Workshop"
CYCLES_60 = (120.0, 127.0, 277.0)


def write_starter(
    folder: Path, volts: float = 230.0, earthing: str = "TN-S", loads_file: Path | None = None, force: bool = False
) -> tuple[Path, ...]:
    """Writes site.toml, loads, relay.toml and the JSON Schema into ``folder``, made where it is not there.

    ``loads_file``: own loads (CSV or .xlsx), copied beside the site, with a board for every name in it. Raises
    InputError, before anything is written, for bad arguments or files that are there already.
    """
    boards, loads_name, loads = [MAIN, SECOND], "loads.csv", b""
    _check(volts, earthing)
    if loads_file is not None:
        boards, loads_name, loads = _own_loads(loads_file)
    figures = {**_figures(volts, earthing), "boards": boards, "loads_file": json.dumps(loads_name, ensure_ascii=False)}
    if loads_file is not None:
        _check_loads(loads_file, figures)
    texts: dict[str, bytes] = {"site.toml": _render("site.toml.j2", figures)}
    texts[loads_name] = loads or _render("loads.csv.j2", figures)
    texts["relay.toml"] = _render("relay.toml.j2", figures)
    texts[SCHEMA] = (json.dumps(site_schema(), indent=1) + "\n").encode()
    if folder.exists() and not folder.is_dir():
        raise _bad(str(folder), "a file", "give a new folder")
    if folder.is_dir():
        there = [name for name in texts if (folder / name).exists()]
        if there and not force:
            raise _bad(str(folder), f"a folder that holds {', '.join(there)}", "give a new folder, or add --force")
    try:
        folder.mkdir(parents=True, exist_ok=True)
    except OSError as reason:
        raise _bad(str(folder), f"not to be made ({(reason.strerror or '').lower()})", "give another folder") from None
    for name in texts:
        check_new(folder / name, force)
    for name, data in texts.items():
        write_new(folder / name, data, force)
    return tuple(folder / name for name in texts)


def _check(volts: float, earthing: str) -> None:
    if earthing not in ("TN-S", "TN-C-S", "TT"):
        raise _bad("--earthing", f'"{earthing}"', "give TN-S, TN-C-S or TT")
    star = star_voltage(volts / 3**0.5, Tables())
    if star is not None and star_voltage(volts, Tables()) is None:
        looks = f"{volts:g}, which looks like a line-to-line voltage"
        raise _bad("--volts", looks, f"give volts from line to neutral, {star:g}")
    if not 50 <= volts <= 600:
        raise _bad("--volts", f"{volts:g}", "give volts from line to neutral, 50 to 600")


def _own_loads(path: Path) -> tuple[list[str], str, bytes]:
    problems: list[Problem] = []
    rows = read_loads(path, str(path), None, problems)
    if problems:
        raise InputError(problems)
    names = list(dict.fromkeys(row.form.board for row in rows))
    suffix = path.suffix.lower() if path.suffix.lower() in (".xlsx", ".xlsm") else ".csv"
    return [MAIN, *(n for n in names if n != MAIN)], f"loads{suffix}", path.read_bytes()


def _check_loads(path: Path, figures: dict[str, Any]) -> None:
    """Holds own loads against the starter site as it will be."""
    text = _render("site.toml.j2", {**figures, "loads_file": json.dumps(str(path), ensure_ascii=False)})
    draft = draft_site(TomlFile.parse("site.toml", text.decode("utf-8")), Path())
    cross_check(draft, placed_loads(draft), Tables(), need_relay=True)
    if draft.problems:
        raise InputError(draft.problems)


def _figures(volts: float, earthing: str) -> dict[str, Any]:
    """Voltages of the templates at the site's nominal voltage."""
    scale = volts / BASE_V
    low, high = Tables().row("default-equipment-nominal-range").value
    curve = Tables().row("household-overvoltage-break-times")
    return {
        "volts": volts,
        "earthing": earthing,
        "scale": scale,
        "frequency": 60 if volts in CYCLES_60 else 50,
        "named_band": volts == BASE_V,
        "no_load": round(1.02 * volts, 1),
        "named_curve": low <= volts <= high,
        "points": [[round(v * scale), s] for v, s in curve.points],
        "sustained": round(curve.content["sustained_v"] * scale, 1),
        "high": (round(volts), round(1.8 * volts)),
        "low": (round(0.3 * volts), round(volts)),
        "shift": (round(0.04 * volts) / 2, round(1.2 * volts) / 2),
        "coil": (round(1.3 * volts), round(2 * volts)),
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
