"""All panels of a scene, made of families that know how to refine themselves."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from bem.geometry.surface import Surface
from bem.panels.align import align_patches
from bem.panels.flat import FlatFamily
from bem.panels.planar import planar_patches
from bem.panels.proximity import crowded

if TYPE_CHECKING:
    from bem.panels.curved import CurvedFamily

    Family = FlatFamily | CurvedFamily

PROXIMITY_ROOM = 1000
"""The starting mesh may grow to twice its panels and this many for the sake of small neighbours."""


@dataclass(frozen=True)
class Mesh:
    """Panels of all conductors, family after family.

    Args:
        families: flat panels of the whole scene, then one family per curved body.
        owners: per family, the conductor (n_family,) of each panel.
        rounding: per conductor, how far its surface may lie from where it was drawn.
        hollow: conductors whose closed surface is a skin, with field on both sides.
    """

    families: tuple[Family, ...]
    owners: tuple[np.ndarray, ...]
    rounding: tuple[float, ...]
    hollow: frozenset[int] = frozenset()

    @classmethod
    def start(cls, surfaces: list[Surface], hollow: Iterable[int] = ()) -> Mesh:
        """Return the starting mesh of one surface per conductor."""
        patches = []
        curved: list[tuple[int, CurvedFamily]] = []
        for k, surface in enumerate(surfaces):
            if surface.curve is None:
                patches += planar_patches(surface, k)
            else:
                from bem.panels.curved import CurvedFamily

                curved.append((k, CurvedFamily.start(surface.curve)))
        families: list[Family] = []
        owners = []
        if patches:
            flat = FlatFamily.start(align_patches(patches, max(s.extent for s in surfaces)))
            families.append(flat)
            owners.append(flat.conductor)
        for k, family in curved:
            families.append(family)
            owners.append(np.full(len(family.corners), k))
        rounding = tuple(s.rounding for s in surfaces)
        return _resolved(cls(tuple(families), tuple(owners), rounding, frozenset(hollow)))

    @property
    def corners(self) -> np.ndarray:
        """(n, 4, 3)."""
        return np.concatenate([f.corners for f in self.families])

    @property
    def conductor(self) -> np.ndarray:
        """(n,) owner of each panel."""
        return np.concatenate(self.owners)

    @property
    def feature(self) -> np.ndarray:
        """(n,) size of the flat face, or of the curved body, that each panel lies on."""
        return np.concatenate([_feature(family) for family in self.families])

    def faceting(self) -> Faceting:
        """How far the panels are from the true surface."""
        parts = [
            _faceting(family, int(owner[0]) in self.hollow)
            for family, owner in zip(self.families, self.owners, strict=True)
        ]
        return Faceting(*(np.concatenate(column) for column in zip(*parts, strict=True)))

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
            flat = isinstance(finer, FlatFamily)
            owners.append(finer.conductor if flat else np.full(len(fresh), owner[0]))
            start += len(owner)
        return Mesh(tuple(families), tuple(owners), self.rounding, self.hollow), np.concatenate(origin)


@dataclass(frozen=True)
class Faceting:
    """Distance of the true surface from the panels, per panel.

    Args:
        offset: (n,) mean outward distance of the true surface from the panel.
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


def _faceting(family: Family, hollow: bool) -> tuple[np.ndarray, ...]:
    count = len(family.corners)
    if isinstance(family, FlatFamily):
        zero = np.zeros(count)
        return zero, zero, zero, zero.astype(bool)
    sheet = np.full(count, hollow or any(family.grid.surface.free_rims))
    return family.offset, family.rim_offset, family.rim_width, sheet


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
