"""Infinite flat layers of different permittivity, with or without grounded planes at the ends."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

ON_PLANE = 1e-9
"""A point nearer to a plane than this part of its largest coordinate lies in the plane."""


@dataclass(frozen=True)
class Layers:
    """Layers from the lowest to the highest, the outermost of them half-spaces.

    Args:
        axis: 0, 1 or 2, normal to all planes.
        planes: (p,) ascending coordinates of the planes between layers.
        permittivity: (p + 1,) of the layers, over that of the surroundings; behind a grounded
            plane it has no meaning.
        grounded_below: whether the lowest plane is at potential zero.
        grounded_above: whether the highest plane is.
    """

    axis: int
    planes: tuple[float, ...]
    permittivity: tuple[float, ...]
    grounded_below: bool = False
    grounded_above: bool = False

    @property
    def count(self) -> int:
        """Number of layers, those behind grounded planes among them."""
        return len(self.permittivity)

    @property
    def grounded(self) -> tuple[float, ...]:
        """Coordinates of the planes at potential zero."""
        below = self.planes[:1] if self.grounded_below else ()
        return below + (self.planes[-1:] if self.grounded_above else ())

    @property
    def between(self) -> tuple[float, ...]:
        """Coordinates of the planes between two dielectrics."""
        last = len(self.planes) - (1 if self.grounded_above else 0)
        return self.planes[1 if self.grounded_below else 0 : last]

    def ends(self, layer: int) -> tuple[float, float]:
        """Coordinates of the planes below and above a layer, infinite where there is none."""
        ends = (-np.inf, *self.planes, np.inf)
        return float(ends[layer]), float(ends[layer + 1])

    def cut(self, bounds: np.ndarray) -> bool:
        """Whether a plane between layers runs through a box, bounds (2, 3)."""
        low, high = np.asarray(bounds)[:, self.axis]
        return any(low < plane < high for plane in self.between)

    def crossed(self, corners: np.ndarray, tolerance: float) -> np.ndarray:
        """(n,) whether a plane between layers runs through panels (n, m, 3)."""
        at = np.asarray(corners)[..., self.axis]
        low, high = at.min(axis=1) + tolerance, at.max(axis=1) - tolerance
        found = np.zeros(len(at), dtype=bool)
        for plane in self.between:
            found |= (low < plane) & (plane < high)
        return found

    def layer_of(self, points: np.ndarray) -> np.ndarray:
        """(n,) layer of points (n, 3); one in a plane counts to the outermost of both layers.

        A half-space has fewer images than a layer between two planes.
        """
        at = np.asarray(points)[:, self.axis]
        layer = np.searchsorted(self.planes, at, side="right")
        tolerance = ON_PLANE * np.abs(points).max(initial=0.0)
        for k, plane in enumerate(self.planes):
            outer = 0 if k == 0 and not self.grounded_below else k + 1
            if k + 1 == self.count - 1 and self.grounded_above:
                outer = k
            layer[np.abs(at - plane) <= tolerance] = outer
        return layer

    def moved(self, scale: float, center: np.ndarray) -> Layers:
        """The layers after every point x goes to ``scale * (x - center)``."""
        shift = float(center[self.axis])
        planes = tuple(scale * (plane - shift) for plane in self.planes)
        return Layers(
            self.axis, planes, self.permittivity, self.grounded_below, self.grounded_above
        )
