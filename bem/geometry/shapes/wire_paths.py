"""The middle line of a wire: straight parts, and arcs or sharp corners between them."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from bem.errors import UsageError
from bem.geometry.shapes import values as need

STRAIGHT = 1e-9
"""Turns below this, radians, are no corners; as near to a half turn, the path goes back."""
ROOM = 1e-9
"""Bends may overlap by this part of the straight between them, which is rounding."""


@dataclass(frozen=True)
class Corner:
    """A corner of the path, rounded with an arc or sharp.

    Args:
        name: what messages call it.
        point: (3,) where the straight parts would meet.
        before: (3,) unit direction of the straight part that leads there.
        after: (3,) unit direction of the next one.
        bend_radius: of the arc; 0 for a sharp corner.
    """

    name: str
    point: np.ndarray
    before: np.ndarray
    after: np.ndarray
    bend_radius: float

    @property
    def axis(self) -> np.ndarray:
        """(3,) unit direction that the path turns about."""
        across = np.cross(self.before, self.after)
        return across / np.linalg.norm(across)

    @property
    def turn(self) -> float:
        """Angle between the straight parts, radians."""
        return turn_between(self.before, self.after)

    @property
    def reach(self) -> float:
        """Length of each straight part that the arc takes the place of."""
        return self.bend_radius * math.tan(0.5 * self.turn)

    @property
    def begin(self) -> np.ndarray:
        """(3,) where the arc begins."""
        return self.point - self.reach * self.before

    @property
    def inward(self) -> np.ndarray:
        """(3,) unit direction from ``begin`` to the centre of the arc."""
        return np.cross(self.axis, self.before)

    @property
    def centre(self) -> np.ndarray:
        """(3,) centre of the arc."""
        return self.begin + self.bend_radius * self.inward

    def rotation(self, angle: float) -> np.ndarray:
        """(3, 3): turns by ``angle`` about the axis of the corner (Rodrigues 1840)."""
        x, y, z = self.axis
        across = np.array([[0.0, -z, y], [z, 0.0, -x], [-y, x, 0.0]])
        sine, rest = math.sin(angle), 2.0 * math.sin(0.5 * angle) ** 2
        return np.eye(3) + sine * across + rest * (across @ across)


@dataclass(frozen=True)
class Path:
    """The middle line of a wire.

    Args:
        start: (3,) where it starts; half-way to the first corner if it loops.
        end: (3,) where it ends; the start if it loops.
        corners: in their order.
        loops: whether it is a closed loop.
    """

    start: np.ndarray
    end: np.ndarray
    corners: tuple[Corner, ...]
    loops: bool

    @property
    def direction(self) -> np.ndarray:
        """(3,) unit direction at the start."""
        first = self.corners[0].point if self.corners else self.end
        return _unit(first - self.start)

    @property
    def last_direction(self) -> np.ndarray:
        """(3,) unit direction at the end."""
        return self.corners[-1].after if self.corners else self.direction

    @property
    def first_axes(self) -> np.ndarray:
        """(2, 3) unit directions across the start, which make a right-handed set with its own.

        The second is that about which the path turns first, or that nearest to z.
        """
        along = self.direction
        if self.corners:
            up = self.corners[0].axis
        else:
            upright = np.array([0.0, 0.0, 1.0] if abs(along[2]) < 1.0 - STRAIGHT else [1.0, 0.0, 0])
            up = _unit(upright - (upright @ along) * along)
        return np.stack([np.cross(up, along), up])


def path_of(path: Sequence[Sequence[float]], bend_radius: float) -> Path:
    """Path through points, all its corners rounded alike.

    Args:
        path: points (x, y, z); if the last one is the first again, the path is a loop.
        bend_radius: of the arcs; 0 leaves sharp corners.

    Raises:
        UsageError: fewer than two points, one twice in a row, the path turns straight back,
            or arcs do not fit between their neighbours.
    """
    names, points = _points(path)
    loops = len(points) > 2 and bool(np.array_equal(points[0], points[-1]))
    steps = np.diff(points, axis=0)
    ahead = steps / np.linalg.norm(steps, axis=1)[:, None]
    corners = [
        Corner(names[k], points[k], ahead[k - 1], ahead[k % len(ahead)], bend_radius)
        for k in range(1, len(points) - (not loops))
    ]
    bent = tuple(corner for corner in corners if _turns(corner))
    _check_room(points, bent, loops)
    start = 0.5 * (bent[-1].point + bent[0].point) if loops else points[0]
    return Path(start, start if loops else points[-1], bent, loops)


def check_apart(path: Path, half: float) -> None:
    """Refuse a path that comes back to within a wire's width of itself.

    Args:
        path: middle line.
        half: half the width of the wire.

    Raises:
        UsageError: it does; the message names the place.
    """
    from scipy.spatial import cKDTree

    points, way = _sampled(path, 0.5 * half)
    near = cKDTree(points).query_pairs(2.0 * half * (1.0 + ROOM), output_type="ndarray")
    between = np.abs(way[near[:, 0]] - way[near[:, 1]])
    if path.loops:
        between = np.minimum(between, way[-1] - between)
    # In the tightest bend, half a turn lies between places a width apart.
    back = near[between > math.pi * half * (1.0 + ROOM)]
    if len(back):
        x, y, z = points[back[0, 0]]
        raise UsageError(
            f"path: the wire meets itself near ({x:.4g}, {y:.4g}, {z:.4g}); keep its parts apart"
        )


def _sampled(path: Path, step: float) -> tuple[np.ndarray, np.ndarray]:
    """Points (n, 3) of the path, no more than ``step`` apart, and the way (n,) to each."""
    stops = [path.start]
    for corner in path.corners:
        count = math.ceil(corner.turn * corner.bend_radius / step) + 1
        from_centre = corner.begin - corner.centre
        angles = corner.turn * np.arange(count + 1) / count
        stops += [corner.centre + corner.rotation(angle) @ from_centre for angle in angles]
    stops.append(path.end)
    lengths = np.linalg.norm(np.diff(stops, axis=0), axis=1)
    way = np.append(0.0, np.cumsum(lengths))
    at = [np.arange(n) / n for n in np.ceil(lengths / step).clip(1.0).astype(int)]
    fine = np.append(np.concatenate([k + part for k, part in enumerate(at)]), len(lengths))
    knots = np.arange(len(stops))
    columns = [np.interp(fine, knots, column) for column in np.array(stops).T]
    return np.stack(columns, axis=1), np.interp(fine, knots, way)


def turn_between(before: np.ndarray, after: np.ndarray) -> float:
    """Angle between two directions (3,), radians."""
    return math.atan2(float(np.linalg.norm(np.cross(before, after))), float(before @ after))


def _unit(vector: np.ndarray) -> np.ndarray:
    return vector / np.linalg.norm(vector)


def _points(path: Sequence[Sequence[float]]) -> tuple[list[str], np.ndarray]:
    listed = [] if isinstance(path, str) or not hasattr(path, "__iter__") else list(path)
    if len(listed) < 2:
        raise UsageError(f"path: found {len(listed)} points; give at least two")
    names = [f"path point {k}" for k in range(1, len(listed) + 1)]
    points = np.array([need.point(name, at) for name, at in zip(names, listed, strict=True)])
    for name, here, there in zip(names[1:], points[:-1], points[1:], strict=True):
        if np.array_equal(here, there):
            raise UsageError(f"{name}: found {tuple(there.tolist())} twice in a row; leave one out")
    return names, points


def _turns(corner: Corner) -> bool:
    if corner.turn > math.pi - STRAIGHT:
        raise UsageError(f"{corner.name}: the path goes straight back here; give it a way round")
    return corner.turn > STRAIGHT


def _check_room(points: np.ndarray, corners: tuple[Corner, ...], loops: bool) -> None:
    """Refuse arcs that need more of a straight part than there is."""
    stops = [corner.point for corner in corners]
    taken = [corner.reach for corner in corners]
    names = [corner.name for corner in corners]
    if loops:
        stops, taken, names = [*stops, stops[0]], [*taken, taken[0]], [*names, names[0]]
    else:
        stops, taken = [points[0], *stops, points[-1]], [0.0, *taken, 0.0]
        names = ["path point 1", *names, f"path point {len(points)}"]
    for k in range(len(stops) - 1):
        length, used = float(np.linalg.norm(stops[k + 1] - stops[k])), taken[k] + taken[k + 1]
        if used > length * (1.0 + ROOM):
            raise UsageError(
                f"bend_radius: the bends between {names[k]} and {names[k + 1]} take {used:.6g} of "
                f"a straight part of {length:.6g}; make it smaller, or move the points apart"
            )
