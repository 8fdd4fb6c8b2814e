"""Polynomials on a panel: orthonormal in the mean, in frames that suit slender panels.

The six functions of a panel are combinations of 1, x, y, xx, yy, xy in its own frame about the
centroid: f0 = 1; f1, f2 span what is linear; f3, f4, f5 what is quadratic and orthogonal to
that. The mean of f_a f_b over the panel is 1 for a = b, otherwise 0.
"""

from __future__ import annotations

import numpy as np

from bem.kernels.arrays import PanelArrays, bilinear, gauss_square, normals, panel_arrays

LINEAR, FUNCTIONS = 3, 6
"""Functions up to first and up to second order."""


def _unit(v: np.ndarray) -> np.ndarray:
    return v / np.linalg.norm(v, axis=-1, keepdims=True)


def long_frames(corners: np.ndarray) -> np.ndarray:
    """Axes (n, 3, 3) of panels (n, 4, 3) of which one follows the longer direction.

    The first axis stays with direction 0 and the second with direction 1. In a frame along a
    short, slanting end of a needle, x and y would be all but the same.
    """
    normal = normals(corners)
    first = corners[:, 1] - corners[:, 0] + corners[:, 2] - corners[:, 3]
    second = corners[:, 2] - corners[:, 1] + corners[:, 3] - corners[:, 0]
    tall = np.linalg.norm(second, axis=1) > np.linalg.norm(first, axis=1)
    along = np.where(tall[:, None], np.cross(second, normal), first)
    along = _unit(along - np.sum(along * normal, axis=1)[:, None] * normal)
    return np.stack([along, np.cross(normal, along), normal], axis=1)


def interface_arrays(corners: np.ndarray) -> PanelArrays:
    """Arrays of panels (n, 4, 3) that carry polynomials, in their long frames."""
    corners = np.ascontiguousarray(corners, dtype=float)
    return panel_arrays(corners, long_frames(corners))


def monomials(x: np.ndarray, y: np.ndarray) -> np.ndarray:
    """1, x, y, xx, yy, xy at points (n, k): (n, 6, k)."""
    return np.stack([np.ones_like(x), x, y, x * x, y * y, x * y], axis=1)


def panel_basis(panels: PanelArrays) -> np.ndarray:
    """Coefficients (n, 6, 6), lower triangular: rows are functions, columns monomials.

    Coordinates are measured in their own spread while the functions are made orthogonal, so
    that a needle is no worse than a square.
    """
    xi, eta, weight = gauss_square(4)
    at, jacobian = bilinear(panels.corners, xi, eta)
    mean = jacobian * weight / panels.area[:, None]
    spread = np.sqrt(np.sum(mean[:, :, None] * at**2, axis=1))
    at = at / spread[:, None]
    rows = np.sqrt(mean)[:, None] * monomials(at[..., 0], at[..., 1])
    upper = np.linalg.qr(rows.swapaxes(1, 2), mode="r")
    upper = upper * np.sign(np.einsum("nkk->nk", upper))[:, :, None]
    scale = 1.0 / monomials(spread[:, :1], spread[:, 1:])
    return np.tril(np.linalg.inv(upper).swapaxes(1, 2) * scale.swapaxes(1, 2))


def values(basis: np.ndarray, at: np.ndarray) -> np.ndarray:
    """The functions (n, 6, k) at points (n, k, 2) in the panels' frames."""
    return np.einsum("nfm,nmk->nfk", basis, monomials(at[..., 0], at[..., 1]))
