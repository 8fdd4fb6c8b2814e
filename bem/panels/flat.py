"""Panels on flat faces: the starting mesh, and refinement by halving."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from bem.geometry.flat_faces import FLATNESS
from bem.geometry.planes import NO_PLANES, Planes
from bem.panels.arrangement import trapezoids
from bem.panels.facing import FacingTable, Walls
from bem.panels.planar import Patch
from bem.panels.rims import Rims
from bem.panels.split import mean_sides, split, split_sides

MANY_PIECES = 400
"""Above this many pieces triangles are fine enough to start from as they are."""
FEW_PIECES = 150
"""Up to this many pieces each is divided at least 2 x 2 before the first round."""
SLENDER = 20.0
"""Triangles with a larger aspect ratio are not divided into three quadrilaterals."""
GRADE_STOP = 1.5
GRADE_PART = 0.25
"""Panels at a rim with gap w are cut at max(GRADE_PART h, w) while h exceeds GRADE_STOP w."""


@dataclass(frozen=True)
class Pieces:
    """Convex quadrilaterals of the starting mesh.

    Args:
        corners: (n, 4, 3).
        owner: (n,) part that each belongs to.
        gap: (n, 4) gap that the charge feels at each side, infinite inside a face.
        feature: (n,) size of the flat face that each lies on.
        sagitta: (n,) how far off it the smooth surface is that it may stand for.
    """

    corners: np.ndarray
    owner: np.ndarray
    gap: np.ndarray
    feature: np.ndarray
    sagitta: np.ndarray


@dataclass(frozen=True)
class FlatFamily:
    """Panels on flat faces.

    Args:
        corners: (n, 4, 3), planar and convex; a triangle repeats its last corner.
        owner: (n,) part that each belongs to.
        feature: (n,) size of the flat face that each lies on.
        sagitta: (n,) mean distance from it, outward, of the smooth surface that the flat face
            may stand for.
        rim: (n, 4) the same, within the face, of the curve that each side may stand for.
    """

    corners: np.ndarray
    owner: np.ndarray
    feature: np.ndarray
    sagitta: np.ndarray
    rim: np.ndarray

    @classmethod
    def start(
        cls,
        patches: list[Patch],
        planes: Planes = NO_PLANES,
        rims: Sequence[Rims] = (),
        coincidence: float = 0.0,
    ) -> FlatFamily:
        """Starting mesh that knows outlines, and gaps to other bodies and to images.

        Args:
            patches: flat faces of all parts.
            planes: grounded and mirror planes.
            rims: stretches of free rims that may stand for curves.
            coincidence: faces nearer to each other than this touch.
        """
        pieces = _pieces(patches, FacingTable.of(patches, planes, coincidence))
        if len(pieces.corners) <= MANY_PIECES:
            pieces = _three_quads(pieces)
        if len(pieces.corners) <= FEW_PIECES:
            pieces = _subdivide(pieces)
        pieces = _grade(pieces)
        rim = np.zeros((len(pieces.corners), 4))
        for curved in rims:
            here = np.flatnonzero(pieces.owner == curved.part)
            rim[here] = curved.beyond(pieces.corners[here])
        return cls(pieces.corners, pieces.owner, pieces.feature, pieces.sagitta, rim)

    def beyond_rims(self) -> tuple[np.ndarray, np.ndarray]:
        """Area (n,) over that of each panel beyond its sides on curved rims, and its width there.

        The width is across the side on the rim, the first if there are two, and 0 without one.
        """
        step = np.roll(self.corners, -1, axis=1) - self.corners
        length, area = np.linalg.norm(step, axis=2), _areas(self.corners)
        side = np.argmax(self.rim != 0.0, axis=1)
        rows = np.arange(len(side))
        reach = self.corners - self.corners[rows, side][:, None]
        off = np.linalg.norm(np.cross(reach, step[rows, side][:, None]), axis=2).max(axis=1)
        width = np.where(self.rim.any(axis=1), off / length[rows, side], 0.0)
        return (self.rim * length).sum(axis=1) / area, width

    def refine(self, marked: np.ndarray, across: np.ndarray) -> tuple[FlatFamily, np.ndarray]:
        """Halve marked panels, ``across`` 0 or 1 each.

        Returns:
            The new family, whose first panels are the unchanged ones, and their old indices.
        """
        kept = np.flatnonzero(~marked)
        near, rest = split(self.corners[marked], across[marked], np.full(marked.sum(), 0.5))
        order = np.concatenate([kept, np.flatnonzero(marked), np.flatnonzero(marked)])
        corners = np.concatenate([self.corners[kept], near, rest])
        rim = np.concatenate([self.rim[kept], *split_sides(self.rim[marked], across[marked], 0.0)])
        owner, feature, sagitta = (x[order] for x in (self.owner, self.feature, self.sagitta))
        return FlatFamily(corners, owner, feature, sagitta, rim), kept


def _pieces(patches: list[Patch], table: FacingTable) -> Pieces:
    corners, owner, gaps, feature, sagitta = [], [], [], [], []
    for k, patch in enumerate(patches):
        walls = table.walls(k)
        for piece in _patch_pieces(patch, walls):
            corners.append(patch.lift(piece))
            owner.append(patch.owner.part)
            gaps.append(_side_gaps(piece, walls, FLATNESS * patch.size))
            feature.append(patch.size)
            sagitta.append(patch.sagitta)
    return Pieces(
        np.array(corners).reshape(-1, 4, 3),
        np.array(owner, dtype=int),
        np.array(gaps).reshape(-1, 4),
        np.array(feature),
        np.array(sagitta),
    )


def _patch_pieces(patch: Patch, walls: Walls) -> list[np.ndarray]:
    """Convex pieces (4, 2) of a patch, as few as a look in several directions finds."""
    alone = bool(walls.outline.all())
    if alone and len(patch.faces) == 1:
        return [_turn_to_needle(patch.faces[0])]
    if alone and len(walls.ends) == 4:
        ring = _convex_ring(walls.ends)
        if ring is not None:
            return [ring]
    best = min((_swept(walls, angle, patch.size) for angle in _angles(walls)), key=len)
    if alone and len(best) > len(patch.faces):
        return [_turn_to_needle(face) for face in patch.faces]
    return best


def _convex_ring(ends: np.ndarray) -> np.ndarray | None:
    """Corners (4, 2) of four edges in order, if they bound a convex quadrilateral."""
    points = np.unique(ends.reshape(-1, 2).round(14), axis=0)
    if len(points) != 4:
        return None
    center = points.mean(axis=0)
    ring = points[np.argsort(np.arctan2(*(points - center).T[::-1]))]
    step = np.roll(ring, -1, axis=0) - ring
    after = np.roll(step, -1, axis=0)
    turn = step[:, 0] * after[:, 1] - step[:, 1] * after[:, 0]
    return ring if np.all(turn > 0.0) else None


def _angles(walls: Walls) -> list[float]:
    """Up to four directions of walls, modulo a right angle, by their total length."""
    step = walls.ends[:, 1] - walls.ends[:, 0]
    length = np.linalg.norm(step, axis=1)
    angle = np.mod(np.arctan2(step[:, 1], step[:, 0]) + 1e-7, np.pi / 2) - 1e-7
    key = np.round(angle, 5)
    values, group = np.unique(key, return_inverse=True)
    total = np.bincount(group.ravel(), length)
    chosen = [int(np.flatnonzero(group.ravel() == g)[0]) for g in np.argsort(-total)[:4]]
    first = [float(angle[k]) for k in chosen]
    return first + [a + np.pi / 2 for a in first]


def _swept(walls: Walls, angle: float, size: float) -> list[np.ndarray]:
    c, s = np.cos(angle), np.sin(angle)
    turn = np.array([[c, s], [-s, c]])
    pieces = trapezoids(walls.ends @ turn.T, walls.outline, FLATNESS * size)
    return [_apex_last(piece, FLATNESS * size) @ turn for piece in pieces]


def _apex_last(piece: np.ndarray, tolerance: float) -> np.ndarray:
    """Corners in an order that ends with the repeated one, if the piece is a triangle."""
    side = np.linalg.norm(np.roll(piece, -1, axis=0) - piece, axis=1)
    k = int(np.argmin(side))
    if side[k] > tolerance:
        return piece
    turned = np.roll(piece, 2 - k, axis=0)
    turned[3] = turned[2]
    return turned


def _turn_to_needle(face: np.ndarray) -> np.ndarray:
    """Corner order that puts the shortest side of a triangle first, its apex last."""
    if not np.array_equal(face[2], face[3]):
        return face
    side = np.linalg.norm(face[[1, 2, 0]] - face[[0, 1, 2]], axis=1)
    k = int(np.argmin(side))
    return face[[k, (k + 1) % 3, (k + 2) % 3, (k + 2) % 3]]


def _side_gaps(piece: np.ndarray, walls: Walls, tolerance: float) -> np.ndarray:
    """(4,) smallest gap of the walls that each side of a piece lies on."""
    gaps = np.full(4, np.inf)
    active = np.isfinite(walls.gap)
    if not active.any():
        return gaps
    ends, gap = walls.ends[active], walls.gap[active]
    step = ends[:, 1] - ends[:, 0]
    length = np.linalg.norm(step, axis=1)
    along = step / length[:, None]
    for k in range(4):
        side = piece[[k, (k + 1) % 4]] - ends[:, None, 0]
        t = np.einsum("esc,ec->es", side, along)
        off = np.abs(side[..., 0] * along[:, None, 1] - side[..., 1] * along[:, None, 0]).max(
            axis=1
        )
        shared = np.minimum(t.max(axis=1), length) - np.maximum(t.min(axis=1), 0.0)
        on = (
            (off <= 2.0 * tolerance)
            & (shared > 1e-3 * np.ptp(t, axis=1))
            & (np.ptp(t, axis=1) > tolerance)
        )
        gaps[k] = gap[on].min(initial=np.inf)
    return gaps


def _three_quads(pieces: Pieces) -> Pieces:
    """Compact triangles become three quadrilaterals: corner, midpoint, centroid, midpoint."""
    c = pieces.corners
    side = np.linalg.norm(np.roll(c, -1, axis=1) - c, axis=2)
    scale = side.max(axis=1)
    doubled = side < 1e-9 * scale[:, None]
    triangle = doubled.any(axis=1)
    height = 2.0 * _areas(c) / scale
    compact = triangle & (scale < SLENDER * height)
    same = pieces.owner, pieces.feature, pieces.sagitta
    parts = [(c[~compact], pieces.gap[~compact], *(x[~compact] for x in same))]
    keep = np.array([np.flatnonzero(~row) for row in doubled[compact]], dtype=int).reshape(-1, 3)
    tri = np.take_along_axis(c[compact], keep[:, :, None], axis=1)
    gap = np.take_along_axis(pieces.gap[compact], keep, axis=1)
    middle = tri.mean(axis=1)
    for k in range(3):
        after, before = tri[:, (k + 1) % 3], tri[:, (k + 2) % 3]
        quad = np.stack(
            [tri[:, k], 0.5 * (tri[:, k] + after), middle, 0.5 * (tri[:, k] + before)], axis=1
        )
        inner = np.full(len(tri), np.inf)
        flags = np.stack([gap[:, k], inner, inner, gap[:, (k + 2) % 3]], axis=1)
        parts.append((quad, flags, *(x[compact] for x in same)))
    corners, gaps, *rest = (np.concatenate(column) for column in zip(*parts, strict=True))
    return Pieces(corners, rest[0], gaps, *rest[1:])


def _areas(corners: np.ndarray) -> np.ndarray:
    cross = np.cross(corners[:, 2] - corners[:, 0], corners[:, 3] - corners[:, 1])
    return 0.5 * np.linalg.norm(cross, axis=1)


def _apply(pieces: Pieces, cut: np.ndarray, across: np.ndarray, part: np.ndarray) -> Pieces:
    """Cut the pieces of index ``cut``; new sides feel no gap."""
    near, rest = split(pieces.corners[cut], across, part)
    gaps = split_sides(pieces.gap[cut], across, np.inf)
    stay = np.ones(len(pieces.corners), dtype=bool)
    stay[cut] = False
    order = np.concatenate([np.flatnonzero(stay), cut, cut])
    return Pieces(
        np.concatenate([pieces.corners[stay], near, rest]),
        pieces.owner[order],
        np.concatenate([pieces.gap[stay], *gaps]),
        pieces.feature[order],
        pieces.sagitta[order],
    )


def _subdivide(pieces: Pieces) -> Pieces:
    """At least two panels in each direction; long pieces more, up to eight."""
    for across in (0, 1):
        sides = mean_sides(pieces.corners)
        ratio = sides[:, across] / sides[:, 1 - across]
        for limit in (0.0, 8.0, 16.0):
            cut = np.flatnonzero(ratio > limit)
            if len(cut) == 0:
                break
            pieces = _apply(pieces, cut, np.full(len(cut), across), np.full(len(cut), 0.5))
            stay = np.ones(len(ratio), dtype=bool)
            stay[cut] = False
            ratio = np.concatenate([ratio[stay], ratio[cut], ratio[cut]])
    return pieces


def _grade(pieces: Pieces) -> Pieces:
    """Cut toward every side that feels a gap, until panels there are as small as the gap."""
    while True:
        depth = mean_sides(pieces.corners)[:, [1, 0, 1, 0]]
        ratio = depth / pieces.gap
        side = ratio.argmax(axis=1)
        cut = np.flatnonzero(ratio.max(axis=1) > GRADE_STOP)
        if len(cut) == 0:
            return pieces
        side = side[cut]
        part = np.maximum(GRADE_PART, 1.0 / ratio[cut, side])
        part = np.where((side == 1) | (side == 2), 1.0 - part, part)
        pieces = _apply(pieces, cut, np.where(side % 2 == 0, 1, 0), part)
