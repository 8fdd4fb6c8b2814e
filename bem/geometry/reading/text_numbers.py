"""Numbers out of the words of a text file."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from bem.errors import InputError


def numbers(words: Sequence[bytes], kind: type, kind_of_file: str) -> np.ndarray:
    """Words as an array of float or int.

    Raises:
        InputError: a word is no such number; the message shows it.
    """
    try:
        return np.array(words, dtype="S").astype(np.dtype(kind))
    except (ValueError, OverflowError):
        bad = next((word for word in words if not _is(word, kind)), b"?")
        shown = bad[:30].decode("ascii", "replace")
        raise InputError(
            f"cannot be read as {kind_of_file}: found {shown!r} where a number belongs; "
            "export it again"
        ) from None


def _is(word: bytes, kind: type) -> bool:
    try:
        kind(word)
    except ValueError:
        return False
    return True
