"""Names on screens: no control characters, known width, shortened in the middle."""

from __future__ import annotations

import unicodedata

_WIDE = "WF"
_GAP = ".."


def shown(text: str, width: int | None = None) -> str:
    """``text`` safe to print on one line, at most ``width`` columns wide.

    Names that differ often differ at their end, so the middle gives way.
    """
    safe = "".join(char if char.isprintable() else _escaped(char) for char in text)
    if width is None or columns(safe) <= width:
        return safe
    head = _fitting(safe, (width - len(_GAP) + 1) // 2)
    tail = _fitting(safe[::-1], (width - len(_GAP)) // 2)[::-1]
    return head + _GAP + tail


def columns(text: str) -> int:
    """How many columns ``text`` takes in a terminal."""
    return sum(_columns_of(char) for char in text)


def padded(text: str, width: int) -> str:
    """``text`` followed by blanks up to ``width`` columns."""
    return text + " " * (width - columns(text))


def _columns_of(char: str) -> int:
    if unicodedata.combining(char):
        return 0
    return 2 if unicodedata.east_asian_width(char) in _WIDE else 1


def _escaped(char: str) -> str:
    return char.encode("unicode_escape").decode("ascii")


def _fitting(text: str, width: int) -> str:
    used = 0
    for index, char in enumerate(text):
        used += _columns_of(char)
        if used > width:
            return text[:index]
    return text
