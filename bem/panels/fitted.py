"""Panels on the smooth surface that the facets of a file seem to follow.

Panels are triangles whose corners lie on the patches of a fit (``geometry/fit/fit.py``), and each
remembers its facet and where on it its corners are. Refining cuts edges, and all panels at an
edge that is cut follow, so that no corner hangs: a closed body stays closed. A panel with an
obtuse corner is always cut through its longest side too, which keeps angles away from 180
degrees (Rivara 1984).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from bem.geometry.fit.fit import Fit
from bem.geometry.fit.patches import (
    Piece,
    area_beyond,
    basis,
    swept_volume,
    triangle_areas,
)
from bem.geometry.topology import edges_of

FEW = 100
"""A body of fewer facets starts with each cut in four."""
SHORTEST = 1e-9
"""Sides below this part of the body's size are not cut."""
COMPACT = 2.5
"""A panel whose sides differ by less than this factor is cut through one side, not two."""
OBTUSE = -0.5
"""Cosine of the largest angle that may be cut through another than its opposite side."""

_SIDE_01 = np.array([True, False, False])


class Net(NamedTuple):
    """Triangles on a fit that meet corner to corner.

    Args:
        points: (m, 3) corners of all.
        vertex: (n, 3) corners of each; side 01 is what direction 0 halves.
        facet: (n,) facet of the fit.
        at: (n, 3, 3) barycentric coordinates of the corners on it, one row each.
    """

    points: np.ndarray
    vertex: np.ndarray
    facet: np.ndarray
    at: np.ndarray

    @property
    def corners(self) -> np.ndarray:
        """(n, 3, 3)."""
        return self.points[self.vertex]

    def taken(self, which: np.ndarray) -> Net:
        """Only the triangles that ``which`` selects."""
        return Net(self.points, self.vertex[which], self.facet[which], self.at[which])


class Cuts(NamedTuple):
    """What is cut: whether (n, 3) on sides 01, 12, 20, and the new point (n, 3) on each, or -1."""

    here: np.ndarray
    point: np.ndarray


def _cut_edges(net: Net, wanted: np.ndarray, shortest: float) -> tuple[np.ndarray, np.ndarray]:
    """Edge (n, 3) on each side, and which (e,) are cut if the sides (n, 3) ``wanted`` are."""
    owner = edges_of(net.vertex).owner.reshape(-1, 3)
    length = _lengths(net.corners)
    longest = owner[np.arange(len(owner)), length.argmax(axis=1)]
    obtuse = _largest_cosine(length) < OBTUSE
    cut = np.zeros(int(owner.max()) + 1, dtype=bool)
    cut[owner[wanted & (length > shortest)]] = True
    while True:
        more = obtuse & cut[owner].any(axis=1) & ~cut[longest]
        if not more.any():
            return owner, cut
        cut[longest[more]] = True


def _largest_cosine(length: np.ndarray) -> np.ndarray:
    """(...) cosine of the angle opposite the longest of three sides (..., 3)."""
    a, b, c = np.moveaxis(np.sort(length, axis=-1), -1, 0)
    return (a * a + b * b - c * c) / (2.0 * a * b)


def _with_new_points(net: Net, fit: Fit, owner: np.ndarray, cut: np.ndarray) -> tuple[Net, Cuts]:
    """Add one point per cut edge, where the patch of one panel beside it has its middle."""
    place = np.full(len(cut), -1)
    place[cut] = len(net.points) + np.arange(int(cut.sum()))
    edges, first = np.unique(owner, return_index=True)
    panel, side = np.divmod(first[cut[edges]], 3)
    at = 0.5 * (net.at[panel, side] + net.at[panel, (side + 1) % 3])
    fresh = np.einsum("ek,eki->ei", basis(at), fit.net[net.facet[panel]])
    points = np.concatenate([net.points, fresh])
    return net._replace(points=points), Cuts(cut[owner], place[owner])


_HALVES = np.array([[[0, 3, 2], [3, 1, 2]]])
_THREE = np.array([[[3, 1, 4], [0, 3, 4], [0, 4, 2]], [[3, 1, 4], [0, 3, 2], [3, 4, 2]]])
_FOUR = np.array([[[0, 3, 5], [3, 1, 4], [5, 4, 2], [3, 4, 5]]])
"""Parts of a triangle by its corners 0, 1, 2 and the middles 3, 4, 5 of sides 01, 12, 20: cut on
side 01; on 01 and 12, in two ways; on all."""


def _parts(net: Net, cuts: Cuts) -> Net:
    """Triangles that the cut ones fall into."""
    parts = [net.taken(np.zeros(0, dtype=int))]
    many = cuts.here.sum(axis=1)
    for count, way in ((1, _HALVES), (2, _THREE), (3, _FOUR)):
        which = np.flatnonzero(many == count)
        turn = _first_cut(cuts.here[which])
        six, at = _six(net.taken(which), cuts.point[which], turn)
        chosen = _better(net.points[six]) if count == 2 else np.repeat(way, len(which), axis=0)
        rows = np.arange(len(which))[:, None, None]
        index, on = six[rows, chosen].reshape(-1, 3), at[rows, chosen].reshape(-1, 3, 3)
        parts.append(Net(net.points, index, np.repeat(net.facet[which], count + 1), on))
    index, facet, at = (np.concatenate([p[k] for p in parts]) for k in (1, 2, 3))
    return _ordered(Net(net.points, index, facet, at))


def _first_cut(here: np.ndarray) -> np.ndarray:
    """(n,) the corner to begin at, so that side 01 is cut, and 20 is not if any is not."""
    return np.argmax(here & ~np.roll(here, 1, axis=1), axis=1)


def _six(net: Net, middle: np.ndarray, turn: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Corners and middles of triangles begun at ``turn``: points (n, 6), coordinates (n, 6, 3)."""
    order = (turn[:, None] + np.arange(3)) % 3
    index, middle = (np.take_along_axis(x, order, axis=1) for x in (net.vertex, middle))
    at = np.take_along_axis(net.at, order[:, :, None], axis=1)
    halfway = 0.5 * (at + np.roll(at, -1, axis=1))
    return np.concatenate([index, middle], axis=1), np.concatenate([at, halfway], axis=1)


def _better(six: np.ndarray) -> np.ndarray:
    """(n, 3, 3) of both ways to make three triangles, the one whose worst angle is farther off."""
    cosine = [_largest_cosine(_lengths(six[:, way])).min(axis=1) for way in _THREE]
    return _THREE[(cosine[1] > cosine[0] + 1e-9).astype(int)]


def _lengths(corners: np.ndarray) -> np.ndarray:
    """(..., 3) lengths of the sides 01, 12, 20 of triangles (..., 3, 3)."""
    return np.linalg.norm(np.roll(corners, -1, axis=-2) - corners, axis=-1)


def _ordered(net: Net) -> Net:
    """Begin each triangle at its side of middle length.

    Of a thin one beside a crease, direction 1 then cuts both sides that lead away from it.
    """
    turn = np.argsort(_lengths(net.corners), axis=1, kind="stable")[:, 1]
    order = (turn[:, None] + np.arange(3)) % 3
    index = np.take_along_axis(net.vertex, order, axis=1)
    return Net(net.points, index, net.facet, np.take_along_axis(net.at, order[:, :, None], axis=1))


class Measures(NamedTuple):
    """Distances of panels from the fit, and of the fit from the truth; fields of the family."""

    offset: np.ndarray
    rim_offset: np.ndarray
    rim_width: np.ndarray
    doubt: np.ndarray
    rim_doubt: np.ndarray


def _measured(net: Net, fit: Fit) -> Measures:
    piece = Piece(fit.net[net.facet], net.at, net.corners)
    area = triangle_areas(piece.corners)
    beyond, width, doubt = np.zeros((3, len(area)))
    for side in range(3):
        at, mean = _on_rim(net, fit, side)
        part = Piece(*(field[at] for field in piece))
        length = _lengths(part.corners)[:, side]
        beyond[at] += area_beyond(part, side) / area[at]
        width[at] = 2.0 * area[at] / length
        doubt[at] += mean * length / area[at]
    return Measures(swept_volume(piece) / area, beyond, width, fit.doubt[net.facet], doubt)


def _on_rim(net: Net, fit: Fit, side: int) -> tuple[np.ndarray, np.ndarray]:
    """Panels whose side lies on a curved free rim, and how far the true rim may be from it."""
    ends = net.at[:, [side, (side + 1) % 3]]
    found, mean = [], []
    for k in range(3):
        sure = fit.rim_sagitta[net.facet, k] != 0.0
        here = np.flatnonzero(sure & (ends[:, :, (k + 2) % 3] == 0.0).all(axis=1))
        found.append(here)
        mean.append(fit.rim_doubt[net.facet[here], k])
    return np.concatenate(found), np.concatenate(mean)


@dataclass(frozen=True, eq=False)
class FittedFamily:
    """Panels on one fitted surface; refining gives a new family.

    Args:
        corners: (n, 4, 3), triangles that repeat their last corner, outward if closed.
        offset: (n,) mean distance of the fit from the panel, outward.
        rim_offset: (n,) for a panel with a side on a curved free rim, the area between that
            side and the rim over the panel's area, positive if the sheet extends beyond it.
        rim_width: (n,) width of such a panel across that side; 0 for all others.
        doubt: (n,) how far the true surface may be from the fit.
        rim_doubt: (n,) area over the panel's that the true rim may add or take.
        net: the triangles.
        fit: what they follow.
    """

    corners: np.ndarray
    offset: np.ndarray
    rim_offset: np.ndarray
    rim_width: np.ndarray
    doubt: np.ndarray
    rim_doubt: np.ndarray
    net: Net
    fit: Fit

    @classmethod
    def start(cls, fit: Fit) -> FittedFamily:
        """One panel per facet, or four where there are few."""
        corners = fit.facets.corners
        at = np.broadcast_to(np.eye(3), (len(corners), 3, 3))
        net = _ordered(Net(fit.facets.points, corners, np.arange(len(corners)), at))
        if len(corners) < FEW:
            net = _refined(net, fit, np.ones(corners.shape, dtype=bool))[0]
        return cls._of(net, fit)

    def placed(self, matrix: np.ndarray, shift: np.ndarray) -> FittedFamily:
        """The same panels with every point x moved to ``matrix @ x + shift``."""
        net = self.net._replace(points=self.net.points @ matrix.T + shift)
        if np.linalg.det(matrix) < 0.0:
            net = net._replace(vertex=net.vertex[:, [1, 0, 2]], at=net.at[:, [1, 0, 2]])
        return FittedFamily._of(net, self.fit.placed(matrix, shift))

    @classmethod
    def _of(cls, net: Net, fit: Fit) -> FittedFamily:
        return cls(net.corners[:, [0, 1, 2, 2]], *_measured(net, fit), net, fit)

    def refine(self, marked: np.ndarray, across: np.ndarray) -> tuple[FittedFamily, np.ndarray]:
        """Cut marked panels, and neighbours where that is needed.

        Args:
            marked: (n,) bool.
            across: (n,) 0 to cut side 01, 1 to cut both others.

        Returns:
            The new family, whose first panels are the unchanged ones, and their old indices.
        """
        net, kept = _refined(self.net, self.fit, marked[:, None] & _sides_of(self.net, across))
        return FittedFamily._of(net, self.fit), kept


def _sides_of(net: Net, across: np.ndarray) -> np.ndarray:
    """(n, 3) sides to cut for a direction: 01, or both others, of compact panels the longer."""
    length = _lengths(net.corners)
    compact = length.max(axis=1) < COMPACT * length.min(axis=1)
    first = np.asarray(across) == 0
    sides = np.where(first[:, None], _SIDE_01, ~_SIDE_01)
    second = length[:, 1] >= length[:, 2]
    sides[compact & ~first, 1] = second[compact & ~first]
    sides[compact & ~first, 2] = ~second[compact & ~first]
    return sides


def _refined(net: Net, fit: Fit, wanted: np.ndarray) -> tuple[Net, np.ndarray]:
    """Triangles after the sides (n, 3) that are wanted are cut, and the old ones kept, first."""
    owner, cut = _cut_edges(net, wanted, SHORTEST * fit.size)
    net, cuts = _with_new_points(net, fit, owner, cut)
    kept = np.flatnonzero(~cuts.here.any(axis=1))
    old, fresh = net.taken(kept), _parts(net, cuts)
    index, facet, at = (np.concatenate([old[k], fresh[k]]) for k in (1, 2, 3))
    return Net(net.points, index, facet, at), kept
