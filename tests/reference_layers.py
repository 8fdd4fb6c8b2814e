"""Single and double layers of monomials on a planar polygon, slow and independent of the package.

In polar coordinates about the projection of the point the integral along the radius is
closed, and what is left is an integral along each side; with t = p sinh(s) its integrand is
smooth at any distance p. Eighty-bit floats, Gauss's rule on short stretches.
"""

from __future__ import annotations

import numpy as np

LONG = np.longdouble
_NODES = 20
_STRETCH = 1.0


def _gauss() -> tuple[np.ndarray, np.ndarray]:
    """Nodes and weights on (0, 1), with all the digits of the long format."""
    x = np.polynomial.legendre.leggauss(_NODES)[0].astype(LONG)
    for _ in range(2):
        before, here = np.ones_like(x), x
        for n in range(1, _NODES):
            before, here = here, ((2 * n + 1) * x * here - n * before) / (n + 1)
        slope = _NODES * (x * here - before) / (x * x - 1)
        x = x - here / slope
    return 0.5 * (x + 1), 1 / ((1 - x * x) * slope * slope)


_X, _W = _gauss()


def _radial(r: np.ndarray, h: LONG) -> list[np.ndarray]:
    """Integrals of 1 and rho over the distance, and of h, h rho, h rho^2 over its cube."""
    a = abs(h)
    d = np.sqrt(r * r + h * h)
    grow = np.arcsinh(r / a) if a > 0 else np.zeros_like(r)
    return [
        d - a,
        0.5 * (r * d - h * h * grow),
        np.sign(h) * (1 - a / d),
        h * (grow - r / d),
        h * ((r * r + 2 * h * h) / d - 2 * a),
    ]


def _side(a: np.ndarray, b: np.ndarray, h: LONG) -> np.ndarray:
    """Part (9,) of one side from a to b, seen from the origin, of the layers of u."""
    length = np.sqrt(np.sum((b - a) ** 2))
    along = (b - a) / length
    out = np.array([along[1], -along[0]])
    p = a @ out
    if p == 0:
        return np.zeros(9, dtype=LONG)
    foot = abs(p)
    start, end = np.arcsinh((a @ along) / foot), np.arcsinh((b @ along) / foot)
    pieces = int(np.ceil((end - start) / _STRETCH))
    step = (end - start) / pieces
    s = (start + step * (np.arange(pieces)[:, None] + _X)).ravel()
    weight = np.tile(_W, pieces) * step / np.cosh(s) * np.sign(p)
    ray = (out[:, None] * np.sign(p) + along[:, None] * np.sinh(s)) / np.cosh(s)
    v0, v1, k0, k1, k2 = _radial(foot * np.cosh(s), h)
    rows = [v0, v1 * ray[0], v1 * ray[1], k0, k1 * ray[0], k1 * ray[1]]
    rows += [k2 * ray[0] ** 2, k2 * ray[1] ** 2, k2 * ray[0] * ray[1]]
    return np.array(rows) @ weight


def layers(ring: np.ndarray, point: np.ndarray) -> np.ndarray:
    """V of 1, x, y and K of 1, x, y, xx, yy, xy (9,), in the plane's coordinates.

    Args:
        ring: (k, 2) corners, counter-clockwise.
        point: (3,) the last the signed height above the plane.
    """
    ring, point = ring.astype(LONG), point.astype(LONG)
    x, y, h = point
    around = ring - point[:2]
    sides = [(a, b) for a, b in zip(around, np.roll(around, -1, axis=0), strict=True)]
    total = sum(_side(a, b, h) for a, b in sides if (a != b).any())
    v, vx, vy, k, kx, ky, xx, yy, xy = total
    full = [v, vx + x * v, vy + y * v, k, kx + x * k, ky + y * k]
    full += [xx + 2 * x * kx + x * x * k, yy + 2 * y * ky + y * y * k]
    return np.array([*full, xy + x * ky + y * kx + x * y * k])
