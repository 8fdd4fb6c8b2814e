"""One flat face of a body, cut where the surfaces of other bodies meet it."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from bem.geometry.flat_faces import sides_of
from bem.geometry.regions import arrange
from bem.geometry.regions.cover import Cover
from bem.geometry.regions.facets import Facets
from bem.geometry.regions.scraps import Scrap, Touch, whole_scrap
from bem.geometry.regions.traces import (
    box_of,
    clipped_segments,
    crossings,
    frame_of,
    lies_in_plane,
    outside_of,
)


class FlatFace:
    """A flat face that others come near.

    Args:
        own: the body that it belongs to.
        flat: its number there.
        tolerance: what is closer than this coincides.
    """

    def __init__(self, own: Facets, flat: int, tolerance: float) -> None:
        self._own, self._flat, self._tolerance = own, flat, tolerance
        self._margin = arrange.INSIDE * tolerance
        sides = sides_of(own.rows[own.flat.label == flat])
        rim = own.vertices[sides.pairs[sides.count[sides.group] % 2 == 1]]
        self._frame = frame_of(own.planes[0][flat], own.planes[1][flat], rim)
        self._triangles = np.flatnonzero(own.flat.label[own.owner] == flat)
        self._inner = self._frame.local(own.corners[self._triangles])[..., :2]
        self._rim = self._frame.local(rim)[..., :2]
        self._box = box_of(self._rim.reshape(-1, 2))

    def scraps(self, bodies: list[Facets], touch: Touch) -> list[Scrap]:
        """Scraps that the triangles near the face cut it into, one if they leave it whole."""
        corners = np.stack([bodies[b].corners[t] for b, t in zip(*touch, strict=True)])
        local = self._frame.local(corners)
        flat = lies_in_plane(local, self._box, self._tolerance)
        cover = Cover(bodies, Touch(touch.body[flat], touch.triangle[flat]), self._frame)
        lines = np.concatenate([crossings(local[~flat], self._tolerance), cover.rims()])
        cells = self._cells(lines)
        return self._cut(cells, cover) if len(cells) else [self._uncut(cover)]

    def _cells(self, lines: np.ndarray) -> list[arrange.Cell]:
        """Cells that lines cut the face into, none if they only run along its rim or outside."""
        lines = clipped_segments(lines, self._box, self._tolerance)
        if len(self._inner) == 1:
            lines = lines[~outside_of(lines, self._rim, self._tolerance)]
        if len(lines) == 0:
            return []
        network = arrange.joined(self._rim, lines, self._tolerance)
        cells = arrange.cells_of(network, self._tolerance) if len(network.other) else []
        points = np.array([cell.point for cell in cells]).reshape(-1, 2)
        inner = np.any(arrange.covered_by(points, self._inner, self._margin), axis=1)
        return [cell for cell, is_inner in zip(cells, inner.tolist(), strict=True) if is_inner]

    def _uncut(self, cover: Cover) -> Scrap:
        point = self._frame.local(self._whole.point)[:2]
        return replace(self._whole, meets=cover.flags(point[None], self._margin)[0])

    @property
    def _whole(self) -> Scrap:
        """The face as one scrap, whatever it meets."""
        whole = whole_scrap(self._own, self._triangles, 0)
        return replace(whole, flat=self._flat, normal=self._frame.axes[2])

    def _cut(self, cells: list[arrange.Cell], cover: Cover) -> list[Scrap]:
        base = replace(self._whole, rows=np.empty(0, dtype=np.int64))
        flags = cover.flags(np.array([cell.point for cell in cells]), self._margin)
        return [
            replace(
                base,
                corners=self._frame.lift(cell.corners),
                point=self._frame.lift(cell.point),
                area=cell.area,
                meets=meets,
            )
            for cell, meets in zip(cells, flags, strict=True)
        ]
