"""Single panels, (4, 3) corners each, that the tests of integrals are made of."""

from __future__ import annotations

import numpy as np

from bem.scene.placing import rotation


def flat(*points: tuple[float, float]) -> np.ndarray:
    """Panel in the xy-plane; of three points the last is repeated."""
    ring = [*points, points[-1]] if len(points) == 3 else points
    return np.array([(x, y, 0.0) for x, y in ring])


def rectangle(u: tuple[float, float], v: tuple[float, float], w: float = 0.0) -> np.ndarray:
    """Rectangle u0 < x < u1, v0 < y < v1 at height w."""
    return flat((u[0], v[0]), (u[1], v[0]), (u[1], v[1]), (u[0], v[1])) + (0.0, 0.0, w)


def upright(u: tuple[float, float], w: tuple[float, float], v: float = 0.0) -> np.ndarray:
    """Rectangle u0 < x < u1, w0 < z < w1 at y = v."""
    return rectangle(u, w)[:, [0, 2, 1]] + (0.0, v, 0.0)


def turned(panel: np.ndarray, seed: int) -> np.ndarray:
    """Turn and shift a panel by what ``seed`` chooses; equal seeds keep panels together."""
    random = np.random.default_rng(seed)
    axis = tuple(random.normal(size=3).tolist())
    return panel @ rotation(axis, random.uniform(0.0, 360.0)).T + random.uniform(-0.5, 0.5, 3)


def in_plane(panel: np.ndarray, degrees: float) -> np.ndarray:
    """Turn a panel about the z axis."""
    return panel @ rotation((0.0, 0.0, 1.0), degrees).T


SQUARE = rectangle((0.0, 1.0), (0.0, 1.0))
TRIANGLE = flat((0.0, 0.0), (1.0, 0.1), (0.3, 0.8))
SKEW = flat((0.0, 0.0), (1.2, 0.1), (0.9, 0.8), (0.1, 0.5))
NEEDLE = rectangle((0.0, 1.0), (0.0, 1e-4))
SPLINTER = flat((0.0, 0.0), (1.0, 0.0), (0.4, 1e-4))
SHAPES = {
    "square": SQUARE,
    "triangle": TRIANGLE,
    "skew": SKEW,
    "needle": NEEDLE,
    "splinter": SPLINTER,
}
