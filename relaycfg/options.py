"""Options that several commands share, and the limits of what they take."""

from collections.abc import Callable
from typing import Any

import click

EXAMPLE = "examples/workshop"
"""Folder that the last line of every help runs on."""
STATES = ("connected", "least", "corners", "sample")
Command = Callable[..., Any]
SITE = click.argument("site", default="site.toml", metavar="[SITE]")
FORCE = click.option("--force", is_flag=True, help="Write over an existing file.")


def within(low: float, high: float, unit: str) -> Callable[[click.Context, click.Parameter, Any], Any]:
    """A check that a number (or each of several) lies within limits; infinity and NaN do not."""

    def checked(_: click.Context, param: click.Parameter, value: Any) -> Any:
        for number in value if isinstance(value, tuple) else (value,):
            if number is not None and not low <= number <= high:
                raise click.BadParameter(f"{number:g} is not {unit} from {low:g} to {high:g}", param=param)
        return value

    return checked


def study_options(command: Command) -> Command:
    """Options of every command that computes load states."""
    for option in (
        click.option("--quiet", is_flag=True, help="Only the result, no messages on stderr."),
        click.option(
            "--seed",
            type=click.IntRange(0),
            default=1,
            show_default=True,
            help="The same seed draws the same load states.",
        ),
        click.option(
            "--samples", type=click.IntRange(1, 1_000_000), default=2000, show_default=True, help="Load states drawn."
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
