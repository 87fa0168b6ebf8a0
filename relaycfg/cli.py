"""The command line as a whole: its commands, its exit codes, and no traceback for a user."""

import contextlib
import os
import sys
import traceback
from typing import NoReturn

import click

from relaycfg import __version__, commands
from relaycfg.commands import DONE, PROGRAM
from relaycfg.errors import InputError
from relaycfg.options import EXAMPLE, help_end
from relaycfg.streams import NO_OUTPUT, complain, why

BAD_INPUT = 2
INTERRUPTED, PIPE_CLOSED = 130, 141


@click.group(
    context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100},
    epilog=help_end(f"relaycfg breaks {EXAMPLE}/site.toml"),
)
@click.version_option(__version__, prog_name="relaycfg", message="%(prog)s %(version)s")
def program() -> None:
    """Settings of voltage relays that disconnect a board when its neutral is lost.

    Exit: 0 done, 1 done with exceptions against the stated criteria, 2 bad usage or bad input and nothing written,
    130 stopped by the keyboard, 141 the reader of the result has gone.
    """


for command in (commands.new, commands.breaks, commands.derive, commands.check, commands.sheet, commands.reading):
    program.add_command(command)


def main(arguments: list[str] | None = None) -> NoReturn:
    """Run the program and leave with its exit code; no traceback reaches a user."""
    os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
    sys.exit(_code(arguments))


def _code(arguments: list[str] | None) -> int:
    if sys.stdout is None:
        complain("Error: standard output is closed; nothing is computed or written")
        return BAD_INPUT
    try:
        code = program.main(arguments, prog_name="relaycfg", standalone_mode=False)
    except InputError as error:
        complain(error.text())
        return BAD_INPUT
    except click.ClickException as error:
        with contextlib.suppress(OSError):
            error.show()
        return BAD_INPUT
    except (click.Abort, KeyboardInterrupt):
        complain("stopped")
        return INTERRUPTED
    except SystemExit:  # how click ends when the reader of stdout has gone
        return PIPE_CLOSED
    except Exception as error:
        if os.environ.get("RELAYCFG_TRACEBACK"):
            traceback.print_exc()
        if isinstance(error, OSError) and error.errno is not None and error.filename is None:  # a stream, not a file
            complain(f"Error: {NO_OUTPUT} ({why(error)}); nothing is written")
            return BAD_INPUT
        what = f"{type(error).__name__}: {error}".rstrip(": ")
        complain(f"{PROGRAM} met an error of its own ({what}); please report it with the command and the files used")
        return BAD_INPUT
    return code if isinstance(code, int) else DONE
