"""Commands, options and exit codes: the only place that prints, and the one that joins files, study, sheet and text."""

import json
import os
import re
import sys
import traceback
from pathlib import Path
from typing import TYPE_CHECKING, Any, NoReturn

import click

from relaycfg import __version__
from relaycfg.errors import InputError
from relaycfg.options import EXAMPLE, FORCE, SITE, STATES, help_end, study_options, within

if TYPE_CHECKING:
    from relaycfg.model.results import Study
    from relaycfg.model.site import Site

PROGRAM = f"relaycfg {__version__}"
DONE, EXCEPTIONS, BAD_INPUT = 0, 1, 2
INTERRUPTED, PIPE_CLOSED = 130, 141


@click.group(
    context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100},
    epilog=help_end(f"relaycfg breaks {EXAMPLE}/site.toml"),
)
@click.version_option(__version__, prog_name="relaycfg", message="%(prog)s %(version)s")
def program() -> None:
    """Settings of voltage relays that disconnect a board when its neutral is lost.

    Exit: 0 done, 1 done with exceptions against the stated criteria, 2 bad usage or bad input and nothing written.
    """


@program.command(epilog=help_end(f"relaycfg new my-board --loads {EXAMPLE}/loads.csv"))
@click.argument("folder", metavar="DIR", type=click.Path(path_type=Path))
@click.option(
    "--volts",
    type=float,
    callback=within(50, 400, "volts"),
    default=230.0,
    show_default=True,
    help="Nominal, line to neutral.",
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
def new(folder: Path, volts: float, earthing: str, loads: Path | None, force: bool) -> int:
    """Write a starter site into DIR: commented site.toml, loads.csv and relay.toml."""
    from relaycfg.files import write_starter

    for path in write_starter(folder, volts, earthing, loads, force):
        click.echo(path)
    return DONE


@program.command(epilog=help_end(f"relaycfg breaks {EXAMPLE}/site.toml"))
@SITE
@click.option("--at", "place", metavar="PLACE", help="One place only: a board, source (the star link) or none.")
@click.option(
    "--joint-ohm",
    type=float,
    callback=within(1e-6, 1e6, "ohms"),
    help="A bad joint of so many ohms instead of an open neutral.",
)
@click.option("--state", type=click.Choice(STATES), help="One kind of load states only.")
@click.option("--all", "everything", is_flag=True, help="Every state and board.")
@study_options
def breaks(
    site: str,
    place: str | None,
    joint_ohm: float | None,
    state: str | None,
    everything: bool,
    form: str,
    samples: int,
    seed: int,
    quiet: bool,
) -> int:
    """Show what a lost neutral does: every place it can break, every board, what the relay sees."""
    found = open_site(site, quiet, need_relay=False)
    from relaycfg.study import breaks as study_breaks
    from relaycfg.text import breaks_dict, breaks_text

    at = None if place is None else known_place(found, place)
    drawn = samples if state in (None, "sample") else 0
    tell(quiet, f"computing every break with {drawn} drawn load states")
    result = study_breaks(found, samples=samples, seed=seed, at=at, joint_ohm=joint_ohm, state=state)
    if form == "json":
        show_json(breaks_dict(result, PROGRAM, found.digest, seed, drawn))
    else:
        click.echo(breaks_text(found, result, everything), nl=False)
    return DONE


@program.command(epilog=help_end(f"relaycfg derive {EXAMPLE}/site.toml -o derived.toml --force"))
@SITE
@click.option(
    "-o",
    "--output",
    metavar="SETTINGS",
    default="settings.toml",
    show_default=True,
    type=click.Path(path_type=Path),
    help="Where the settings go.",
)
@click.option("--explain", is_flag=True, help="The ride-through and withstand curves, with the case behind every step.")
@FORCE
@study_options
def derive(site: str, output: Path, explain: bool, force: bool, form: str, samples: int, seed: int, quiet: bool) -> int:
    """Derive settings for a new installation, with bounds, reasons, margins and cases."""
    found = open_site(site, quiet)
    from relaycfg.files import check_new, settings_text, write_new
    from relaycfg.study import derive as study_derive
    from relaycfg.text import curves_text, derive_text, settings_comments, study_dict

    check_new(output, force)
    tell(quiet, f"deriving over {samples} drawn load states")
    result = study_derive(found, samples, seed)
    write_new(output, settings_text(result.settings, found, settings_comments(result)).encode(), force)
    if form == "json":
        show_json(study_dict(result, PROGRAM, explain))
    else:
        click.echo(derive_text(result) + (curves_text(result) if explain else ""), nl=False)
    return finish(result, output, form)


@program.command(epilog=help_end(f"relaycfg check {EXAMPLE}/site.toml {EXAMPLE}/existing-settings.toml"))
@SITE
@click.argument("settings", default="settings.toml", metavar="[SETTINGS]", type=click.Path(path_type=Path))
@study_options
def check(site: str, settings: Path, form: str, samples: int, seed: int, quiet: bool) -> int:
    """Check existing settings against must-hold cases and neutral breaks."""
    found = open_site(site, quiet)
    from relaycfg.files import read_settings
    from relaycfg.study import check as study_check
    from relaycfg.text import check_text, study_dict

    existing = read_settings(settings, found)
    tell(quiet, f"checking {settings} over {samples} drawn load states")
    result = study_check(found, existing, samples, seed)
    if form == "json":
        show_json(study_dict(result, PROGRAM))
    else:
        click.echo(check_text(result), nl=False)
    return EXCEPTIONS if result.exceptions else DONE


@program.command(epilog=help_end(f"relaycfg sheet {EXAMPLE}/site.toml -o sheet.pdf --force"))
@SITE
@click.argument("settings", required=False, metavar="[SETTINGS]", type=click.Path(path_type=Path))
@click.option(
    "-o",
    "--output",
    metavar="PDF",
    type=click.Path(path_type=Path),
    help="Where the sheet goes; default <number>-<revision>.pdf.",
)
@FORCE
@study_options
def sheet(
    site: str,
    settings: Path | None,
    output: Path | None,
    force: bool,
    form: str,
    samples: int,
    seed: int,
    quiet: bool,
) -> int:
    """Write the setting sheet as a PDF; the settings are derived where none are given."""
    found = open_site(site, quiet)
    from relaycfg.files import check_new, read_settings, templates_dir, write_new
    from relaycfg.sheet import render
    from relaycfg.study import check as study_check
    from relaycfg.study import derive as study_derive
    from relaycfg.text import sheet_text, study_dict

    path = output if output is not None else Path(sheet_name(found))
    existing = None if settings is None else read_settings(settings, found)
    check_new(path, force)
    tell(quiet, f"{'deriving' if existing is None else 'checking'} over {samples} drawn load states")
    result = study_derive(found, samples, seed) if existing is None else study_check(found, existing, samples, seed)
    tell(quiet, "drawing the sheet")
    write_new(path, render(result, templates_dir(), __version__), force)
    if form == "json":
        show_json(study_dict(result, PROGRAM))
    else:
        click.echo(sheet_text(result), nl=False)
    return finish(result, path, form)


@program.command(epilog=help_end("relaycfg reading 172 263 263"))
@click.argument("l_n", nargs=3, type=float, callback=within(0, 1000, "volts"), metavar="V1 V2 V3")
@click.option(
    "--line-to-line",
    "l_l",
    nargs=3,
    type=float,
    callback=within(0, 1000, "volts"),
    metavar="V12 V23 V31",
    help="Volts between lines, read at the same time.",
)
@click.option(
    "--nominal",
    type=float,
    callback=within(50, 400, "volts"),
    default=230.0,
    show_default=True,
    help="Nominal volts, line to neutral.",
)
def reading(l_n: tuple[float, float, float], l_l: tuple[float, float, float] | None, nominal: float) -> int:
    """Say what a meter reading means: lost neutral, lost phase or supply; what to check first, what not to do."""
    from relaycfg.study.reading import read_meter
    from relaycfg.text import reading_text

    click.echo(reading_text(read_meter(l_n, l_l, nominal)), nl=False)
    return DONE


def open_site(site: str, quiet: bool, need_relay: bool = True) -> "Site":
    """The site of a file, or of stdin for ``-``; its warnings go to stderr."""
    from relaycfg.files import read_site

    if site == "-":
        text = sys.stdin.buffer.read().decode("utf-8", errors="surrogateescape")
        found = read_site(None, text=text, need_relay=need_relay)
    else:
        found = read_site(Path(site), need_relay=need_relay)
    for warning in found.warnings:
        tell(quiet, f"warning: {warning}")
    return found


def known_place(site: "Site", given: str) -> str:
    """A break place by its name as given on the command line."""
    import unicodedata

    name = unicodedata.normalize("NFC", given.strip())
    known = ("none", *site.places)
    if name not in known:
        raise click.BadParameter(
            f"{given!r} is no place where the neutral can break; give one of {', '.join(known)}", param_hint="'--at'"
        )
    return name


def sheet_name(site: "Site") -> str:
    """Number and revision as a plain file name."""
    stated = "-".join(part for part in (site.document.number, site.document.revision) if part)
    return (re.sub(r"[^\w.-]+", "_", stated).strip("._-") or "setting-sheet") + ".pdf"


def finish(result: "Study", path: Path, form: str) -> int:
    """The path written, last: on stderr beside JSON, which stays whole on stdout."""
    click.echo(path, err=form == "json")
    return EXCEPTIONS if result.exceptions else DONE


def show_json(result: dict[str, Any]) -> None:
    """One JSON document on stdout."""
    click.echo(json.dumps(result, ensure_ascii=False, indent=1, allow_nan=False))


def tell(quiet: bool, message: str) -> None:
    """A message on stderr."""
    if not quiet:
        click.echo(f"relaycfg: {message}", err=True)


def main(arguments: list[str] | None = None) -> NoReturn:
    """Run the program and leave with its exit code; no traceback reaches a user."""
    os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
    sys.exit(_code(arguments))


def _code(arguments: list[str] | None) -> int:
    try:
        code = program.main(arguments, prog_name="relaycfg", standalone_mode=False)
    except InputError as error:
        click.echo(error.text(), err=True)
        return BAD_INPUT
    except click.ClickException as error:
        error.show()
        return BAD_INPUT
    except (click.Abort, KeyboardInterrupt):
        click.echo("stopped", err=True)
        return INTERRUPTED
    except SystemExit:  # how click ends when the reader of stdout has gone
        return PIPE_CLOSED
    except Exception as error:
        if os.environ.get("RELAYCFG_TRACEBACK"):
            traceback.print_exc()
        what = f"{type(error).__name__}: {error}".rstrip(": ")
        click.echo(
            f"{PROGRAM} met an error of its own ({what}); please report it with the command and the files used",
            err=True,
        )
        return BAD_INPUT
    return code if isinstance(code, int) else DONE
