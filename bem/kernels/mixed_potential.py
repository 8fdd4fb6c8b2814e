"""Potential of charge densities that are constant or linear on each panel."""

from __future__ import annotations

import numpy as np

from bem.compiled import njit
from bem.kernels.mixed_arrays import MixedPanels
from bem.kernels.moments import ROWS, moments


@njit(cache=True, nogil=True, error_model="numpy")
def _potential(panels, basis, points, density):
    """Sum at points (3, m) over panels of the potential of densities (g n, 3)."""
    count = points.shape[1]
    block, work = points.reshape((1, 3, count)), np.empty((ROWS, count))
    total = np.zeros(count)
    for source in range(density.shape[0]):
        moments(source, basis, panels, block, 0, work)
        one, first, second = density[source, 0], density[source, 1], density[source, 2]
        for k in range(count):
            total[k] += one * work[3, k] + first * work[10, k] + second * work[11, k]
    return total


def mixed_potential(
    setup: MixedPanels, points: np.ndarray, density: np.ndarray, weight: np.ndarray
) -> np.ndarray:
    """(m,) potential at points (m, 3).

    Args:
        setup: n panels and their images.
        points: (m, 3).
        density: (n, 3) coefficients of 1, f1, f2 on each panel.
        weight: (g, n) factor of each image of each panel, as seen from the points.
    """
    every = np.concatenate([factor[:, None] * density for factor in weight])
    return _potential(setup.panels, setup.basis, np.ascontiguousarray(points.T), every)
