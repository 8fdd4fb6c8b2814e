"""Bodies made in Python: flat ones, and round ones that know their true surface.

All lengths are in the unit of the scene that the shape is put into. Round shapes carry an
ordinary faceting too, for checks and pictures; the solver follows the true surface instead.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from bem.errors import UsageError
from bem.geometry.revolved import Piece, Revolution
from bem.geometry.shapes import values as need
from bem.geometry.shapes.outlines import AROUND as AROUND_HOLES
from bem.geometry.shapes.outlines import Hole
from bem.geometry.shapes.steps import (
    AROUND,
    ArcTo,
    Step,
    Wording,
    check_crossing,
    corners_of,
    pieces_between,
    polygon,
    read_steps,
)
from bem.geometry.surface import NO_CORNER, Surface

PROFILE = Wording("profile", ("r", "z"))

Point = tuple[float, float, float]


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
    half = 0.5 * np.array([need.length("lx", lx), need.length("ly", ly), need.length("lz", lz)])
    low_high = np.array([-half, half])
    vertices = [[low_high[i, 0], low_high[j, 1], low_high[k, 2]] for k, j, i in np.ndindex(2, 2, 2)]
    faces = [[0, 2, 3, 1], [4, 5, 7, 6], [0, 1, 5, 4], [2, 6, 7, 3], [0, 4, 6, 2], [1, 3, 7, 5]]
    return Surface(np.array(vertices) + need.point("center", center), np.array(faces))


def plate(
    lx: float,
    ly: float,
    center: Point = (0.0, 0.0, 0.0),
    holes: Sequence[Hole] = (),
    around: int = AROUND_HOLES,
) -> Surface:
    """Rectangular sheet without thickness, parallel to the xy-plane.

    Args:
        lx: length along x.
        ly: length along y.
        center: of the rectangle.
        holes: round ones as ``{"center": (x, y), "radius": r}``, others as points (x, y) and
            ``ArcTo`` steps, all counted from the center of the rectangle.
        around: facets that a full circle is cut into for the fit of round parts.

    Raises:
        UsageError: a length is not positive and finite, the center is not finite, or a hole
            does not lie inside or meets another one.
    """
    x, y = 0.5 * need.length("lx", lx), 0.5 * need.length("ly", ly)
    middle = need.point("center", center)
    rim = [(-x, -y), (x, -y), (x, y), (-x, y)]
    if holes:
        from bem.geometry.shapes.extrusions import sheet

        return sheet(rim, holes, around).placed(np.eye(3), middle)
    return Surface(np.array([(*at, 0.0) for at in rim]) + middle, np.array([[0, 1, 2, 3]]))


def disc(radius: float) -> Surface:
    """Round sheet without thickness in the xy-plane, centred at the origin.

    Raises:
        UsageError: the radius is not positive and finite.
    """
    return revolve([(0.0, 0.0), (need.length("radius", radius), 0.0)])


def annulus(inner: float, outer: float) -> Surface:
    """Round sheet with a round hole, in the xy-plane, centred at the origin.

    Args:
        inner: radius of the hole.
        outer: radius of the sheet.

    Raises:
        UsageError: a radius is not positive and finite, or inner is not below outer.
    """
    inner, outer = need.increasing("inner", inner, "outer", outer)
    return revolve([(inner, 0.0), (outer, 0.0)])


def tube(radius: float, length: float) -> Surface:
    """Side of a cylinder without its ends, a sheet, centred at the origin along z.

    Raises:
        UsageError: a length is not positive and finite.
    """
    r, z = need.length("radius", radius), 0.5 * need.length("length", length)
    return revolve([(r, -z), (r, z)])


def bowl(radius: float) -> Surface:
    """Lower half of a sphere about the origin, a sheet open upwards.

    Raises:
        UsageError: the radius is not positive and finite.
    """
    r = need.length("radius", radius)
    return revolve([(0.0, -r), _quarter_up(r)])


def sphere(radius: float) -> Surface:
    """Sphere about the origin.

    Raises:
        UsageError: the radius is not positive and finite.
    """
    r = need.length("radius", radius)
    return revolve([(0.0, -r), ArcTo((r, 0.0), (0.0, r))])


def spheroid(radius: float, half_length: float) -> Surface:
    """Spheroid about the origin: ``radius`` across, ``half_length`` along z.

    Raises:
        UsageError: a length is not positive and finite.
    """
    r, z = need.length("radius", radius), need.length("half_length", half_length)
    return _scaled_sphere(r, r, z)


def ellipsoid(a: float, b: float, c: float) -> Surface:
    """Ellipsoid about the origin with half-axes ``a``, ``b``, ``c`` along x, y, z.

    Raises:
        UsageError: a half-axis is not positive and finite.
    """
    return _scaled_sphere(need.length("a", a), need.length("b", b), need.length("c", c))


def cylinder(radius: float, length: float) -> Surface:
    """Solid cylinder along z, centred at the origin.

    Raises:
        UsageError: a length is not positive and finite.
    """
    r, z = need.length("radius", radius), 0.5 * need.length("length", length)
    return revolve([(0.0, -z), (r, -z), (r, z), (0.0, z)])


def hemisphere(radius: float) -> Surface:
    """Solid half of a sphere: below the xy-plane, its flat face in it, about the origin.

    Raises:
        UsageError: the radius is not positive and finite.
    """
    r = need.length("radius", radius)
    return revolve([(0.0, -r), _quarter_up(r), (0.0, 0.0)])


def torus(major: float, minor: float) -> Surface:
    """Ring about the z-axis, centred at the origin.

    Args:
        major: radius of the circle that the middle of the wire follows.
        minor: radius of the wire.

    Raises:
        UsageError: a radius is not positive and finite, or minor is not below major.
    """
    minor, major = need.increasing("minor", minor, "major", major)
    inside, outside = (major - minor, 0.0), (major + minor, 0.0)
    below, above = (major, -minor), (major, minor)
    return revolve([outside, ArcTo(above, inside), ArcTo(below, outside)])


def ring(
    major: float | None = None,
    minor: float | None = None,
    *,
    inner: float | None = None,
    outer: float | None = None,
    height: float | None = None,
) -> Surface:
    """Solid ring about the z-axis, centred at the origin, with round or rectangular section.

    Args:
        major: radius of the circle that the middle of a round wire follows, and
        minor: radius of that wire; or else
        inner: radius of the hole of a ring with rectangular section,
        outer: its outer radius, and
        height: its length along z.

    Raises:
        UsageError: neither set of arguments is complete, both are given, or a length does
            not fit.
    """
    wire = {"major": major, "minor": minor}
    bar = {"inner": inner, "outer": outer, "height": height}
    given = {key: size for key, size in (wire | bar).items() if size is not None}
    if given.keys() == wire.keys():
        return torus(given["major"], given["minor"])
    if given.keys() == bar.keys():
        return _washer(given["inner"], given["outer"], given["height"])
    found = ", ".join(given) or "no sizes"
    raise UsageError(f"ring: found {found}; give major and minor, or inner, outer and height")


def cone(radius: float, height: float, top_radius: float = 0.0) -> Surface:
    """Solid cone along z, its base at -height/2 and its tip, or flat top, at +height/2.

    Args:
        radius: of the base.
        height: length along z.
        top_radius: of the flat top of a truncated cone; 0 for a pointed one.

    Raises:
        UsageError: a length is not positive and finite, or top_radius is negative.
    """
    r, z = need.length("radius", radius), 0.5 * need.length("height", height)
    top = need.number("top_radius", top_radius)
    if top < 0.0:
        raise UsageError(f"top_radius: found {top_radius!r}; a radius must not be negative")
    side = [(0.0, -z), (r, -z), (top, z)]
    return revolve([*side, (0.0, z)] if top else side)


def revolve(steps: Sequence[Step], around: int = AROUND) -> Surface:
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
    outline = polygon(profile)
    check_crossing(outline, PROFILE)
    curve = Revolution(profile, np.eye(3), np.zeros(3))
    if not any(curve.free_rims) and _swept_volume(outline) < 0.0:
        backwards = tuple(piece.reversed() for piece in profile[::-1])
        curve = Revolution(backwards, np.eye(3), np.zeros(3))
    return faceted(curve, around)


def _scaled_sphere(a: float, b: float, c: float) -> Surface:
    return sphere(1.0).placed(np.diag([a, b, c]), np.zeros(3))


def _washer(inner: float, outer: float, height: float) -> Surface:
    low, high = need.increasing("inner", inner, "outer", outer)
    z = 0.5 * need.length("height", height)
    return revolve([(low, -z), (high, -z), (high, z), (low, z), (low, -z)])


def _quarter_up(r: float) -> ArcTo:
    return ArcTo((r * math.sqrt(0.5), -r * math.sqrt(0.5)), (r, 0.0))


def _profile(steps: Sequence[Step]) -> tuple[Piece, ...]:
    """Pieces from each step to the next, in the order given."""
    stops = read_steps(steps, PROFILE)
    tolerance = stops.tolerance
    ends = [(0.0 if abs(r) <= tolerance else r, z) for r, z in stops.ends]
    if math.dist(ends[0], ends[-1]) <= tolerance:
        ends[-1] = ends[0]
    for name, end in zip(stops.names, ends, strict=True):
        if end[0] < 0.0:
            raise UsageError(f"{name}: found r = {end[0]!r}; the profile must stay at r >= 0")
    return pieces_between(stops._replace(ends=ends))


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


def _swept_volume(outline: np.ndarray) -> float:
    """Volume inside, positive if the outline has the body on its left (by Pappus)."""
    r = outline[:, 0]
    dz = np.diff(outline[:, 1])
    return float(np.sum(dz * (r[:-1] ** 2 + r[:-1] * r[1:] + r[1:] ** 2)) * math.pi / 3.0)


def _levels(curve: Revolution, around: int) -> np.ndarray:
    """Parameters s of the rings of vertices."""
    levels = [0.0]
    for k, piece in enumerate(curve.profile):
        count = len(corners_of(piece, around)) - 1
        levels += [k + j / count for j in range(1, count + 1)]
    return np.array(levels)


def faceted(curve: Revolution, around: int) -> Surface:
    """Surface of revolution with facets whose corners lie on it.

    Args:
        curve: the true surface, which the result keeps.
        around: facets around the axis, and as dense along arcs of the profile.

    Raises:
        UsageError: ``around`` is no whole number from 3.
    """
    levels = _levels(curve, need.facets("around", around))
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
