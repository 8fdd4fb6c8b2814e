"""Starting families of panels from parts of surfaces."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from bem.geometry.fit.fit import Fit, fit_of
from bem.geometry.flat_faces import FLATNESS, FlatFaces
from bem.geometry.parts import METAL, SURROUNDINGS, Part
from bem.geometry.planes import Planes
from bem.geometry.surface import Surface
from bem.geometry.topology import edges_of
from bem.geometry.turning import curve_along
from bem.panels.align import align_patches
from bem.panels.fitted import FittedFamily
from bem.panels.flat import FlatFamily
from bem.panels.joined import with_joints
from bem.panels.planar import Owner, Patch, patches_of
from bem.panels.rims import Rims

if TYPE_CHECKING:
    from bem.geometry.revolved import Revolution
    from bem.panels.curved import CurvedFamily

    Family = FlatFamily | CurvedFamily | FittedFamily


def whole(surface: Surface, hollow: bool, planes: Planes, conductor: int) -> Part:
    """All of a conductor in the surroundings; a hollow one is a skin even where it is closed."""
    if surface.curve is not None:
        closed = not any(surface.curve.free_rims)
    else:
        edges = edges_of(surface.triangles)
        ends = surface.vertices[edges.ends[edges.uses != 2]]
        closed = bool(planes.mirrored(ends, FLATNESS * surface.extent).all())
    back = METAL if closed and not hollow else SURROUNDINGS
    return Part(surface, conductor, back, SURROUNDINGS, conductor)


@dataclass(frozen=True)
class Blanks:
    """Parts that get panels, with what is found out about their faces.

    Args:
        parts: all of them.
        turned: whether their faces lead from back to front; otherwise they do not say.
        flat: by part, flat faces of those without a true surface.
        fits: by part, the smooth surface that its facets seem to follow, where there is one.
    """

    parts: list[Part]
    turned: bool
    flat: dict[int, FlatFaces]
    fits: dict[int, Fit]

    @classmethod
    def of(
        cls, parts: list[Part], turned: bool, planes: Planes, accept: Callable[[int], None]
    ) -> Blanks:
        """Look at the faces of all parts; ``accept`` is told how many flat ones there are."""
        size: dict[int, float] = {}
        for part in parts:
            size[part.body] = max(size.get(part.body, 0.0), part.surface.extent)
        flat = {
            k: FlatFaces.of(part.surface, size[part.body])
            for k, part in enumerate(parts)
            if part.surface.curve is None
        }
        accept(sum(faces.count for faces in flat.values()))
        found = {k: fit_of(parts[k].surface, faces, turned) for k, faces in flat.items()}
        fits = {k: with_joints(fit, parts[k], parts, planes) for k, fit in found.items() if fit}
        return cls(parts, turned, flat, fits)

    @property
    def fitted(self) -> list[int]:
        """Parts whose panels follow a fit."""
        return [k for k in self.fits if self.parts[k].surface.smooth]

    def patches(self) -> list[Patch]:
        """Flat faces of all parts with panels on these."""
        return [
            patch
            for k, faces in self.flat.items()
            if k not in self.fitted
            for patch in patches_of(faces, self._owner(k), self._sagitta(k))
        ]

    def _owner(self, k: int) -> Owner:
        return Owner(k, self.parts[k].conductor, self.parts[k].body)

    def _sagitta(self, k: int) -> np.ndarray | None:
        return self.fits[k].sagitta if k in self.fits else None

    def rims(self) -> list[Rims]:
        """Free rims that may stand for curves, of parts with panels on flat faces."""
        return [Rims.of(fit, k) for k, fit in self.fits.items() if k not in self.fitted]

    def curve(self, k: int) -> Revolution | None:
        """The true surface of a part, its normal from back to front."""
        surface = self.parts[k].surface
        return curve_along(surface) if self.turned else surface.curve


def families_of(
    blanks: Blanks, planes: Planes, coincidence: float
) -> tuple[tuple[Family, ...], tuple[np.ndarray, ...]]:
    """Starting families of all parts, and the part (n_family,) of each panel of theirs."""
    families: list[Family] = []
    owners = []
    patches = blanks.patches()
    if patches:
        aligned = align_patches(patches, max(part.surface.extent for part in blanks.parts))
        families.append(FlatFamily.start(aligned, planes, blanks.rims(), coincidence))
        owners.append(owners_of(families[-1], 0))
    for k in range(len(blanks.parts)):
        family = _own_family(blanks, k)
        if family is not None:
            families.append(family)
            owners.append(owners_of(family, k))
    return tuple(families), tuple(owners)


def _own_family(blanks: Blanks, k: int) -> Family | None:
    """Family of a part that shares it with no other."""
    curve = blanks.curve(k)
    if curve is not None:
        from bem.panels.curved import CurvedFamily

        return CurvedFamily.start(curve)
    return FittedFamily.start(blanks.fits[k]) if k in blanks.fitted else None


def owners_of(family: Family, part: int) -> np.ndarray:
    """Part (n,) of each panel of a family, ``part`` if it is one of a single part."""
    if isinstance(family, FlatFamily):
        return family.owner
    return np.full(len(family.corners), part)
