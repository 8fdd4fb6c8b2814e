"""Flat regions given by an outline and holes, each of lines and arcs or a circle."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from itertools import combinations
from typing import Any, NamedTuple

import numpy as np

from bem.errors import UsageError
from bem.geometry.revolved import Segment
from bem.geometry.shapes import values as need
from bem.geometry.shapes.steps import (
    ArcTo,
    Step,
    Wording,
    check_crossing,
    meeting_place,
    pieces_between,
    polygon,
    read_steps,
)

AXES = ("x", "y")
AROUND = 24
"""Facets that a full circle is cut into: few and well shaped, as panels follow a fit to them."""

Hole = Sequence[Step] | Mapping[str, Any]
"""A hole: steps like those of an outline, or ``{"center": (x, y), "radius": r}``."""


class Contour(NamedTuple):
    """A closed polygon.

    Args:
        name: what messages call it.
        line: (n + 1, 2) corners, the first one again at the end; counterclockwise.
        curved: whether some of its sides stand for an arc.
    """

    name: str
    line: np.ndarray
    curved: bool


class Region(NamedTuple):
    """What lies inside an outline and outside its holes.

    Args:
        rims: (n, 2) corners each, the outline first; the region lies on the left of each.
        curved: whether some side stands for an arc.
        around: facets that a full circle is cut into.
    """

    rims: list[np.ndarray]
    curved: bool
    around: int

    @property
    def points(self) -> np.ndarray:
        """(v, 2): corners of all rims, one after the other."""
        return np.concatenate(self.rims)

    def triangles(self) -> np.ndarray:
        """(t, 3) counterclockwise, indices into ``points``; no further corners."""
        from manifold3d import triangulate

        return np.asarray(triangulate(self.rims), dtype=np.int64)

    def sides(self) -> np.ndarray:
        """(v, 2) indices into ``points``: from each corner to the next on its rim."""
        starts = np.cumsum([0, *map(len, self.rims[:-1])])
        rings = [start + np.arange(len(rim)) for start, rim in zip(starts, self.rims, strict=True)]
        return np.concatenate([np.stack([ring, np.roll(ring, -1)], axis=1) for ring in rings])


def region(outline: Sequence[Step], holes: Sequence[Hole], around: int) -> Region:
    """Region of an outline with holes.

    Args:
        outline: steps; a last point other than the first is joined to it by a straight line.
        holes: inside the outline, apart from each other.
        around: facets that a full circle is cut into; their corners lie on it.

    Raises:
        UsageError: an outline is too short or meets itself or another one, a hole does not lie
            inside, or a number is not finite.
    """
    need.facets("around", around)
    rim = _contour("outline", outline, around)
    found = [_hole(f"holes[{k}]", hole, around) for k, hole in enumerate(_listed(holes))]
    for hole in found:
        _check_inside(hole, rim)
    for one, other in combinations(found, 2):
        _check_apart(one, other)
    rims = [rim.line[:-1], *(hole.line[:0:-1] for hole in found)]
    return Region(rims, rim.curved or any(hole.curved for hole in found), around)


def _listed(holes: Any) -> list[Any]:
    if isinstance(holes, str | Mapping) or not hasattr(holes, "__iter__"):
        raise UsageError(f"holes: found {holes!r}; give a list of them")
    return list(holes)


def _hole(name: str, hole: Any, around: int) -> Contour:
    steps = _circle(name, hole) if isinstance(hole, Mapping) else hole
    return _contour(name, steps, around)


def _circle(name: str, hole: Mapping[str, Any]) -> list[Step]:
    if set(hole) != {"center", "radius"}:
        found = ", ".join(map(str, hole)) or "nothing"
        raise UsageError(f"{name}: found {found}; give center and radius, or a list of points")
    x, y = need.point(f"{name}.center", hole["center"], AXES).tolist()
    r = need.length(f"{name}.radius", hole["radius"])
    right, left = (x + r, y), (x - r, y)
    return [right, ArcTo((x, y + r), left), ArcTo((x, y - r), right)]


def _contour(name: str, steps: Sequence[Step], around: int) -> Contour:
    say = Wording(name, AXES)
    stops = read_steps(steps, say)
    first, last = stops.ends[0], stops.ends[-1]
    if np.hypot(*np.subtract(first, last)) <= stops.tolerance:
        pieces = pieces_between(stops._replace(ends=[*stops.ends[:-1], first]))
    else:
        pieces = (*pieces_between(stops), Segment(last, first))
    line = polygon(pieces, around)
    check_crossing(line, say)
    curved = any(piece.bend > 0.0 for piece in pieces)
    return Contour(name, line if _area(line) > 0.0 else line[::-1], curved)


def _area(line: np.ndarray) -> float:
    """Signed area inside, positive if it lies on the left."""
    x, y = (line - line[0]).T
    return 0.5 * float(np.sum(x[:-1] * y[1:] - x[1:] * y[:-1]))


def _check_inside(hole: Contour, rim: Contour) -> None:
    place = meeting_place(hole.line, rim.line)
    if place is None and not _encloses(rim.line, hole.line[0]):
        place = hole.line[0]
    if place is not None:
        raise UsageError(
            f"{hole.name}: reaches the outline or lies outside near {_at(place)}; keep it inside"
        )


def _check_apart(one: Contour, other: Contour) -> None:
    if np.any(one.line.max(axis=0) < other.line.min(axis=0)):
        return
    if np.any(other.line.max(axis=0) < one.line.min(axis=0)):
        return
    place = meeting_place(other.line, one.line)
    for inner, outer in ((one, other), (other, one)):
        if place is None and _encloses(outer.line, inner.line[0]):
            place = inner.line[0]
    if place is not None:
        raise UsageError(
            f"{other.name}: meets {one.name} near {_at(place)}; keep holes apart or join them"
        )


def _encloses(line: np.ndarray, point: np.ndarray) -> bool:
    """Whether a point that is on no side lies inside (crossings of a ray along x)."""
    (x, y), (a, b) = point, (line[:-1], line[1:])
    over = (a[:, 1] > y) != (b[:, 1] > y)
    a, b = a[over], b[over]
    cut = a[:, 0] + (y - a[:, 1]) / (b[:, 1] - a[:, 1]) * (b[:, 0] - a[:, 0])
    return bool(np.count_nonzero(cut > x) % 2)


def _at(place: np.ndarray) -> str:
    return f"x = {place[0]:.4g}, y = {place[1]:.4g}"
