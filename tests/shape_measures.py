"""Plain measures of surfaces, which tests compare with formulas."""

from __future__ import annotations

import numpy as np

from bem.geometry.surface import Surface
from bem.geometry.topology import edges_of, open_edges


def volume(surface: Surface) -> float:
    """Volume inside, positive if the faces run outward (divergence theorem)."""
    a, b, c = np.moveaxis(surface.vertices[surface.triangles], 1, 0)
    return float(np.einsum("ij,ij->", a, np.cross(b, c))) / 6.0


def area(surface: Surface) -> float:
    """Area of all faces."""
    a, b, c = np.moveaxis(surface.vertices[surface.triangles], 1, 0)
    return 0.5 * float(np.linalg.norm(np.cross(b - a, c - a), axis=1).sum())


def side_counts(surface: Surface) -> np.ndarray:
    """How many faces share each side."""
    rows = [row[row >= 0] for row in surface.faces]
    ends = np.concatenate([np.stack([row, np.roll(row, -1)], axis=1) for row in rows])
    return np.unique(np.sort(ends, axis=1), axis=0, return_counts=True)[1]


def is_closed(surface: Surface) -> bool:
    """Whether no edge is left open, as the checks of a scene see it."""
    edges = edges_of(surface.triangles)
    return len(open_edges(surface.vertices, edges, 1e-9 * surface.extent)) == 0


def bend_of_quads(surface: Surface) -> float:
    """Largest distance of a quadrilateral's fourth corner from the plane of the others."""
    quads = surface.vertices[surface.faces[surface.faces[:, 3] >= 0]]
    normal = np.cross(quads[:, 1] - quads[:, 0], quads[:, 2] - quads[:, 0])
    normal /= np.linalg.norm(normal, axis=1, keepdims=True)
    return float(np.abs(np.einsum("qx,qx->q", quads[:, 3] - quads[:, 0], normal)).max(initial=0.0))


def polygon_factor(around: int) -> float:
    """Area of a regular polygon over that of the circle through its corners."""
    return around / (2.0 * np.pi) * float(np.sin(2.0 * np.pi / around))
