"""What the compiled integrals know of each panel, as plain arrays in one named tuple.

Every panel is a planar convex quadrilateral; a triangle is one whose last two corners
coincide. In its own frame the corners are counter-clockwise, the centroid is the origin
and the first axis runs along the side from corner 0 to corner 1.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

RECTANGLE_TOLERANCE = 1e-9
"""A quadrilateral counts as a rectangle if its corners fit one to this part of its size."""


class PanelArrays(NamedTuple):
    """Geometry of n panels; lengths in the unit of the corners.

    Args:
        center: (n, 3) centroids.
        axes: (n, 3, 3) rows: two in-plane axes and the normal.
        corners: (n, 4, 2) in the panel's frame, counter-clockwise.
        sides: (n, 4, 3) direction (2) and length of the side that starts at each corner.
        area: (n,).
        radius: (n,) largest distance of a corner from the centroid.
        moment: (n, 6) mean of (x - c)(x - c)^T: xx, yy, zz, xy, xz, yz.
        higher: (n, 9) mean third and fourth powers of the in-plane position about the centroid:
            xxx, xxy, xyy, yyy, xxxx, xxxy, xxyy, xyyy, yyyy.
        half: (n, 2) half the side lengths of a rectangle, zero for other panels.
    """

    center: np.ndarray
    axes: np.ndarray
    corners: np.ndarray
    sides: np.ndarray
    area: np.ndarray
    radius: np.ndarray
    moment: np.ndarray
    higher: np.ndarray
    half: np.ndarray


def bilinear(corners: np.ndarray, xi: np.ndarray, eta: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Images (n, k, 2) and Jacobians (n, k) of points of the square, corners (n, 4, 2)."""
    shape = 0.25 * np.array(
        [(1 - xi) * (1 - eta), (1 + xi) * (1 - eta), (1 + xi) * (1 + eta), (1 - xi) * (1 + eta)]
    )
    d_xi = 0.25 * np.array([-(1 - eta), 1 - eta, 1 + eta, -(1 + eta)])
    d_eta = 0.25 * np.array([-(1 - xi), -(1 + xi), 1 + xi, 1 - xi])
    at, a, b = (np.einsum("sk,nsc->nkc", m, corners) for m in (shape, d_xi, d_eta))
    return at, a[..., 0] * b[..., 1] - a[..., 1] * b[..., 0]


def gauss_square(points: int) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Product Gauss rule on the square: xi, eta and weights, (points^2,) each."""
    x, w = np.polynomial.legendre.leggauss(points)
    return np.repeat(x, points), np.tile(x, points), np.outer(w, w).ravel()


def _higher_moments(xy: np.ndarray, area: np.ndarray) -> np.ndarray:
    """(n, 9) mean third and fourth powers; the rule integrates them exactly."""
    xi, eta, weight = gauss_square(4)
    at, jacobian = bilinear(xy, xi, eta)
    mean = jacobian * weight / area[:, None]
    x, y = at[..., 0], at[..., 1]
    powers = [x**3, x**2 * y, x * y**2, y**3, x**4, x**3 * y, x**2 * y**2, x * y**3, y**4]
    return np.stack([(mean * p).sum(axis=1) for p in powers], axis=1)


def _unit(v: np.ndarray) -> np.ndarray:
    return v / np.linalg.norm(v, axis=-1, keepdims=True)


def normals(corners: np.ndarray) -> np.ndarray:
    """(n, 3) unit normals of panels (n, 4, 3) whose corners run counter-clockwise."""
    return _unit(np.cross(corners[:, 2] - corners[:, 0], corners[:, 3] - corners[:, 1]))


def side_frames(corners: np.ndarray) -> np.ndarray:
    """Axes (n, 3, 3) of panels (n, 4, 3): the first along the side from corner 0 to corner 1."""
    normal = normals(corners)
    along = corners[:, 1] - corners[:, 0]
    along = _unit(along - np.sum(along * normal, axis=1)[:, None] * normal)
    return np.stack([along, np.cross(normal, along), normal], axis=1)


def _planar_moments(xy: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Area (n,), centroid (n, 2), mean second moment (n, 2, 2) about it of polygons (n, 4, 2)."""
    a = xy - xy[:, :1]
    area = np.zeros(len(xy))
    first = np.zeros((len(xy), 2))
    second = np.zeros((len(xy), 2, 2))
    for k in (1, 2):
        p, q = a[:, k], a[:, k + 1]
        part = 0.5 * (p[:, 0] * q[:, 1] - p[:, 1] * q[:, 0])
        area += part
        first += part[:, None] * (p + q) / 3.0
        s = p + q
        outer = sum(v[:, :, None] * v[:, None, :] for v in (p, q, s))
        second += part[:, None, None] * outer / 12.0
    mean = first / area[:, None]
    return area, mean + xy[:, 0], second / area[:, None, None] - mean[:, :, None] * mean[:, None, :]


def _half_sides(xy: np.ndarray, radius: np.ndarray) -> np.ndarray:
    half = 0.25 * np.stack(
        [
            xy[:, 1, 0] + xy[:, 2, 0] - xy[:, 0, 0] - xy[:, 3, 0],
            xy[:, 2, 1] + xy[:, 3, 1] - xy[:, 0, 1] - xy[:, 1, 1],
        ],
        axis=1,
    )
    sign = np.array([[-1, -1], [1, -1], [1, 1], [-1, 1]])
    fit = np.abs(xy - half[:, None, :] * sign).max(axis=(1, 2))
    thin = np.minimum(radius, half.min(axis=1))
    return np.where((fit <= RECTANGLE_TOLERANCE * radius + 1e-6 * thin)[:, None], half, 0.0)


def panel_arrays(corners: np.ndarray, axes: np.ndarray | None = None) -> PanelArrays:
    """Arrays for the compiled integrals.

    Args:
        corners: (n, 4, 3) planar convex quadrilaterals, a triangle repeating its last corner.
        axes: (n, 3, 3) frames to use instead of those along side 0-1.
    """
    corners = np.ascontiguousarray(corners, dtype=float)
    axes = side_frames(corners) if axes is None else axes
    origin = corners.mean(axis=1)
    xy = np.einsum("nkc,nac->nka", corners - origin[:, None], axes[:, :2])
    area, mean, second = _planar_moments(xy)
    center = origin + np.einsum("na,nac->nc", mean, axes[:, :2])
    xy = xy - mean[:, None]
    radius = np.linalg.norm(xy, axis=2).max(axis=1)
    step = np.roll(xy, -1, axis=1) - xy
    length = np.linalg.norm(step, axis=2)
    direction = step / np.where(length > 0.0, length, 1.0)[:, :, None]
    full = np.einsum("nac,nab,nbd->ncd", axes[:, :2], second, axes[:, :2])
    return PanelArrays(
        center=center,
        axes=np.ascontiguousarray(axes),
        corners=np.ascontiguousarray(xy),
        sides=np.concatenate([direction, length[:, :, None]], axis=2),
        area=area,
        radius=radius,
        moment=np.stack(
            [full[:, a, b] for a, b in ((0, 0), (1, 1), (2, 2), (0, 1), (0, 2), (1, 2))], axis=1
        ),
        higher=_higher_moments(xy, area),
        half=_half_sides(xy, radius),
    )
