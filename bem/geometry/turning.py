"""True surfaces turned to have their normals where the faces that approximate them have theirs."""

from __future__ import annotations

import numpy as np

from bem.geometry.revolved import Piece, Revolution
from bem.geometry.surface import Surface

SAMPLES = 33
"""Points along each piece of a profile that corners of faces are compared with."""


def curve_along(surface: Surface) -> Revolution | None:
    """The true surface of faces, reversed if most of their area looks the other way."""
    curve = surface.curve
    if curve is None:
        return None
    corners = surface.vertices[surface.triangles]
    area = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    agreement = np.einsum("ti,ti->t", area, _normals(curve, corners)).sum()
    return curve if agreement >= 0.0 else curve.reversed()


def _normals(curve: Revolution, corners: np.ndarray) -> np.ndarray:
    """(t, 3) normal of the true surface where each of the triangles (t, 3, 3) belongs."""
    local = (corners - curve.shift) @ np.linalg.inv(curve.matrix).T
    rz = np.stack([np.hypot(local[..., 0], local[..., 1]), local[..., 2]], axis=-1)
    middle = local.mean(axis=1)
    around = np.arctan2(middle[:, 1], middle[:, 0]) / (2.0 * np.pi)
    return curve.normal(around, _along(curve.profile, rz))


def _along(profile: tuple[Piece, ...], rz: np.ndarray) -> np.ndarray:
    """(t,) parameter of the profile nearest to the mean of corners (t, 3, 2) on one piece."""
    t = np.linspace(0.0, 1.0, SAMPLES)[1:-1]
    off, at = [], []
    for k, piece in enumerate(profile):
        line = piece.at(np.linspace(0.0, 1.0, SAMPLES))
        away = np.linalg.norm(rz[:, :, None] - line, axis=3).min(axis=2)
        off.append(away.max(axis=1))
        inner = np.linalg.norm(rz.mean(axis=1)[:, None] - line[1:-1], axis=2)
        at.append(k + t[inner.argmin(axis=1)])
    best = np.argmin(off, axis=0)
    return np.array(at)[best, np.arange(len(rz))]
