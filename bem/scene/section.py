"""A plane section of a scene: which body fills each point, and the outlines of all bodies.

Points are found by parity along lines: a closed surface is crossed an odd number of times on the
way to a point inside. So no outline has to be stitched together first.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from bem.errors import UsageError
from bem.geometry.fine import fine_facets
from bem.geometry.planes import AXES, Plane
from bem.geometry.surface import Surface
from bem.geometry.topology import edges_of
from bem.scene.material import Material
from bem.scene.regions import OUTSIDE
from bem.scene.scene import Conductor, Dielectric, Scene

METAL_HERE = -1
"""Stands for solid metal among the regions."""
MARGIN = 0.08
"""Room around the bodies, per larger side of the section."""
PIXELS = 1200
"""Points along the larger side."""
ASIDE = 1e-7
"""The plane is moved by this part of the scene's size, so that it does not run in a face."""


@dataclass(frozen=True, eq=False)
class Section:
    """What a plane cuts.

    Args:
        scene: that is cut, lengths in metres.
        plane: where it is cut.
        segments: per body, conductors first, (s, 2, 2) lines in which it is cut.
        frame: (2, 2) lowest and highest coordinates shown, on the axes ``along``.
    """

    scene: Scene
    plane: Plane
    segments: list[np.ndarray]
    frame: np.ndarray

    @classmethod
    def of(cls, scene: Scene, plane: Plane | None = None) -> Section:
        """Cut a scene, half-way across y if no plane is given.

        Raises:
            UsageError: the plane meets no body.
        """
        bounds = np.array([body.surface.bounds for body in scene.bodies])
        low, high = bounds[:, 0].min(axis=0), bounds[:, 1].max(axis=0)
        plane = plane or Plane(1, 0.5 * float(low[1] + high[1]))
        segments = [_cut(body.surface, plane, ASIDE * scene.size) for body in scene.bodies]
        if not sum(map(len, segments)):
            raise UsageError(
                f"--plane: {plane} meets no body; they lie between "
                f"{Plane(plane.axis, low[plane.axis])} and {Plane(plane.axis, high[plane.axis])}"
            )
        along = _along(plane)
        room = MARGIN * float((high - low)[along].max())
        frame = np.array([low[along] - room, high[along] + room])
        return cls(scene, plane, segments, frame)

    @property
    def along(self) -> list[int]:
        """The two axes in the plane, the horizontal one first."""
        return _along(self.plane)

    @cached_property
    def points(self) -> tuple[np.ndarray, np.ndarray]:
        """Horizontal (w,) and vertical (h,) coordinates of the points of ``regions``."""
        size = self.frame[1] - self.frame[0]
        number = np.maximum(np.round(PIXELS * size / size.max()), 2).astype(int)
        x, y = (
            low + (np.arange(n) + 0.5) * extent / n
            for low, extent, n in zip(self.frame[0], size, number, strict=True)
        )
        return x, y

    @cached_property
    def regions(self) -> np.ndarray:
        """(h, w) medium at each point, by precedence; ``METAL_HERE`` in solid metal."""
        x, y = self.points
        found = self._layers(x, y)
        count = len(self.scene.conductors)
        for number, segments in enumerate(self.segments[count:], 1):
            found[_inside(segments, x, y)] = number
        for conductor, segments in zip(self.scene.conductors, self.segments, strict=False):
            if _is_metal(conductor):
                found[_inside(segments, x, y)] = METAL_HERE
        return found

    @property
    def media(self) -> list[tuple[str, Material]]:
        """Name and material of each number in ``regions``: as in regions, then flat layers."""
        scene = self.scene
        bodies = [(body.name, body.material) for body in scene.dielectrics]
        return [(OUTSIDE, scene.surroundings), *bodies, *_layer_media(scene)]

    def _layers(self, x: np.ndarray, y: np.ndarray) -> np.ndarray:
        """(h, w) medium without bodies."""
        found = np.zeros((len(y), len(x)), dtype=int)
        stack = self.scene.stack
        if stack is None:
            return found
        first = 1 + len(self.scene.dielectrics)
        numbers = _layer_numbers(self.scene, first)
        if stack.axis == self.plane.axis:
            return found + numbers[np.searchsorted(stack.planes, self.plane.at)]
        across = stack.axis == self.along[0]
        layer = numbers[np.searchsorted(stack.planes, x if across else y)]
        return found + (layer[None, :] if across else layer[:, None])


def _layer_media(scene: Scene) -> list[tuple[str, Material]]:
    if scene.half_space is not None:
        return [("half-space", scene.half_space.material)]
    layers = scene.flat_layers.materials if scene.flat_layers else ()
    return [(f"layer {k}", layer) for k, layer in enumerate(layers, 1)]


def _layer_numbers(scene: Scene, first: int) -> np.ndarray:
    """Number of the medium in each layer of the stack, the lowest first."""
    if scene.half_space is not None:
        return np.array([0, first] if scene.half_space.above else [first, 0])
    count = len(scene.flat_layers.materials) if scene.flat_layers else 0
    return np.array([0, *range(first, first + count), 0])


def _along(plane: Plane) -> list[int]:
    return [axis for axis in range(3) if axis != plane.axis]


def plane_of(text: str, metres: float) -> Plane:
    """Read a plane such as "z=0.5".

    Args:
        text: as typed in.
        metres: per unit of the number.

    Raises:
        UsageError: it is none.
    """
    key, _, value = text.partition("=")
    try:
        at = float(value)
    except ValueError:
        at = np.nan
    if key.strip() not in tuple(AXES) or not np.isfinite(at):
        raise UsageError(f'--plane: found "{text}"; give an axis and a number, such as z=0.5')
    return Plane(AXES.index(key.strip()), metres * at)


def facets_of(surface: Surface) -> Surface:
    """The facets themselves, or finer ones of a curved shape."""
    return surface if surface.curve is None else fine_facets(surface.curve)


def _is_metal(conductor: Conductor | Dielectric) -> bool:
    """Whether a conductor fills its closed surface."""
    if isinstance(conductor, Dielectric) or conductor.body != "solid":
        return False
    faces = conductor.surface
    if faces.curve is not None:
        return not any(faces.curve.free_rims)
    return not (edges_of(faces.triangles).uses % 2).any()


def _cut(surface: Surface, plane: Plane, aside: float) -> np.ndarray:
    """Lines (s, 2, 2) in which a plane cuts a surface, in the coordinates of the plane."""
    faces = facets_of(surface)
    corners = faces.vertices[faces.triangles]
    above = plane.height(corners) > aside
    met = above.any(axis=1) & ~above.all(axis=1)
    corners, above = corners[met], above[met]
    lone = (above == (above.sum(axis=1) == 1)[:, None]).argmax(axis=1)
    rows = np.arange(len(corners))
    tip, one, other = (corners[rows, (lone + step) % 3] for step in range(3))
    ends = [_crossing(tip, end, plane, aside) for end in (one, other)]
    return np.stack(ends, axis=1)[..., _along(plane)]


def _crossing(start: np.ndarray, stop: np.ndarray, plane: Plane, aside: float) -> np.ndarray:
    """Points (n, 3) where lines from ``start`` to ``stop`` (n, 3) cross the plane."""
    low, high = plane.height(start) - aside, plane.height(stop) - aside
    return np.asarray(start + (low / (low - high))[:, None] * (stop - start))


def _inside(segments: np.ndarray, x: np.ndarray, y: np.ndarray) -> np.ndarray:
    """(h, w) which points lie inside closed lines."""
    flips = np.zeros((len(y), len(x) + 1), dtype=bool)
    first, last = segments[:, 0], segments[:, 1]
    low = np.searchsorted(y, np.minimum(first[:, 1], last[:, 1]), side="left")
    high = np.searchsorted(y, np.maximum(first[:, 1], last[:, 1]), side="left")
    for k in np.flatnonzero(high > low):
        rows = np.arange(low[k], high[k])
        share = (y[rows] - first[k, 1]) / (last[k, 1] - first[k, 1])
        at = first[k, 0] + share * (last[k, 0] - first[k, 0])
        np.logical_xor.at(flips, (rows, np.searchsorted(x, at)), True)
    return np.logical_xor.accumulate(flips, axis=1)[:, :-1]
