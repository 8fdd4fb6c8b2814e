"""Cells of general meshes: surface cells as faces, volume cells by their boundary.

A side of a volume cell that is used once within a set of cells lies on the boundary of that
set. Cells of higher order count by their corners, which all formats list first.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from bem.geometry.surface import NO_CORNER

SURFACE_CORNERS = {"triangle": 3, "quad": 4, "pixel": 4, "polygon": 0}
"""Number of corners by kind of cell; a polygon has any."""

VOLUME_CORNERS = {"tetra": 4, "hexahedron": 8, "voxel": 8, "wedge": 6, "pyramid": 5}
_SIDES = {
    "tetra": ((0, 2, 1), (0, 1, 3), (1, 2, 3), (0, 3, 2)),
    "hexahedron": (
        (0, 3, 2, 1), (4, 5, 6, 7), (0, 1, 5, 4), (1, 2, 6, 5), (2, 3, 7, 6), (3, 0, 4, 7),
    ),
    "wedge": ((0, 2, 1), (3, 4, 5), (0, 1, 4, 3), (1, 2, 5, 4), (2, 0, 3, 5)),
    "pyramid": ((0, 3, 2, 1), (0, 1, 4), (1, 2, 4), (2, 3, 4), (3, 0, 4)),
}  # fmt: skip
_AROUND = {"pixel": (0, 1, 3, 2), "voxel": (0, 1, 3, 2, 4, 5, 7, 6)}
"""Corners of cells that are numbered row by row, in the order around a face."""


class Volume(NamedTuple):
    """Sides of volume cells.

    Args:
        faces: (k, 4) int64 faces of surface cells, then all other sides once each.
        face: (s,) which of them each side is.
        cell: (s,) number of the cell that it belongs to.
    """

    faces: np.ndarray
    face: np.ndarray
    cell: np.ndarray

    def boundary(self, cells: np.ndarray) -> np.ndarray:
        """Faces (indices) that a set of cells (numbers) uses once."""
        inside = np.isin(self.cell, cells)
        uses = np.bincount(self.face[inside], minlength=len(self.faces))
        return np.flatnonzero(uses == 1)


def kind_of(cell: str) -> str | None:
    """Kind of a cell such as "triangle6", or None for lines, points and what is unknown."""
    for kind in (*SURFACE_CORNERS, *VOLUME_CORNERS):
        if cell.startswith(kind) and not cell.removeprefix(kind).strip("0123456789"):
            return kind
    return None


def is_surface(cell: str) -> bool:
    """Whether a kind of cell is a triangle, a quadrilateral or a polygon, of any order."""
    return kind_of(cell) in SURFACE_CORNERS


def is_volume(cell: str) -> bool:
    """Whether a kind of cell is a volume cell of any order."""
    return kind_of(cell) in VOLUME_CORNERS


def is_curved(cell: str, nodes: np.ndarray) -> bool:
    """Whether cells with nodes (n, m) have more of them than corners."""
    return kind_of(cell) is not None and nodes.shape[1] > corners_of(cell, nodes).shape[1]


def corners_of(cell: str, nodes: np.ndarray) -> np.ndarray:
    """Corners (n, k) of the nodes (n, m) of cells, in the order around each side."""
    kind = kind_of(cell) or ""
    number = SURFACE_CORNERS.get(kind) or VOLUME_CORNERS.get(kind, 0)
    return nodes[:, list(_AROUND.get(kind, range(number or nodes.shape[1])))]


def as_faces(corners: np.ndarray) -> np.ndarray:
    """Triangles (n, 3) or quadrilaterals (n, 4) as faces (n, 4)."""
    faces = np.full((len(corners), 4), NO_CORNER, dtype=np.int64)
    faces[:, : corners.shape[1]] = corners
    return faces


def volume_of(known: np.ndarray, blocks: Sequence[tuple[str, np.ndarray, np.ndarray]]) -> Volume:
    """Sides of volume cells.

    Args:
        known: (f, 4) faces of surface cells; a side with the same corners is the same face.
        blocks: kinds of volume cells with their corners (n, k) and numbers (n,).
    """
    sides, cell = [np.empty((0, 4), dtype=np.int64)], [np.empty(0, dtype=np.int64)]
    for kind, corners, numbers in blocks:
        for side in _SIDES[(kind_of(kind) or "").replace("voxel", "hexahedron")]:
            sides.append(as_faces(corners[:, side]))
            cell.append(numbers)
    every = np.concatenate([known, *sides])
    first = _first_copies(every)
    fresh = np.flatnonzero(first[len(known) :] == np.arange(len(known), len(every))) + len(known)
    place = np.arange(len(every))
    place[fresh] = len(known) + np.arange(len(fresh))
    faces = np.concatenate([known, every[fresh]])
    return Volume(faces, place[first[len(known) :]], np.concatenate(cell))


def _first_copies(faces: np.ndarray) -> np.ndarray:
    """Index (f,) of the first face with the same corners in any order."""
    corners = np.sort(faces, axis=1)
    order = np.lexsort(corners.T)
    moved = corners[order]
    starts = np.append(True, (moved[1:] != moved[:-1]).any(axis=1))[: len(faces)]
    first = np.empty(len(faces), dtype=np.int64)
    first[order] = order[starts][np.cumsum(starts) - 1]
    return first
