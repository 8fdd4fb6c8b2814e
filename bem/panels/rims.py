"""Free rims of facets that stand for curves, and the panels that lie on them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from bem.geometry.fit.fit import Fit
from bem.geometry.flat_faces import FLATNESS

BLOCK = 256
"""Sides of panels that are compared with all stretches of a rim at once."""


@dataclass(frozen=True)
class Rims:
    """Straight stretches of the free rims of one part.

    Args:
        part: its index.
        ends: (m, 2, 3) of each stretch.
        sagitta: (m,) mean distance of the curve from each, away from the facet.
        tolerance: a point this near to a stretch lies on it.
    """

    part: int
    ends: np.ndarray
    sagitta: np.ndarray
    tolerance: float

    @classmethod
    def of(cls, fit: Fit, part: int) -> Rims:
        """Stretches of a fit's rims that are bent."""
        facet, side = np.nonzero(fit.rim_sagitta)
        corners = fit.facets.corners[facet]
        rows = np.arange(len(facet))
        ends = np.stack([corners[rows, side], corners[rows, (side + 1) % 3]], axis=1)
        points, sagitta = fit.facets.points[ends], fit.rim_sagitta[facet, side]
        return cls(part, points, sagitta, 10.0 * FLATNESS * fit.size)

    def beyond(self, corners: np.ndarray) -> np.ndarray:
        """(n, 4) sagitta of the stretch on which each side of panels (n, 4, 3) lies, or 0."""
        middle = (0.5 * (corners + np.roll(corners, -1, axis=1))).reshape(-1, 3)
        found = np.zeros(len(middle))
        if len(self.ends):
            for start in range(0, len(middle), BLOCK):
                found[start : start + BLOCK] = self._at(middle[start : start + BLOCK])
        real = np.linalg.norm(np.roll(corners, -1, axis=1) - corners, axis=2) > self.tolerance
        return np.where(real, found.reshape(-1, 4), 0.0)

    def _at(self, points: np.ndarray) -> np.ndarray:
        start, step = self.ends[:, 0], self.ends[:, 1] - self.ends[:, 0]
        way = points[:, None] - start
        part = np.einsum("nmi,mi->nm", way, step) / np.einsum("mi,mi->m", step, step)
        off = np.linalg.norm(way - np.clip(part, 0.0, 1.0)[:, :, None] * step, axis=2)
        nearest = off.argmin(axis=1)
        on = off[np.arange(len(points)), nearest] <= self.tolerance
        return np.where(on, self.sagitta[nearest], 0.0)
