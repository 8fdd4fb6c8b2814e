"""Rims of a part where the metal goes on: in another part of its body, or in a mirror image."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from bem.geometry.fit.fit import Fit
from bem.geometry.flat_faces import FLATNESS
from bem.geometry.parts import INTERFACE, METAL, Part
from bem.geometry.planes import Planes
from bem.geometry.topology import edges_of

BLOCK = 256
"""Edges that are compared with all of the other parts at once."""


def with_joints(fit: Fit, part: Part, parts: list[Part], planes: Planes) -> Fit:
    """The fit of a sheet's facets, of whose rims only those are left where the metal ends.

    Args:
        fit: of the part.
        part: that it belongs to.
        parts: all of them.
        planes: grounded and mirror planes.
    """
    if part.conductor == INTERFACE or part.back == METAL:
        return fit
    facets = fit.facets
    rim = np.flatnonzero(facets.rim)
    ends = facets.points[facets.ends[rim]]
    slack = 10.0 * FLATNESS * fit.size
    goes_on = planes.mirrored(ends, slack)
    for other in parts:
        if other is not part and other.body == part.body and len(ends):
            goes_on |= _along(ends, _rim_of(other), slack)
    uses = facets.uses.copy()
    uses[rim[goes_on]] += 1
    return replace(fit, facets=replace(facets, uses=uses))


def _rim_of(part: Part) -> np.ndarray:
    """(m, 2, 3) edges of a part that belong to one triangle."""
    edges = edges_of(part.surface.triangles)
    return part.surface.vertices[edges.ends[edges.uses == 1]]


def _along(edges: np.ndarray, others: np.ndarray, slack: float) -> np.ndarray:
    """(n,) whether edges (n, 2, 3) have both ends and the middle on others (m, 2, 3)."""
    if not len(others):
        return np.zeros(len(edges), dtype=bool)
    points = np.stack([edges[:, 0], edges.mean(axis=1), edges[:, 1]], axis=1).reshape(-1, 3)
    off = [_distance(points[k : k + BLOCK], others) for k in range(0, len(points), BLOCK)]
    on: np.ndarray = np.concatenate(off).reshape(-1, 3) <= slack
    return np.asarray(on.all(axis=1))


def _distance(points: np.ndarray, edges: np.ndarray) -> np.ndarray:
    """(n,) distance of points (n, 3) from the nearest of edges (m, 2, 3)."""
    start, step = edges[:, 0], edges[:, 1] - edges[:, 0]
    way = points[:, None] - start
    part = np.einsum("nmi,mi->nm", way, step) / np.einsum("mi,mi->m", step, step)
    return np.linalg.norm(way - np.clip(part, 0.0, 1.0)[:, :, None] * step, axis=2).min(axis=1)
