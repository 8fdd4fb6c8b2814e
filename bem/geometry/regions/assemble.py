"""Parts put together from scraps; corners of cut pieces move onto corners that are there."""

from __future__ import annotations

from dataclasses import replace
from typing import NamedTuple

import numpy as np
from scipy.spatial import cKDTree

from bem.geometry.parts import METAL, Part
from bem.geometry.regions.facets import Facets, as_faces, reversed_rows
from bem.geometry.regions.partition import Solid
from bem.geometry.regions.scraps import NOT_FLAT, Scrap
from bem.geometry.regions.sides import Sides, conductor_of
from bem.geometry.surface import Surface
from bem.geometry.weld import near_groups


class Cut(NamedTuple):
    """A body, its scraps, and what lies on their sides."""

    solid: Solid
    facets: Facets
    scraps: list[Scrap]
    sides: Sides


def settled(cuts: list[Cut], tolerance: float) -> list[Cut]:
    """Bodies whose cut pieces share corners, with one another and with faces left uncut."""
    pieces = [scrap.corners for cut in cuts for scrap in cut.scraps]
    corners = np.concatenate([*pieces, np.empty((0, 3, 3))])
    if len(corners) == 0:
        return cuts
    anchors = np.concatenate([cut.facets.vertices for cut in cuts])
    moved = np.split(_snapped(corners, anchors, tolerance), np.cumsum([len(p) for p in pieces]))
    fresh = iter(moved)
    return [
        cut._replace(scraps=[replace(scrap, corners=next(fresh)) for scrap in cut.scraps])
        for cut in cuts
    ]


def _snapped(corners: np.ndarray, anchors: np.ndarray, tolerance: float) -> np.ndarray:
    """Triangles (t, 3, 3) with corners moved to anchors, or else to one another."""
    points, index = np.unique(corners.reshape(-1, 3), axis=0, return_inverse=True)
    off, nearest = cKDTree(anchors).query(points)
    near = off <= tolerance
    points[near] = anchors[nearest[near]]
    if not near.all():
        keep, label = near_groups(points[~near], 0.5 * tolerance)
        points[~near] = points[~near][keep][label]
    return points[index].reshape(-1, 3, 3)


def parts_of(body: int, cut: Cut) -> list[Part]:
    """Parts of one body: its scraps grouped by the regions on their sides."""
    scraps, sides = _rejoined(cut)
    groups: dict[tuple[int, int], list[Scrap]] = {}
    for scrap, back, front in zip(scraps, sides.back.tolist(), sides.front.tolist(), strict=True):
        groups.setdefault((back, front), []).append(scrap)
    return [_part(body, cut, key, group) for key, group in groups.items()]


def _rejoined(cut: Cut) -> tuple[list[Scrap], Sides]:
    """Scraps that are kept; flat faces with the same on the sides of all of it are not cut."""
    label = np.array([scrap.flat for scrap in cut.scraps])
    verdict = np.column_stack([cut.sides.kept, cut.sides.back, cut.sides.front])
    flat, first, group = np.unique(label, return_index=True, return_inverse=True)
    mixed = np.zeros(len(flat), dtype=bool)
    np.logical_or.at(mixed, group, (verdict != verdict[first[group]]).any(axis=1))
    joined = (label != NOT_FLAT) & ~mixed[group]
    chosen = np.flatnonzero(cut.sides.kept & (~joined | (np.arange(len(label)) == first[group])))
    scraps = [_uncut(cut.scraps[k], cut.facets) if joined[k] else cut.scraps[k] for k in chosen]
    return scraps, Sides(*(one[chosen] for one in cut.sides))


def _uncut(scrap: Scrap, facets: Facets) -> Scrap:
    rows = np.flatnonzero(facets.flat.label == scrap.flat)
    return replace(scrap, rows=rows, corners=np.empty((0, 3, 3)))


def _part(body: int, cut: Cut, key: tuple[int, int], scraps: list[Scrap]) -> Part:
    back, front = key
    rows = np.concatenate([_turned_rows(scrap, cut.facets) for scrap in scraps])
    corners = np.concatenate([scrap.corners for scrap in scraps])[:, [0, 1, 2, 2]]
    if front == METAL:
        back, front = front, back
        rows, corners = reversed_rows(rows), corners[:, [0, 2, 1, 1]]
    surface = _surface(cut, rows, corners)
    return Part(surface, conductor_of(cut.solid), back, front, body)


def _turned_rows(scrap: Scrap, facets: Facets) -> np.ndarray:
    """Uncut faces (f, 4) of a scrap, along its normal if they lie in one plane."""
    rows = facets.rows[scrap.rows]
    against = (facets.normals[scrap.rows] @ scrap.normal < 0.0) & (scrap.flat != NOT_FLAT)
    return np.where(against[:, None], reversed_rows(rows), rows)


def _surface(cut: Cut, rows: np.ndarray, corners: np.ndarray) -> Surface:
    """Surface of uncut faces (f, 4) of a body and of triangles (t, 4, 3)."""
    if len(corners) == 0 and len(rows) == len(cut.facets.rows):
        return replace(cut.solid.surface, vertices=cut.facets.vertices, faces=as_faces(rows))
    points = np.concatenate([cut.facets.vertices[rows], corners])
    vertices, index = np.unique(points.reshape(-1, 3), axis=0, return_inverse=True)
    index = index.reshape(-1, 4)
    real = (
        (index[:, 0] != index[:, 1]) & (index[:, 1] != index[:, 2]) & (index[:, 2] != index[:, 0])
    )
    return replace(cut.solid.surface, vertices=vertices, faces=as_faces(index[real]), curve=None)
