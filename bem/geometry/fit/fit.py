"""The smooth surface that the facets of a body seem to follow.

Facets whose edges turn by less than the crease angle are taken for samples of a smooth surface,
and each gets a cubic patch that runs through its corners, square to the normals there. Creases
stay where they are, flat faces stay flat. The sagitta of a facet is the mean distance between it
and its patch.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from bem.geometry.fit.edges import crease_tangents, edge_curves
from bem.geometry.fit.facets import Facets
from bem.geometry.fit.flats import rise_by_turns
from bem.geometry.fit.normals import normals_of
from bem.geometry.fit.patches import Piece, area_beyond, basis, control_net
from bem.geometry.flat_faces import FlatFaces
from bem.geometry.surface import Surface

FIT = 1.0 / 3.0
"""Distance between fit and truth, over the sagitta times the square of the turn between facets.

On spheres, cylinders and rings it is 0.05 to 0.09; on uneven facets of ellipsoids up to 0.3.
"""
EXPLAINED = 1.0
"""Height of a patch over its flat face that is believed, over width times turn of the face.

On regular facets it is below 0.5, on uneven ones of spheres and ellipsoids mostly below 0.6.
"""
_MIDDLES = np.array([[2, 2, 2], [3, 3, 0], [0, 3, 3], [3, 0, 3]]) / 6.0
NOTHING = 1e-9
"""A sagitta below this part of the body's size is none."""


@dataclass(frozen=True, eq=False)
class Fit:
    """Patches over the facets of one body.

    Args:
        facets: the triangles.
        net: (t, 10, 3) control points of each patch, as in ``fit_patches``.
        size: of the body.
    """

    facets: Facets
    net: np.ndarray
    size: float

    @classmethod
    def of(cls, faces: FlatFaces, crease: float, turned: bool = False) -> Fit:
        """Fit a smooth surface to the flat faces of one body.

        Args:
            faces: of the body.
            crease: a turn above this is sharp, radians.
            turned: the faces run the right way round already.
        """
        facets = Facets.of(faces, crease, turned)
        tangent = crease_tangents(facets, crease)
        curves = edge_curves(facets, normals_of(facets, crease, tangent), tangent)
        along = curves[facets.edge]
        back = facets.corners > np.roll(facets.corners, -1, axis=1)
        along[back] = along[back][:, ::-1]
        net = control_net(facets.points[facets.corners], along)
        return cls(facets, net, float(np.linalg.norm(np.ptp(faces.vertices, axis=0))))

    def placed(self, matrix: np.ndarray, shift: np.ndarray) -> Fit:
        """The same patches with every point x moved to ``matrix @ x + shift``."""
        normal = self.facets.normal @ np.linalg.inv(matrix)
        facets = replace(
            self.facets,
            points=self.facets.points @ matrix.T + shift,
            normal=normal / np.linalg.norm(normal, axis=1, keepdims=True),
        )
        size = self.size * float(np.cbrt(abs(np.linalg.det(matrix))))
        return Fit(facets, self.net @ matrix.T + shift, size)

    def pieces(self, facet: np.ndarray) -> Piece:
        """Patches (n,) over their whole facets."""
        corners = self.facets.points[self.facets.corners[facet]]
        return Piece(self.net[facet], np.broadcast_to(np.eye(3), (len(facet), 3, 3)), corners)

    @cached_property
    def sagitta(self) -> np.ndarray:
        """(g,) mean distance of the surface from each flat face, outward positive.

        The mean of a patch is that of its control points.
        """
        facets = self.facets
        corners = facets.points[facets.corners]
        height = np.einsum("ti,ti->t", self.net.mean(axis=1) - corners.mean(axis=1), facets.normal)
        total = np.bincount(facets.flat, facets.area * height, facets.flats)
        mean = total / np.bincount(facets.flat, facets.area, facets.flats)
        return np.where(np.abs(mean) > NOTHING * self.size, mean, 0.0)

    @cached_property
    def rim_sagitta(self) -> np.ndarray:
        """(t, 3) mean distance of the rim from each side of a facet that lies on a free one."""
        mean = np.zeros(self.facets.corners.shape)
        on_rim = self.facets.rim[self.facets.edge]
        for k in range(3):
            here = np.flatnonzero(on_rim[:, k])
            chord = np.linalg.norm(self.facets.chord[self.facets.edge[here, k]], axis=1)
            mean[here, k] = area_beyond(self.pieces(here), k) / chord
        return np.where(np.abs(mean) > NOTHING * self.size, mean, 0.0)

    @cached_property
    def doubt(self) -> np.ndarray:
        """(t,) how far the true surface may be from the patch of each facet.

        What the patches miss is of fourth order in the size of the facets where they are
        regular, two orders above the sagitta. A patch that rises higher than the turns at its
        facet explain is not to be believed at all.
        """
        turn = self.facets.steepest
        return FIT * turn**2 * np.abs(self.sagitta)[self.facets.flat] + self._unexplained

    @cached_property
    def _unexplained(self) -> np.ndarray:
        """(t,) height of each patch beyond that of a curve that turns as the facets do."""
        corners = self.facets.points[self.facets.corners]
        off = self.net - corners.mean(axis=1, keepdims=True)
        height = np.abs(np.einsum("tki,ti->tk", off, self.facets.normal)).max(axis=1)
        beyond = height - EXPLAINED * rise_by_turns(self.facets)
        return np.where(beyond > NOTHING * self.size, beyond, 0.0)

    @cached_property
    def rim_doubt(self) -> np.ndarray:
        """(t, 3) how far the true rim may be from the curve over each side on a free one.

        The turn of a rim comes from its sagitta, as on a circle.
        """
        sagitta = np.abs(self.rim_sagitta)
        chord = np.linalg.norm(self.facets.chord, axis=1)[self.facets.edge]
        return FIT * (12.0 * sagitta / chord) ** 2 * sagitta

    @property
    def bends(self) -> bool:
        """Whether the surface leaves the facets anywhere."""
        return bool(self.sagitta.any() or self.rim_sagitta.any())

    @cached_property
    def farthest(self) -> float:
        """Largest distance of the surface from a facet, at the middles of facets and edges."""
        corners = self.facets.points[self.facets.corners]
        off = basis(_MIDDLES) @ self.net - _MIDDLES @ corners
        return float(np.linalg.norm(off, axis=2).max())


def fit_of(surface: Surface, faces: FlatFaces, turned: bool = False) -> Fit | None:
    """Fit to the flat faces of a surface; None if they are the shape, or no curve shows."""
    if surface.smooth is False:
        return None
    fit = Fit.of(faces, surface.crease, turned)
    return fit if fit.bends else None
