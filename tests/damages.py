"""Sound bodies, and damages such as exporters do to them."""

from __future__ import annotations

import numpy as np
from made_bodies import ball, cube, faces_of, soup

from bem.geometry.surface import Surface

RANDOM_SEED = 11


def joined(*surfaces: Surface) -> Surface:
    """One surface of several pieces."""
    start = np.cumsum([0] + [len(s.vertices) for s in surfaces])
    faces = [s.faces + k * (s.faces >= 0) for s, k in zip(surfaces, start, strict=False)]
    return Surface(np.concatenate([s.vertices for s in surfaces]), np.concatenate(faces))


def box(low: tuple[float, float, float], high: tuple[float, float, float]) -> Surface:
    """Box between two corners, of triangles."""
    size = np.subtract(high, low)
    return cube().placed(np.diag(size), low + 0.5 * size)


def rectangle(low: tuple[float, float], high: tuple[float, float], z: float = 0.0) -> Surface:
    """Sheet of one quadrilateral in a plane of constant z."""
    (a, b), (c, d) = low, high
    corners = np.array([[a, b, z], [c, b, z], [c, d, z], [a, d, z]])
    return Surface(corners, np.array([[0, 1, 2, 3]]))


def finer(surface: Surface, times: int) -> Surface:
    """Divide each triangle by four, a number of times, without new shape."""
    corners = soup(surface)
    for _ in range(times):
        a, b, c = np.moveaxis(corners, 1, 0)
        p, q, r = 0.5 * (a + b), 0.5 * (b + c), 0.5 * (c + a)
        parts = [(a, p, r), (p, b, q), (r, q, c), (p, q, r)]
        corners = np.concatenate([np.stack(part, axis=1) for part in parts])
    points, index = np.unique(corners.reshape(-1, 3), axis=0, return_inverse=True)
    return Surface(points, faces_of(index.reshape(-1, 3)))


def bracket() -> Surface:
    """L-shaped block, outward."""
    outline = [(0.0, 0.0), (2.0, 0.0), (2.0, 0.5), (0.5, 0.5), (0.5, 1.5), (0.0, 1.5)]
    points = np.array([[x, y, z] for z in (0.0, 1.0) for x, y in outline])
    flat = np.array([[0, 1, 2, 3], [0, 3, 4, 5]])
    around = [[k, (k + 1) % 6, (k + 1) % 6 + 6, k + 6] for k in range(6)]
    quads = Surface(points, np.concatenate([flat[:, ::-1], flat + 6, around]))
    return Surface(points, faces_of(quads.triangles))


BODIES = {
    "cube": finer(cube(), 2),
    "ball": ball(1.0, 16),
    "bracket": finer(bracket(), 2),
}
"""Of 192, 224 and 320 triangles."""


def random() -> np.random.Generator:
    return np.random.default_rng(RANDOM_SEED)


def unwelded(corners: np.ndarray) -> Surface:
    """Surface in which no two triangles (t, 3, 3) share a vertex."""
    return Surface(corners.reshape(-1, 3), faces_of(np.arange(3 * len(corners)).reshape(-1, 3)))


def sizes(surface: Surface) -> np.ndarray:
    """Areas (t,) of the triangles."""
    a, b, c = np.moveaxis(soup(surface), 1, 0)
    return 0.5 * np.linalg.norm(np.cross(b - a, c - a), axis=1)


def cracked(surface: Surface, relative: float = 1e-5) -> Surface:
    """Round the corners of each facet by themselves."""
    corners = soup(surface)
    width = relative * surface.extent
    return unwelded(corners + random().uniform(-0.5, 0.5, corners.shape) * width)


def without_a_facet(surface: Surface) -> Surface:
    return Surface(surface.vertices, np.delete(surface.faces, sizes(surface).argmin(), axis=0))


def with_copies(surface: Surface) -> Surface:
    return Surface(surface.vertices, np.concatenate([surface.faces, surface.faces[3:8]]))


def with_turned_copies(surface: Surface) -> Surface:
    turned = faces_of(surface.faces[3:8, 2::-1])
    return Surface(surface.vertices, np.concatenate([surface.faces, turned]))


def with_a_corner_on_an_edge(surface: Surface) -> Surface:
    """Split one facet at the middle of its longest side, and leave the neighbour as it is."""
    k = int(sizes(surface).argmax())
    corners = surface.vertices[surface.faces[k, :3]]
    first = int(np.linalg.norm(np.roll(corners, -1, axis=0) - corners, axis=1).argmax())
    a, b, c = np.roll(surface.faces[k, :3], -first)
    middle = len(surface.vertices)
    vertices = np.concatenate([surface.vertices, surface.vertices[[a, b]].mean(axis=0)[None]])
    parts = faces_of(np.array([[a, middle, c], [middle, b, c]]))
    return Surface(vertices, np.concatenate([np.delete(surface.faces, k, axis=0), parts]))


def with_slivers(surface: Surface) -> Surface:
    """Add facets without area: with a repeated corner, and along an edge."""
    a, b = surface.faces[0, :2]
    middle = len(surface.vertices)
    vertices = np.concatenate([surface.vertices, surface.vertices[[a, b]].mean(axis=0)[None]])
    flat = faces_of(np.array([[a, a, b], [a, middle, b]]))
    return Surface(vertices, np.concatenate([surface.faces, flat]))


def with_flipped_normals(surface: Surface) -> Surface:
    flip = random().random(len(surface.faces)) < 0.5
    triangles = surface.triangles
    return Surface(
        surface.vertices, faces_of(np.where(flip[:, None], triangles[:, ::-1], triangles))
    )


def with_an_unused_vertex(surface: Surface) -> Surface:
    vertices = np.concatenate([[[1e9, 0.0, 0.0]], surface.vertices])
    return Surface(vertices, surface.faces + (surface.faces >= 0))


def with_a_corner_far_away(surface: Surface) -> Surface:
    corners = soup(surface)
    corners[0, 0] = [1e9, 0.0, 0.0]
    return unwelded(corners)


def with_a_patch(surface: Surface) -> Surface:
    """Lay a smaller triangle on the largest facet."""
    corners = soup(surface)[sizes(surface).argmax()]
    return joined(surface, unwelded(0.5 * (corners + np.roll(corners, 1, axis=0))[None]))


def with_an_inner_wall(surface: Surface) -> Surface:
    """Cut a cell off a ball by two facets inside it."""
    a, b, c = surface.faces[0, :3]
    shares = (np.isin(surface.faces, [a, b]).sum(axis=1) == 2) & (np.arange(len(surface.faces)) > 0)
    d = next(v for v in surface.faces[shares][0, :3] if v not in (a, b))
    wall = faces_of(np.array([[a, c, d], [b, c, d]]))
    return Surface(surface.vertices, np.concatenate([surface.faces, wall]))


def with_a_pin(surface: Surface) -> Surface:
    """Put a small box halfway through the middle of a facet."""
    center = soup(surface)[sizes(surface).argmax()].mean(axis=0)
    return joined(surface, cube(0.01, tuple(center + 1e-3)))


def of_quadrilaterals(surface: Surface) -> Surface:
    """Join pairs of facets along shared edges to quadrilaterals, flat or not."""
    faces, used, quads = surface.faces[:, :3].tolist(), set[int](), []
    sides = {(f[k], f[k - 2]): (i, f[k - 1]) for i, f in enumerate(faces) for k in range(3)}
    for i, (a, b, c) in enumerate(faces):
        j, d = sides[b, a]
        if i not in used and j not in used:
            used |= {i, j}
            quads.append([a, d, b, c])
    rest = [[*f, -1] for i, f in enumerate(faces) if i not in used]
    return Surface(surface.vertices, np.array(quads + rest))
