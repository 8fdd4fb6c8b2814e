"""Flat bodies meshed in several ways, in metres: regular, irregular, in slivers, of needles."""

from __future__ import annotations

import itertools

import numpy as np

from bem.geometry.surface import NO_CORNER, Surface

JITTER = 0.35
"""Part of a cell by which an irregular mesh moves its points at most."""

Counts = tuple[int, ...]
Sizes = tuple[float, ...]


def _triangles(quads: np.ndarray, random: np.random.Generator) -> np.ndarray:
    """Two triangles (as rows of ``Surface.faces``) for each quadrilateral, by either diagonal."""
    turn = random.integers(0, 2, len(quads))
    rolled = np.where(turn[:, None] == 1, np.roll(quads, -1, axis=1), quads)
    halves = np.concatenate([rolled[:, [0, 1, 2]], rolled[:, [0, 2, 3]]])
    return np.column_stack([halves, np.full(len(halves), NO_CORNER)])


def _lattice(counts: Counts, jitter: float, random: np.random.Generator) -> np.ndarray:
    """Points of a lattice in the unit square or cube; those on its boundary stay on it."""
    index = np.array(list(itertools.product(*(range(n + 1) for n in counts))), dtype=float)
    inside = (index > 0) & (index < np.array(counts))
    moved = index + inside * random.uniform(-jitter, jitter, index.shape)
    return moved / np.array(counts) - 0.5


def sheet(counts: Counts, sizes: Sizes = (1.0, 1.0), jitter: float = 0.0) -> Surface:
    """Rectangle in the xy-plane about the origin, of triangles.

    Args:
        counts: cells along x and y.
        sizes: lengths along x and y.
        jitter: ``JITTER`` for an irregular mesh.
    """
    random = np.random.default_rng(7)
    points = _lattice(counts, jitter, random) * np.array(sizes)
    number = np.arange(len(points)).reshape(counts[0] + 1, counts[1] + 1)
    quads = np.stack([number[:-1, :-1], number[1:, :-1], number[1:, 1:], number[:-1, 1:]], axis=-1)
    vertices = np.column_stack([points, np.zeros(len(points))])
    return Surface(vertices, _triangles(quads.reshape(-1, 4), random))


def block(counts: Counts, sizes: Sizes = (1.0, 1.0, 1.0), jitter: float = 0.0) -> Surface:
    """Box about the origin, of triangles that meet corner to corner; arguments as in ``sheet``."""
    random = np.random.default_rng(8)
    points = _lattice(counts, jitter, random) * np.array(sizes)
    number = np.arange(len(points)).reshape([n + 1 for n in counts])
    quads = [_side(number, axis, end) for axis in range(3) for end in (0, -1)]
    faces = _triangles(np.concatenate(quads), random)
    used, inverse = np.unique(faces[:, :3], return_inverse=True)
    return Surface(points[used], np.column_stack([inverse.reshape(-1, 3), faces[:, 3]]))


def _side(number: np.ndarray, axis: int, end: int) -> np.ndarray:
    flat = np.take(number, end, axis=axis)
    return np.stack([flat[:-1, :-1], flat[1:, :-1], flat[1:, 1:], flat[:-1, 1:]], -1).reshape(-1, 4)


def cube_with_point_near_edge(distance: float) -> Surface:
    """Make a unit cube with the middle vertex of a face moved ``distance`` off an edge."""
    cube = block((2, 2, 2))
    vertices = cube.vertices.copy()
    middle = np.flatnonzero((vertices == (0.0, 0.0, 0.5)).all(axis=1))
    vertices[middle, 1] = 0.5 - distance
    return Surface(vertices, cube.faces)


def needle(length: float, base: float) -> Surface:
    """One triangle with a right angle, a sheet in the xy-plane."""
    vertices = np.array([[0.0, 0.0, 0.0], [length, 0.0, 0.0], [0.0, base, 0.0]])
    return Surface(vertices, np.array([[0, 1, 2, NO_CORNER]]))


def needles(length: float, count: int) -> Surface:
    """Make a rectangle 1 x ``length`` of a fan of ``count`` needles and one more triangle."""
    across = np.linspace(-0.5, 0.5, count + 1)
    rim = np.column_stack([across, np.full(count + 1, 0.5 * length), np.zeros(count + 1)])
    base = np.array([[-0.5, -0.5 * length, 0.0], [0.5, -0.5 * length, 0.0]])
    fan = [[0, k + 3, k + 2, NO_CORNER] for k in range(count)]
    return Surface(np.vstack([base, rim]), np.array([*fan, [0, 1, count + 2, NO_CORNER]]))


def moved(surface: Surface, *shift: float) -> Surface:
    """Shift a surface by (x, y, z)."""
    return surface.placed(np.eye(3), np.array(shift))


def turned_about_z(surface: Surface, degrees: float) -> Surface:
    """Turn a surface about the z-axis."""
    cos, sin = np.cos(np.radians(degrees)), np.sin(np.radians(degrees))
    return surface.placed(np.array([[cos, -sin, 0], [sin, cos, 0], [0, 0, 1.0]]), np.zeros(3))
