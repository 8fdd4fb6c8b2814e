"""Where a body goes: scaled first, then turned about the origin, then shifted."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np

from bem.errors import InputError
from bem.scene import checks

_QUARTERS = {0.0: (1.0, 0.0), 90.0: (0.0, 1.0), 180.0: (-1.0, 0.0), 270.0: (0.0, -1.0)}


@dataclass(frozen=True)
class Place:
    """Where a body goes: scaled first, then turned about the origin, then shifted.

    Args:
        shift: three lengths in the scene's unit.
        turn_axis: direction of the axis through the origin, any length.
        turn_degrees: right-handed angle in degrees.
        scale: positive factor.
    """

    shift: tuple[float, float, float] = (0.0, 0.0, 0.0)
    turn_axis: tuple[float, float, float] = (0.0, 0.0, 1.0)
    turn_degrees: float = 0.0
    scale: float = 1.0

    def checked(self, where: str) -> Place:
        """Return the place with its values as floats.

        Args:
            where: entry that messages name, such as 'conductor 1 ("rod"): place'.

        Raises:
            InputError: a value is not finite, the scale not positive, or the axis zero.
        """
        axis = checks.triple(f"{where}.turn.axis", self.turn_axis)
        if not any(axis):
            raise checks.refuse(f"{where}.turn.axis", self.turn_axis, "a direction other than zero")
        return Place(
            shift=checks.triple(f"{where}.shift", self.shift),
            turn_axis=axis,
            turn_degrees=checks.number(f"{where}.turn.degrees", self.turn_degrees),
            scale=checks.positive(f"{where}.scale", self.scale),
        )

    @property
    def matrix(self) -> np.ndarray:
        """Scale times rotation, (3, 3)."""
        return self.scale * rotation(self.turn_axis, self.turn_degrees)


def place_or_refuse(where: str, value: Any) -> Place:
    """Return a checked ``Place``, the default one for None.

    Raises:
        InputError: it is none, or one of its values does not fit.
    """
    if value is None:
        return Place()
    if not isinstance(value, Place):
        raise checks.refuse(where, value, "a Place")
    return value.checked(where)


def place_of(where: str, value: Any) -> Place:
    """Place of a table of a scene file; its numbers are checked where it is used.

    Raises:
        InputError: no such table, or a key is unknown or missing.
    """
    entries = checks.table(where, value, ("shift", "turn", "scale"))
    given: dict[str, Any] = {key: entries[key] for key in ("shift", "scale") if key in entries}
    if "turn" in entries:
        turn = checks.table(f"{where}.turn", entries["turn"], ("axis", "degrees"))
        for key in ("axis", "degrees"):
            if key not in turn:
                raise InputError(f"{where}.turn.{key}: missing")
        given |= {"turn_axis": turn["axis"], "turn_degrees": turn["degrees"]}
    return Place(**given)


def rotation(axis: tuple[float, float, float], degrees: float) -> np.ndarray:
    """Rotation matrix (3, 3) about ``axis`` (Rodrigues 1840), exact for quarter turns.

    Args:
        axis: direction, any length but zero.
        degrees: right-handed angle.
    """
    direction = np.asarray(axis, dtype=float) / np.abs(axis).max()
    x, y, z = direction / np.linalg.norm(direction)
    turn = degrees % 360.0
    angle = math.radians(turn)
    cos, sin = _QUARTERS.get(turn, (math.cos(angle), math.sin(angle)))
    across = np.array([[0.0, -z, y], [z, 0.0, -x], [-y, x, 0.0]])
    along = np.outer([x, y, z], [x, y, z])
    return cos * np.eye(3) + sin * across + (1.0 - cos) * along
