"""Area and flux of surfaces of revolution by quadrature on the true surface."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from bem.geometry.revolved import Revolution

AROUND = 64
"""Points around the axis: exact for circles, and good to rounding for ellipses of ratio 3."""
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(32)


class Measures(NamedTuple):
    """Integrals over a surface.

    Args:
        area: of it.
        vector_area: (3,) integral of the unit normal.
        volume: a third of the flux of the position vector: the volume inside if it is closed.
    """

    area: float
    vector_area: np.ndarray
    volume: float


def measures(curve: Revolution) -> Measures:
    """Area, vector area and flux of a surface with its whole turn."""
    s = np.arange(curve.pieces)[:, None] + 0.5 * (_NODES + 1.0)
    frame = curve.frame(np.arange(AROUND)[:, None] / AROUND, s.ravel())
    weights = np.tile(0.5 * _WEIGHTS, curve.pieces) / AROUND
    normal = np.cross(frame.by_u, frame.by_s)
    area = np.linalg.norm(normal, axis=2).sum(axis=0) @ weights
    volume = np.sum(frame.point * normal, axis=2).sum(axis=0) @ weights / 3.0
    return Measures(float(area), np.einsum("usx,s->x", normal, weights), float(volume))
