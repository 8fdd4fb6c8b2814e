"""Scraps of a body's surface, each with one region on each side."""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from bem.geometry.regions.facets import Facets

LIES_ON, BEHIND, BEFORE = 1, 2, 4
"""What a body is to a scrap: its surface runs along it, its inside is behind or before it."""
NOT_FLAT = -1
"""Stands for the flat face of a scrap that may consist of several."""


class Touch(NamedTuple):
    """Triangles of other bodies near one flat face: (k,) their bodies, (k,) their numbers."""

    body: np.ndarray
    triangle: np.ndarray


@dataclass(frozen=True, eq=False)
class Scrap:
    """A piece of a body's surface.

    Args:
        rows: (f,) faces of the body that it consists of, if it is not cut from one.
        corners: (t, 3, 3) triangles of a piece that is cut out.
        flat: the flat face that it belongs to, or NOT_FLAT.
        point: (3,) on it, off its rim.
        normal: (3,) unit normal there.
        area: of all of it.
        solid: whether its own body is solid behind it.
        meets: (n,) flags for each body.
    """

    rows: np.ndarray
    corners: np.ndarray
    flat: int
    point: np.ndarray
    normal: np.ndarray
    area: float
    solid: bool
    meets: np.ndarray


def whole_scrap(own: Facets, triangles: np.ndarray, bodies: int) -> Scrap:
    """Scrap of uncut faces, given by their triangles (t,), that meets none of the bodies."""
    size = np.linalg.norm(own.areas[triangles], axis=1)
    best = triangles[size.argmax()]
    return Scrap(
        rows=np.unique(own.owner[triangles]),
        corners=np.empty((0, 3, 3)),
        flat=NOT_FLAT,
        point=own.corners[best].mean(axis=0),
        normal=own.normals[best],
        area=float(size.sum()),
        solid=bool(own.closed[best]),
        meets=np.zeros(bodies, dtype=np.int64),
    )


def is_covered(scrap: Scrap, own: Facets) -> bool:
    """Whether the partition of curved bodies has taken care of what a scrap stands for."""
    rows = scrap.rows if scrap.flat == NOT_FLAT else own.flat.label == scrap.flat
    return bool(own.covered[rows].all())
