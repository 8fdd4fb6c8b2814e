"""What the partition of space is made from, and what it gives."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Literal

import numpy as np

from bem.geometry.parts import INTERFACE, METAL, SURROUNDINGS, Part
from bem.geometry.regions.measures import measures
from bem.geometry.surface import Surface

Kind = Literal["metal", "skin", "dielectric"]


@dataclass(frozen=True)
class Solid:
    """One body that takes part.

    Args:
        surface: welded and repaired faces; closed for a dielectric.
        kind: "metal" is solid where its surface is closed, "skin" is a conductor without
            thickness, closed or not.
        conductor: index of the conductor, or INTERFACE for a dielectric.
        name: for notes and errors; "conductor 1", "dielectric 2", ... if left out.
    """

    surface: Surface
    kind: Kind
    conductor: int = INTERFACE
    name: str = ""


@dataclass(frozen=True)
class Partition:
    """Faces of all bodies, cut so that each has one region on each side.

    Args:
        parts: together the boundaries of all regions; no two of them overlap.
        notes: one line for each overlap and each contact of two bodies.
    """

    parts: list[Part]
    notes: list[str]

    @cached_property
    def volumes(self) -> dict[int, float]:
        """Volume of each dielectric region, by the divergence theorem over its boundary."""
        volumes: dict[int, float] = {}
        for part in self.parts:
            flux = _flux(part)
            for region, sign in ((part.back, 1.0), (part.front, -1.0)):
                if region > SURROUNDINGS:
                    volumes[region] = volumes.get(region, 0.0) + sign * flux
        return volumes

    @cached_property
    def areas(self) -> dict[tuple[int, int], float]:
        """Area between each two neighbours, the lower region (METAL -1) first.

        A sheet in one region counts as area between that region and METAL, twice.
        """
        areas: dict[tuple[int, int], float] = {}
        for part in self.parts:
            for pair in _neighbours(part):
                areas[pair] = areas.get(pair, 0.0) + area_of(part.surface)
        return areas


def _neighbours(part: Part) -> list[tuple[int, int]]:
    """Pairs of neighbours that a part stands for; both sides of a conductor meet metal."""
    if part.conductor == INTERFACE:
        return [(min(part.back, part.front), max(part.back, part.front))]
    return [(METAL, region) for region in (part.back, part.front) if region != METAL]


def _vector_areas(surface: Surface) -> tuple[np.ndarray, np.ndarray]:
    """Corners (t, 3, 3) of the facets and their vector areas (t, 3)."""
    corners = surface.vertices[surface.triangles]
    return corners, 0.5 * np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])


def _flux(part: Part) -> float:
    """A third of the flux of the position vector through a part."""
    if part.surface.curve is not None:
        return measures(part.surface.curve).volume
    corners, areas = _vector_areas(part.surface)
    return float(np.einsum("tx,tx->", corners.mean(axis=1), areas)) / 3.0


def area_of(surface: Surface) -> float:
    """Area of a surface, the true one if it is curved."""
    if surface.curve is not None:
        return measures(surface.curve).area
    return float(np.linalg.norm(_vector_areas(surface)[1], axis=1).sum())
