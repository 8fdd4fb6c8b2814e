"""Arguments of shapes, checked at the door; each message starts with the argument's name."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from bem.errors import UsageError


def number(name: str, value: float) -> float:
    """Return a finite number as float.

    Raises:
        UsageError: it is none.
    """
    try:
        found = math.nan if isinstance(value, bool) else float(value)
    except (TypeError, ValueError):
        found = math.nan
    if not math.isfinite(found):
        raise UsageError(f"{name}: found {value!r}; give a finite number")
    return found


def length(name: str, value: float) -> float:
    """Return a positive finite number as float.

    Raises:
        UsageError: it is none.
    """
    size = number(name, value)
    if size <= 0.0:
        raise UsageError(f"{name}: found {value!r}; a length must be positive and finite")
    return size


def increasing(low: str, small: float, high: str, large: float) -> tuple[float, float]:
    """Return two lengths, the first below the second.

    Raises:
        UsageError: they are not.
    """
    small, large = length(low, small), length(high, large)
    if small >= large:
        raise UsageError(f"{low}: found {small!r}; it must be below {high}, which is {large!r}")
    return small, large


def numbers(name: str, value: Sequence[float]) -> list[float]:
    """Return a sequence of finite numbers as a list.

    Raises:
        UsageError: it is none.
    """
    if isinstance(value, str | dict) or not hasattr(value, "__iter__"):
        raise UsageError(f"{name}: found {value!r}; give its coordinates as a tuple of numbers")
    return [number(name, x) for x in value]


def point(name: str, value: Sequence[float], axes: tuple[str, ...] = ("x", "y", "z")) -> np.ndarray:
    """Return as many finite numbers as there are axes, (2,) or (3,).

    Raises:
        UsageError: they are not.
    """
    found = numbers(name, value)
    if len(found) != len(axes):
        how_many = {2: "two", 3: "three"}[len(axes)]
        raise UsageError(f"{name}: found {value!r}; give {how_many} numbers ({', '.join(axes)})")
    return np.array(found)


def facets(name: str, value: int, least: int = 3) -> int:
    """Return a whole number of facets.

    Raises:
        UsageError: it is none, or below ``least``.
    """
    if not isinstance(value, int) or isinstance(value, bool) or value < least:
        raise UsageError(f"{name}: found {value!r}; give a whole number of facets, {least} or more")
    return value
