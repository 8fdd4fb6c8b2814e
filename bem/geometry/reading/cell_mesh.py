"""A mesh of cells and groups of them as faces and parts.

Surface cells are the faces. A group of volume cells is a part by its boundary, and in a mesh
without surface cells the boundary of all volume cells is the whole.
"""

from __future__ import annotations

from collections.abc import Collection, Mapping
from dataclasses import dataclass

import numpy as np

from bem.errors import InputError
from bem.geometry.reading.cells import (
    Volume,
    corners_of,
    is_curved,
    is_surface,
    is_volume,
    volume_of,
)
from bem.geometry.reading.mesh_data import MeshData
from bem.geometry.reading.polygons import Polygons, cut_polygons
from bem.geometry.wording import counted

IN_VOLUME = " (volume)"
"""Follows the name of a group of volume cells if surface cells have one of that name."""

Blocks = list[tuple[str, np.ndarray]]
"""Kinds of cells, each with the nodes (n, k) of its cells."""


@dataclass(frozen=True)
class _Surface:
    """Faces of the surface cells.

    Args:
        faces: (f, 4) int64.
        cell: (f,) the cell that each comes from.
        changes: one line for each kind of change.
    """

    faces: np.ndarray
    cell: np.ndarray
    changes: tuple[str, ...]


def cell_mesh(
    points: np.ndarray,
    blocks: Blocks,
    groups: Mapping[str, np.ndarray],
    named: Collection[str],
) -> MeshData:
    """Faces and parts of a mesh of cells.

    Args:
        points: (v, 3) float64.
        blocks: all cells, of any kind; they are numbered through.
        groups: cells (numbers) of each group.
        named: groups that stand for a body each, unless they overlap.

    Raises:
        InputError: a cell uses a node that is not listed.
    """
    _check(len(points), blocks)
    surface = _surface(points, blocks)
    volume = _volume(surface.faces, blocks)
    parts = {name: np.flatnonzero(np.isin(surface.cell, cells)) for name, cells in groups.items()}
    parts = {name: faces for name, faces in parts.items() if len(faces)}
    regions = {
        name + IN_VOLUME * (name in parts): volume.boundary(cells)
        for name, cells in groups.items()
        if np.isin(cells, volume.cell).any()
    }
    whole = np.arange(len(surface.faces))
    solid = len(whole) == 0 and len(volume.faces) > 0
    if solid:
        whole = volume.boundary(volume.cell)
    return MeshData(
        points,
        volume.faces,
        parts | regions,
        _bodies(parts, named, whole) or _bodies(regions, named, whole),
        (*_curved(blocks), *surface.changes),
        whole=whole,
        volumes=(*regions, None) if solid else tuple(regions),
        volume_cells=len(np.unique(volume.cell)),
    )


def _check(points: int, blocks: Blocks) -> None:
    for kind, nodes in blocks:
        used = is_surface(kind) or is_volume(kind)
        if used and nodes.size and (nodes.min() < 0 or nodes.max() >= points):
            raise InputError(f"a cell uses a node beyond the {points:,} listed; export it again")


def _numbered(blocks: Blocks) -> list[tuple[str, np.ndarray, np.ndarray]]:
    """Kind, nodes and numbers of the cells of each block."""
    ends = np.cumsum([len(nodes) for _, nodes in blocks]).tolist()
    return [
        (kind, nodes, np.arange(end - len(nodes), end))
        for (kind, nodes), end in zip(blocks, ends, strict=True)
    ]


def _surface(points: np.ndarray, blocks: Blocks) -> _Surface:
    corners, sizes, cells = [], [], []
    for kind, nodes, numbers in _numbered(blocks):
        if is_surface(kind):
            found = corners_of(kind, nodes)
            corners.append(found.ravel())
            sizes.append(np.full(len(found), found.shape[1]))
            cells.append(numbers)
    none = np.empty(0, dtype=np.int64)
    polygons = Polygons(np.concatenate([none, *corners]), np.concatenate([none, *sizes]))
    cut = cut_polygons(points, polygons)
    return _Surface(cut.faces, np.concatenate([none, *cells])[cut.source], cut.changes)


def _volume(known: np.ndarray, blocks: Blocks) -> Volume:
    return volume_of(
        known,
        [
            (kind, corners_of(kind, nodes), numbers)
            for kind, nodes, numbers in _numbered(blocks)
            if is_volume(kind)
        ],
    )


def _bodies(
    parts: dict[str, np.ndarray], named: Collection[str], whole: np.ndarray
) -> tuple[str, ...]:
    """Named parts that stand for a body each.

    One that holds everything is none beside others, nor is one that lies within another;
    none are if the rest overlap.
    """
    every = frozenset(whole.tolist())
    sets: dict[frozenset[int], str] = {}
    for name, faces in parts.items():
        if name in named:
            sets.setdefault(frozenset(faces.tolist()), name)
    some = [faces for faces in sets if not faces >= every] or list(sets)
    outer = [faces for faces in some if not any(faces < other for other in some)]
    disjoint = sum(map(len, outer)) == len(frozenset().union(*some))
    return tuple(sets[faces] for faces in outer) if disjoint else ()


def _curved(blocks: Blocks) -> list[str]:
    curved = sum(len(nodes) for kind, nodes in blocks if is_curved(kind, nodes))
    return [f"{counted(curved, 'cell')} of higher order reduced to the corners"] if curved else []
