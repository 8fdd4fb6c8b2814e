"""The scene in lengths of its own size, so that no power of a coordinate under- or overflows."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from bem.geometry.folding import folded
from bem.geometry.planes import Planes
from bem.geometry.surface import Surface
from bem.scene.scene import Scene
from bem.units import EPS0


@dataclass(frozen=True)
class ScaledScene:
    """Surfaces in units of ``length``, centred.

    Args:
        surfaces: one per conductor, what is left of it on the kept side of mirror planes.
        length: metres per unit, the largest side of the scene's bounding box.
        center: (3,) m, what was subtracted first.
        farad: capacitance in farad of one unit of L = C / (4 pi eps), mirror images included.
        planes: grounded and mirror planes.
    """

    surfaces: list[Surface]
    length: float
    center: np.ndarray
    farad: float
    planes: Planes

    @classmethod
    def of(cls, scene: Scene, like: ScaledScene | None = None) -> ScaledScene:
        """Scale a scene, to its own size and center or to those of another."""
        length, center = _frame(scene) if like is None else (like.length, like.center)
        matrix = np.eye(3) / length
        planes = scene.planes.moved(1.0 / length, center)
        surfaces = [
            folded(c.surface.placed(matrix, -center / length), planes, c.body == "solid")
            for c in scene.conductors
        ]
        farad = 4.0 * np.pi * EPS0 * scene.relative_permittivity * length
        return cls(surfaces, length, center, farad * planes.multiplicity, planes)


def _frame(scene: Scene) -> tuple[float, np.ndarray]:
    """Largest side and center (3,) of the bounding box of all conductors."""
    bounds = np.array([c.surface.bounds for c in scene.conductors])
    low, high = bounds[:, 0].min(axis=0), bounds[:, 1].max(axis=0)
    return float((high - low).max()), 0.5 * (low + high)
