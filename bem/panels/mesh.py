"""All panels of a scene, made of families that know how to refine themselves."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from bem.geometry.parts import INTERFACE, METAL, Part
from bem.geometry.planes import NO_PLANES, Planes
from bem.geometry.surface import Surface
from bem.panels.fitted import FittedFamily
from bem.panels.flat import FlatFamily
from bem.panels.proximity import crowded
from bem.panels.starting import Blanks, families_of, owners_of, whole

if TYPE_CHECKING:
    from bem.panels.curved import CurvedFamily
    from bem.panels.starting import Family

BENT_SHEET = 4.0
"""How much more the residual of a panel on a fitted bent sheet counts towards the bar."""
PROXIMITY_ROOM = 1000
"""The starting mesh may grow to twice its panels and this many for the sake of small neighbours."""


@dataclass(frozen=True)
class Body:
    """What a part of a surface is to its panels; without dielectrics, all of a conductor.

    Args:
        conductor: that it bounds, or INTERFACE.
        back: region behind, or METAL.
        front: region in front.
        body: that it was cut from.
        rounding: how far its surface may lie from where it was drawn.
        sagitta: largest distance of its facets from the smooth surface that they may stand for.
    """

    conductor: int
    back: int
    front: int
    body: int
    rounding: float
    sagitta: float = 0.0

    @classmethod
    def of(
        cls, surface: Surface, hollow: bool, planes: Planes = NO_PLANES, conductor: int = 0
    ) -> Body:
        """Tell what a whole conductor bounds; a hollow one is a skin even where it is closed."""
        return cls.of_part(whole(surface, hollow, planes, conductor))

    @classmethod
    def of_part(cls, part: Part) -> Body:
        """What is known without its panels."""
        return cls(part.conductor, part.back, part.front, part.body, part.surface.rounding)

    @property
    def solid(self) -> bool:
        """Whether there is metal behind."""
        return self.back == METAL

    @property
    def sheet(self) -> bool:
        """Whether it is metal with field on both sides."""
        return not self.solid and self.conductor != INTERFACE


@dataclass(frozen=True)
class Mesh:
    """Panels of all parts, family after family.

    Args:
        families: flat panels of the whole scene, then one family per curved or fitted part.
        owners: per family, the part (n_family,) of each panel.
        bodies: what each part is; without dielectrics, each conductor.
        planes: whose images of all panels count too.
    """

    families: tuple[Family, ...]
    owners: tuple[np.ndarray, ...]
    bodies: tuple[Body, ...]
    planes: Planes = NO_PLANES

    @classmethod
    def start(
        cls,
        surfaces: Sequence[Surface] | Sequence[Part],
        hollow: Iterable[int] = (),
        accept: Callable[[int], None] = lambda _: None,
        planes: Planes = NO_PLANES,
        coincidence: float = 0.0,
    ) -> Mesh:
        """Return the starting mesh of one surface per conductor, or of parts.

        The corners of every panel of a part run counterclockwise seen from its front. Those of
        a mere surface run as its faces do, and there the front is no more than a name.

        Args:
            surfaces: of all conductors, or parts.
            hollow: conductors whose closed surface is a skin, with field on both sides; parts
                tell that themselves.
            accept: called early with a number of panels that the mesh will at least have,
                and with that of the finished mesh; it may raise.
            planes: grounded and mirror planes; no surface crosses them.
            coincidence: faces nearer to each other than this touch.
        """
        parts = [part for part in surfaces if isinstance(part, Part)]
        turned, skins = bool(parts), set(hollow)
        for k, surface in enumerate(surfaces):
            if isinstance(surface, Surface):
                parts.append(whole(surface, k in skins, planes, k))
        blanks = Blanks.of(parts, turned, planes, accept)
        families, owners = families_of(blanks, planes, coincidence)
        accept(sum(len(owner) for owner in owners))
        bodies = [Body.of_part(part) for part in parts]
        for k, fit in blanks.fits.items():
            bodies[k] = replace(bodies[k], sagitta=fit.farthest)
        return _resolved(cls(families, owners, tuple(bodies), planes))

    @property
    def corners(self) -> np.ndarray:
        """(n, 4, 3)."""
        return np.concatenate([f.corners for f in self.families])

    @property
    def owner(self) -> np.ndarray:
        """(n,) part that each panel belongs to."""
        return np.concatenate(self.owners)

    @property
    def conductor(self) -> np.ndarray:
        """(n,) conductor of each panel, or INTERFACE."""
        return np.array([body.conductor for body in self.bodies])[self.owner]

    @property
    def body(self) -> np.ndarray:
        """(n,) body that each panel was cut from."""
        return np.array([body.body for body in self.bodies])[self.owner]

    @property
    def regions(self) -> np.ndarray:
        """(n, 2) region behind each panel, or METAL, and region in front of it."""
        return np.array([(body.back, body.front) for body in self.bodies])[self.owner]

    @property
    def rounding(self) -> np.ndarray:
        """(n,) how far the surface under each panel may lie from where it was drawn."""
        return np.array([body.rounding for body in self.bodies])[self.owner]

    @property
    def feature(self) -> np.ndarray:
        """(n,) size of the flat face, or of the curved body, that each panel lies on."""
        return np.concatenate([_feature(family) for family in self.families])

    def faceting(self) -> Faceting:
        """How far the panels are from the true surface."""
        parts = [
            _faceting(family, self.bodies[owner[0]])
            for family, owner in zip(self.families, self.owners, strict=True)
        ]
        return Faceting(*(np.concatenate(column) for column in zip(*parts, strict=True)))

    def unsure(self) -> np.ndarray:
        """(n,) factor on what the residual of each panel says of the error.

        It is above 1 on fitted bent sheets, whose rims triangles resolve slowly.
        """
        bent = [
            isinstance(family, FittedFamily)
            and self.bodies[owner[0]].sheet
            and bool(family.doubt.any())
            for family, owner in zip(self.families, self.owners, strict=True)
        ]
        return np.repeat(np.where(bent, BENT_SHEET, 1.0), [len(owner) for owner in self.owners])

    def doubtful(self) -> Faceting:
        """How far the facets of files, or the fits to them, may be from what they stand for."""
        sheet = np.array([body.sheet for body in self.bodies])
        parts = [
            _doubtful(family, sheet[owner])
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
            owners.append(owners_of(finer, int(owner[0])))
            start += len(owner)
        finer_mesh = Mesh(tuple(families), tuple(owners), self.bodies, self.planes)
        return finer_mesh, np.concatenate(origin)


@dataclass(frozen=True)
class Faceting:
    """Distance of the true surface from the panels, per panel.

    Args:
        offset: (n,) mean distance of the true surface from the panel, towards its front, weighted
            where the density grows towards a sharp edge of a solid.
        rim_offset: (n,) part of the panel's area that is missing at a curved free rim.
        rim_width: (n,) width of such a panel across the rim, 0 for all others.
        sheet: (n,) bool, panels of open or hollow conductors, with field on both sides.
    """

    offset: np.ndarray
    rim_offset: np.ndarray
    rim_width: np.ndarray
    sheet: np.ndarray

    @property
    def exact(self) -> bool:
        """Whether all panels lie on the true surface."""
        return not (self.offset.any() or self.rim_offset.any())


def _faceting(family: Family, body: Body) -> tuple[np.ndarray, ...]:
    count = len(family.corners)
    if isinstance(family, FlatFamily):
        zero = np.zeros(count)
        return zero, zero, zero, zero.astype(bool)
    offset = family.offset
    if body.solid and not isinstance(family, FittedFamily):
        offset = offset * family.crowding
    return offset, *_on_rims(family, body.sheet), np.full(count, body.sheet)


def _on_rims(family: CurvedFamily | FittedFamily, sheet: bool) -> tuple[np.ndarray, np.ndarray]:
    """What is missing at free rims, and widths there; only sheets have such rims."""
    return sheet * family.rim_offset, sheet * family.rim_width


def _doubtful(family: Family, sheet: np.ndarray) -> tuple[np.ndarray, ...]:
    if isinstance(family, FlatFamily):
        beyond, width = family.beyond_rims()
        return family.sagitta, sheet * beyond, sheet * width, sheet
    if isinstance(family, FittedFamily):
        return family.doubt, sheet * family.rim_doubt, sheet * family.rim_width, sheet
    return *np.zeros((3, len(sheet))), sheet


def _feature(family: Family) -> np.ndarray:
    if isinstance(family, FlatFamily):
        return family.feature
    size = np.linalg.norm(np.ptp(family.corners.reshape(-1, 3), axis=0))
    return np.full(len(family.corners), size)


def _resolved(mesh: Mesh) -> Mesh:
    """Halve panels beside much smaller ones of other bodies until they can see them."""
    most = 2 * len(mesh.owner) + PROXIMITY_ROOM
    while True:
        marked, across = crowded(mesh.corners, mesh.body, mesh.feature)
        if not marked.any() or len(mesh.owner) + marked.sum() > most:
            return mesh
        mesh, _ = mesh.refine(marked, across)
