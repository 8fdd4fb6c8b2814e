"""Bodies as mesh files have them: facets with their corners on a smooth surface, in metres."""

from __future__ import annotations

import numpy as np
from made_bodies import faces_of
from scipy.spatial import ConvexHull, Delaunay

from bem.geometry.surface import Surface

GOLDEN = np.pi * (3.0 - np.sqrt(5.0))


def tidy(points: np.ndarray, triangles: np.ndarray) -> Surface:
    return Surface(np.asarray(points, dtype=float), faces_of(np.asarray(triangles)))


def hull(points: np.ndarray) -> Surface:
    """Facets of a convex body with corners at all the given points."""
    return tidy(points, ConvexHull(points).simplices)


def icosphere(times: int) -> Surface:
    """Unit sphere of 20 * 4**times facets."""
    golden = 0.5 * (1.0 + np.sqrt(5.0))
    rows = [(0.0, s, t * golden) for s in (-1, 1) for t in (-1, 1)]
    points = np.array([np.roll(row, k) for k in range(3) for row in rows])
    points /= np.linalg.norm(points, axis=1, keepdims=True)
    for _ in range(times):
        triangles = ConvexHull(points).simplices
        sides = np.sort(triangles[:, [0, 1, 1, 2, 2, 0]].reshape(-1, 2), axis=1)
        ends = points[np.unique(sides, axis=0)]
        middle = ends.sum(axis=1)
        middle /= np.linalg.norm(middle, axis=1, keepdims=True)
        points = np.concatenate([points, middle])
    return hull(points)


def uv_sphere(around: int) -> Surface:
    """Unit sphere of rings and meridians."""
    polar = np.linspace(0.0, np.pi, around // 2 + 1)[1:-1, None]
    turn = 2.0 * np.pi * np.arange(around) / around
    rings = np.stack(
        [np.sin(polar) * np.cos(turn), np.sin(polar) * np.sin(turn), np.cos(polar) + 0 * turn], -1
    )
    return hull(np.concatenate([rings.reshape(-1, 3), [[0, 0, 1.0], [0, 0, -1.0]]]))


def uneven_sphere(count: int, seed: int = 1) -> Surface:
    """Unit sphere with corners scattered as a free mesher does, or a little worse."""
    random = np.random.default_rng(seed)
    k = np.arange(count) + 0.5
    z = 1.0 - 2.0 * k / count
    r = np.sqrt(1.0 - z * z)
    points = np.stack([r * np.cos(GOLDEN * k), r * np.sin(GOLDEN * k), z], axis=1)
    points += random.uniform(-1.0, 1.0, points.shape) * 0.35 * np.sqrt(4.0 * np.pi / count)
    return hull(points / np.linalg.norm(points, axis=1, keepdims=True))


def stretched(surface: Surface, *factors: float) -> Surface:
    """Make an ellipsoid of a sphere."""
    return Surface(surface.vertices * np.array(factors), surface.faces)


def _sheet_of(u: np.ndarray, v: np.ndarray, loops: tuple[bool, bool]) -> np.ndarray:
    """Triangles (t, 3) of a lattice of u x v points, closed in the directions that loop."""
    number = np.arange(u * v).reshape(u, v)
    if loops[0]:
        number = np.concatenate([number, number[:1]])
    if loops[1]:
        number = np.concatenate([number, number[:, :1]], axis=1)
    a, b, c, d = number[:-1, :-1], number[1:, :-1], number[1:, 1:], number[:-1, 1:]
    return np.concatenate([np.stack(t, -1).reshape(-1, 3) for t in ((a, b, c), (a, c, d))])


def torus(around: int, section: int, jitter: float = 0.0, radii: tuple = (2.0, 1.0)) -> Surface:
    """Ring about the z-axis; ``jitter`` moves its corners by parts of a cell along it."""
    random = np.random.default_rng(3)
    i, j = np.meshgrid(np.arange(around), np.arange(section), indexing="ij")
    move = random.uniform(-jitter, jitter, (2, *i.shape))
    u, v = 2 * np.pi * (i + move[0]) / around, 2 * np.pi * (j + move[1]) / section
    r = radii[0] + radii[1] * np.cos(v)
    points = np.stack([r * np.cos(u), r * np.sin(u), radii[1] * np.sin(v)], axis=-1)
    return tidy(points.reshape(-1, 3), _sheet_of(around, section, (True, True)))


def cylinder(around: int, height: float = 2.0, along: int = 1) -> Surface:
    """Round solid of radius 1 with flat ends cut into fans."""
    turn = 2.0 * np.pi * np.arange(around) / around
    levels = np.linspace(-0.5 * height, 0.5 * height, along + 1)
    ring = np.stack([np.cos(turn), np.sin(turn)], axis=1)
    points = np.concatenate([np.column_stack([ring, np.full(around, z)]) for z in levels])
    wall = _sheet_of(along + 1, around, (False, True))
    fan = np.array([[0, k, k + 1] for k in range(1, around - 1)])
    return tidy(points, np.concatenate([wall, fan, fan + along * around]))


def bowl(around: int) -> Surface:
    """Half of the unit sphere, an open sheet."""
    rings = around // 4
    polar = 0.5 * np.pi * np.arange(1, rings + 1)[:, None] / rings
    turn = 2.0 * np.pi * np.arange(around) / around
    points = np.stack(
        [np.sin(polar) * np.cos(turn), np.sin(polar) * np.sin(turn), -np.cos(polar) + 0 * turn], -1
    ).reshape(-1, 3)
    wall = _sheet_of(rings, around, (False, True)) + 1
    k = np.arange(around)
    cap = np.stack([np.zeros(around, dtype=int), k + 1, (k + 1) % around + 1], axis=1)
    return tidy(np.concatenate([[[0.0, 0.0, -1.0]], points]), np.concatenate([cap, wall]))


def flat_sheet(rings: list[np.ndarray], keep) -> Surface:
    """Sheet in the plane z = 0 over points (n, 2), without triangles whose middle is not kept."""
    points = np.concatenate(rings)
    triangles = Delaunay(points).simplices
    middle = points[triangles].mean(axis=1)
    return tidy(np.column_stack([points, np.zeros(len(points))]), triangles[keep(middle)])


def circle(count: int, radius: float) -> np.ndarray:
    turn = 2.0 * np.pi * (np.arange(count) + 0.5) / count
    return radius * np.stack([np.cos(turn), np.sin(turn)], axis=1)


def disc(count: int) -> Surface:
    """Polygon in the unit circle."""
    return flat_sheet([circle(count, 1.0), np.zeros((1, 2))], lambda x: x[:, 0] < 9.0)


def annulus(count: int, inner: float = 0.5) -> Surface:
    """Sheet between two polygons, both with corners on their circles."""
    limit = inner * np.cos(np.pi / count) * (1.0 - 1e-9)
    rings = [circle(count, 1.0), circle(count, inner)]
    return flat_sheet(rings, lambda x: np.hypot(*x.T) > 0.999 * limit)


def plate_with_hole(count: int) -> Surface:
    """Square plate of side 2 with a polygon of radius 0.5 cut out."""
    square = np.array([[-1.0, -1.0], [1.0, -1.0], [1.0, 1.0], [-1.0, 1.0]])
    limit = 0.5 * np.cos(np.pi / count)
    return flat_sheet([square, circle(count, 0.5)], lambda x: np.hypot(*x.T) > 0.99 * limit)


def rounded_box(steps: int, radius: float = 0.2) -> Surface:
    """Unit cube whose edges and corners are rounded with ``steps`` facets a quarter."""
    angle = 0.5 * np.pi * np.arange(steps + 1) / steps
    a, b = np.meshgrid(angle, angle, indexing="ij")
    octant = np.stack([np.cos(a) * np.cos(b), np.cos(a) * np.sin(b), np.sin(a)], -1).reshape(-1, 3)
    signs = np.array([[1 - 2 * (k >> i & 1) for i in range(3)] for k in range(8)])
    points = np.concatenate([s * (0.5 - radius + radius * octant) for s in signs])
    return hull(np.unique(points.round(12), axis=0))


def bent_wire(section: int, bend: int, radius: float = 0.1) -> Surface:
    """Round wire with a quarter turn of radius 0.5 between straight ends of length 1."""
    angle = 0.5 * np.pi * np.arange(bend + 1) / bend
    centre = [(-1.0, 0.0, 0.0), *((0.5 * np.sin(t), 0.5 - 0.5 * np.cos(t), t) for t in angle)]
    centre.append((0.5, 1.5, 0.5 * np.pi))
    turn = 2.0 * np.pi * np.arange(section) / section
    rings = [
        np.stack(
            [
                x - radius * np.cos(turn) * np.sin(t),
                y + radius * np.cos(turn) * np.cos(t),
                radius * np.sin(turn),
            ],
            axis=1,
        )
        for x, y, t in centre
    ]
    wall = _sheet_of(len(rings), section, (False, True))
    fan = np.array([[0, k, k + 1] for k in range(1, section - 1)])
    last = (len(rings) - 1) * section
    return tidy(np.concatenate(rings), np.concatenate([wall, fan, fan + last]))
