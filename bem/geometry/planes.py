"""Infinite planes that stand for images: grounded ones and mirrors.

A charge q over a grounded plane sees a charge -q at its mirror image (Thomson 1848), one beside
a plane of symmetry sees +q. Planes are normal to coordinate axes, at most one to each, so that
all images come from reflections that commute: p planes give 2^p copies, the original among them.
Flat layers of other permittivity are kept beside them; their images are in ``kernels``.
"""

from __future__ import annotations

import itertools
from dataclasses import dataclass, field

import numpy as np

from bem.geometry.layers import Layers
from bem.geometry.wording import metre_text

AXES = "xyz"


@dataclass(frozen=True)
class Plane:
    """A plane normal to a coordinate axis.

    Args:
        axis: 0, 1 or 2.
        at: coordinate of the plane on that axis.
    """

    axis: int
    at: float

    def __str__(self) -> str:
        return f"{AXES[self.axis]} = {metre_text(self.at)}"

    def reflect(self, points: np.ndarray) -> np.ndarray:
        """Mirror images of points (..., 3)."""
        out = np.array(points, dtype=float)
        out[..., self.axis] = 2.0 * self.at - out[..., self.axis]
        return out

    def height(self, points: np.ndarray) -> np.ndarray:
        """(...,) signed distance of points (..., 3), positive on the side of larger coordinates."""
        return np.asarray(points)[..., self.axis] - self.at

    def moved(self, scale: float, center: np.ndarray) -> Plane:
        """The plane after every point x goes to ``scale * (x - center)``."""
        return Plane(self.axis, scale * (self.at - float(center[self.axis])))


@dataclass(frozen=True)
class Planes:
    """What bounds or mirrors the scene.

    Args:
        ground: infinite plane at potential zero, or None.
        mirrors: planes of symmetry.
        layers: flat layers of different permittivity, normal to another axis; or None.
    """

    ground: Plane | None = None
    mirrors: tuple[Plane, ...] = field(default=())
    layers: Layers | None = None

    @property
    def all(self) -> tuple[Plane, ...]:
        """Mirrors, then the grounded plane."""
        return self.mirrors if self.ground is None else (*self.mirrors, self.ground)

    @property
    def multiplicity(self) -> int:
        """Copies of each body that belong to its conductor: 2 for each mirror."""
        return 2 ** len(self.mirrors)

    @property
    def copies(self) -> int:
        """Number of images, the original among them."""
        return 2 ** len(self.all)

    @property
    def signs(self) -> np.ndarray:
        """(g,) sign of the charge on each image, 1 for the original, which comes first."""
        grounded = [plane is self.ground for plane in self.all]
        flipped = itertools.product((False, True), repeat=len(self.all))
        return np.array([(-1.0) ** sum(np.logical_and(grounded, f)) for f in flipped])

    @property
    def parities(self) -> np.ndarray:
        """(g,) -1 for images that an odd number of planes reflects, else 1."""
        flipped = itertools.product((False, True), repeat=len(self.all))
        return np.array([(-1.0) ** sum(f) for f in flipped])

    def images(self, points: np.ndarray) -> np.ndarray:
        """(g, ..., 3) all images of points (..., 3), in the order of ``signs``."""
        out = [np.asarray(points, dtype=float)]
        for flips in list(itertools.product((False, True), repeat=len(self.all)))[1:]:
            image = out[0]
            for plane, flip in zip(self.all, flips, strict=True):
                image = plane.reflect(image) if flip else image
            out.append(image)
        return np.array(out)

    def layer_of(self, points: np.ndarray) -> np.ndarray:
        """(n,) layer that each of the points (n, 3) lies in, 0 without layers."""
        if self.layers is None:
            return np.zeros(len(points), dtype=np.int64)
        return self.layers.layer_of(points)

    def mirrored(self, points: np.ndarray, tolerance: float) -> np.ndarray:
        """(n,) whether all of the points (n, m, 3) of each row lie in one mirror plane."""
        found = np.zeros(len(points), dtype=bool)
        for mirror in self.mirrors:
            found |= (np.abs(mirror.height(points)) <= tolerance).all(axis=1)
        return found

    def moved(self, scale: float, center: np.ndarray) -> Planes:
        """The planes after every point x goes to ``scale * (x - center)``."""
        ground = None if self.ground is None else self.ground.moved(scale, center)
        mirrors = tuple(mirror.moved(scale, center) for mirror in self.mirrors)
        layers = None if self.layers is None else self.layers.moved(scale, center)
        return Planes(ground, mirrors, layers)


NO_PLANES = Planes()
"""Free space."""
