"""Options that several commands share, and the limits of what they take."""

import re
from collections.abc import Callable
from pathlib import Path
from typing import Any

import click

EXAMPLE = "examples/workshop"
"""Folder that the last line of every help runs on."""
STATES = ("connected", "least", "corners", "sample")
MOST_SAMPLES = 1_000_000
NOMINAL_V = (50.0, 600.0)
"""Nominal volts, line to neutral, as in a site file."""
LINES = ("L1", "L2", "L3")
READ_V = (0.0, 1500.0)
"""Volts that a meter may show on such a system."""
Command = Callable[..., Any]
SITE = click.argument("site", default="site.toml", metavar="[SITE]")
FORCE = click.option("--force", is_flag=True, help="Write over an existing file.")


def number(low: float, high: float, unit: str) -> Callable[[str], float]:
    """The type of a number within limits; infinity and NaN are not."""

    def convert(given: str) -> float:
        try:
            value = float(given)
        except ValueError:
            raise click.BadParameter(_no_number(given)) from None
        if not low <= value <= high:
            raise click.BadParameter(f"{value:g} is outside {low:g} to {high:g} {unit}")
        return value

    return convert


def whole(low: int, high: int | None = None) -> Callable[[str], int]:
    """The type of a whole number within limits; without ``high`` it has none above."""
    allowed = f"{low} or more" if high is None else f"{low} to {high}"

    def convert(given: str) -> int:
        try:
            value = int(given)
        except ValueError:
            raise click.BadParameter(f"{given!r} is no whole number; give {allowed}") from None
        if value < low or (high is not None and value > high):
            raise click.BadParameter(f"{value} is not possible; give {allowed}")
        return value

    return convert


def _no_number(given: str) -> str:
    pointed = given.replace(",", ".")
    if re.fullmatch(r"-?\d+\.\d+", pointed):
        return f"{given!r} has a decimal comma; write {pointed}"
    if re.match(r"-\D", given):
        return f"{given!r} is no option of this command, and no number"
    return f"{given!r} is no number"


def three_readings(_: click.Context, param: click.Parameter, given: tuple[float, ...]) -> tuple[float, float, float]:
    """The readings of the three lines."""
    if len(given) != len(LINES):
        wanted = f"give {len(LINES)} readings, line to neutral in order {' '.join(LINES)}"
        raise click.BadParameter(f"{wanted}; {len(given)} given", param=param)
    first, second, third = given
    return first, second, third


def a_path(what: str) -> Callable[[click.Context, click.Parameter, Path | None], Path | None]:
    """A check that a path is none of the streams; ``what`` says what to do instead."""

    def checked(_: click.Context, param: click.Parameter, value: Path | None) -> Path | None:
        if value is not None and str(value) == "-":
            raise click.BadParameter(f"'-' is no file; {what}", param=param)
        return value

    return checked


def load_state(_: click.Context, param: click.Parameter, value: str | None) -> str | None:
    """A kind of load states, or one sampled state by its number, written as the results name it."""
    if value is None or value in STATES:
        return value
    numbered = re.fullmatch(r"sample +(\d{1,7})", value)
    if numbered is None or int(numbered[1]) >= MOST_SAMPLES:
        known = ", ".join(STATES)
        raise click.BadParameter(
            f'{value!r} is not one of {known}, or a sampled state such as "sample 17"', param=param
        )
    return f"sample {int(numbered[1])}"


def study_options(command: Command) -> Command:
    """Options of every command that computes load states."""
    for option in (
        click.option("--quiet", is_flag=True, help="Only the result, no messages on stderr."),
        click.option(
            "--seed",
            type=whole(0),
            metavar="N",
            default=1,
            show_default=True,
            help="The same seed draws the same load states.",
        ),
        click.option(
            "--samples",
            type=whole(1, MOST_SAMPLES),
            metavar="N",
            default=2000,
            show_default=True,
            help="Load states drawn.",
        ),
        click.option(
            "--format",
            "form",
            type=click.Choice(["text", "json"]),
            default="text",
            show_default=True,
            help="Form of the result.",
        ),
    ):
        command = option(command)
    return command


def help_end(command: str) -> str:
    """The end of a help: a command that runs as it stands."""
    return f"\b\nTry it:\n{command}"
