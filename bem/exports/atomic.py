"""Files that appear complete or not at all.

The bytes go to a file of another name in the same folder, reach the disk, and only then take
the place of the target. Pipes and devices are written directly.
"""

from __future__ import annotations

import contextlib
import os
import secrets
import shutil
from collections.abc import Iterator
from os import PathLike
from pathlib import Path

from bem.errors import BemError, InputError, UsageError


def write_file(path: str | PathLike[str], data: bytes) -> None:
    """Put ``data`` into the file ``path``, replacing what was there.

    Raises:
        InputError: it could not be written; what was there before is untouched.
    """
    with _reported(path, InputError, "what was there before is untouched"):
        target = Path(os.path.realpath(path))
        if _is_stream(target):
            target.write_bytes(data)
        else:
            _replace(target, data)


def check_target(path: str | PathLike[str]) -> None:
    """Find out before a long computation whether ``write_file`` can work.

    Raises:
        UsageError: it cannot; the message says why.
    """
    with _reported(path, UsageError, "choose another file"):
        target = Path(os.path.realpath(path))
        if target.is_dir():
            raise UsageError(f"cannot write {path}: it is a folder; give the name of a file")
        if not target.parent.is_dir():
            raise UsageError(
                f"cannot write {path}: there is no folder {target.parent}; "
                "create it or choose another"
            )
        if _is_stream(target):
            return
        if target.exists() and not os.access(target, os.W_OK):
            raise UsageError(
                f"cannot write {path}: the file is read-only; choose another or make it writable"
            )
        with _scratch(target.parent):
            pass


@contextlib.contextmanager
def _reported(path: str | PathLike[str], kind: type[BemError], next_step: str) -> Iterator[None]:
    try:
        yield
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise kind(f"cannot write {os.fspath(path)!r}: {reason}; {next_step}") from error


def _is_stream(target: Path) -> bool:
    return target.exists() and not target.is_file() and not target.is_dir()


def _replace(target: Path, data: bytes) -> None:
    with _scratch(target.parent) as scratch:
        with open(scratch, "wb") as file:
            file.write(data)
            file.flush()
            os.fsync(file.fileno())
        if target.exists():
            shutil.copymode(target, scratch)
        os.replace(scratch, target)
    _sync_folder(target.parent)


@contextlib.contextmanager
def _scratch(folder: Path) -> Iterator[Path]:
    """Make a new empty file in ``folder``; it is gone at the end unless it was renamed."""
    scratch = folder / f".bem-{secrets.token_hex(8)}.part"
    os.close(os.open(scratch, os.O_WRONLY | os.O_CREAT | os.O_EXCL, 0o666))
    try:
        yield scratch
    finally:
        with contextlib.suppress(FileNotFoundError):
            os.unlink(scratch)


def _sync_folder(folder: Path) -> None:
    """Make the new name survive a loss of power, where the system offers it."""
    with contextlib.suppress(OSError):
        handle = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(handle)
        finally:
            os.close(handle)
