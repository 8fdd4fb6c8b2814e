"""Samples of a panel clustered at its rim and at cuts, with its test functions, for near pairs.

On each stretch between two cuts nodes t of Gauss's rule are moved to 3 t^2 - 2 t^3.
"""

from __future__ import annotations

import numpy as np

from bem.compiled import njit
from bem.kernels.pairs import clustered_rule
from bem.kernels.rim_cuts import on_panel

UNCUT = np.array([-1.0, 1.0])
_WHOLE, _PART, _SMALL = clustered_rule(8, False), clustered_rule(6, False), clustered_rule(5, False)
"""Rules for directions of one, two or three, and more stretches."""


@njit(cache=True, error_model="numpy")
def _nodes(cuts):
    """Nodes and weights on (-1, 1), clustered at all cuts."""
    rule = _WHOLE if cuts.size == 2 else _PART if cuts.size < 5 else _SMALL
    each = rule[0].size
    nodes, weights = np.empty(each * (cuts.size - 1)), np.empty(each * (cuts.size - 1))
    for k in range(cuts.size - 1):
        half = 0.5 * (cuts[k + 1] - cuts[k])
        for q in range(each):
            nodes[each * k + q] = cuts[k] + half * (1.0 + rule[0][q])
            weights[each * k + q] = half * rule[1][q]
    return nodes, weights


@njit(cache=True, error_model="numpy")
def _legendre(mean, i, s, t, weight, k, weights):
    """The constant and four Legendre polynomials less their means, times the weight."""
    weights[0, 0, k] = weight
    weights[0, 1, k] = weight * (s - mean[i, 0])
    weights[0, 2, k] = weight * (t - mean[i, 1])
    weights[0, 3, k] = weight * (1.5 * s * s - 0.5 - mean[i, 2])
    weights[0, 4, k] = weight * (1.5 * t * t - 0.5 - mean[i, 3])
    weights[0, 5, k] = 0.0


@njit(cache=True, error_model="numpy")
def _polynomials(basis, i, x, y, weight, k, weights):
    """The six functions of an interface panel, times the weight."""
    powers = (1.0, x, y, x * x, y * y, x * y)
    for f in range(6):
        total = 0.0
        for m in range(6):
            total += basis[i, f, m] * powers[m]
        weights[0, f, k] = weight * total


@njit(cache=True, error_model="numpy")
def rim_samples(p, setup, cuts):
    """Samples of panel or image p.

    Args:
        p: index among panels and images.
        setup: the ``MixedPanels``.
        cuts: of both directions, as from ``rim_cuts``.

    Returns:
        points (1, 3, m), and test functions times integration weights (1, 6, m).
    """
    panels, count = setup.panels, setup.basis.shape[0]
    i = p % count
    u, v = _nodes(cuts[0]), _nodes(cuts[1])
    m = u[0].size * v[0].size
    points, weights = np.empty((1, 3, m)), np.empty((1, 6, m))
    corners, axes, center = panels.corners[p], panels.axes[p], panels.center[p]
    for k in range(m):
        a, b = k // v[0].size, k % v[0].size
        s, t = u[0][a], v[0][b]
        x, y, xs, ys, xt, yt = on_panel(corners, s, t)
        for c in range(3):
            points[0, c, k] = center[c] + x * axes[0, c] + y * axes[1, c]
        weight = u[1][a] * v[1][b] * (xs * yt - ys * xt)
        if i < setup.counts[0]:
            _legendre(setup.mean, i, s, t, weight, k, weights)
        else:
            _polynomials(setup.basis, i, x, y, weight, k, weights)
    return points, weights
