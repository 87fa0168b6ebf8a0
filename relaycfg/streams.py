"""What passes between a command and the terminal: the only place that reads or writes the standard streams."""

import contextlib
import json
import sys
from pathlib import Path
from typing import Any

import click

NO_OUTPUT = "standard output takes no more"
STDIN = Path("/dev/stdin")
"""The file that standard input comes from, where it comes from one and the system has such a path."""
FEW_SAMPLES = 200
"""Below this the 95 % intervals of shares are wider than some 14 percent points."""
PATIENCE_S = 10.0
"""Longer than this asks for a word beforehand."""


def standard_input() -> str:
    """All of stdin, as far as there is one."""
    try:
        data = sys.stdin.buffer.read() if sys.stdin is not None else None
    except OSError as reason:
        raise click.UsageError(f"standard input cannot be read ({why(reason)}); give the path of a site") from None
    if data is None:
        raise click.UsageError("standard input is closed; give the path of a site")
    return data.decode("utf-8", errors="surrogateescape")


def show_text(result: str) -> None:
    """A result that ends its own last line, on stdout."""
    click.echo(result, nl=False)


def show_json(result: dict[str, Any]) -> None:
    """One JSON document on stdout."""
    click.echo(json.dumps(result, ensure_ascii=False, indent=1, allow_nan=False))


def show_written(paths: str, err: bool = False) -> None:
    """Paths that are written by now, which is said where they cannot be shown."""
    try:
        click.echo(paths, err=err)
    except BrokenPipeError:
        raise
    except OSError as reason:
        if not err:
            named = paths.replace("\n", ", ")
            raise click.ClickException(f"{NO_OUTPUT} ({why(reason)}); written all the same: {named}") from None


def announce(quiet: bool, doing: str, samples: int, places: int, seconds: float) -> None:
    """What is about to be computed, on stderr; ``seconds`` are those of one load state at one place, roughly."""
    over = f" with {samples} drawn load states" if samples else ""
    at = f" at {places} place{'s' if places != 1 else ''}"
    long = "; this takes a while, fewer --samples are faster" if samples * places * seconds > PATIENCE_S else ""
    tell(quiet, f"{doing}{over}{at}{long}")
    if 0 < samples < FEW_SAMPLES:
        tell(quiet, f"note: shares of {samples} load states mean little; take {FEW_SAMPLES} or more")


def tell(quiet: bool, message: str) -> None:
    """A message on stderr; nobody stops where it is not taken."""
    if not quiet:
        complain(f"relaycfg: {message}")


def complain(message: str) -> None:
    """A line on stderr."""
    with contextlib.suppress(OSError):
        click.echo(message, err=True)


def why(reason: OSError) -> str:
    """The system's reason in its own words."""
    return (reason.strerror or "unknown reason").lower()
