"""All panels of a scene, made of families that know how to refine themselves."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from bem.geometry.fit.fit import fit_of
from bem.geometry.flat_faces import FLATNESS, FlatFaces
from bem.geometry.planes import NO_PLANES, Planes
from bem.geometry.surface import Surface
from bem.geometry.topology import edges_of
from bem.panels.align import align_patches
from bem.panels.fitted import FittedFamily
from bem.panels.flat import FlatFamily
from bem.panels.planar import patches_of
from bem.panels.proximity import crowded
from bem.panels.rims import Rims

if TYPE_CHECKING:
    from bem.geometry.revolved import Revolution
    from bem.panels.curved import CurvedFamily

    Family = FlatFamily | CurvedFamily | FittedFamily

BENT_SHEET = 4.0
"""How much more the residual of a panel on a fitted bent sheet counts towards the bar."""
PROXIMITY_ROOM = 1000
"""The starting mesh may grow to twice its panels and this many for the sake of small neighbours."""


SURROUNDINGS = 0
"""Number of the outer medium among the regions; conductor k is region -(k + 1)."""


@dataclass(frozen=True)
class Body:
    """What a conductor is to its panels.

    Args:
        solid: its closed surface bounds metal; otherwise there is field on both sides.
        rounding: how far its surface may lie from where it was drawn.
        sagitta: largest distance of its facets from the smooth surface that they may stand for.
    """

    solid: bool
    rounding: float
    sagitta: float = 0.0

    @classmethod
    def of(cls, surface: Surface, hollow: bool, planes: Planes = NO_PLANES) -> Body:
        """Tell what a surface bounds; a hollow one is a skin even where it is closed."""
        if surface.curve is not None:
            closed = not any(surface.curve.free_rims)
        else:
            edges = edges_of(surface.triangles)
            ends = surface.vertices[edges.ends[edges.uses != 2]]
            closed = bool(planes.mirrored(ends, FLATNESS * surface.extent).all())
        return cls(closed and not hollow, surface.rounding)


@dataclass(frozen=True)
class Mesh:
    """Panels of all conductors, family after family.

    Args:
        families: flat panels of the whole scene, then one family per curved or fitted body.
        owners: per family, the conductor (n_family,) of each panel.
        bodies: what each conductor is.
        planes: whose images of all panels count too.
    """

    families: tuple[Family, ...]
    owners: tuple[np.ndarray, ...]
    bodies: tuple[Body, ...]
    planes: Planes = NO_PLANES

    @classmethod
    def start(
        cls,
        surfaces: list[Surface],
        hollow: Iterable[int] = (),
        accept: Callable[[int], None] = lambda _: None,
        planes: Planes = NO_PLANES,
    ) -> Mesh:
        """Return the starting mesh of one surface per conductor.

        Args:
            surfaces: of all conductors.
            hollow: conductors whose closed surface is a skin, with field on both sides.
            accept: called early with a number of panels that the mesh will at least have,
                and with that of the finished mesh; it may raise.
            planes: grounded and mirror planes; no surface crosses them.
        """
        flat = {k: FlatFaces.of(s) for k, s in enumerate(surfaces) if s.curve is None}
        accept(sum(faces.count for faces in flat.values()))
        fits = {k: fit for k, faces in flat.items() if (fit := fit_of(surfaces[k], faces))}
        fitted = [k for k in fits if surfaces[k].smooth]
        patches = [
            patch
            for k, faces in flat.items()
            if k not in fitted
            for patch in patches_of(faces, k, fits[k].sagitta if k in fits else None)
        ]
        families: list[Family] = []
        owners = []
        if patches:
            rims = [Rims.of(fit, k) for k, fit in fits.items() if k not in fitted]
            aligned = align_patches(patches, max(s.extent for s in surfaces))
            families.append(FlatFamily.start(aligned, planes, rims))
            owners.append(_owners(families[-1], 0))
        for k, surface in enumerate(surfaces):
            if surface.curve is not None:
                families.append(_curved(surface.curve))
            elif k in fitted:
                families.append(FittedFamily.start(fits[k]))
            else:
                continue
            owners.append(_owners(families[-1], k))
        accept(sum(len(owner) for owner in owners))
        bodies = tuple(Body.of(s, k in set(hollow), planes) for k, s in enumerate(surfaces))
        bodies = tuple(
            replace(body, sagitta=fits[k].farthest) if k in fits else body
            for k, body in enumerate(bodies)
        )
        return _resolved(cls(tuple(families), tuple(owners), bodies, planes))

    @property
    def corners(self) -> np.ndarray:
        """(n, 4, 3)."""
        return np.concatenate([f.corners for f in self.families])

    @property
    def conductor(self) -> np.ndarray:
        """(n,) owner of each panel."""
        return np.concatenate(self.owners)

    @property
    def regions(self) -> np.ndarray:
        """(n, 2) region behind and in front of each panel.

        A solid's metal counts as behind whichever way the panel is turned; both sides of a
        sheet lie in the surroundings, and the sheet itself is told by ``conductor``.
        """
        solid = np.array([body.solid for body in self.bodies])[self.conductor]
        behind = np.where(solid, -(self.conductor + 1), SURROUNDINGS)
        return np.stack([behind, np.full(len(behind), SURROUNDINGS)], axis=1)

    @property
    def feature(self) -> np.ndarray:
        """(n,) size of the flat face, or of the curved body, that each panel lies on."""
        return np.concatenate([_feature(family) for family in self.families])

    def faceting(self) -> Faceting:
        """How far the panels are from the true surface."""
        parts = [
            _faceting(family, not self.bodies[owner[0]].solid)
            for family, owner in zip(self.families, self.owners, strict=True)
        ]
        return Faceting(*(np.concatenate(column) for column in zip(*parts, strict=True)))

    def unsure(self) -> np.ndarray:
        """(n,) factor on what the residual of each panel says of the error.

        It is above 1 on fitted bent sheets, whose rims triangles resolve slowly.
        """
        bent = [
            isinstance(family, FittedFamily)
            and not self.bodies[owner[0]].solid
            and bool(family.doubt.any())
            for family, owner in zip(self.families, self.owners, strict=True)
        ]
        return np.repeat(np.where(bent, BENT_SHEET, 1.0), [len(owner) for owner in self.owners])

    def doubtful(self) -> Faceting:
        """How far the facets of files, or the fits to them, may be from what they stand for."""
        solid = np.array([body.solid for body in self.bodies])
        parts = [
            _doubtful(family, solid[owner])
            for family, owner in zip(self.families, self.owners, strict=True)
        ]
        return Faceting(*(np.concatenate(column) for column in zip(*parts, strict=True)))

    def bulging(self, longer: np.ndarray) -> np.ndarray:
        """(n,) whether halving side 0-1 brings panels nearer to the true surface than side 1-2.

        Args:
            longer: (n,) whether side 0-1 is the longer one, which decides where nothing else does.
        """
        out, start = longer.copy(), 0
        for family, owner in zip(self.families, self.owners, strict=True):
            around = getattr(family, "bulges_around", None)
            if around is not None:
                out[start : start + len(owner)] = around
            start += len(owner)
        return out

    def refine(self, marked: np.ndarray, across: np.ndarray) -> tuple[Mesh, np.ndarray]:
        """Halve marked panels, ``across`` 0 (sides 0-1) or 1 (sides 1-2) each.

        Returns:
            The new mesh and, per new panel, the index of the old one it equals, or -1.
        """
        families, owners, origin = [], [], []
        start = 0
        for family, owner in zip(self.families, self.owners, strict=True):
            here = slice(start, start + len(owner))
            finer, kept = family.refine(marked[here], across[here])
            fresh = np.full(len(finer.corners), -1)
            fresh[: len(kept)] = start + kept
            families.append(finer)
            origin.append(fresh)
            owners.append(_owners(finer, int(owner[0])))
            start += len(owner)
        finer_mesh = Mesh(tuple(families), tuple(owners), self.bodies, self.planes)
        return finer_mesh, np.concatenate(origin)


@dataclass(frozen=True)
class Faceting:
    """Distance of the true surface from the panels, per panel.

    Args:
        offset: (n,) mean outward distance of the true surface from the panel, weighted where the
            density grows towards a sharp edge of a solid.
        rim_offset: (n,) part of the panel's area that is missing at a curved free rim.
        rim_width: (n,) width of such a panel across the rim, 0 for all others.
        sheet: (n,) bool, panels of open or hollow surfaces, with field on both sides.
    """

    offset: np.ndarray
    rim_offset: np.ndarray
    rim_width: np.ndarray
    sheet: np.ndarray

    @property
    def exact(self) -> bool:
        """Whether all panels lie on the true surface."""
        return not (self.offset.any() or self.rim_offset.any())


def _faceting(family: Family, sheet: bool) -> tuple[np.ndarray, ...]:
    count = len(family.corners)
    if isinstance(family, FlatFamily):
        zero = np.zeros(count)
        return zero, zero, zero, zero.astype(bool)
    offset = family.offset
    if not (sheet or isinstance(family, FittedFamily)):
        offset = offset * family.crowding
    return offset, family.rim_offset, family.rim_width, np.full(count, sheet)


def _doubtful(family: Family, solid: np.ndarray) -> tuple[np.ndarray, ...]:
    sheet = ~solid
    if isinstance(family, FlatFamily):
        return family.sagitta, *family.beyond_rims(), sheet
    if isinstance(family, FittedFamily):
        return family.doubt, family.rim_doubt, family.rim_width, sheet
    return *np.zeros((3, len(sheet))), sheet


def _curved(surface: Revolution) -> CurvedFamily:
    from bem.panels.curved import CurvedFamily

    return CurvedFamily.start(surface)


def _owners(family: Family, conductor: int) -> np.ndarray:
    if isinstance(family, FlatFamily):
        return family.conductor
    return np.full(len(family.corners), conductor)


def _feature(family: Family) -> np.ndarray:
    if isinstance(family, FlatFamily):
        return family.feature
    size = np.linalg.norm(np.ptp(family.corners.reshape(-1, 3), axis=0))
    return np.full(len(family.corners), size)


def _resolved(mesh: Mesh) -> Mesh:
    """Halve panels beside much smaller ones of other conductors until they can see them."""
    most = 2 * len(mesh.conductor) + PROXIMITY_ROOM
    while True:
        marked, across = crowded(mesh.corners, mesh.conductor, mesh.feature)
        if not marked.any() or len(mesh.conductor) + marked.sum() > most:
            return mesh
        mesh, _ = mesh.refine(marked, across)
