"""Panels that follow one smooth surface of revolution and refine towards it.

The parameters (u, s) of the surface are cut into leaves, rectangles that are halved in u or
in s in any pattern (an anisotropic quadtree). A leaf is one panel: the four points at its
corners lie in one plane. Where neighbours are cut finer, their corners hang on its sides;
then the leaf becomes triangles over all points on its outline. Every side of a panel is
therefore a side of exactly one other panel (or lies on a free rim): there are no cracks.

Leaves are cut further until few points hang, and only where they do no harm:

* at most one on a side;
* not on two opposite sides, nor opposite to a pole or a free rim: there halving the leaf
  costs no more panels than triangles would, and adds no further hanging point;
* not where the point bulges out of the straight side by more than a part of the leaf's
  width: the triangles would stand on edge (Schwarz 1880).
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from typing import NamedTuple

import numpy as np

from bem.geometry.revolved import Revolution
from bem.panels.edges import edge_turns, square_over_mean

BULGE = 0.25
"""Largest distance of a hanging point from its straight side, in widths of the leaf."""
MOST_ALONG = 16
"""Largest number of leaves along one piece of the profile in the starting mesh."""
LARGEST_BEND = np.pi / 3.0
"""Largest angle of an arc along the profile that a leaf of the starting mesh covers."""
FEWEST_AROUND, MOST_AROUND = 8, 32
"""Range of the number of leaves around in a starting mesh that chooses it."""
FEWEST_JOINED = 16
"""The fewest where other surfaces go on, whose panels need not have their corners here."""
ALIKE = 6
"""Decimals of the logarithm to which two triangulations count as equally good."""

BOTTOM, RIGHT, TOP, LEFT = range(4)
U0, U1, S0, S1 = range(4)
POLE_BELOW, POLE_ABOVE = 16, 32
"""Bits of a leaf's pattern beside 1, 2, 4, 8 for a point hanging on side 0, 1, 2, 3."""

_GAUSS_X, _GAUSS_W = np.polynomial.legendre.leggauss(3)
_NODES, _WEIGHTS = 0.5 * (_GAUSS_X + 1.0), 0.5 * _GAUSS_W


@dataclass(frozen=True, eq=False)
class Grid:
    """Integer parameters of the surface: leaves have exact corners, however small.

    Args:
        surface: what the panels follow.
        around: leaves around the whole axis in the starting mesh.
        cells: (K,) leaves along each piece of the profile in the starting mesh.
    """

    surface: Revolution
    around: int
    cells: np.ndarray

    @property
    def unit(self) -> int:
        """Steps per starting leaf in each direction: as many as a 62-bit key has room for."""
        room = 62 - self.around.bit_length() - int(self.cells.sum() + 1).bit_length()
        return 1 << (room // 2)

    @property
    def period(self) -> int:
        """Steps around the axis."""
        return self.around * self.unit

    @property
    def height(self) -> int:
        """Steps along the profile."""
        return int(self.cells.sum()) * self.unit

    def key(self, u: np.ndarray, s: np.ndarray) -> np.ndarray:
        """One integer per point; equal where the surface closes on itself."""
        along = s % self.height if self.surface.loops else s
        return (u % self.period) * (self.height + 1) + along

    def along(self, s: np.ndarray) -> np.ndarray:
        """Profile parameters of integer ones."""
        ends = np.cumsum(self.cells) * self.unit
        piece = np.minimum(np.searchsorted(ends, s, side="right"), len(ends) - 1)
        steps = self.cells[piece] * self.unit
        return piece + (s - (ends[piece] - steps)) / steps

    def points(self, nodes: np.ndarray) -> np.ndarray:
        """(..., 3) points at integer parameters (..., 2)."""
        u, s = np.moveaxis(nodes, -1, 0)
        return self.surface.point((u % self.period) / self.period, self.along(s))

    def normals(self, nodes: np.ndarray) -> np.ndarray:
        """(..., 3) unit normals at integer parameters (..., 2)."""
        u, s = np.moveaxis(nodes, -1, 0)
        return self.surface.normal((u % self.period) / self.period, self.along(s))


@dataclass(frozen=True, eq=False)
class Leaves:
    """Rectangles in the integer parameters.

    Args:
        box: (n, 4) u0, u1, s0, s1.
        origin: (n,) index before the last refinement of a leaf left as it was, or -1.
    """

    box: np.ndarray
    origin: np.ndarray

    def halved(self, cut: np.ndarray) -> Leaves:
        """Leaves cut where ``cut`` (n, 2) says, in u and in s; those left alone come first."""
        in_u = self._halved(cut[:, 0], U0)
        stay, gone = cut[~cut[:, 0], 1], cut[cut[:, 0], 1]
        return in_u._halved(np.concatenate([stay, gone, gone]), S0)

    def _halved(self, cut: np.ndarray, low: int) -> Leaves:
        first, second = self.box[cut], self.box[cut]
        middle = (first[:, low] + first[:, low + 1]) // 2
        first[:, low + 1] = middle
        second[:, low] = middle
        fresh = np.full(2 * len(first), -1)
        return Leaves(
            np.concatenate([self.box[~cut], first, second]),
            np.concatenate([self.origin[~cut], fresh]),
        )


class Side(NamedTuple):
    """Nodes (n, 2) on a side of each leaf, counterclockwise from its first corner."""

    first: np.ndarray
    quarter: np.ndarray
    middle: np.ndarray
    three_quarters: np.ndarray
    last: np.ndarray


def _side(box: np.ndarray, side: int) -> Side:
    corners = box[:, [[U0, S0], [U1, S0], [U1, S1], [U0, S1]]]
    first, last = corners[:, side], corners[:, (side + 1) % 4]
    quarter = (last - first) // 4
    return Side(first, first + quarter, (first + last) // 2, last - quarter, last)


@dataclass(frozen=True, eq=False)
class Outline:
    """What hangs on the sides of each leaf.

    Args:
        once: (n, 4) a corner of a neighbour lies amid the side.
        more: (n, 4) there are further ones.
        free: (n, 4) the side has no neighbour: it is a pole or a free rim.
    """

    once: np.ndarray
    more: np.ndarray
    free: np.ndarray

    @classmethod
    def of(cls, grid: Grid, box: np.ndarray) -> Outline:
        """Look for the corners of all leaves on the sides of each."""
        sides = [_side(box, k) for k in range(4)]
        known = np.unique(np.concatenate([_keys(grid, side.first) for side in sides]))
        once = np.stack([_among(known, _keys(grid, side.middle)) for side in sides], axis=1)
        more = np.zeros_like(once)
        for k, side in enumerate(sides):
            near = np.flatnonzero(once[:, k])
            for nodes in (side.quarter, side.three_quarters):
                more[near, k] |= _among(known, _keys(grid, nodes[near]))
        free = np.zeros_like(once)
        if not grid.surface.loops:
            free[:, BOTTOM] = box[:, S0] == 0
            free[:, TOP] = box[:, S1] == grid.height
        return cls(once, more, free)

    def crowded(self) -> np.ndarray:
        """(n, 2): whether a leaf must be halved in u, and in s, for the points on its sides."""
        taken = self.once | self.free
        low, high = taken[:, [BOTTOM, LEFT]], taken[:, [TOP, RIGHT]]
        some = self.once[:, [BOTTOM, LEFT]] | self.once[:, [TOP, RIGHT]]
        more = self.more[:, [BOTTOM, LEFT]] | self.more[:, [TOP, RIGHT]]
        return (low & high & some) | more

    def pattern(self, grid: Grid) -> np.ndarray:
        """(n,) bits that tell how a leaf is made into panels."""
        below, above = grid.surface.poles
        bits = self.once @ np.array([1, 2, 4, 8])
        return (
            bits
            + POLE_BELOW * (below & self.free[:, BOTTOM])
            + POLE_ABOVE * (above & self.free[:, TOP])
        )


def _keys(grid: Grid, nodes: np.ndarray) -> np.ndarray:
    return grid.key(nodes[:, 0], nodes[:, 1])


def _among(known: np.ndarray, keys: np.ndarray) -> np.ndarray:
    """Whether each key is in the sorted array ``known``."""
    place = np.minimum(np.searchsorted(known, keys), len(known) - 1)
    return known[place] == keys


def _bulging(grid: Grid, box: np.ndarray, once: np.ndarray) -> np.ndarray:
    """(n, 2): whether a leaf must be halved in u, and in s, as a point bulges too far out."""
    cut = np.zeros((len(box), 2), dtype=bool)
    for k in range(4):
        here = np.flatnonzero(once[:, k])
        side, opposite = _side(box[here], k), _side(box[here], (k + 2) % 4)
        nodes = np.stack([side.middle, side.first, side.last, opposite.first, opposite.last])
        hanging, *ends = grid.points(nodes)
        middle, beyond = 0.5 * (ends[0] + ends[1]), 0.5 * (ends[2] + ends[3])
        bulge = np.linalg.norm(hanging - middle, axis=1)
        cut[here, k % 2] |= bulge > BULGE * np.linalg.norm(beyond - middle, axis=1)
    return cut


def _settled(grid: Grid, leaves: Leaves) -> tuple[Leaves, np.ndarray]:
    """Leaves halved until the points on their sides are few and harmless, and their patterns."""
    while True:
        outline = Outline.of(grid, leaves.box)
        cut = outline.crowded()
        rest = np.flatnonzero(outline.once.any(axis=1) & ~cut.any(axis=1))
        cut[rest] = _bulging(grid, leaves.box[rest], outline.once[rest])
        if not cut.any():
            return leaves, outline.pattern(grid)
        leaves = leaves.halved(cut)


_RING = np.array([[0, 0], [1, 0], [2, 0], [2, 1], [2, 2], [1, 2], [0, 2], [0, 1]])
"""Corners and side midpoints of a leaf in half widths, counterclockwise."""

_AT_POLE = {
    POLE_BELOW: [(4, 6, 0, 2)],
    POLE_BELOW + 2: [(3, 6, 0, 2), (4, 6, 3, 3)],
    POLE_BELOW + 8: [(4, 7, 0, 2), (4, 6, 7, 7)],
    POLE_ABOVE: [(0, 2, 4, 6)],
    POLE_ABOVE + 2: [(0, 3, 4, 6), (0, 2, 3, 3)],
    POLE_ABOVE + 8: [(7, 2, 4, 6), (0, 2, 7, 7)],
}
"""Panels of leaves at a pole, as indices into the ring; the pole is the last two."""


@lru_cache
def _ways(pattern: int) -> np.ndarray:
    """(c, m, 4) indices into the ring: c ways to make a leaf of some pattern into m panels.

    Side 0-1 of a panel runs mostly along u, side 1-2 along s; a pole comes last.
    """
    if pattern == 0:
        return np.array([[(0, 2, 4, 6)]])
    if pattern in _AT_POLE:
        return np.array([_AT_POLE[pattern]])
    used = [k for k in range(8) if k % 2 == 0 or pattern >> (k // 2) & 1]
    ways = [way for way in _triangulations(used) if all(map(_has_area, way))]
    return np.array([[_turned_to_u(triangle) for triangle in way] for way in ways])


def _triangulations(ring: list[int]) -> list[list[tuple[int, int, int]]]:
    """All triangulations of a convex polygon."""
    if len(ring) < 3:
        return [[]]
    return [
        [(ring[0], ring[k], ring[-1]), *before, *after]
        for k in range(1, len(ring) - 1)
        for before in _triangulations(ring[: k + 1])
        for after in _triangulations(ring[k:])
    ]


def _has_area(triangle: tuple[int, int, int]) -> bool:
    nodes = _RING[list(triangle)]
    return bool(np.all(np.ptp(nodes, axis=0) > 0))


def _turned_to_u(triangle: tuple[int, int, int]) -> tuple[int, int, int, int]:
    """Begin a triangle at the side that runs most along u, and repeat its last corner."""
    a, b, c = max(
        (triangle[k:] + triangle[:k] for k in range(3)),
        key=lambda abc: _leaning(*_RING[list(abc)]),
    )
    return a, b, c, c


def _leaning(a: np.ndarray, b: np.ndarray, c: np.ndarray) -> int:
    first, second = np.abs(b - a), np.abs(c - b)
    return int(first[0] * second[1] - first[1] * second[0])


def _tiled(grid: Grid, box: np.ndarray, pattern: int) -> np.ndarray:
    """(n, m, 4, 2) integer parameters of the panels of leaves of one pattern."""
    ways = _ways(pattern)
    half = np.stack([box[:, U1] - box[:, U0], box[:, S1] - box[:, S0]], axis=1) // 2
    ring = box[:, None, [U0, S0]] + half[:, None, :] * _RING
    if len(ways) == 1:
        return ring[:, ways[0]]
    quality = _quality(grid.points(ring)[:, ways[..., :3]])
    best = np.argmax(np.round(quality.min(axis=2), ALIKE), axis=1)
    return ring[np.arange(len(box))[:, None, None], ways[best]]


def _quality(triangles: np.ndarray) -> np.ndarray:
    """Logarithm of the sine of the smallest angle of triangles (..., 3, 3)."""
    sides = np.roll(triangles, -1, axis=-2) - triangles
    length = np.sort(np.linalg.norm(sides, axis=-1), axis=-1)
    twice_area = np.linalg.norm(np.cross(sides[..., 0, :], sides[..., 1, :]), axis=-1)
    return np.log(twice_area / (length[..., 1] * length[..., 2]))


def _nodes(grid: Grid, box: np.ndarray, pattern: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Integer parameters (n, 4, 2) of the panels of leaves, and the leaf (n,) of each."""
    nodes, leaf = [np.zeros((0, 4, 2), dtype=np.int64)], [np.zeros(0, dtype=np.int64)]
    for kind in np.unique(pattern):
        here = np.flatnonzero(pattern == kind)
        tiled = _tiled(grid, box[here], int(kind))
        nodes.append(tiled.reshape(-1, 4, 2))
        leaf.append(np.repeat(here, tiled.shape[1]))
    return np.concatenate(nodes), np.concatenate(leaf)


class Panels(NamedTuple):
    """Panels with their distance from the true surface; the fields are those of the family."""

    corners: np.ndarray
    offset: np.ndarray
    rim_offset: np.ndarray
    rim_width: np.ndarray
    crowding: np.ndarray

    def joined(self, other: Panels) -> Panels:
        """Panels of both, the other's last."""
        return Panels(*(np.concatenate(pair) for pair in zip(self, other, strict=True)))

    def taken(self, which: np.ndarray) -> Panels:
        """Only the panels that ``which`` selects."""
        return Panels(*(field[which] for field in self))


def _measured(grid: Grid, nodes: np.ndarray) -> Panels:
    corners = grid.points(nodes)
    parameters = np.stack([nodes[..., 0] / grid.period, grid.along(nodes[..., 1])], axis=-1)
    diagonals = corners[:, 2] - corners[:, 0], corners[:, 3] - corners[:, 1]
    normal = 0.5 * np.cross(*diagonals)
    area = np.linalg.norm(normal, axis=1)
    volume = _swept_volume(grid.surface, parameters, corners)
    beyond, width = np.zeros(len(area)), np.zeros(len(area))
    for first, last in ((0, 1), (2, 3)):
        at = np.flatnonzero(_on_free_rim(grid, nodes[:, first], nodes[:, last]))
        chord = Chord(parameters[at][:, [first, last]], corners[at][:, [first, last]])
        unit = normal[at] / area[at, None]
        beyond[at] = _area_beyond(grid.surface, chord, unit) / area[at]
        width[at] = _reach(chord, corners[at])
    return Panels(corners, volume / area, beyond, width, _crowding(grid, nodes))


def _crowding(grid: Grid, nodes: np.ndarray) -> np.ndarray:
    """(n,) mean square over squared mean of the density on solids, by the edges beside panels."""
    at_edge = square_over_mean(edge_turns(grid.surface)) - 1.0
    levels = np.append(0, np.cumsum(grid.cells)) * grid.unit
    crowding = np.ones(len(nodes))
    for first, last in ((0, 1), (2, 3)):
        (u, s), (v, t) = nodes[:, first].T, nodes[:, last].T
        edge = np.minimum(np.searchsorted(levels, s), grid.surface.pieces)
        crowding += np.where((s == t) & (u != v) & (levels[edge] == s), at_edge[edge], 0.0)
    return crowding


def _bilinear() -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    """Shape functions (g, 4) of the square, their derivatives, and weights (g,) at Gauss points."""
    a, b = (x.ravel() for x in np.meshgrid(_NODES, _NODES, indexing="ij"))
    shape = np.stack([(1 - a) * (1 - b), a * (1 - b), a * b, (1 - a) * b], axis=1)
    by_a = np.stack([b - 1, 1 - b, b, -b], axis=1)
    by_b = np.stack([a - 1, -a, a, 1 - a], axis=1)
    return shape, by_a, by_b, np.outer(_WEIGHTS, _WEIGHTS).ravel()


def _swept_volume(surface: Revolution, parameters: np.ndarray, corners: np.ndarray) -> np.ndarray:
    """(n,) volume that panels sweep on the straight way y = p + t d, d = x - p, to the surface.

    p and the parameters of x are bilinear between the corners, so that neighbours agree on
    their common side and the volumes add up to what lies between panels and surface. With
    the derivatives by the two directions of the square, a and b, it is

        integral of d . (p_a x p_b + (p_a x d_b + d_a x p_b)/2 + d_a x d_b/3) da db
    """
    shape, by_a, by_b, weights = _bilinear()
    p, p_a, p_b = (f @ corners for f in (shape, by_a, by_b))
    at, at_a, at_b = (f @ parameters for f in (shape, by_a, by_b))
    x = surface.frame(at[..., 0], at[..., 1])
    d = x.point - p
    d_a = x.by_u * at_a[..., :1] + x.by_s * at_a[..., 1:] - p_a
    d_b = x.by_u * at_b[..., :1] + x.by_s * at_b[..., 1:] - p_b
    swept = np.cross(p_a, p_b + 0.5 * d_b) + np.cross(d_a, 0.5 * p_b + d_b / 3.0)
    return np.einsum("g,ngi,ngi->n", weights, d, swept)


class Chord(NamedTuple):
    """Sides of panels on a free rim: parameters (n, 2, 2) and points (n, 2, 3) of their ends."""

    parameters: np.ndarray
    ends: np.ndarray


def _on_free_rim(grid: Grid, first: np.ndarray, last: np.ndarray) -> np.ndarray:
    at_start, at_end = grid.surface.free_rims
    s, t = first[:, 1], last[:, 1]
    on_rim = (at_start & (s == 0) & (t == 0)) | (at_end & (s == grid.height) & (t == grid.height))
    return on_rim & (first[:, 0] != last[:, 0])


def _area_beyond(surface: Revolution, chord: Chord, normal: np.ndarray) -> np.ndarray:
    """(n,) area between chord and rim, seen along the panel's unit normal; outside positive."""
    shape = np.stack([1.0 - _NODES, _NODES], axis=1)
    at, p = shape @ chord.parameters, shape @ chord.ends
    p_a = (chord.ends[:, 1] - chord.ends[:, 0])[:, None]
    x = surface.frame(at[..., 0], at[..., 1])
    x_a = x.by_u * (chord.parameters[:, 1] - chord.parameters[:, 0])[:, None, :1]
    outward = np.cross(0.5 * (p_a + x_a), normal[:, None])
    return np.einsum("g,ngi,ngi->n", _WEIGHTS, x.point - p, outward)


def _reach(chord: Chord, corners: np.ndarray) -> np.ndarray:
    """(n,) largest distance of a panel's corners from a chord's line."""
    along = chord.ends[:, 1] - chord.ends[:, 0]
    off = np.cross(corners - chord.ends[:, :1], along[:, None])
    return np.linalg.norm(off, axis=2).max(axis=1) / np.linalg.norm(along, axis=1)


@dataclass(frozen=True, eq=False)
class CurvedFamily:
    """Panels on one surface of revolution; refining gives a new family.

    Lengths are in the unit of the surface.

    Args:
        corners: (n, 4, 3) planar and convex, counterclockwise seen from the side that the
            surface's normal points to; a triangle repeats its last corner. Side 0-1 runs
            mostly around the axis, side 1-2 mostly along the profile.
        offset: (n,) mean distance of the true surface from the panel: the volume between
            them over the panel's area, positive where the surface's normal points away.
        rim_offset: (n,) for a panel with a side on a curved free rim, the area between that
            side and the rim over the panel's area, positive if the sheet extends beyond the
            panel; 0 for all others.
        rim_width: (n,) width of such a panel across its side on the rim; 0 for all others.
        crowding: (n,) mean square over squared mean of the density if the surface bounds a solid:
            1, but for panels with a side on a sharp edge.
        grid: parameters of the surface.
        box: (l, 4) the leaves.
        pattern: (l,) what hangs on their sides.
        leaf: (n,) leaf of each panel.
    """

    corners: np.ndarray
    offset: np.ndarray
    rim_offset: np.ndarray
    rim_width: np.ndarray
    crowding: np.ndarray
    grid: Grid
    box: np.ndarray
    pattern: np.ndarray
    leaf: np.ndarray

    @classmethod
    def start(
        cls,
        surface: Revolution,
        around: int | None = None,
        along: tuple[int, ...] | None = None,
    ) -> CurvedFamily:
        """Coarse mesh: leaves about as long as wide, two or more on every piece.

        Args:
            surface: what the panels follow.
            around: leaves around the axis, 3 or more; by default 8, more on slender rings.
            along: leaves along each piece of the profile, 2 or more.
        """
        chosen_around, chosen_along = _start_counts(surface, around)
        cells = np.array(chosen_along if along is None else along)
        grid = Grid(surface, chosen_around, cells)
        columns = round(surface.turn * grid.around)
        i, j = (x.ravel() for x in np.indices((columns, int(cells.sum()))))
        box = np.stack([i, i + 1, j, j + 1], axis=1) * grid.unit
        leaves, pattern = _settled(grid, Leaves(box, np.full(len(box), -1)))
        nodes, leaf = _nodes(grid, leaves.box, pattern)
        return cls(*_measured(grid, nodes), grid, leaves.box, pattern, leaf)

    @property
    def bulges_around(self) -> np.ndarray:
        """(n,) whether a panel leaves the surface more around the axis than along the profile."""
        low, high = self.box[:, [U0, S0]], self.box[:, [U1, S1]]
        bulge = []
        for k in (0, 1):
            first, last = (low + high) // 2, (low + high) // 2
            first[:, k] = (3 * low[:, k] + high[:, k]) // 4
            last[:, k] = (low[:, k] + 3 * high[:, k]) // 4
            step = self.grid.points(last) - self.grid.points(first)
            turn = self.grid.normals(last) - self.grid.normals(first)
            bulge.append(np.linalg.norm(step, axis=1) * np.linalg.norm(turn, axis=1))
        return (bulge[0] >= bulge[1])[self.leaf]

    def refine(self, marked: np.ndarray, along: np.ndarray) -> tuple[CurvedFamily, np.ndarray]:
        """Halve the leaves of marked panels, and of neighbours where that is needed.

        A leaf that cannot be told from its halves any more, about 1e-8 of a starting leaf,
        stays as it is.

        Args:
            marked: (n,) bool.
            along: (n,) 0 to cut the panel's side 0-1, 1 to cut its side 1-2.

        Returns:
            The new family, whose first panels are the unchanged ones, and their old indices.
        """
        cut = np.zeros((len(self.box), 2), dtype=bool)
        cut[self.leaf[marked], np.asarray(along)[marked]] = True
        cut &= self.box[:, [U1, S1]] - self.box[:, [U0, S0]] >= 4
        untouched = Leaves(self.box, np.arange(len(self.box)))
        leaves, pattern = _settled(self.grid, untouched.halved(cut))
        old = leaves.origin
        same = (old >= 0) & (pattern == self.pattern[old])
        now = np.full(len(self.box), -1)
        now[old[same]] = np.flatnonzero(same)
        kept = np.flatnonzero(now[self.leaf] >= 0)
        fresh = np.flatnonzero(~same)
        nodes, owner = _nodes(self.grid, leaves.box[fresh], pattern[fresh])
        mine = Panels(self.corners, self.offset, self.rim_offset, self.rim_width, self.crowding)
        panels = mine.taken(kept).joined(_measured(self.grid, nodes))
        leaf = np.concatenate([now[self.leaf[kept]], fresh[owner]])
        return CurvedFamily(*panels, self.grid, leaves.box, pattern, leaf), kept

    def on(self, surface: Revolution) -> CurvedFamily:
        """The same panels in the same order, by their parameters, on another surface.

        Args:
            surface: its profile has as many pieces, and the same poles and rims.
        """
        nodes, leaf = _nodes(self.grid, self.box, self.pattern)
        order = np.empty(len(leaf), dtype=np.int64)
        order[np.argsort(self.leaf, kind="stable")] = np.argsort(leaf, kind="stable")
        grid = Grid(surface, self.grid.around, self.grid.cells)
        panels = _measured(grid, nodes[order])
        return CurvedFamily(*panels, grid, self.box, self.pattern, self.leaf)


def _start_counts(surface: Revolution, around: int | None) -> tuple[int, tuple[int, ...]]:
    """Leaves around, and along each piece, that make the leaves about as long as wide."""
    s = np.linspace(0.0, 1.0, 17) + np.arange(surface.pieces)[:, None]
    points = surface.point(np.arange(24) / 24.0, s[..., None])
    rings = np.linalg.norm(np.roll(points, -1, axis=2) - points, axis=3).sum(axis=2).max(axis=1)
    lengths = np.linalg.norm(np.diff(points, axis=1), axis=3).sum(axis=1).mean(axis=1)
    if around is None:
        around = FEWEST_JOINED if any(surface.joined) else FEWEST_AROUND
        while around < MOST_AROUND and 4.0 * around * lengths.sum() < rings.max():
            around *= 2
    bends = np.array([piece.bend for piece in surface.profile])
    fewest = np.full(surface.pieces, 2.0)
    # A plane of symmetry may have cut a piece in half.
    fewest[[0, -1]] = np.where(surface.cut, 1.0, 2.0)
    least = np.maximum(fewest, np.ceil(bends / LARGEST_BEND - 1e-9))
    counts = np.clip(np.round(lengths * around / rings), least, MOST_ALONG)
    return around, tuple(counts.astype(int).tolist())
