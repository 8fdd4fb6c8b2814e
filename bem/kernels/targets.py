"""Where the potential of a panel is sampled, and the test functions of the error indicator.

A panel is the image of the square -1 < xi, eta < 1 (a triangle with one side collapsed).
Samples are 4 x 4 Gauss points of that square. The tests are the Legendre polynomials
P1(xi), P1(eta), P2(xi), P2(eta), each less its mean over the panel: they see what a
constant density cannot represent, in either direction.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from bem.kernels.arrays import PanelArrays, bilinear, gauss_square

GAUSS_POINTS = 4
XI, ETA, _WEIGHT = gauss_square(GAUSS_POINTS)


class Targets(NamedTuple):
    """Sample points and test functions of n panels.

    Args:
        points: (n, 3, 16).
        weights: (n, 16) integration weights, summing to the area.
        tests: (n, 4, 16) test functions times the weights.
        first: (n, 4, 2) integral of test times in-plane position.
        second: (n, 4, 3) integral of test times xx, yy, xy of the in-plane position.
        square: (n, 4) integral of the squared test.
    """

    points: np.ndarray
    weights: np.ndarray
    tests: np.ndarray
    first: np.ndarray
    second: np.ndarray
    square: np.ndarray


def make_targets(panels: PanelArrays) -> Targets:
    """Samples and tests of all panels; those of one do not depend on the others to the last bit."""
    at, jacobian = bilinear(panels.corners, XI, ETA)
    weights = jacobian * _WEIGHT
    raw = np.array([XI, ETA, 1.5 * XI**2 - 0.5, 1.5 * ETA**2 - 0.5])
    mean = np.einsum("nk,tk->nt", weights, raw) / panels.area[:, None]
    test = raw[None] - mean[:, :, None]
    weighted = test * weights[:, None, :]
    products = np.stack([at[..., 0] ** 2, at[..., 1] ** 2, at[..., 0] * at[..., 1]], axis=2)
    points = panels.center[:, :, None] + np.einsum("nkc,ncd->ndk", at, panels.axes[:, :2])
    return Targets(
        points=np.ascontiguousarray(points),
        weights=weights,
        tests=np.ascontiguousarray(weighted),
        first=np.einsum("ntk,nkc->ntc", weighted, at),
        second=np.einsum("ntk,nkc->ntc", weighted, products),
        square=np.sum(weighted * test, axis=2),
    )
