"""The scene in lengths of its own size, so that no power of a coordinate under- or overflows."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from bem.geometry.folding import folded
from bem.geometry.layer_cut import cut_in_layers
from bem.geometry.parts import Part
from bem.geometry.planes import Planes
from bem.geometry.surface import Surface
from bem.scene.layering import planes_of
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
        planes: grounded and mirror planes, and flat layers.
        parts: of all surfaces, by what lies on both sides; empty without dielectrics.
        permittivity: (r,) of each region over that of the surroundings, which come first.
        coincidence: faces closer than this coincide.
        notes: contacts and overlaps of bodies, one line each.
    """

    surfaces: list[Surface]
    length: float
    center: np.ndarray
    farad: float
    planes: Planes
    parts: tuple[Part, ...]
    permittivity: np.ndarray
    coincidence: float
    notes: tuple[str, ...]

    @classmethod
    def of(cls, scene: Scene, like: ScaledScene | None = None) -> ScaledScene:
        """Scale a scene, to its own size and center or to those of another."""
        length, center = _frame(scene) if like is None else (like.length, like.center)
        matrix = np.eye(3) / length
        planes = planes_of(scene).moved(1.0 / length, center)
        surfaces = [
            folded(c.surface.placed(matrix, -center / length), planes, c.body == "solid")
            for c in scene.conductors
        ]
        if planes.layers is not None:
            surfaces = [cut_in_layers(surface, planes.layers) for surface in surfaces]
        farad = 4.0 * np.pi * EPS0 * scene.relative_permittivity * length
        parts, notes = _partition(scene, (matrix, -center / length), planes)
        if planes.layers is not None:
            cut = [cut_in_layers(part.surface, planes.layers) for part in parts]
            parts = tuple(replace(p, surface=s) for p, s in zip(parts, cut, strict=True))
        media = [scene.relative_permittivity, *(d.relative_permittivity for d in scene.dielectrics)]
        return cls(
            surfaces,
            length,
            center,
            farad * planes.multiplicity,
            planes,
            parts,
            np.array(media) / scene.relative_permittivity,
            scene.coincidence,
            notes,
        )


def _partition(
    scene: Scene, move: tuple[np.ndarray, np.ndarray], planes: Planes
) -> tuple[tuple[Part, ...], tuple[str, ...]]:
    """Parts of all surfaces, and notes; none without dielectrics.

    Bodies on the far side of a mirror plane are reflected first; those that it cuts take part
    as a whole, and their parts are cut afterwards.

    Args:
        scene: in metres.
        move: matrix and shift, x -> matrix @ x + shift, to scaled units.
        planes: in these.

    Raises:
        GeometryError: a dielectric is not closed.
    """
    if not scene.dielectrics:
        return (), ()
    from bem.geometry.part_folding import folded_parts
    from bem.geometry.regions.parted import parted
    from bem.scene.regions import solids_of

    solids = [replace(s, surface=s.surface.placed(*move)) for s in solids_of(scene)]
    found = parted(solids, scene.coincidence)
    return tuple(folded_parts(found.parts, planes, scene.coincidence)), tuple(found.notes)


def _frame(scene: Scene) -> tuple[float, np.ndarray]:
    """Largest side and center (3,) of the bounding box of all bodies."""
    bounds = np.array([body.surface.bounds for body in scene.bodies])
    low, high = bounds[:, 0].min(axis=0), bounds[:, 1].max(axis=0)
    return float((high - low).max()), 0.5 * (low + high)
