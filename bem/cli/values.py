"""Values of options: text as typed in, checked numbers out."""

from __future__ import annotations

import math
import re
from collections.abc import Callable

from bem.cli.parser import nearest
from bem.errors import UsageError

_BYTES = {
    "B": 1,
    **{name: 1000 ** (k + 1) for k, name in enumerate(["kB", "MB", "GB", "TB"])},
    **{name: 1024 ** (k + 1) for k, name in enumerate(["KiB", "MiB", "GiB", "TiB"])},
}
_HERTZ = {"": 1.0, "hz": 1.0, "khz": 1e3, "mhz": 1e6, "ghz": 1e9}
_BYTES_OF = {name.lower(): size for name, size in _BYTES.items()}
_AMOUNT = re.compile(r"\s*([0-9.eE+-]*[0-9.])\s*([A-Za-z]*)\s*")


def fraction(option: str) -> Callable[[str], float]:
    """Reader of a fraction between 0 and 1, written 0.01 or 1%."""

    def read(text: str) -> float:
        number, percent, rest = text.strip().partition("%")
        value = _number(number) / (100.0 if percent else 1.0)
        if rest or not 0.0 < value < 1.0:
            raise UsageError(
                f"{option}: found {text!r}; give a fraction above 0 and below 1, "
                "such as 0.001 or 0.1%"
            )
        return value

    return read


def count(option: str) -> Callable[[str], int]:
    """Reader of a whole number of at least 1."""

    def read(text: str) -> int:
        digits = text.strip().replace("_", "")
        if not (digits.isascii() and digits.isdigit() and 0 < len(digits) < 19 and int(digits)):
            raise UsageError(f"{option}: found {text!r}; give a whole number of 1 or more")
        return int(digits)

    return read


def frequency(option: str) -> Callable[[str], float]:
    """Reader of a frequency in Hz, written 50, 50Hz, 1.5kHz, 1MHz or 2.4GHz."""

    def read(text: str) -> float:
        found = _AMOUNT.fullmatch(text)
        scale = _HERTZ.get(found[2].lower()) if found else None
        value = _number(found[1]) * scale if found and scale else math.nan
        if not 0.0 < value < math.inf:
            raise UsageError(
                f"{option}: found {text!r}; give a frequency above 0, such as 50Hz, 10kHz or 1MHz"
            )
        return value

    return read


def positive(option: str) -> Callable[[str], float]:
    """Reader of a finite number above 0."""

    def read(text: str) -> float:
        value = _number(text)
        if not 0.0 < value < math.inf:
            raise UsageError(f"{option}: found {text!r}; give a number above 0, such as 2.1")
        return value

    return read


def memory(option: str) -> Callable[[str], int]:
    """Reader of an amount of memory with its unit, in bytes."""

    def read(text: str) -> int:
        match = _AMOUNT.fullmatch(text)
        amount, unit = match.groups() if match else ("", "")
        size = _number(amount) * _BYTES_OF.get(unit.lower(), math.nan)
        if not 1.0 <= size < math.inf:
            hint = nearest(unit, list(_BYTES)) if unit and unit.lower() not in _BYTES_OF else ""
            raise UsageError(
                f"{option}: found {text!r}{hint}; give a number and a unit, such as 8GB; "
                f"the units are {', '.join(_BYTES)}"
            )
        return int(size)

    return read


def _number(text: str) -> float:
    """Return the number in ``text``, or NaN, which fails every comparison."""
    try:
        return float(text)
    except ValueError:
        return math.nan
