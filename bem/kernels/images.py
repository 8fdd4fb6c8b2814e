"""Panels with their images behind grounded planes, mirror planes and planes between layers."""

from __future__ import annotations

import itertools
from typing import NamedTuple

import numpy as np

from bem.compiled import njit
from bem.geometry.layers import Layers
from bem.geometry.planes import Planes
from bem.kernels.arrays import PanelArrays, panel_arrays
from bem.kernels.layered import layer_images
from bem.kernels.mixed_arrays import Images, no_images
from bem.kernels.pairs import Sources

COINCIDENT = 1e-6
"""An image nearer to its panel than this part of the radius lies in the same place."""


class Copies(NamedTuple):
    """Images of every panel, each point x of it at ``flip * x + shift``; the original is first.

    Args:
        flip: (g, 3) -1 for coordinates that are mirrored.
        shift: (g, 3).
        weight: (l, l, g) charge on each image over that of the panel, by the layer of the
            target and that of the panel.
    """

    flip: np.ndarray
    shift: np.ndarray
    weight: np.ndarray

    @property
    def parity(self) -> np.ndarray:
        """(g,) -1 for images that are mirrored."""
        return self.flip.prod(axis=1)

    def of(self, points: np.ndarray) -> np.ndarray:
        """(g, ..., 3) images of points (..., 3)."""
        shape = (len(self.flip),) + (1,) * (points.ndim - 1) + (3,)
        return self.flip.reshape(shape) * points + self.shift.reshape(shape)

    def times(self, other: Copies) -> Copies:
        """Images of images, those of ``other`` changing slowest."""
        flip = other.flip[:, None] * self.flip
        shift = other.flip[:, None] * self.shift + other.shift[:, None]
        weight = other.weight[..., :, None] * self.weight[..., None, :]
        return Copies(
            flip.reshape(-1, 3), shift.reshape(-1, 3), weight.reshape(*weight.shape[:2], -1)
        )


def reflections(planes: Planes) -> Copies:
    """Images in grounded and mirror planes."""
    flips, shifts = [], []
    for taken in itertools.product((False, True), repeat=len(planes.all)):
        flip, shift = np.ones(3), np.zeros(3)
        for plane in itertools.compress(planes.all, taken):
            flip[plane.axis], shift[plane.axis] = -1.0, 2.0 * plane.at
        flips.append(flip)
        shifts.append(shift)
    return Copies(np.array(flips), np.array(shifts), planes.signs[None, None])


def copies_in_layers(layers: Layers, occupied: np.ndarray, size: float) -> tuple[Copies, float]:
    """Images that stand for flat layers, and the error of the potential that they leave.

    Args:
        layers: the stack.
        occupied: layers that hold panels.
        size: largest distance of two panels.
    """
    known = tuple(int(k) for k in occupied)
    found = layer_images(layers, known, float(2.0 ** np.ceil(np.log2(size))))
    flip, shift = np.ones((len(found.flip), 3)), np.zeros((len(found.flip), 3))
    flip[:, layers.axis], shift[:, layers.axis] = found.flip, found.shift
    return Copies(flip, shift, found.weight), found.error


def copies_of(corners: np.ndarray, planes: Planes, layer: np.ndarray) -> tuple[Copies, float]:
    """All images of panels, and the error of the potential where they stand for layers.

    Args:
        corners: (n, 4, 3) of the panels themselves.
        planes: that bound, mirror or fill the scene.
        layer: (n,) of each panel.
    """
    if planes.layers is None:
        return reflections(planes), 0.0
    size = float(np.linalg.norm(np.ptp(corners.reshape(-1, 3), axis=0)))
    there, error = copies_in_layers(planes.layers, np.unique(layer), size)
    return reflections(planes).times(there), error


def sources_of(corners: np.ndarray, planes: Planes) -> Sources:
    """Arrays of panels and their images.

    Args:
        corners: (n, 4, 3) of the panels themselves.
        planes: that bound, mirror or fill the scene.
    """
    layer = planes.layer_of(corners.mean(axis=1))
    copies, error = copies_of(corners, planes, layer)
    panels = panel_arrays(copies.of(corners).reshape(-1, 4, 3))
    weight = np.ascontiguousarray(copies.weight)
    return Sources(panels, Images(weight, copies.parity, layer), error)


def plain_sources(panels: PanelArrays) -> Sources:
    """Panels in one medium, without images."""
    return Sources(panels, no_images(len(panels.area)), 0.0)


def originals(sources: Sources) -> PanelArrays:
    """The panels themselves, without their images."""
    count = len(sources.images.layer)
    return PanelArrays(*(array[:count] for array in sources.panels))


def with_images(density: np.ndarray, sources: Sources, layer: int = 0) -> np.ndarray:
    """Densities (g n,) of panels and images, as points in a layer see those of the panels (n,)."""
    return (sources.images.weight[layer, sources.images.layer].T * density).ravel()


def own_images(sources: Sources) -> np.ndarray:
    """(n,) weight of those images of each panel that lie where it lies, the panel among them.

    A sheet in a mirror plane is its own image, and its charge counts twice in its energy.
    """
    panels, layer = sources.panels, sources.images.layer
    center = panels.center.reshape(-1, len(layer), 3)
    apart = np.linalg.norm(center - center[0], axis=2)
    weight = sources.images.weight[layer, layer].T
    return np.where(apart <= COINCIDENT * panels.radius[: len(layer)], weight, 0.0).sum(axis=0)


def plain_energy(sources: Sources, left: np.ndarray, right: np.ndarray) -> np.ndarray:
    """(k, m) energy of charges of one sign on n panels, their images counted as positive too.

    Panels count as points, those nearer than a radius as that far: good to some ten per
    cent, and meant for error estimates.

    Args:
        sources: n panels and their images.
        left: (n, k) densities.
        right: (n, m) densities.
    """
    area = sources.panels.area[: len(left), None]
    return (area * left).T @ _plain_potential(sources, np.ascontiguousarray(area * right))


@njit(cache=True, nogil=True, error_model="numpy")
def _plain_potential(sources, charge):
    """(n, m) sum of |weight| charge / distance over all panels and images."""
    center, radius, layer = sources.panels.center, sources.panels.radius, sources.images.layer
    n, m = charge.shape
    total = np.zeros((n, m))
    for i in range(n):
        for image in range(sources.images.weight.shape[2]):
            for j in range(n):
                weight = abs(sources.images.weight[layer[i], layer[j], image])
                source = image * n + j
                square = radius[i] ** 2
                apart = 0.0
                for c in range(3):
                    apart += (center[i, c] - center[source, c]) ** 2
                inverse = weight / np.sqrt(max(apart, square))
                for k in range(m):
                    total[i, k] += inverse * charge[j, k]
    return total
