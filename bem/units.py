"""Units at the door: lengths come in as stated by the user, SI is used inside."""

from __future__ import annotations

import difflib
import math

from bem.errors import UsageError

EPS0 = 8.8541878188e-12
"""Electric constant in F/m (CODATA 2022)."""

METRES_PER = {
    "m": 1.0,
    "cm": 1e-2,
    "mm": 1e-3,
    "um": 1e-6,
    "nm": 1e-9,
    "in": 0.0254,
    "mil": 2.54e-5,
}
"""Length units that scenes and commands accept, in metres."""

_FARAD_STEPS = [("aF", 1e-18), ("fF", 1e-15), ("pF", 1e-12), ("nF", 1e-9), ("uF", 1e-6), ("F", 1.0)]
_SIEMENS_STEPS = [
    *(("aS", 1e-18), ("fS", 1e-15), ("pS", 1e-12), ("nS", 1e-9)),
    *(("uS", 1e-6), ("mS", 1e-3), ("S", 1.0)),
]
_METRE_STEPS = [("nm", 1e-9), ("um", 1e-6), ("mm", 1e-3), ("m", 1.0), ("km", 1e3)]


def metres_per(unit: str) -> float:
    """Length of one ``unit`` in metres.

    Raises:
        UsageError: the unit is unknown; the message lists those allowed.
    """
    if unit in METRES_PER:
        return METRES_PER[unit]
    near = difflib.get_close_matches(str(unit).lower(), METRES_PER, n=1, cutoff=0.5)
    hint = f" (did you mean {near[0]!r}?)" if near else ""
    raise UsageError(f"unit: found {unit!r}{hint}; allowed are {', '.join(METRES_PER)}")


def _step(value: float, steps: list[tuple[str, float]]) -> tuple[str, float]:
    size = abs(value)
    if not math.isfinite(size) or size == 0.0:
        return steps[-1]
    chosen = steps[0]
    for name, scale in steps:
        if size >= scale:
            chosen = (name, scale)
    return chosen


def siemens_unit(value: float) -> tuple[str, float]:
    """Name and size in siemens of a unit that shows ``value`` (siemens) as 1 to 1000 or so."""
    return _step(value, _SIEMENS_STEPS)


def farad_unit(value: float) -> tuple[str, float]:
    """Name and size in farad of a unit that shows ``value`` (farad) as 1 to 1000 or so."""
    return _step(value, _FARAD_STEPS)


def metre_unit(value: float) -> tuple[str, float]:
    """Name and size in metres of a unit that shows ``value`` (metres) as 1 to 1000 or so."""
    return _step(value, _METRE_STEPS)
