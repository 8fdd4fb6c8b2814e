"""Surfaces: the faces of one body as they were read or made, in metres.

A surface says nothing about physics. Faces are triangles or planar quadrilaterals;
their orientation carries no meaning for a conductor.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from bem.geometry.revolved import Revolution

CREASE_DEGREES = 40.0
"""Edges that turn by more are sharp unless the user says otherwise."""
NO_CORNER = -1
"""Stands in the fourth column of a triangle's row of ``Surface.faces``."""


@dataclass(frozen=True)
class Surface:
    """Faces of one body.

    Args:
        vertices: (v, 3) float64, metres.
        faces: (f, 4) int64 indices into ``vertices``; a triangle has -1 last.
        curve: the true surface that the faces approximate, for shapes that have one.
        rounding: how far a vertex may lie from where it was drawn because its file holds
            rounded numbers, metres.
        smooth: whether the facets stand for a smooth surface: True refines onto one fitted to
            them, False takes them for the shape, None takes them and doubts it.
        crease: edges that turn by more than this stay sharp, radians.
    """

    vertices: np.ndarray
    faces: np.ndarray
    curve: Revolution | None = None
    rounding: float = 0.0
    smooth: bool | None = None
    crease: float = math.radians(CREASE_DEGREES)

    @property
    def is_triangle(self) -> np.ndarray:
        """(f,) bool: which faces have three corners."""
        return self.faces[:, 3] == NO_CORNER

    @property
    def triangles(self) -> np.ndarray:
        """(t, 3) int64: all faces as triangles, a quadrilateral as two of them.

        Triangles of the original faces come first, then the first and the second
        halves of the quadrilaterals.
        """
        tri = self.is_triangle
        quads = self.faces[~tri]
        return np.concatenate([self.faces[tri][:, :3], quads[:, [0, 1, 2]], quads[:, [0, 2, 3]]])

    @property
    def bounds(self) -> np.ndarray:
        """(2, 3): lowest and highest coordinates of the vertices in use, metres."""
        used = self.vertices[np.unique(self.faces[self.faces >= 0])]
        return np.array([used.min(axis=0), used.max(axis=0)])

    @property
    def extent(self) -> float:
        """Length of the diagonal of the bounding box, metres."""
        low, high = self.bounds
        return float(np.linalg.norm(high - low))

    def placed(self, matrix: np.ndarray, shift: np.ndarray) -> Surface:
        """The surface with every point x moved to ``matrix @ x + shift``.

        Args:
            matrix: (3, 3), a rotation times a positive scale.
            shift: (3,), metres.
        """
        return replace(
            self,
            rounding=self.rounding * float(np.cbrt(abs(np.linalg.det(matrix)))),
            vertices=self.vertices @ np.asarray(matrix).T + np.asarray(shift),
            curve=None if self.curve is None else self.curve.placed(matrix, shift),
        )
