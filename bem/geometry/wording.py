"""Numbers and names as lines for the user show them."""

from __future__ import annotations

import json
from collections.abc import Iterable
from typing import Any

from bem.units import metre_unit


def metre_text(value: float) -> str:
    """Length in metres with the unit that suits it, as in "2.5 mm"."""
    if value == 0.0:
        return "0 m"
    name, size = metre_unit(value)
    return f"{value / size:.4g} {name}"


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
