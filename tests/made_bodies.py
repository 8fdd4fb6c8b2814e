"""Bodies and files that the geometry tests are made of."""

from __future__ import annotations

import struct
from pathlib import Path

import numpy as np

from bem.geometry.surface import NO_CORNER, Surface
from bem.scene.placing import rotation

CUBE_TRIANGLES = np.array(
    [
        [0, 2, 1], [1, 2, 3], [4, 5, 6], [5, 7, 6], [0, 1, 4], [1, 5, 4],
        [2, 6, 3], [3, 6, 7], [0, 4, 2], [2, 4, 6], [1, 3, 5], [3, 7, 5],
    ]
)  # fmt: skip
"""Unit cube, outward, vertices numbered x + 2 y + 4 z."""

CUBE_QUADS = np.array(
    [[0, 2, 3, 1], [4, 5, 7, 6], [0, 1, 5, 4], [2, 6, 7, 3], [0, 4, 6, 2], [1, 3, 7, 5]]
)


def cube_vertices(size: float = 1.0, center: tuple[float, float, float] = (0.0, 0.0, 0.0)):
    corners = np.array([[k & 1, k >> 1 & 1, k >> 2] for k in range(8)], dtype=float)
    return size * (corners - 0.5) + center


def faces_of(triangles: np.ndarray) -> np.ndarray:
    return np.column_stack([triangles, np.full(len(triangles), NO_CORNER)])


def cube(size: float = 1.0, center: tuple[float, float, float] = (0.0, 0.0, 0.0)) -> Surface:
    return Surface(cube_vertices(size, center), faces_of(CUBE_TRIANGLES))


def soup(surface: Surface) -> np.ndarray:
    """Corners (t, 3, 3) of the triangles."""
    return surface.vertices[surface.triangles]


def ball(radius: float, around: int = 12) -> Surface:
    """Make a closed faceted ball with poles, outward."""
    polar = np.linspace(0.0, np.pi, around // 2 + 1)[1:-1, None]
    turn = 2.0 * np.pi * np.arange(around)[None, :] / around
    rings = np.stack(
        [np.sin(polar) * np.cos(turn), np.sin(polar) * np.sin(turn), np.cos(polar) + 0.0 * turn],
        axis=-1,
    )
    grid = np.arange(rings.shape[0] * around).reshape(-1, around)
    south, north = grid.size, grid.size + 1
    a, b = grid[:-1], grid[1:]
    right = np.roll(grid, -1, axis=1)
    c, d = right[1:], right[:-1]
    strips = [np.stack([a, b, c], -1).reshape(-1, 3), np.stack([a, c, d], -1).reshape(-1, 3)]
    top = np.stack([grid[0], right[0], np.full(around, north)], axis=1)
    bottom = np.stack([right[-1], grid[-1], np.full(around, south)], axis=1)
    points = np.concatenate([rings.reshape(-1, 3), [[0.0, 0.0, -1.0], [0.0, 0.0, 1.0]]])
    return Surface(radius * points, faces_of(np.concatenate([*strips, top, bottom])))


def ring(radius: float, thickness: float, around: int = 24, section: int = 8) -> Surface:
    """Make a closed faceted ring about the z axis, of quadrilaterals (flat ones)."""
    u = 2.0 * np.pi * np.arange(around)[:, None] / around
    v = 2.0 * np.pi * np.arange(section)[None, :] / section
    r = radius + thickness * np.cos(v)
    points = np.stack([r * np.cos(u), r * np.sin(u), thickness * np.sin(v) + 0.0 * u], axis=-1)
    grid = np.arange(around * section).reshape(around, section)
    right, up = np.roll(grid, -1, axis=0), np.roll(grid, -1, axis=1)
    corner = np.roll(right, -1, axis=1)
    return Surface(points.reshape(-1, 3), np.stack([grid, right, corner, up], -1).reshape(-1, 4))


def turned(surface: Surface, seed: int) -> Surface:
    """Turn a surface by an angle and about an axis that ``seed`` chooses."""
    random = np.random.default_rng(seed)
    axis = tuple(random.normal(size=3).tolist())
    return surface.placed(rotation(axis, random.uniform(0.0, 360.0)), np.zeros(3))


def stl_text(solids: dict[str, np.ndarray]) -> str:
    """Text STL of named solids, each given by the corners (t, 3, 3) of its triangles."""
    lines = []
    for name, corners in solids.items():
        lines.append(f"solid {name}".rstrip())
        for triangle in corners:
            lines += ["facet normal 0 0 0", "outer loop"]
            lines += [f"vertex {x!r} {y!r} {z!r}" for x, y, z in triangle.tolist()]
            lines += ["endloop", "endfacet"]
        lines.append(f"endsolid {name}".rstrip())
    return "\n".join(lines) + "\n"


def stl_binary(corners: np.ndarray, header: bytes = b"made for a test") -> bytes:
    """Binary STL of triangles with corners (t, 3, 3)."""
    facets = [struct.pack("<12fH", 0.0, 0.0, 0.0, *c.ravel(), 0) for c in corners]
    return header.ljust(80, b" ") + struct.pack("<I", len(facets)) + b"".join(facets)


def write_cube(path: Path, size: float = 1.0, center=(0.0, 0.0, 0.0)) -> Path:
    path.write_bytes(stl_binary(soup(cube(size, center))))
    return path
