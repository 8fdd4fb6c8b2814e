"""Scenes that the tests of the numerics are made of, in metres."""

from __future__ import annotations

from collections.abc import Iterable
from pathlib import Path

import numpy as np
from made_bodies import CUBE_QUADS, cube_vertices, faces_of, soup, stl_binary
from reference_values import Body, Reference

import bem
from bem.geometry import shapes
from bem.geometry.shapes.round import ArcTo
from bem.geometry.surface import Surface
from bem.scene.placing import rotation
from bem.units import EPS0

FARAD = 4.0 * np.pi * EPS0
"""Capacitance in farad of L = 1 m."""

AXIS = (0.3, -1.1, 0.7)
SHIFT = (0.31, -0.17, 0.53)


def tidy(points: np.ndarray, triangles: np.ndarray) -> Surface:
    """Surface of triangles (t, 3)."""
    return Surface(np.asarray(points, dtype=float), faces_of(np.asarray(triangles)))


def _touching_spheres(radius: float) -> Surface:
    """Two equal balls with a tiny neck where they would touch."""
    neck = 1e-3 * radius
    half = float(np.sqrt(radius**2 - neck**2))
    low = ArcTo((radius, -half), (neck, 0.0))
    high = ArcTo((radius, half), (0.0, half + radius))
    return shapes.revolve([(0.0, -half - radius), low, high])


SHAPES = {
    "sphere": shapes.sphere,
    "spherical shell": shapes.sphere,
    "spheroid": lambda radius, half_axis: shapes.spheroid(radius, half_axis),
    "ellipsoid": shapes.ellipsoid,
    "torus": shapes.torus,
    "bowl": lambda radius, polar_angle: shapes.bowl(radius),
    "half ball": shapes.hemisphere,
    "touching spheres": _touching_spheres,
    "box": lambda x, y, z: shapes.box(x, y, z),
    "plate": lambda x, y: shapes.plate(x, y),
    "disc": shapes.disc,
    "annulus": shapes.annulus,
    "tube": shapes.tube,
    "cylinder": shapes.cylinder,
}
"""Maker of each kind of body of the reference table; every bowl there is a half sphere."""


def shape_of(body: Body) -> Surface:
    """Surface of a body of the reference table, at its place."""
    surface = SHAPES[body.kind](**body.sizes)
    return surface.placed(np.eye(3), np.array(body.centre))


def scene_of(surfaces: Iterable[Surface], shells: tuple[int, ...] = ()) -> bem.Scene:
    """Scene in metres with conductors c0, c1, ...; those numbered in ``shells`` are hollow."""
    scene = bem.Scene(unit="m")
    for k, surface in enumerate(surfaces):
        scene.add_conductor(f"c{k}", surface, body="shell" if k in shells else "solid")
    return scene


def scene_of_reference(record: Reference) -> bem.Scene:
    """Scene of a record, its bodies in order."""
    hollow = tuple(k for k, b in enumerate(record.bodies) if "shell" in b.kind)
    scene = scene_of([shape_of(b) for b in record.bodies], hollow)
    return scene.set_ground_plane(z=0.0) if record.grounded else scene


def in_lengths(farads: np.ndarray) -> np.ndarray:
    """L = C / (4 pi eps0) in metres."""
    return np.asarray(farads) / FARAD


def moved(surface: Surface, degrees: float = 37.0, shift: tuple = SHIFT) -> Surface:
    """Turn a surface about ``AXIS`` and shift it."""
    return surface.placed(rotation(AXIS, degrees), np.array(shift))


def _grid(n: int, jitter: float, seed: int) -> tuple[np.ndarray, np.ndarray]:
    """Points (m, 2) and triangles (t, 3) of the unit square about the origin."""
    level = np.linspace(-0.5, 0.5, n + 1)
    points = np.stack(np.meshgrid(level, level, indexing="ij"), axis=-1).reshape(-1, 2)
    inside = np.all(np.abs(points) < 0.5 - 1e-9, axis=1)
    random = np.random.default_rng(seed)
    points[inside] += jitter / n * random.uniform(-1.0, 1.0, (int(inside.sum()), 2))
    i, j = np.divmod(np.arange(n * n), n)
    a = i * (n + 1) + j
    b, c, d = a + n + 1, a + n + 2, a + 1
    turn = random.random(n * n) < (0.5 if jitter else 0.0)
    first = np.where(turn[:, None], np.stack([a, b, d], 1), np.stack([a, b, c], 1))
    second = np.where(turn[:, None], np.stack([b, c, d], 1), np.stack([a, c, d], 1))
    return points, np.concatenate([first, second])


def meshed_plate(n: int, jitter: float = 0.0, seed: int = 0) -> Surface:
    """Make the unit square of 2 n^2 triangles at z = 0, inner points moved by ``jitter`` cells."""
    points, triangles = _grid(n, jitter, seed)
    return tidy(np.column_stack([points, np.zeros(len(points))]), triangles)


def _box_of(points: np.ndarray, triangles: np.ndarray) -> Surface:
    """Make the unit cube, each face meshed like the unit square, common vertices joined."""
    sides = []
    for axis in range(3):
        for height in (-0.5, 0.5):
            side = np.insert(points, axis, height, axis=1)
            sides.append(side[triangles])
    corners = np.concatenate(sides)
    vertices, index = np.unique(corners.reshape(-1, 3).round(12), axis=0, return_inverse=True)
    return tidy(vertices, index.reshape(-1, 3))


def meshed_box(n: int, jitter: float = 0.0, seed: int = 0) -> Surface:
    """Make the unit cube of 12 n^2 triangles."""
    return _box_of(*_grid(n, jitter, seed))


def _strips(n: int) -> tuple[np.ndarray, np.ndarray]:
    """Make the unit square of n strips, cut once each: triangles of aspect n."""
    level = np.linspace(-0.5, 0.5, n + 1)
    points = np.array([(x, y) for x in level for y in (-0.5, 0.5)])
    a = 2 * np.arange(n)
    return points, np.concatenate([np.stack([a, a + 2, a + 3], 1), np.stack([a, a + 3, a + 1], 1)])


def sliver_plate(n: int) -> Surface:
    """Make the unit square of 2 n long triangles."""
    points, triangles = _strips(n)
    return tidy(np.column_stack([points, np.zeros(len(points))]), triangles)


def slivers(n: int) -> Surface:
    """Make the unit cube of 12 n long triangles; strips of neighbouring faces meet unmatched."""
    return _box_of(*_strips(n))


def one_quad_per_face() -> Surface:
    """Make the unit cube of six quadrilaterals."""
    return Surface(cube_vertices(), CUBE_QUADS)


def from_stl(scene: bem.Scene, folder: Path, name: str, surface: Surface) -> None:
    """Add a surface to a scene by way of a binary STL file."""
    path = folder / f"{name}.stl"
    path.write_bytes(stl_binary(soup(surface)))
    scene.add_conductor(name, mesh=path)


def scene_from_files(folder: Path, surfaces: Iterable[Surface]) -> bem.Scene:
    """Scene in metres whose conductors went through STL files."""
    scene = bem.Scene(unit="m")
    for k, surface in enumerate(surfaces):
        from_stl(scene, folder, f"c{k}", surface)
    return scene


def check(result: bem.CapacitanceResult, exact: np.ndarray, slack: float = 0.0) -> None:
    """Require every entry to be within its bar and the tolerance, and so the row sums."""
    size = np.sqrt(np.diag(exact))
    scale = np.outer(size, size)
    apart = np.abs(in_lengths(result.capacitance) - exact)
    assert result.converged
    assert np.all(apart <= result.tolerance * scale + slack), apart / scale
    assert np.all(apart <= in_lengths(result.error) + slack), apart / in_lengths(result.error)
    row = np.abs(in_lengths(result.row_sum) - exact.sum(axis=1))
    assert np.all(row <= in_lengths(result.row_sum_error) + slack)
