"""The commands: each opens its files, runs one study and shows the result; the rest is imported inside each."""

import re
from pathlib import Path
from typing import TYPE_CHECKING

import click

from relaycfg import __version__
from relaycfg.options import (
    EXAMPLE,
    FORCE,
    LINES,
    NOMINAL_V,
    READ_V,
    RELAY,
    SITE,
    SYSTEMS,
    USUAL_V,
    ReadingCommand,
    a_path,
    help_end,
    known_place,
    known_state,
    load_state,
    number,
    one_system,
    readings,
    studied,
    study_options,
    together,
)
from relaycfg.streams import STDIN, announce, show_json, show_text, show_written, standard_input, tell

if TYPE_CHECKING:
    from relaycfg.model.geometry import System
    from relaycfg.model.results import Study
    from relaycfg.model.site import Site

PROGRAM = f"relaycfg {__version__}"
DONE, EXCEPTIONS = 0, 1
GIVE_OUTPUT = "the result goes to standard output, give a path for the file"
GIVE_SETTINGS = "only a site is read from standard input, give the path of the settings"
BREAK_S, STUDY_S = 0.0001, 0.001
"""Seconds that one load state at one place takes, on a slow machine: breaks alone, and with settings."""


@click.command(epilog=help_end(f"relaycfg new my-board --loads {EXAMPLE}/loads.csv"))
@click.argument("folder", metavar="DIR", type=click.Path(path_type=Path))
@click.option(
    "--volts",
    type=number(*NOMINAL_V, "volts"),
    metavar="V",
    show_default="230; with two lines 120",
    help="Nominal volts, line to neutral, 50 to 600.",
)
@click.option(
    "--system",
    type=click.Choice(SYSTEMS),
    default=SYSTEMS[0],
    show_default=True,
    help="Three lines of a star, split phase, or two lines of a star.",
)
@click.option(
    "--earthing",
    type=click.Choice(["TN-C-S", "TN-S", "TT"]),
    default="TN-S",
    show_default=True,
    help="System earthing.",
)
@click.option("--loads", type=click.Path(path_type=Path), help="Loads to start from, .csv or .xlsx.")
@FORCE
def new(folder: Path, volts: float | None, system: "System", earthing: str, loads: Path | None, force: bool) -> int:
    """Write a starter site into DIR: commented site.toml, loads.csv and relay.toml."""
    from relaycfg.files import write_starter

    paths = write_starter(folder, USUAL_V[system] if volts is None else volts, earthing, loads, force, system)
    show_written("\n".join(map(str, paths)))
    return DONE


@click.command(epilog=help_end(f"relaycfg breaks {EXAMPLE}/site.toml"))
@SITE
@click.option("--at", "place", metavar="PLACE", help="One place only: a board, source (the star link) or none.")
@click.option(
    "--joint-ohm",
    type=number(1e-6, 1e6, "ohms"),
    metavar="R",
    help="A bad joint of so many ohms instead of an open neutral.",
)
@click.option(
    "--state",
    metavar="STATE",
    callback=load_state,
    help="Some load states only: connected, least, corners, sample, or worst (the highest volts of all on/off "
    'combinations); "sample 17" shows that sampled state, "on: A; B" what is always on with loads A and B.',
)
@click.option("--all", "everything", is_flag=True, help="Every state and board, N-PE and unbalance at the relay.")
@RELAY
@study_options
def breaks(
    site: str,
    place: str | None,
    joint_ohm: float | None,
    state: str | None,
    everything: bool,
    relay: str | None,
    form: str,
    samples: int,
    seed: int,
    quiet: bool,
) -> int:
    """Show what a lost neutral does: every place it can break, every board, what the relay sees."""
    found, _ = open_site(site, quiet, relay, need_relay=False)
    from relaycfg.study import breaks as study_breaks
    from relaycfg.text import breaks_dict, breaks_text

    at = None if place is None else known_place(found, place)
    known_state(found, state, at)
    drawn = samples if state in (None, "sample") else 0
    where = len(found.places) if at is None else 1
    announce(quiet, "computing every break", drawn, where, BREAK_S)
    result = study_breaks(found, samples=samples, seed=seed, at=at, joint_ohm=joint_ohm, state=state)
    if form == "json":
        show_json(breaks_dict(result, PROGRAM, found.digest, seed, drawn))
    else:
        show_text(breaks_text(found, result, everything))
    return DONE


@click.command(epilog=help_end(f"relaycfg derive {EXAMPLE}/site.toml -o derived.toml --force"))
@SITE
@click.option(
    "-o",
    "--output",
    metavar="SETTINGS",
    default="settings.toml",
    show_default=True,
    type=click.Path(path_type=Path),
    callback=a_path(GIVE_OUTPUT),
    help="Where the settings go.",
)
@click.option(
    "--explain",
    is_flag=True,
    help="The ride-through and withstand curves with the case behind every step; in JSON the V0 plane too.",
)
@FORCE
@RELAY
@study_options
def derive(
    site: str,
    output: Path,
    explain: bool,
    force: bool,
    relay: str | None,
    form: str,
    samples: int,
    seed: int,
    quiet: bool,
) -> int:
    """Derive settings for a new installation, with bounds, reasons, margins and cases.

    The path written comes last on standard output; with --format json on standard error, so that the JSON stays whole.
    """
    found, read = open_site(site, quiet or form == "text", relay)
    from relaycfg.files import check_new, settings_text, write_new
    from relaycfg.study import derive as study_derive
    from relaycfg.text import curves_text, derive_text, settings_comments, study_dict

    check_new(output, force, read)
    announce(quiet, "deriving", samples, len(found.places), STUDY_S)
    result = study_derive(found, samples, seed)
    settings = settings_text(result.settings, found, settings_comments(result)).encode()
    if form == "json":
        show_json(study_dict(result, PROGRAM, explain))
    else:
        show_text(derive_text(result) + (curves_text(result) if explain else ""))
    write_new(output, settings, force, read)
    return finish(result, output, form)


@click.command(epilog=help_end(f"relaycfg check {EXAMPLE}/site.toml {EXAMPLE}/existing-settings.toml"))
@SITE
@click.argument(
    "settings",
    default="settings.toml",
    metavar="[SETTINGS]",
    type=click.Path(path_type=Path),
    callback=a_path(GIVE_SETTINGS),
)
@RELAY
@study_options
def check(site: str, settings: Path, relay: str | None, form: str, samples: int, seed: int, quiet: bool) -> int:
    """Check existing settings against must-hold cases and neutral breaks."""
    found, _ = open_site(site, quiet or form == "text", relay)
    from relaycfg.files import read_settings
    from relaycfg.study import check as study_check
    from relaycfg.text import check_text, study_dict

    existing = read_settings(settings, found)
    announce(quiet, f"checking {settings}", samples, len(found.places), STUDY_S)
    result = study_check(found, existing, samples, seed)
    if form == "json":
        show_json(study_dict(result, PROGRAM))
    else:
        show_text(check_text(result))
    return EXCEPTIONS if result.exceptions else DONE


@click.command(epilog=help_end(f"relaycfg sheet {EXAMPLE}/site.toml -o sheet.pdf --force"))
@SITE
@click.argument(
    "settings",
    required=False,
    metavar="[SETTINGS]",
    type=click.Path(path_type=Path),
    callback=a_path(GIVE_SETTINGS),
)
@click.option(
    "-o",
    "--output",
    metavar="PDF",
    type=click.Path(path_type=Path),
    callback=a_path(GIVE_OUTPUT),
    help="Where the sheet goes; default <number>-<revision>.pdf.",
)
@FORCE
@RELAY
@study_options
def sheet(
    site: str,
    settings: Path | None,
    output: Path | None,
    force: bool,
    relay: str | None,
    form: str,
    samples: int,
    seed: int,
    quiet: bool,
) -> int:
    """Write the setting sheet as a PDF; the settings are derived where none are given.

    The path written comes last on standard output; with --format json on standard error, so that the JSON stays whole.
    """
    found, read = open_site(site, quiet, relay)
    from relaycfg.files import check_new, read_settings, templates_dir, write_new
    from relaycfg.sheet import render
    from relaycfg.study import check as study_check
    from relaycfg.study import derive as study_derive
    from relaycfg.text import sheet_text, study_dict

    path = output if output is not None else Path(sheet_name(found))
    existing = None if settings is None else read_settings(settings, found)
    read = read if settings is None else (*read, settings)
    check_new(path, force, read)
    doing = "deriving" if existing is None else f"checking {settings}"
    announce(quiet, doing, samples, len(found.places), STUDY_S)
    result = study_derive(found, samples, seed) if existing is None else study_check(found, existing, samples, seed)
    tell(quiet, "drawing the sheet")
    pages = render(result, templates_dir(), __version__)
    if form == "json":
        show_json(study_dict(result, PROGRAM))
    else:
        show_text(sheet_text(result))
    write_new(path, pages, force, read)
    return finish(result, path, form)


@click.command(
    cls=ReadingCommand,
    epilog=help_end("relaycfg reading 172 263 263"),
    context_settings={"ignore_unknown_options": True},  # a reading of -5 is a wrong number, not an option
)
@click.argument("l_n", nargs=-1, type=number(*READ_V, "volts"), callback=readings, metavar="V1 V2 [V3]")
@click.option(
    "--line-to-line",
    "l_l",
    nargs=len(LINES),
    type=number(*READ_V, "volts"),
    metavar="V12 [V23 V31]",
    callback=together,
    help="Volts between lines, read at the same time; behind the readings where there are two.",
)
@click.option(
    "--system",
    type=click.Choice(SYSTEMS),
    help="Three lines of a star, split phase, or two lines of a star; default: split phase for two readings.",
)
@click.option(
    "--nominal",
    type=number(*NOMINAL_V, "volts"),
    metavar="V",
    show_default="230; with two lines 120",
    help="Nominal volts, line to neutral, 50 to 600.",
)
def reading(
    l_n: tuple[float, ...], l_l: tuple[float, ...] | None, system: "System | None", nominal: float | None
) -> int:
    """Say what a meter reading means: lost neutral, lost phase or supply; what to check first, what not to do."""
    from relaycfg.study import read_board
    from relaycfg.text import reading_text

    kind = one_system(len(l_n), system)
    show_text(reading_text(read_board(l_n, l_l, kind, USUAL_V[kind] if nominal is None else nominal)))
    return DONE


def open_site(site: str, quiet: bool, relay: str | None, need_relay: bool = True) -> tuple["Site", tuple[Path, ...]]:
    """The site of a file, or of stdin for ``-``, with the relay to study, and the files read for it.

    Its warnings go to stderr, where the result does not print them.
    """
    from relaycfg.files import read_site

    if site == "-":
        found = read_site(None, text=standard_input(), need_relay=need_relay)
        read = (STDIN, *map(Path, found.files))
    else:
        found = read_site(Path(site), need_relay=need_relay)
        read = tuple(map(Path, found.files))
    for warning in found.warnings:
        tell(quiet, f"warning: {warning}")
    return studied(found, relay), read


def sheet_name(site: "Site") -> str:
    """Number and revision as a plain file name."""
    stated = "-".join(part for part in (site.document.number, site.document.revision) if part)
    return (re.sub(r"[^\w.-]+", "_", stated).strip("._-") or "setting-sheet") + ".pdf"


def finish(result: "Study", path: Path, form: str) -> int:
    """The path written, last: on stderr beside JSON, which stays whole on stdout."""
    show_written(str(path), err=form == "json")
    return EXCEPTIONS if result.exceptions else DONE
