"""Triangles of other bodies that lie in the plane of a face: what they cover, and their rims."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from bem.geometry.flat_faces import sides_of
from bem.geometry.regions.arrange import covered_by
from bem.geometry.regions.facets import Facets
from bem.geometry.regions.scraps import BEFORE, BEHIND, LIES_ON, Touch
from bem.geometry.regions.traces import Frame

CHUNK = 256
"""Points whose triangles are looked up at a time."""


@dataclass(frozen=True, eq=False)
class Cover:
    """Triangles in a plane.

    Args:
        bodies: all bodies.
        touch: which of their triangles lie in the plane.
        frame: of the plane.
    """

    bodies: list[Facets]
    touch: Touch
    frame: Frame

    @cached_property
    def _corners(self) -> np.ndarray:
        return self.frame.local(self._of("corners").reshape(-1, 3, 3))[..., :2]

    @cached_property
    def _flags(self) -> np.ndarray:
        ahead = self._of("normals").reshape(-1, 3) @ self.frame.axes[2] > 0.0
        inner = np.where(ahead, BEHIND, BEFORE)
        return LIES_ON | np.where(self._of("closed").astype(bool), inner, 0)

    def _of(self, name: str) -> np.ndarray:
        """What the bodies tell about each triangle."""
        pairs = zip(*self.touch, strict=True)
        return np.array([getattr(self.bodies[body], name)[k] for body, k in pairs])

    def rims(self) -> np.ndarray:
        """Segments (s, 2, 2) around what each body covers."""
        rims = [np.empty((0, 2, 2))]
        for body in np.unique(self.touch.body):
            mine = self.touch.triangle[self.touch.body == body]
            sides = sides_of(self.bodies[body].triangles[mine][:, [0, 1, 2, 2]])
            rim = sides.pairs[sides.count[sides.group] % 2 == 1]
            rims.append(self.frame.local(self.bodies[body].vertices[rim])[..., :2])
        return np.concatenate(rims)

    def flags(self, points: np.ndarray, margin: float) -> np.ndarray:
        """What each body is to points (n, 2) of the plane, (n, bodies)."""
        flags = np.zeros((len(points), len(self.bodies)), dtype=np.int64)
        for start in range(0, len(points), CHUNK):
            covered = covered_by(points[start : start + CHUNK], self._corners, margin)
            at, by = np.nonzero(covered)
            np.bitwise_or.at(flags, (start + at, self.touch.body[by]), self._flags[by])
        return flags
