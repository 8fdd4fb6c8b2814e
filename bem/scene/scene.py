"""What the user describes: named conductors and the medium around them."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path

import numpy as np

from bem.geometry.surface import Surface


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


@dataclass(frozen=True)
class Source:
    """Where a conductor's surface came from, for the record.

    Args:
        file: file name as given, or None for a shape made in Python.
        sha256: hex digest of the file's bytes, or None.
        unit: unit of the numbers in the file.
        part: named portion of the file, or None for all of it.
        changes: what reading changed, one line each (welded vertices, dropped faces, ...).
    """

    file: str | None
    sha256: str | None
    unit: str
    part: str | None = None
    changes: tuple[str, ...] = ()


@dataclass(frozen=True)
class Conductor:
    """One named conductor in metres, placed.

    Args:
        name: unique in its scene.
        surface: faces in metres.
        body: "solid" (a closed mesh is solid metal) or "shell" (only its faces are metal).
        source: where the surface came from.
    """

    name: str
    surface: Surface
    body: str
    source: Source


@dataclass
class Scene:
    """Conductors in one homogeneous medium.

    Args:
        unit: unit of every length that the scene is given; required.
        relative_permittivity: of the surroundings.
    """

    unit: str
    relative_permittivity: float = 1.0
    conductors: list[Conductor] = field(default_factory=list)

    def add_conductor(
        self,
        name: str,
        shape: Surface | None = None,
        *,
        mesh: str | Path | None = None,
        part: str | None = None,
        place: Place | None = None,
        body: str = "solid",
    ) -> Scene:
        """Add a conductor from a shape or a mesh file; returns the scene itself."""
        raise NotImplementedError


def rotation(axis: tuple[float, float, float], degrees: float) -> np.ndarray:
    """Rotation matrix (3, 3) about ``axis`` (Rodrigues 1840)."""
    raise NotImplementedError
