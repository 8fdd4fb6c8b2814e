"""Sharp edges of solid curved bodies: what they add to the effect of facets beside them.

At an edge where the outer surface turns by t (a convex edge of inner angle pi - t) the density
grows like r^-a with a = t / (pi + t), r the distance from the edge; at a concave one it vanishes
with a < 0. The effect of facets goes with the mean of the squared density over a panel, of which
only the square of the mean is known. For a panel with a side on the edge it is larger by

    (1 - a)^2 / (1 - 2 a)

(4/3 at a right angle). Field at an edge: any textbook of electrostatics, by conformal mapping.
"""

from __future__ import annotations

import numpy as np

from bem.geometry.revolved import Revolution

MOST = 10.0
"""Largest such factor: it grows without limit as an edge becomes that of a sheet."""
ASIDE = 1e-9
"""Normals beside an edge are taken this far from it, in parts of a piece."""


def square_over_mean(turn: np.ndarray) -> np.ndarray:
    """Mean square over squared mean of the density on a panel beside an edge.

    Args:
        turn: angle by which the surface turns at the edge, radians; positive if it is convex.
    """
    a = turn / (np.pi + turn)
    return np.minimum((1.0 - a) ** 2 / (1.0 - 2.0 * a), MOST)


def edge_turns(surface: Revolution) -> np.ndarray:
    """(K + 1,) angle by which the surface turns where its pieces start and end, radians.

    Zero at poles and free rims; the last is the first where the profile loops.
    """
    turns = np.zeros(surface.pieces + 1)
    inner = range(0 if surface.loops else 1, surface.pieces)
    for k in inner:
        low = (k or surface.pieces) - ASIDE
        before, after = surface.normal(0.0, low), surface.normal(0.0, k + ASIDE)
        ahead = surface.frame(0.0, k + ASIDE).by_s
        angle = np.arctan2(np.linalg.norm(np.cross(before, after)), before @ after)
        turns[k] = np.copysign(angle, (after - before) @ ahead)
    if surface.loops:
        turns[-1] = turns[0]
    return turns
