"""What the expansions know of panels: moments as sources, eight samples as distant targets.

The samples are the rule of eight points and fifth degree on the square (Stroud 1971, C2 5-3,
from memory), with weights corrected so that all test functions have their true moments up to
the second order on a panel of any form.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from bem.kernels.arrays import PanelArrays, bilinear, gauss_square
from bem.kernels.basis import monomials, values
from bem.kernels.mixed_expansion import POWERS
from bem.kernels.targets import ETA, GAUSS_POINTS, XI

_SIDE, _CORNER = np.sqrt(7.0 / 15.0), np.sqrt(7.0 / 9.0)
EIGHT_XI = np.array([-_SIDE, _SIDE, 0.0, 0.0, -_CORNER, _CORNER, -_CORNER, _CORNER])
EIGHT_ETA = np.array([0.0, 0.0, -_SIDE, _SIDE, -_CORNER, -_CORNER, _CORNER, _CORNER])
_WEIGHT = np.repeat([40.0 / 49.0, 9.0 / 49.0], 4)


class FarPanels(NamedTuple):
    """Moments and samples of n panels.

    Args:
        moments: (n, 6, 15) integrals of the functions of each panel times ``POWERS`` of the
            position in its frame.
        points: (n, 3, 8) samples.
        weights: (n, 6, 8) test functions times integration weights.
    """

    moments: np.ndarray
    points: np.ndarray
    weights: np.ndarray


def _rows(at: np.ndarray) -> np.ndarray:
    return monomials(at[..., 0], at[..., 1])


def source_moments(panels: PanelArrays, basis: np.ndarray) -> np.ndarray:
    """Moments (n, 6, 15) of the functions ``basis`` (n, 6, 6); the rule integrates exactly."""
    xi, eta, weight = gauss_square(4)
    at, jacobian = bilinear(panels.corners, xi, eta)
    functions = values(basis, at) * (jacobian * weight)[:, None]
    powers = [at[..., 0] ** p * at[..., 1] ** q for p, q in POWERS]
    return np.ascontiguousarray(functions @ np.stack(powers, axis=2))


def legendre(xi: np.ndarray, eta: np.ndarray) -> np.ndarray:
    """P1(xi), P1(eta), P2(xi), P2(eta): (4, k)."""
    return np.array([xi, eta, 1.5 * xi**2 - 0.5, 1.5 * eta**2 - 0.5])


def _biquadratic(xi: np.ndarray, eta: np.ndarray) -> np.ndarray:
    """The nine products of powers up to the second, (k, 9)."""
    return np.stack([xi**p * eta**q for p in range(3) for q in range(3)], axis=1)


_CARRY = _biquadratic(EIGHT_XI, EIGHT_ETA) @ np.linalg.pinv(_biquadratic(XI, ETA))
"""(8, 16) values at the eight samples from those at the sixteen; exact for all functions."""


def _whitening(at: np.ndarray, mean: np.ndarray) -> np.ndarray:
    """Maps (n, 2, 2) to coordinates in which any panel is as wide as long."""
    second = np.einsum("nk,nka,nkb->nab", mean, at, at)
    spread = np.sqrt(np.einsum("naa->na", second))
    second = second / spread[:, :, None] / spread[:, None]
    return np.linalg.inv(np.linalg.cholesky(second)) / spread[:, None]


def _corrected(
    first: np.ndarray, plain: np.ndarray, rows: np.ndarray, exact: np.ndarray
) -> np.ndarray:
    """Weights (n, 6, 8) with the least change from ``first`` that have the ``exact`` moments."""
    back = rows * plain[:, None]
    missing = exact - first @ rows.swapaxes(1, 2)
    return first + missing @ np.linalg.solve(back @ rows.swapaxes(1, 2), back)


def eight_samples(panels: PanelArrays, weights: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Points (n, 3, 8), and weights (n, 6, 8) that stand for those at the 16 samples.

    Args:
        panels: n panels.
        weights: (n, 6, 16) test functions times integration weights at the samples of ``targets``.
    """
    many, full = bilinear(panels.corners, XI, ETA)
    few, part = bilinear(panels.corners, EIGHT_XI, EIGHT_ETA)
    full, part = full * gauss_square(GAUSS_POINTS)[2], part * _WEIGHT
    white = _whitening(many, full / panels.area[:, None]).swapaxes(1, 2)
    exact = weights @ _rows(many @ white).swapaxes(1, 2)
    first = (weights / full[:, None]) @ _CARRY.T * part[:, None]
    out = _corrected(first, part, _rows(few @ white), exact)
    points = panels.center[:, :, None] + np.einsum("nkc,ncd->ndk", few, panels.axes[:, :2])
    return np.ascontiguousarray(points), np.ascontiguousarray(out)


def far_panels(panels: PanelArrays, basis: np.ndarray, weights: np.ndarray) -> FarPanels:
    """Moments and samples of n panels.

    Args:
        panels: n panels.
        basis: (n, 6, 6) functions of each as combinations of 1, x, y, xx, yy, xy.
        weights: (n, 6, 16) test functions times integration weights at the samples of ``targets``.
    """
    return FarPanels(source_moments(panels, basis), *eight_samples(panels, weights))
