"""Writes results whole or not at all, and over nothing that is there unless told to."""

import os
from pathlib import Path

from relaycfg.errors import InputError, Problem


def write_new(path: Path, data: bytes | str, force: bool) -> None:
    """Writes ``data`` to ``path`` by a temporary file in the same folder, then a rename.

    Raises InputError where the file is there and ``force`` is not set, or where it cannot be written.
    """
    check_new(path, force)
    draft = path.with_name(f".{path.name}.{os.getpid()}.part")
    try:
        with draft.open("xb") as stream:
            stream.write(data.encode("utf-8") if isinstance(data, str) else data)
            stream.flush()
            os.fsync(stream.fileno())
        draft.replace(path)
    except OSError as reason:
        draft.unlink(missing_ok=True)
        why = (reason.strerror or "unknown reason").lower()
        raise _refusal(path, f"not writable ({why})", "give a path that can be written") from None


def check_new(path: Path, force: bool) -> None:
    """Raises InputError where ``path`` could not be written, before any work is done."""
    if path.is_dir():
        raise _refusal(path, "a folder", "give the name of a file")
    if not path.parent.is_dir():
        raise _refusal(path, "in a folder that is not there", f"make {path.parent} first, or give another path")
    if path.exists() and not force:
        raise _refusal(path, "already there", "add --force to replace it, or give another name")


def _refusal(path: Path, given: str, remedy: str) -> InputError:
    return InputError([Problem(str(path), None, None, "", given, "", remedy)])
