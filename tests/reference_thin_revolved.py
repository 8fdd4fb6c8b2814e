"""Thin sheets of revolution solved to ten digits by a spectral method of their own.

A sheet whose generator is a straight line, s = mid + half * cos(theta), carries the charge
mu(theta) dtheta. For open sheets mu is smooth and even in theta, so cosine interpolation converges
exponentially. The potential of a ring of unit charge is (2/pi) K(m) / D with
D^2 = (r+s)^2 + (z-w)^2 and 1 - m = ((r-s)^2 + (z-w)^2) / D^2. Near m = 1 the elliptic integral is
-(1/pi) K(1-m) ln(1-m) plus a smooth part; the logarithm is integrated exactly (Kress 1989).

Nothing here is shared with the package: no panels, no collocation in space, no quadrature of 1/r.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.special import ellipk, ellipkm1


@dataclass(frozen=True)
class Generator:
    """Straight generator from (r0, z0) to (r1, z1), revolved about the z axis."""

    r0: float
    z0: float
    r1: float
    z1: float

    @property
    def half(self) -> float:
        """Half of its length."""
        return 0.5 * float(np.hypot(self.r1 - self.r0, self.z1 - self.z0))

    def points(self, cosines: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """Radii and heights at the given cosines."""
        radius = 0.5 * (self.r0 + self.r1) + 0.5 * (self.r1 - self.r0) * cosines
        height = 0.5 * (self.z0 + self.z1) + 0.5 * (self.z1 - self.z0) * cosines
        return radius, height


def thin_capacitance(generators: list[Generator], nodes: int = 100) -> np.ndarray:
    """Maxwell matrix in L of thin sheets of revolution.

    Args:
        generators: one per conductor; both ends are free edges. A disc is given a pinhole: one
            of 1e-3 of its radius changes L by 1e-10.
        nodes: unknowns per generator.
    """
    blocks = [[_block(to, by, nodes) for by in generators] for to in generators]
    ones = np.kron(np.eye(len(generators)), np.ones((nodes, 1)))
    return ones.T @ np.linalg.solve(np.block(blocks), ones) * np.pi / nodes


def _block(to: Generator, by: Generator, nodes: int) -> np.ndarray:
    cosines = np.cos((np.arange(nodes) + 0.5) * np.pi / nodes)
    radius, height = (x[:, None] for x in to.points(cosines))
    source_radius, source_height = by.points(cosines)
    far2 = (radius + source_radius) ** 2 + (height - source_height) ** 2
    near2 = (radius - source_radius) ** 2 + (height - source_height) ** 2
    if to is by:
        return _self_block(near2 / far2, np.sqrt(far2), by.half)
    return 2.0 / np.pi * ellipkm1(near2 / far2) / np.sqrt(far2) * np.pi / nodes


def _self_block(ratio: np.ndarray, far: np.ndarray, half: float) -> np.ndarray:
    """Matrix of a sheet on itself: the smooth part by points, the logarithm exactly."""
    nodes = len(ratio)
    angle = (np.arange(nodes) + 0.5) * np.pi / nodes
    spread = 2.0 * np.abs(np.cos(angle)[:, None] - np.cos(angle))
    diagonal = np.diag(far).copy()
    np.fill_diagonal(ratio, 1.0)
    np.fill_diagonal(spread, 1.0)
    strength = -4.0 / np.pi**2 * ellipk(ratio) / far
    np.fill_diagonal(strength, -2.0 / np.pi / diagonal)
    smooth = 2.0 / np.pi * ellipkm1(ratio) / far - strength * np.log(spread)
    np.fill_diagonal(smooth, 2.0 / np.pi / diagonal * np.log(8.0 * diagonal / half))
    return smooth * np.pi / nodes + strength * _log_weights(angle)


def _log_weights(angle: np.ndarray) -> np.ndarray:
    """Weights w_ij with sum_j w_ij f(t_j) = int_0^pi ln|2 (cos t_i - cos t)| f(t) dt."""
    order = np.arange(1, len(angle))[:, None]
    waves = np.cos(order * angle)
    return -2.0 * np.pi / len(angle) * waves.T @ (waves / order)
