"""Bodies of revolution solved to nine digits by a spectral method of their own.

The generator is a chain of straight pieces, run through by theta in (0, pi). On each piece a
sigmoid of degree p crowds the nodes at both ends (Kress 1990), which smooths the charge
mu(theta) dtheta there, at corners and free rims alike. Continued evenly, mu is periodic, and
cosine interpolation converges fast. The potential of a ring of unit charge is (2/pi) K(m) / D with
D^2 = (r+s)^2 + (z-w)^2 and 1 - m = ((r-s)^2 + (z-w)^2) / D^2; near m = 1 the elliptic integral is
-(1/pi) K(1-m) ln(1-m) plus a smooth part, and the logarithm is integrated exactly.

Nothing here is shared with the package: no panels, no collocation in space, no quadrature of 1/r.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.special import ellipk, ellipkm1

DEGREE = 4
"""Of the sigmoid."""


@dataclass(frozen=True)
class Generator:
    """Chain of straight pieces through points (r, z), revolved about the z axis.

    Its two ends are free rims. A disc or a solid gets a pinhole on the axis instead of an end
    there: one of 1e-3 of the radius changes L by less than 1e-9.
    """

    points: tuple[tuple[float, float], ...]


@dataclass(frozen=True)
class Nodes:
    """Points (n,) of a generator and the length per angle (n,) that it runs there."""

    radius: np.ndarray
    height: np.ndarray
    speed: np.ndarray


def revolved_capacitance(generators: list[Generator], count: int = 240) -> np.ndarray:
    """Maxwell matrix in L = C / (4 pi eps0), one conductor per generator.

    Args:
        generators: they must not touch.
        count: unknowns per generator.
    """
    nodes = [_nodes(generator, count) for generator in generators]
    blocks = [[_self_block(a) if a is b else _block(a, b) for b in nodes] for a in nodes]
    ones = np.kron(np.eye(len(nodes)), np.ones((count, 1)))
    return ones.T @ np.linalg.solve(np.block(blocks), ones) * np.pi / count


def _angles(count: int) -> np.ndarray:
    return (np.arange(count) + 0.5) * np.pi / count


def _nodes(generator: Generator, count: int) -> Nodes:
    points = np.array(generator.points, dtype=float)
    pieces = len(points) - 1
    along = _angles(count) / np.pi * pieces
    piece = along.astype(int)
    here, slope = _sigmoid(along - piece)
    step = points[piece + 1] - points[piece]
    place = points[piece] + here[:, None] * step
    return Nodes(place[:, 0], place[:, 1], np.hypot(*step.T) * slope * pieces / np.pi)


def _sigmoid(u: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Map of [0, 1] on itself that is flat at both ends, and its slope."""
    left, right = u**DEGREE, (1.0 - u) ** DEGREE
    slope = DEGREE * (u * (1.0 - u)) ** (DEGREE - 1) / (left + right) ** 2
    return left / (left + right), slope


def _distances(to: Nodes, by: Nodes) -> tuple[np.ndarray, np.ndarray]:
    """1 - m, and the distance D to the far side of the source ring."""
    rise = (to.height[:, None] - by.height) ** 2
    far = (to.radius[:, None] + by.radius) ** 2 + rise
    near = (to.radius[:, None] - by.radius) ** 2 + rise
    return near / far, np.sqrt(far)


def _block(to: Nodes, by: Nodes) -> np.ndarray:
    ratio, far = _distances(to, by)
    return 2.0 / np.pi * ellipkm1(ratio) / far * np.pi / len(by.radius)


def _self_block(nodes: Nodes) -> np.ndarray:
    """Matrix of a body on itself: the smooth part by points, the logarithm exactly."""
    angle = _angles(len(nodes.radius))
    spread = 2.0 * np.abs(np.cos(angle)[:, None] - np.cos(angle))
    ratio, far = _distances(nodes, nodes)
    own = 2.0 * nodes.radius
    np.fill_diagonal(ratio, 1.0)
    np.fill_diagonal(spread, 1.0)
    strength = -4.0 / np.pi**2 * ellipk(ratio) / far
    np.fill_diagonal(strength, -2.0 / np.pi / own)
    smooth = 2.0 / np.pi * ellipkm1(ratio) / far - strength * np.log(spread)
    closest = np.log(8.0 * own * np.sin(angle) / nodes.speed)
    np.fill_diagonal(smooth, 2.0 / np.pi / own * closest)
    return smooth * np.pi / len(angle) + strength * _log_weights(angle)


def _log_weights(angle: np.ndarray) -> np.ndarray:
    """Weights w_ij with sum_j w_ij f(t_j) = int_0^pi ln|2 (cos t_i - cos t)| f(t) dt."""
    order = np.arange(1, len(angle))[:, None]
    waves = np.cos(order * angle)
    return -2.0 * np.pi / len(angle) * waves.T @ (waves / order)
