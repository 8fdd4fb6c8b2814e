"""Which points lie inside closed bodies: exactly for curved ones, by rays for facets."""

from __future__ import annotations

import numpy as np

from bem.geometry.rays import points_inside, ray_directions
from bem.geometry.regions.meridian import holds
from bem.geometry.revolved import Revolution
from bem.geometry.surface import Surface
from bem.geometry.tree import build_tree


def inside(surface: Surface, points: np.ndarray) -> np.ndarray:
    """(n,) whether points lie inside a closed surface; none of them may lie on it.

    Args:
        surface: closed; normals may point either way.
        points: (n, 3), in the same unit.
    """
    if surface.curve is not None:
        return inside_curve(surface.curve, points)
    low, high = surface.bounds
    found = ((points >= low) & (points <= high)).all(axis=1)
    if found.any():
        corners = surface.vertices[surface.triangles]
        every = np.ones(len(corners), dtype=bool)
        found[found] = points_inside(build_tree(corners), every, points[found], ray_directions())
    return found


def inside_curve(curve: Revolution, points: np.ndarray) -> np.ndarray:
    """(n,) whether points (n, 3) lie inside a closed surface of revolution."""
    local = np.linalg.solve(curve.matrix, (points - curve.shift).T).T
    return holds(curve.profile, np.column_stack([np.hypot(*local[:, :2].T), local[:, 2]]))
