"""Where planes between layers cut flat faces, and the images that faces near them see."""

from __future__ import annotations

import numpy as np

from bem.geometry.layers import Layers
from bem.geometry.planes import Plane, Planes
from bem.panels.planar import Patch

PARALLEL = 1e-9
"""A face that rises by less than this sine is parallel to the layers."""
WEAK = 0.1
"""Images of less than this part of the charge cast no shadow."""
BEYOND = 1.5
"""How far a wall reaches from the middle of a face, in sizes of the face."""


def layer_walls(patch: Patch, layers: Layers | None) -> np.ndarray:
    """(w, 2, 2) lines along which planes between layers cut a face, in its own plane."""
    if layers is None:
        return np.empty((0, 2, 2))
    rise = patch.axes[:2, layers.axis]
    steepness = float(np.linalg.norm(rise))
    if steepness < PARALLEL:
        return np.empty((0, 2, 2))
    points = patch.edges.reshape(-1, 2)
    middle = 0.5 * (points.min(axis=0) + points.max(axis=0))
    height = patch.origin[layers.axis] + points @ rise
    up = rise / steepness
    along = BEYOND * patch.size * np.array([[-up[1], up[0]], [up[1], -up[0]]])
    level = patch.origin[layers.axis] + middle @ rise
    return np.array(
        [
            middle + up * (plane - level) / steepness + along
            for plane in layers.between
            if height.min() < plane < height.max()
        ]
    ).reshape(-1, 2, 2)


def with_layer_mirrors(planes: Planes) -> list[Planes]:
    """The planes, and each plane of the layers in which a charge has a strong image, by itself."""
    layers = planes.layers
    if layers is None:
        return [planes]
    steps = zip(layers.planes, layers.permittivity, layers.permittivity[1:], strict=False)
    strong = [at for at, a, b in steps if at in layers.between and abs(a - b) > WEAK * (a + b)]
    return [planes, *(Planes(Plane(layers.axis, at)) for at in (*layers.grounded, *strong))]
