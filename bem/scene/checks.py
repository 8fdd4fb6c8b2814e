"""Checks of single values in a scene; each message names the entry, what was found, the limit."""

from __future__ import annotations

import difflib
import math
from collections.abc import Iterable
from typing import Any

from bem.errors import InputError
from bem.geometry.wording import listed, shown


def refuse(where: str, found: Any, needs: str) -> InputError:
    """Make the error for a value that does not fit."""
    return InputError(f"{where}: found {shown(found)}, needs {needs}")


def number(where: str, value: Any) -> float:
    """Return a finite number as float.

    Raises:
        InputError: it is none.
    """
    if isinstance(value, bool) or not hasattr(value, "__float__"):
        raise refuse(where, value, "a number")
    if not math.isfinite(float(value)):
        raise refuse(where, str(value), "a finite number")
    return float(value)


def positive(where: str, value: Any) -> float:
    """Return a positive finite number as float.

    Raises:
        InputError: it is none.
    """
    if number(where, value) <= 0.0:
        raise refuse(where, value, "a number above 0")
    return float(value)


def not_negative(where: str, value: Any) -> float:
    """Return a finite number of 0 or more as float.

    Raises:
        InputError: it is none.
    """
    if number(where, value) < 0.0:
        raise refuse(where, value, "a number of 0 or more")
    return float(value)


def within(where: str, value: Any, low: float, high: float) -> float:
    """Return a number between two limits as float.

    Raises:
        InputError: it is none.
    """
    if not low <= number(where, value) <= high:
        raise refuse(where, value, f"a number from {low:g} to {high:g}")
    return float(value)


def flag(where: str, value: Any) -> bool:
    """Return true or false.

    Raises:
        InputError: it is neither.
    """
    if not isinstance(value, bool):
        raise refuse(where, value, "true or false")
    return value


def triple(where: str, value: Any) -> tuple[float, float, float]:
    """Return three finite numbers.

    Raises:
        InputError: they are not.
    """
    try:
        items = None if isinstance(value, str | dict) else list(value)
    except TypeError:
        items = None
    if items is None or len(items) != 3:
        raise refuse(where, value, "three numbers")
    x, y, z = (number(f"{where}[{i}]", item) for i, item in enumerate(items))
    return x, y, z


def text(where: str, value: Any) -> str:
    """Return printable text that is not blank.

    Raises:
        InputError: it is none.
    """
    if not isinstance(value, str) or not value.strip():
        raise refuse(where, value, "text that is not blank")
    if not value.isprintable():
        raise refuse(where, value, "printable text on one line")
    return value


def one_of(where: str, value: Any, allowed: tuple[Any, ...]) -> Any:
    """Return one of the allowed words or values.

    Raises:
        InputError: it is none; the message lists those allowed.
    """
    if value not in allowed:
        raise InputError(f"{where}: found {shown(value)}; allowed are {listed(allowed)}")
    return value


def table(where: str, value: Any, known: tuple[str, ...]) -> dict[str, Any]:
    """Return a table whose keys are all known.

    Args:
        where: the entry, "" for the whole file.
        value: what was found there.
        known: the keys allowed.

    Raises:
        InputError: no table, or an unknown key; the message suggests the nearest one.
    """
    if not isinstance(value, dict):
        raise refuse(where, value, f"a table with {' and '.join(known)}")
    for key in value:
        if key not in known:
            start = f"{where}: " if where else ""
            raise InputError(f"{start}unknown key {shown(key)}{near(key, known)}")
    return value


def near(key: str, known: Iterable[str]) -> str:
    """End of a message about an unknown word: the nearest known one, and all of them."""
    found = difflib.get_close_matches(key.lower(), known, n=1, cutoff=0.5)
    hint = f"; did you mean {shown(found[0])}?" if found else ";"
    return f"{hint} known are {', '.join(known)}"
