"""Closed forms and series for conductors among dielectrics, independent of the package.

Every value is a length L = C / (4 pi eps0) in the unit of the arguments; permittivities are
relative to the surroundings.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from scipy.special import comb


def coated_sphere(radius: float, outer: float, permittivity: float) -> float:
    """Conducting sphere in a concentric coat: 1 / [(1/a - 1/b) / er + 1/b]."""
    return 1.0 / ((1.0 / radius - 1.0 / outer) / permittivity + 1.0 / outer)


def layered_spheres(radii: Sequence[float], permittivities: Sequence[float]) -> float:
    """Between concentric conductors at the first and last radius: 1 / sum((1/a - 1/b) / er).

    The layers between fill the gap, from the inside outward; a last radius without end gives the
    capacitance to the surroundings.
    """
    inverse = [0.0 if math.isinf(r) else 1.0 / r for r in radii]
    steps = -np.diff(inverse) / np.array(permittivities)
    return 1.0 / float(np.sum(steps))


def sphere_and_dielectric_sphere(
    radius: float, other: float, distance: float, permittivity: float, terms: int = 80
) -> float:
    """Conducting sphere beside an uncharged dielectric one, by multipoles about both centres.

    Outside, phi = sum A_n (a/r)^(n+1) P_n + sum B_n (b/r')^(n+1) P_n', angles from the line to the
    other centre, so that (1/r')^(n+1) P_n' = sum_m C(n+m, m) r^m / d^(n+m+1) P_m. The conductor
    asks for phi = 1, the dielectric for B_m = -(er - 1) m / (er m + m + 1) R_m b^m, with R_m the
    coefficient of r'^m P_m' in the field of the conductor.
    """
    a, b, d = radius, other, distance
    n = np.arange(terms)[:, None]
    m = np.arange(terms)[None, :]
    pairs = comb(n + m, m) / d
    toward_a = pairs * (a / d) ** n * (b / d) ** m * b
    toward_b = pairs * (b / d) ** n * (a / d) ** m * a
    order = np.arange(terms)
    answer = (permittivity - 1.0) * order / (permittivity * order + order + 1.0)
    system = np.eye(terms) - toward_a @ (answer[:, None] * toward_b)
    return float(a * np.linalg.solve(system, np.eye(terms)[:, 0])[0])


def sphere_over_half_space(radius: float, height: float, permittivity: float) -> float:
    """Conducting sphere with its centre ``height`` above a half-space.

    a sum_n k^n sinh al / sinh((n+1) al), k = (er - 1) / (er + 1), cosh al = h / a: images of
    images, each weakened by k (Thomson 1848, from memory).
    """
    alpha = math.acosh(height / radius)
    k = (permittivity - 1.0) / (permittivity + 1.0)
    n = np.arange(min(int(600.0 / alpha), 200_000))
    decay = np.exp(-n * alpha) * -np.expm1(-2 * alpha) / -np.expm1(-2 * (n + 1) * alpha)
    return float(radius * np.sum(k**n * decay))


def sunk_to_half(alone: float, permittivity: float) -> float:
    """Body that the plane of a half-space cuts in mirror halves: L0 (1 + er) / 2.

    Its field is that of vacuum, which has no component normal to the plane there.
    """
    return 0.5 * alone * (1.0 + permittivity)


def ideal_plates(area: float, layers: Sequence[tuple[float, float]]) -> float:
    """Plates with layers (thickness, er) between, edges left out: A / sum(d/er) / 4 pi."""
    return area / sum(d / er for d, er in layers) / (4.0 * math.pi)
