"""Numbers and names as lines for the user show them."""

from __future__ import annotations

import difflib
import json
from collections.abc import Iterable, Sequence
from typing import Any

from bem.units import metre_unit, metres_per

_MOST_NAMES = 12


def metre_text(value: float) -> str:
    """Length in metres with the unit that suits it, as in "2.5 mm"."""
    if value == 0.0:
        return "0 m"
    name, size = metre_unit(value)
    return f"{value / size:.4g} {name}"


def point_text(point: Iterable[float], unit: str) -> str:
    """Point given in metres in another unit, as in "(1, 2.5, 0) mm"."""
    numbers = (f"{(x + 0.0) / metres_per(unit):.6g}" for x in point)
    return f"({', '.join(numbers)}) {unit}"


def counted(number: int, thing: str, plural: str | None = None) -> str:
    """Write number and noun, as in "1 face" or "1,200 faces"."""
    return f"{number:,} {thing if number == 1 else plural or thing + 's'}"


def listed(names: Iterable[str]) -> str:
    """Names in quotes with commas between them, as in '"rod", "plate"'."""
    return ", ".join(shown(name) for name in names)


def shown(value: Any) -> str:
    """Value on one line, cut to 60 characters, text in double quotes."""
    try:
        text = json.dumps(value, ensure_ascii=False)
    except (TypeError, ValueError):
        text = " ".join(repr(value).split())
    return text if len(text) <= 60 else text[:56] + " ..."


def unknown_name(name: str, known: Sequence[str]) -> str:
    """Words for a name that no conductor has, with the nearest and the first of those known."""
    near = difflib.get_close_matches(name, known, n=1, cutoff=0.5)
    hint = f" (did you mean {near[0]!r}?)" if near else ""
    names = ", ".join(repr(one) for one in known[:_MOST_NAMES])
    more = f" and {len(known) - _MOST_NAMES} more" if len(known) > _MOST_NAMES else ""
    return f"no conductor is named {name!r}{hint}; the conductors are {names}{more}"
