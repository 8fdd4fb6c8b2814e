"""Bodies made in Python: flat ones, and round ones that know their true surface.

All lengths are in the unit of the scene that the shape is put into. Round shapes carry an
ordinary faceting too, for checks and pictures; the solver follows the true surface instead.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from bem.errors import UsageError
from bem.geometry.revolved import Piece, Position, Revolution, Segment, arc_through
from bem.geometry.surface import NO_CORNER, Surface

AROUND = 48
"""Facets around the axis in the faceting of a round shape."""
SNAP = 1e-12
"""Profile points this near to the axis, or to the first point at the end, count as there;
relative to the largest coordinate."""

Point = tuple[float, float, float]


class ArcTo(NamedTuple):
    """A step of a profile: along a circle by way of ``via`` to ``to``, both (r, z)."""

    via: Position
    to: Position


def box(lx: float, ly: float, lz: float, center: Point = (0.0, 0.0, 0.0)) -> Surface:
    """Box with its edges along x, y and z.

    Args:
        lx: length along x.
        ly: length along y.
        lz: length along z.
        center: of the box.

    Raises:
        UsageError: a length is not positive and finite, or the center is not finite.
    """
    half = 0.5 * np.array([_length("lx", lx), _length("ly", ly), _length("lz", lz)])
    low_high = np.array([-half, half])
    vertices = [[low_high[i, 0], low_high[j, 1], low_high[k, 2]] for k, j, i in np.ndindex(2, 2, 2)]
    faces = [[0, 2, 3, 1], [4, 5, 7, 6], [0, 1, 5, 4], [2, 6, 7, 3], [0, 4, 6, 2], [1, 3, 7, 5]]
    return Surface(np.array(vertices) + _point("center", center), np.array(faces))


def plate(lx: float, ly: float, center: Point = (0.0, 0.0, 0.0)) -> Surface:
    """Rectangular sheet without thickness, parallel to the xy-plane.

    Args:
        lx: length along x.
        ly: length along y.
        center: of the rectangle.

    Raises:
        UsageError: a length is not positive and finite, or the center is not finite.
    """
    x, y = 0.5 * _length("lx", lx), 0.5 * _length("ly", ly)
    vertices = np.array([[-x, -y, 0.0], [x, -y, 0.0], [x, y, 0.0], [-x, y, 0.0]])
    return Surface(vertices + _point("center", center), np.array([[0, 1, 2, 3]]))


def disc(radius: float) -> Surface:
    """Round sheet without thickness in the xy-plane, centred at the origin.

    Raises:
        UsageError: the radius is not positive and finite.
    """
    return revolve([(0.0, 0.0), (_length("radius", radius), 0.0)])


def annulus(inner: float, outer: float) -> Surface:
    """Round sheet with a round hole, in the xy-plane, centred at the origin.

    Args:
        inner: radius of the hole.
        outer: radius of the sheet.

    Raises:
        UsageError: a radius is not positive and finite, or inner is not below outer.
    """
    inner, outer = _increasing("inner", inner, "outer", outer)
    return revolve([(inner, 0.0), (outer, 0.0)])


def tube(radius: float, length: float) -> Surface:
    """Side of a cylinder without its ends, a sheet, centred at the origin along z.

    Raises:
        UsageError: a length is not positive and finite.
    """
    r, z = _length("radius", radius), 0.5 * _length("length", length)
    return revolve([(r, -z), (r, z)])


def bowl(radius: float) -> Surface:
    """Lower half of a sphere about the origin, a sheet open upwards.

    Raises:
        UsageError: the radius is not positive and finite.
    """
    r = _length("radius", radius)
    return revolve([(0.0, -r), _quarter_up(r)])


def sphere(radius: float) -> Surface:
    """Sphere about the origin.

    Raises:
        UsageError: the radius is not positive and finite.
    """
    r = _length("radius", radius)
    return revolve([(0.0, -r), ArcTo((r, 0.0), (0.0, r))])


def spheroid(radius: float, half_length: float) -> Surface:
    """Spheroid about the origin: ``radius`` across, ``half_length`` along z.

    Raises:
        UsageError: a length is not positive and finite.
    """
    r, z = _length("radius", radius), _length("half_length", half_length)
    return _scaled_sphere(r, r, z)


def ellipsoid(a: float, b: float, c: float) -> Surface:
    """Ellipsoid about the origin with half-axes ``a``, ``b``, ``c`` along x, y, z.

    Raises:
        UsageError: a half-axis is not positive and finite.
    """
    return _scaled_sphere(_length("a", a), _length("b", b), _length("c", c))


def cylinder(radius: float, length: float) -> Surface:
    """Solid cylinder along z, centred at the origin.

    Raises:
        UsageError: a length is not positive and finite.
    """
    r, z = _length("radius", radius), 0.5 * _length("length", length)
    return revolve([(0.0, -z), (r, -z), (r, z), (0.0, z)])


def hemisphere(radius: float) -> Surface:
    """Solid half of a sphere: below the xy-plane, its flat face in it, about the origin.

    Raises:
        UsageError: the radius is not positive and finite.
    """
    r = _length("radius", radius)
    return revolve([(0.0, -r), _quarter_up(r), (0.0, 0.0)])


def torus(major: float, minor: float) -> Surface:
    """Ring about the z-axis, centred at the origin.

    Args:
        major: radius of the circle that the middle of the wire follows.
        minor: radius of the wire.

    Raises:
        UsageError: a radius is not positive and finite, or minor is not below major.
    """
    minor, major = _increasing("minor", minor, "major", major)
    inside, outside = (major - minor, 0.0), (major + minor, 0.0)
    below, above = (major, -minor), (major, minor)
    return revolve([outside, ArcTo(above, inside), ArcTo(below, outside)])


def revolve(steps: Sequence[Position | ArcTo], around: int = AROUND) -> Surface:
    """Surface of revolution about the z-axis from a profile of lines and arcs.

    A profile from axis to axis, or back to its first point, makes a closed body; any other
    an open sheet.

    Args:
        steps: the first is a point (r, z); each further one is a point, reached in a straight
            line, or an ``ArcTo``. Only the first and the last point may lie on the axis.
        around: facets around the axis in the faceting for checks and pictures.

    Raises:
        UsageError: the profile is too short, leaves r >= 0, touches the axis or itself on the
            way, or has a number that is not finite.
    """
    profile = _profile(steps)
    _check_axis(profile)
    parts = [_corners(piece, AROUND)[:-1] for piece in profile]
    outline = np.vstack([*parts, profile[-1].end])
    _check_crossing(outline)
    curve = Revolution(profile, np.eye(3), np.zeros(3))
    if not any(curve.free_rims) and _swept_volume(outline) < 0.0:
        backwards = tuple(piece.reversed() for piece in profile[::-1])
        curve = Revolution(backwards, np.eye(3), np.zeros(3))
    return _faceted(curve, around)


def _scaled_sphere(a: float, b: float, c: float) -> Surface:
    return sphere(1.0).placed(np.diag([a, b, c]), np.zeros(3))


def _quarter_up(r: float) -> ArcTo:
    return ArcTo((r * math.sqrt(0.5), -r * math.sqrt(0.5)), (r, 0.0))


def _length(name: str, value: float) -> float:
    size = _number(name, value)
    if size <= 0.0:
        raise UsageError(f"{name}: found {value!r}; a length must be positive and finite")
    return size


def _number(name: str, value: float) -> float:
    try:
        number = float(value)
    except (TypeError, ValueError):
        number = math.nan
    if not math.isfinite(number):
        raise UsageError(f"{name}: found {value!r}; give a finite number")
    return number


def _increasing(low: str, small: float, high: str, large: float) -> tuple[float, float]:
    small, large = _length(low, small), _length(high, large)
    if small >= large:
        raise UsageError(f"{low}: found {small!r}; it must be below {high}, which is {large!r}")
    return small, large


def _point(name: str, value: Point) -> np.ndarray:
    numbers = _numbers(name, value)
    if len(numbers) != 3:
        raise UsageError(f"{name}: found {value!r}; give three numbers (x, y, z)")
    return np.array(numbers)


def _position(name: str, value: Position) -> Position:
    numbers = _numbers(name, value)
    if len(numbers) != 2:
        raise UsageError(f"{name}: found {value!r}; give two numbers (r, z) or an ArcTo")
    return numbers[0], numbers[1]


def _numbers(name: str, value: Sequence[float]) -> list[float]:
    if isinstance(value, str) or not hasattr(value, "__iter__"):
        raise UsageError(f"{name}: found {value!r}; give its coordinates as a tuple of numbers")
    return [_number(name, x) for x in value]


def _profile(steps: Sequence[Position | ArcTo]) -> tuple[Piece, ...]:
    """Pieces from each step to the next, in the order given."""
    steps = list(steps) if hasattr(steps, "__iter__") else []
    if len(steps) < 2:
        raise UsageError(f"profile: found {len(steps)} points; give at least two")
    if isinstance(steps[0], ArcTo):
        raise UsageError("profile: the first step is an ArcTo; start with a point (r, z)")
    names = [f"profile point {k}" for k in range(1, len(steps) + 1)]
    vias = [_via(name, step) for name, step in zip(names, steps, strict=True)]
    stops = [_stop(name, step) for name, step in zip(names, steps, strict=True)]
    stops = _snapped(stops, SNAP * max(abs(x) for stop in stops for x in stop))
    for name, stop in zip(names, stops, strict=True):
        if stop[0] < 0.0:
            raise UsageError(f"{name}: found r = {stop[0]!r}; the profile must stay at r >= 0")
    return tuple(map(_piece, names[1:], stops[:-1], vias[1:], stops[1:]))


def _stop(name: str, step: Position | ArcTo) -> Position:
    return _position(name, step.to if isinstance(step, ArcTo) else step)


def _via(name: str, step: Position | ArcTo) -> Position | None:
    return _position(name, step.via) if isinstance(step, ArcTo) else None


def _snapped(stops: list[Position], tolerance: float) -> list[Position]:
    """Points almost on the axis put onto it, and a last one almost at the first put there."""
    stops = [(0.0 if abs(r) <= tolerance else r, z) for r, z in stops]
    if math.dist(stops[0], stops[-1]) <= tolerance:
        stops[-1] = stops[0]
    return stops


def _piece(name: str, here: Position, via: Position | None, there: Position) -> Piece:
    if there == here:
        raise UsageError(
            f"{name}: found {there!r} twice in a row; leave one out, or give a full circle as "
            f"two arcs"
        )
    if via is None:
        return Segment(here, there)
    arc = arc_through(here, via, there)
    if arc is None:
        raise UsageError(
            f"{name}: found an arc from {here!r} by {via!r} to {there!r}, which are in line; "
            f"give a straight step"
        )
    return arc


def _check_axis(profile: tuple[Piece, ...]) -> None:
    for number, piece in enumerate(profile[:-1], start=2):
        if piece.end[0] == 0.0:
            raise UsageError(
                f"profile point {number}: found on the axis (r = 0); only the first and the "
                f"last point may be there"
            )
    for number, piece in enumerate(profile, start=2):
        if piece.least_r <= 0.0:
            raise UsageError(
                f"profile point {number}: the way there reaches r = {piece.least_r:.4g}; the "
                f"profile must stay at r > 0 between its ends"
            )


def _check_crossing(outline: np.ndarray) -> None:
    """Refuse a profile whose outline touches itself other than where its ends meet."""
    a, b = outline[:-1], outline[1:]
    beside = _side(a[:, None], b[:, None], a) * _side(a[:, None], b[:, None], b) <= 0.0
    count = len(a)
    apart = np.subtract.outer(np.arange(count), np.arange(count)) > 1
    apart[-1, 0] &= not np.array_equal(outline[0], outline[-1])
    touching = beside & beside.T & apart & _boxes_meet(a, b)
    touching[range(1, count), range(count - 1)] = _turns_back(b - a)
    if touching.any():
        r, z = a[np.argwhere(touching)[0, 0]]
        raise UsageError(
            f"profile: found touching or crossing itself near r = {r:.4g}, z = {z:.4g}; "
            f"give an outline that does not"
        )


def _side(a: np.ndarray, b: np.ndarray, p: np.ndarray) -> np.ndarray:
    """Twice the signed area of a, b, p."""
    ab, ap = b - a, p - a
    return ab[..., 0] * ap[..., 1] - ab[..., 1] * ap[..., 0]


def _boxes_meet(a: np.ndarray, b: np.ndarray) -> np.ndarray:
    low, high = np.minimum(a, b), np.maximum(a, b)
    return np.all((low[:, None] <= high) & (low <= high[:, None]), axis=-1)


def _turns_back(steps: np.ndarray) -> np.ndarray:
    """Whether each step after the first retraces the one before."""
    before, after = steps[:-1], steps[1:]
    onward = np.sum(before * after, axis=1)
    aside = before[:, 0] * after[:, 1] - before[:, 1] * after[:, 0]
    return (onward < 0.0) & (np.abs(aside) <= 1e-9 * np.abs(onward))


def _swept_volume(outline: np.ndarray) -> float:
    """Volume inside, positive if the outline has the body on its left (by Pappus)."""
    r = outline[:, 0]
    dz = np.diff(outline[:, 1])
    return float(np.sum(dz * (r[:-1] ** 2 + r[:-1] * r[1:] + r[1:] ** 2)) * math.pi / 3.0)


def _corners(piece: Piece, around: int) -> np.ndarray:
    """(m, 2): the ends of a piece, and for an arc points between as dense as ``around``."""
    count = max(1, math.ceil(around * piece.bend / (2.0 * math.pi) - 1e-9))
    return piece.at(np.arange(count + 1) / count)


def _levels(curve: Revolution, around: int) -> np.ndarray:
    """Parameters s of the rings of vertices."""
    levels = [0.0]
    for k, piece in enumerate(curve.profile):
        count = len(_corners(piece, around)) - 1
        levels += [k + j / count for j in range(1, count + 1)]
    return np.array(levels)


def _faceted(curve: Revolution, around: int) -> Surface:
    if not isinstance(around, int) or around < 3:
        raise UsageError(f"around: found {around!r}; give a whole number of facets, 3 or more")
    levels = _levels(curve, around)
    rings = np.arange(len(levels) * around).reshape(len(levels), around)
    if curve.loops:
        rings[-1] = rings[0]
    for end, on_axis in zip((0, -1), curve.poles, strict=True):
        if on_axis:
            rings[end] = rings[end, 0]
    used, index = np.unique(rings, return_inverse=True)
    points = curve.point(np.arange(around) / around, levels[:, None]).reshape(-1, 3)
    return Surface(points[used], _between(index.reshape(rings.shape)), curve)


def _between(rings: np.ndarray) -> np.ndarray:
    """(f, 4) faces between neighbouring rings of vertices, triangles at a pole."""
    low, high = rings[:-1], rings[1:]
    next_low, next_high = np.roll(low, -1, axis=1), np.roll(high, -1, axis=1)
    faces = np.stack([low, next_low, next_high, high], axis=-1).reshape(-1, 4)
    from_pole = faces[:, 0] == faces[:, 1]
    faces[from_pole] = faces[from_pole][:, [1, 2, 3, 3]]
    faces[faces[:, 2] == faces[:, 3], 3] = NO_CORNER
    return faces
