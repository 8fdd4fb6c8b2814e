"""Printing that survives closed pipes and screens without plus-minus signs."""

from __future__ import annotations

import os
import sys
from typing import TextIO

from bem.errors import InputError


def put(text: str) -> None:
    """Print a block on standard output; a reader that has gone away (| head) is no fault.

    Raises:
        InputError: standard output cannot be written, for example because the disk is full.
    """
    if sys.stdout is None:
        return
    try:
        sys.stdout.write(showable(text, sys.stdout) + "\n")
        sys.stdout.flush()
    except BrokenPipeError:
        silence_stdout()
    except OSError as error:
        silence_stdout()
        raise InputError(f"cannot write to standard output: {error.strerror}") from error


def tell(text: str) -> None:
    """Print one line on standard error, if there is one."""
    if sys.stderr is None:
        return
    try:
        sys.stderr.write(showable(text, sys.stderr) + "\n")
        sys.stderr.flush()
    except OSError:
        return


def showable(text: str, stream: TextIO) -> str:
    """``text`` with what the stream's encoding lacks written as escapes."""
    encoding = _encoding(stream)
    return text.encode(encoding, "backslashreplace").decode(encoding)


def can_show(text: str, stream: TextIO | None) -> bool:
    """Whether the stream's encoding has every character of ``text``."""
    if stream is None:
        return True
    try:
        text.encode(_encoding(stream))
    except UnicodeEncodeError:
        return False
    return True


def silence_stdout() -> None:
    """Send what is still buffered nowhere, so that the interpreter's exit stays quiet."""
    nowhere = os.open(os.devnull, os.O_WRONLY)
    os.dup2(nowhere, sys.stdout.fileno())
    os.close(nowhere)


def _encoding(stream: TextIO) -> str:
    return getattr(stream, "encoding", None) or "utf-8"
