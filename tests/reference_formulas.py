"""Closed forms and one-dimensional equations for capacitances, independent of the package.

Every value is a length L = C / (4 pi eps0) in the unit of the arguments (a sphere of radius 1 has
L = 1), except where a docstring says "per length", which is C' / eps0. Maxwell signs.
"""

from __future__ import annotations

import math

import numpy as np
from scipy.special import ellipk, elliprf

Matrix = np.ndarray

NEGLIGIBLE_AT = 80.0
"""Where an integrand that falls like exp(-t/2) is cut off (4e-18)."""


def disc(radius: float) -> float:
    """Thin circular disc: 2 a / pi (any textbook)."""
    return 2.0 * radius / math.pi


def prolate_spheroid(half_axis: float, radius: float) -> float:
    """Spheroid longer than wide: e / acosh(a/b), e^2 = a^2 - b^2."""
    return math.sqrt(half_axis**2 - radius**2) / math.acosh(half_axis / radius)


def oblate_spheroid(radius: float, half_axis: float) -> float:
    """Spheroid wider than long: e / acos(c/a), e^2 = a^2 - c^2."""
    return math.sqrt(radius**2 - half_axis**2) / math.acos(half_axis / radius)


def ellipsoid(a: float, b: float, c: float) -> float:
    """Ellipsoid with semi-axes a, b, c: 1 / R_F(a^2, b^2, c^2) (DLMF 19.33.6)."""
    return 1.0 / float(elliprf(a * a, b * b, c * c))


def torus(major: float, minor: float, terms: int = 60) -> float:
    """Torus by ring functions (DLMF 14.19), which two trapezoidal rules integrate.

    L = (2 c / pi) sum' Q_{n-1/2}(ch) / P_{n-1/2}(ch), c^2 = R^2 - r^2, ch = R / r; the sum counts
    n = 0 once and all others twice.
    """
    order = np.arange(terms)[:, None]
    ch, c = major / minor, math.sqrt(major**2 - minor**2)
    sh = c / minor
    angle = (np.arange(256) + 0.5) * np.pi / 256
    first = np.mean((ch + sh * np.cos(angle)) ** (order - 0.5), axis=1)
    step = 1.0 / 16.0
    t = np.arange(-NEGLIGIBLE_AT, NEGLIGIBLE_AT + step, step)
    second = 0.5 * step * np.sum((ch + sh * np.cosh(t)) ** (-order - 0.5), axis=1)
    ratio = second / first
    return float(2.0 * c / math.pi * (ratio[0] + 2.0 * ratio[1:].sum()))


def bowl(radius: float, polar_angle: float) -> float:
    """Open part of a sphere out to ``polar_angle`` from its pole (Kelvin 1869)."""
    return radius * (polar_angle + math.sin(polar_angle)) / math.pi


def solid_hemisphere(radius: float) -> float:
    """Half ball: 2 (1 - 1/sqrt 3) a (inversion)."""
    return 2.0 * radius * (1.0 - 1.0 / math.sqrt(3.0))


def spheres_in_contact(radius: float) -> float:
    """Two equal spheres that touch, as one body: 2 a ln 2."""
    return 2.0 * radius * math.log(2.0)


def cylinder_fit(radius: float, half_length: float) -> float:
    """Solid cylinder, Smythe's fit (J. Appl. Phys. 27, 917, 1956; 33, 2966, 1962), within 0.6 %."""
    return radius * (8.0 + 6.95 * (half_length / radius) ** 0.76) / (4.0 * math.pi)


def concentric_spheres(inner: float, outer: float) -> Matrix:
    """Sphere inside a thin spherical shell: [[k, -k], [-k, k + b]], k = a b / (b - a)."""
    inside = inner * outer / (outer - inner)
    return np.array([[inside, -inside], [-inside, inside + outer]])


def two_spheres(a: float, b: float, distance: float) -> Matrix:
    """Two spheres by the series of images (Maxwell, Treatise).

    cosh mu = (d^2 - a^2 - b^2) / (2 a b).
    """
    mu = math.acosh((distance**2 - a * a - b * b) / (2.0 * a * b))
    n = np.arange(int(300.0 / mu))
    here, after = np.sinh(n * mu), np.sinh((n + 1) * mu)
    factor = a * b * math.sinh(mu)
    first = factor * np.sum(1.0 / (a * here + b * after))
    second = factor * np.sum(1.0 / (b * here + a * after))
    mutual = -factor / distance * np.sum(1.0 / here[1:])
    return np.array([[first, mutual], [mutual, second]])


def two_discs(gap: float, nodes: int = 400) -> Matrix:
    """Equal coaxial thin discs of radius 1 by the integral equation of Love (1949).

    f(x) +- (1/pi) int_{-1}^{1} k f(t) / (k^2 + (x-t)^2) dt = 1 with + for equal and - for opposite
    potentials; the charge per volt of a disc is int f / pi. Accurate once ``nodes`` times ``gap``
    exceeds about 20.
    """
    x, weight = np.polynomial.legendre.leggauss(nodes)
    kernel = gap / (gap**2 + (x[:, None] - x) ** 2) / np.pi * weight
    one, unit = np.ones(nodes), np.eye(nodes)
    equal, opposite = (
        weight @ np.linalg.solve(unit + s * kernel, one) / np.pi for s in (1.0, -1.0)
    )
    own, mutual = 0.5 * (equal + opposite), 0.5 * (equal - opposite)
    return np.array([[own, mutual], [mutual, own]])


def two_discs_kirchhoff(gap: float) -> float:
    """Charge per volt between equal discs of radius 1 for small gaps (Kirchhoff 1877)."""
    return 1.0 / (4.0 * gap) + (math.log(16.0 * math.pi / gap) - 1.0) / (4.0 * math.pi)


def two_wires(radius: float, distance: float) -> float:
    """Parallel round wires of one radius, charge per volt between them, per length.

    2 pi / acosh((d^2 - 2 a^2) / (2 a^2)) = pi / acosh(d / 2 a).
    """
    return 2.0 * math.pi / math.acosh((distance**2 - 2.0 * radius**2) / (2.0 * radius**2))


def wire_over_plane(height_over_radius: float) -> float:
    """Round wire over an earthed plane, per length."""
    return 2.0 * math.pi / math.acosh(height_over_radius)


def coaxial_line(ratio: float) -> float:
    """Coaxial cable with radii in ``ratio``, per length."""
    return 2.0 * math.pi / math.log(ratio)


def cross_capacitance() -> float:
    """Opposite quarters of a closed shell, per length (Thompson & Lampard, Nature 177, 888, 1956).

    The two cross-capacitances obey exp(-pi C1) + exp(-pi C2) = 1 in these units; equal ones give
    ln 2 / pi.
    """
    return math.log(2.0) / math.pi


def shielded_strip(width_over_spacing: float) -> float:
    """Thin strip midway between two planes, per length, by conformal mapping.

    4 K(k) / K'(k) with k = tanh(pi w / 2 b).
    """
    parameter = math.tanh(0.5 * math.pi * width_over_spacing) ** 2
    return float(4.0 * ellipk(parameter) / ellipk(1.0 - parameter))


def volume_radius(volume: float) -> float:
    """Radius of the sphere of equal volume: no body of that volume has a smaller L."""
    return (3.0 * volume / (4.0 * math.pi)) ** (1.0 / 3.0)


def plate_bound(area: float) -> float:
    """Disc of equal area: no flat plate of that area has a smaller L (Polya & Szego 1951)."""
    return disc(math.sqrt(area / math.pi))


def box_half_mean_width(sides: tuple[float, float, float]) -> float:
    """Half the mean width of a box or rectangle: no convex body has a larger L."""
    return 0.25 * sum(sides)


def cylinder_half_mean_width(radius: float, half_length: float) -> float:
    """Half the mean width of a solid cylinder (or of a disc, at half length 0)."""
    return 0.5 * (half_length + 0.5 * math.pi * radius)
