"""Options that several commands share, and the limits of what they take."""

import re
import unicodedata
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

if TYPE_CHECKING:
    from relaycfg.model.geometry import System
    from relaycfg.model.site import Site

EXAMPLE = "examples/workshop"
"""Folder that the last line of every help runs on."""
STATES = ("connected", "least", "corners", "sample", "worst")
MOST_SAMPLES = 1_000_000
NOMINAL_V = (50.0, 600.0)
"""Nominal volts, line to neutral, as in a site file."""
LINES = ("L1", "L2", "L3")
SYSTEMS: tuple["System", ...] = ("3ph-4w", "1ph-3w", "2ph-3w")
"""Kinds of system as in a site file; all but the first have two lines."""
TWO_LINES, USUAL_V = 2, {"3ph-4w": 230.0, "1ph-3w": 120.0, "2ph-3w": 120.0}
"""Lines of those systems, and nominal volts taken where none are given."""
READ_V = (0.0, 1500.0)
"""Volts that a meter may show on such a system."""
Command = Callable[..., Any]
SITE = click.argument("site", default="site.toml", metavar="[SITE]")
FORCE = click.option("--force", is_flag=True, help="Write over an existing file.")
RELAY = click.option("--relay", metavar="NAME", help="The relay studied where the site has several; else the first.")


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


def readings(_: click.Context, param: click.Parameter, given: tuple[float, ...]) -> tuple[float, ...]:
    """The readings of three lines, or of two."""
    if len(given) not in (TWO_LINES, len(LINES)):
        wanted = f"give {len(LINES)} readings, line to neutral in order {' '.join(LINES)}"
        raise click.BadParameter(f"{wanted}, or 2 where there are two lines; {len(given)} given", param=param)
    return given


def together(_: click.Context, __: click.Parameter, given: Any) -> tuple[float, ...] | None:
    """Volts between lines as a tuple, be they one or three."""
    return (given,) if isinstance(given, float) else given


class ReadingCommand(click.Command):
    """A command whose ``--line-to-line`` takes one voltage behind two readings, and three elsewhere."""

    def parse_args(self, ctx: click.Context, args: list[str]) -> list[str]:
        """Count the readings before the option, then parse."""
        before, left = 0, iter(args)
        for arg in left:
            if arg.startswith("--line-to-line"):
                break
            if arg in ("--nominal", "--system"):
                next(left, None)
            else:
                before += not arg.startswith("--")
        option = next(p for p in self.params if p.name == "l_l")
        option.nargs = 1 if before == TWO_LINES else len(LINES)
        return super().parse_args(ctx, args)


def one_system(lines: int, given: "System | None") -> "System":
    """The system of that many readings; the one given has to have as many lines."""
    usual = SYSTEMS[0] if lines == len(LINES) else SYSTEMS[1]
    if given is not None and (given == SYSTEMS[0]) != (lines == len(LINES)):
        raise click.BadParameter(f"{given!r} does not have {lines} lines", param_hint="'--system'")
    return given or usual


def studied(site: "Site", name: str | None) -> "Site":
    """The site with the relay of that name as the one studied; without a name the first."""
    if name is None:
        return site
    given = unicodedata.normalize("NFC", name.strip())
    known = [relay.name for relay in site.relays]
    if given not in known:
        among = f"give one of {', '.join(known)}" if known else "the site has none"
        raise click.BadParameter(f"{name!r} is no relay of this site; {among}", param_hint="'--relay'")
    return site.with_relay(given)


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
    if value.startswith("on:"):
        return unicodedata.normalize("NFC", value)
    numbered = re.fullmatch(r"sample +(\d{1,7})", value)
    if numbered is None or int(numbered[1]) >= MOST_SAMPLES:
        known = ", ".join(STATES)
        raise click.BadParameter(
            f'{value!r} is not one of {known}, a sampled state such as "sample 17", or "on: A; B"', param=param
        )
    return f"sample {int(numbered[1])}"


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


def known_state(site: "Site", state: str | None, place: str | None) -> None:
    """Refuses a state that the site has not: unknown loads, or the worst one of no break."""
    if state == "worst" and place == "none":
        raise click.BadParameter("the worst state is that of a break; give its place", param_hint="'--at'")
    if state is not None and state.startswith("on:"):
        known = {*(load.name for load in site.loads), *(motor.name for motor in site.motors)}
        strange = [n for n in map(str.strip, state.removeprefix("on:").split(";")) if n and n not in known]
        if strange:
            which = "; ".join(strange)
            raise click.BadParameter(
                f"the site has no load or motor called {which}; separate names by semicolons", param_hint="'--state'"
            )


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
