"""Wires: a round or square section led along a path, its corners rounded or mitred.

The section keeps its turn from each straight part to the next (no twist), so that every facet
is flat and every corner of a facet lies on the true surface.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from typing import NamedTuple

import numpy as np

from bem.errors import UsageError
from bem.geometry.shapes import values as need
from bem.geometry.shapes.round import Point, cylinder
from bem.geometry.shapes.wire_paths import Corner, Path, check_apart, path_of
from bem.geometry.surface import NO_CORNER, Surface

AROUND = 24
"""Facets around a bent round wire: with 16 the fit to a tight bend may be in doubt by 0.1 %."""
STEP = math.radians(15.0)
"""Largest angle between neighbouring sections in a bend."""
GROWTH = 2.0
"""Facets of a straight part grow by this from its ends to its middle."""
LONGEST = 12.0
"""Longest facet of a straight part, in widths."""
CLOSING = 1e-6
"""A loop closes if its sections come back as near as this part of the wire's size."""
SAME = 1e-9
"""Sections nearer than this part of the wire's size are one."""


class Section(NamedTuple):
    """Section of a wire.

    Args:
        corners: (n, 2) across the wire, counterclockwise seen against its direction.
        curved: whether they stand for a circle.
        size: radius of the largest circle inside.
    """

    corners: np.ndarray
    curved: bool
    size: float


def wire(
    path: Sequence[Point],
    radius: float | None = None,
    *,
    side: float | None = None,
    bend_radius: float = 0.0,
    around: int = AROUND,
) -> Surface:
    """Solid wire along a path, with flat ends.

    Args:
        path: points (x, y, z) of the middle line; if the last one is the first again, the wire
            is a closed loop.
        radius: of a round wire; or else
        side: of a square wire. Its sides lie in the plane of the first bend and across it; those
            of a straight wire lie level and upright.
        bend_radius: of the middle line at the corners of the path. It must be above half the
            width of the wire; 0 cuts the corners of a square wire to a sharp mitre.
        around: facets around a bent round wire, which is solved on a smooth surface fitted to
            them. A straight one knows its true surface.

    Raises:
        UsageError: the path is too short, turns back or comes too near to itself, a bend does
            not fit, or a number does not.
    """
    section = _section(radius, side, need.facets("around", around))
    middle = path_of(path, _bend_radius(bend_radius))
    if section.curved and not middle.corners:
        return _straight(middle, section.size)
    if section.curved and bend_radius <= section.size:
        raise UsageError(
            f"bend_radius: found {bend_radius!r}; a round wire with corners needs one above its "
            f"radius, which is {section.size:g}"
        )
    rings = _rings(middle, section)
    check_apart(middle, section.size)
    whole = _looped(rings) if middle.loops else _capped(rings, section.curved)
    return replace(whole, smooth=section.curved or bend_radius > 0.0)


def _section(radius: float | None, side: float | None, around: int) -> Section:
    if (radius is None) == (side is None):
        found = "neither" if radius is None else "both"
        raise UsageError(f"wire: found {found} of radius and side; give one of them")
    if radius is not None:
        r = need.length("radius", radius)
        angle = 2.0 * np.pi * np.arange(around) / around
        return Section(r * np.stack([np.cos(angle), np.sin(angle)], axis=1), True, r)
    assert side is not None
    half = 0.5 * need.length("side", side)
    corners = half * np.array([(1.0, 1.0), (-1.0, 1.0), (-1.0, -1.0), (1.0, -1.0)])
    return Section(corners, False, half)


def _straight(middle: Path, radius: float) -> Surface:
    start, end = middle.start, middle.end
    across, up = middle.first_axes
    along = np.cross(across, up)
    turn = np.stack([across, up, along], axis=1)
    return cylinder(radius, float(np.linalg.norm(end - start))).placed(turn, 0.5 * (start + end))


def _bend_radius(value: float) -> float:
    if need.number("bend_radius", value) < 0.0:
        raise UsageError(f"bend_radius: found {value!r}; a radius must not be negative")
    return float(value)


def _rings(middle: Path, section: Section) -> np.ndarray:
    """(m, n, 3): corners of the section along the path, from its start to its end."""
    offset = section.corners @ middle.first_axes
    rings = [middle.start + offset]
    for corner in middle.corners:
        bend = _bend(corner, offset) if corner.bend_radius else [_mitre(corner, offset)]
        rings += [*_between(rings[-1], bend[0], corner.before, section), *bend]
        offset = offset @ corner.rotation(corner.turn).T
    end = middle.end + offset
    rings += [*_between(rings[-1], end, middle.last_direction, section), end]
    apart = np.abs(np.diff(rings, axis=0)).max(axis=(1, 2)) > SAME * section.size
    return np.array(rings)[np.append(True, apart)]


def _between(
    here: np.ndarray, there: np.ndarray, along: np.ndarray, section: Section
) -> list[np.ndarray]:
    """Sections of a straight part, without its ends."""
    ahead = (there - here) @ along
    if ahead.min() < -SAME * section.size:
        raise UsageError(
            f"path: a straight part is {-ahead.min():.6g} too short for the corners at its ends; "
            f"move the points apart"
        )
    width = float(np.linalg.norm(section.corners[1] - section.corners[0]))
    parts = _graded(float(ahead.min()), width)
    return [here + part * (there - here) for part in parts]


def _graded(length: float, width: float) -> np.ndarray:
    """Parts of a length, in (0, 1), where facets of it end: small at its ends, longer amid."""
    if length <= width:
        return np.empty(0)
    steps = [width]
    while 2.0 * sum(steps) < length:
        steps.append(min(GROWTH * steps[-1], LONGEST * width))
    levels = np.cumsum([*steps, *steps[::-1]])
    return levels[:-1] / levels[-1]


def _bend(corner: Corner, offset: np.ndarray) -> list[np.ndarray]:
    """Sections of a bend, the first and the last included."""
    if (offset @ corner.inward).max() >= corner.bend_radius:
        raise UsageError(
            f"bend_radius: found {corner.bend_radius:g}; at {corner.name} the wire reaches "
            f"{(offset @ corner.inward).max():.6g} inwards, the bend must be wider"
        )
    count = math.ceil(corner.turn / STEP - 1e-9)
    from_centre = corner.begin + offset - corner.centre
    angles = corner.turn * np.arange(count + 1) / count
    return [corner.centre + from_centre @ corner.rotation(angle).T for angle in angles]


def _mitre(corner: Corner, offset: np.ndarray) -> np.ndarray:
    """Section in the plane half-way between both directions."""
    plane = corner.before + corner.after
    ahead = -(offset @ plane) / (corner.before @ plane)
    return corner.point + offset + ahead[:, None] * corner.before


def _capped(rings: np.ndarray, curved: bool) -> Surface:
    """Surface of open sections with a flat face at either end."""
    count, around = rings.shape[:2]
    index = np.arange(count * around).reshape(count, around)
    vertices, sides = rings.reshape(-1, 3), _walls(index)
    if not curved:
        return Surface(vertices, np.concatenate([sides, index[:1, ::-1], index[-1:]]))
    centres = rings[[0, -1]].mean(axis=1)
    ends = [_fan(index[0, ::-1], len(vertices)), _fan(index[-1], len(vertices) + 1)]
    return Surface(np.concatenate([vertices, centres]), np.concatenate([sides, *ends]))


def _looped(rings: np.ndarray) -> Surface:
    """Surface of sections that come back to the first one, maybe turned by some corners."""
    around, size = rings.shape[1], np.ptp(rings[0], axis=0).max()
    turned = [np.abs(np.roll(rings[-1], -k, axis=0) - rings[0]).max() for k in range(around)]
    shift = int(np.argmin(turned))
    if turned[shift] > CLOSING * size:
        raise UsageError(
            "path: found a loop that does not lie in a plane, in which the section comes back "
            "turned; leave a gap"
        )
    index = np.arange((len(rings) - 1) * around).reshape(-1, around)
    index = np.concatenate([index, np.roll(index[:1], shift, axis=1)])
    return Surface(rings[:-1].reshape(-1, 3), _walls(index))


def _walls(index: np.ndarray) -> np.ndarray:
    """(f, 4) faces outward between sections of vertices (m, n)."""
    low, high = index[:-1], index[1:]
    corners = [low, np.roll(low, -1, axis=1), np.roll(high, -1, axis=1), high]
    return np.stack(corners, axis=-1).reshape(-1, 4)


def _fan(rim: np.ndarray, centre: int) -> np.ndarray:
    """(n, 4) triangles from a rim of vertices (n,) to one in its middle."""
    middle, none = np.full(len(rim), centre), np.full(len(rim), NO_CORNER)
    return np.stack([rim, np.roll(rim, -1), middle, none], axis=1)
