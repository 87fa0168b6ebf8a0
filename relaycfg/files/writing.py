"""Writes results whole or not at all, over nothing that is there unless told to, and never over what was read."""

import contextlib
import errno
import os
import secrets
import stat
from collections.abc import Iterable
from pathlib import Path

from relaycfg.errors import InputError, Problem


def write_new(path: Path, data: bytes | str, force: bool, inputs: Iterable[Path | str] = ()) -> None:
    """Writes ``data`` to ``path`` by a temporary file in the same folder, then a rename.

    A link stays: what it points to is written. ``inputs`` are files that must not be written over, whatever ``force``
    says. Raises InputError where the file is there and ``force`` is not set, or where it cannot be written.
    """
    target = _target(path, force, inputs)
    draft = target.with_name(f".relaycfg-{secrets.token_hex(8)}.part")
    try:
        with draft.open("xb") as stream:
            stream.write(data.encode("utf-8") if isinstance(data, str) else data)
            stream.flush()
            os.fsync(stream.fileno())
        draft.replace(target)
    except OSError as reason:
        raise _unusable(path, reason) from None
    finally:
        with contextlib.suppress(OSError):
            draft.unlink(missing_ok=True)


def check_new(path: Path, force: bool, inputs: Iterable[Path | str] = ()) -> None:
    """Raises InputError where ``path`` could not be written, before any work is done."""
    _target(path, force, inputs)


def _target(path: Path, force: bool, inputs: Iterable[Path | str]) -> Path:
    """The file to write, links followed; raises InputError where it must not or cannot be."""
    try:
        linked = path.is_symlink()
        target = Path(os.path.realpath(path)) if linked else path
        there = _status(target)
        if there is not None and stat.S_ISLNK(there.st_mode):
            raise _refusal(path, "a link that leads back to itself", "give another name")
        if there is not None and not stat.S_ISREG(there.st_mode):
            raise _refusal(path, _kind(there.st_mode), "give the name of a file")
        folder = _status(target.parent, follow=True)
        if folder is None or not stat.S_ISDIR(folder.st_mode):
            make = f"make {target.parent} first, or give another path"
            raise _refusal(path, "in a folder that is not there", make)
        if there is not None and _is_one_of(there, inputs):
            raise _refusal(path, "one of the files read for it", "give another name: an input is never replaced")
        if (there is not None or linked) and not force:
            raise _refusal(path, "already there", "add --force to replace it, or give another name")
        if not os.access(target.parent, os.W_OK):
            raise _refusal(path, "in a folder that cannot be written", "give another path")
    except OSError as reason:
        raise _unusable(path, reason) from None
    except ValueError:
        raise _refusal(path, "not a usable path", "give another path") from None
    return target


def _status(path: Path, follow: bool = False) -> os.stat_result | None:
    try:
        return path.stat() if follow else path.lstat()
    except (FileNotFoundError, NotADirectoryError):
        return None


def _kind(mode: int) -> str:
    if stat.S_ISDIR(mode):
        return "a folder"
    return "a pipe" if stat.S_ISFIFO(mode) else "a socket" if stat.S_ISSOCK(mode) else "a device"


def _is_one_of(there: os.stat_result, inputs: Iterable[Path | str]) -> bool:
    found = (_status(Path(name), follow=True) for name in inputs)
    return any(other is not None and os.path.samestat(there, other) for other in found)


def _unusable(path: Path, reason: OSError) -> InputError:
    if reason.errno == errno.ENAMETOOLONG:
        return _refusal(path, "a name that is too long", "give a shorter one")
    why = (reason.strerror or "unknown reason").lower()
    return _refusal(path, f"not writable ({why})", "give a path that can be written")


def _refusal(path: Path, given: str, remedy: str) -> InputError:
    return InputError([Problem(str(path), None, None, "", given, "", remedy)])
