"""Walls that a patch is divided along: its outline, and the shadows of faces close to it.

Where a face of another body lies near and about parallel, the charge changes within one
gap of every rim, its own or the other's projected on it. Halving alone gains only gap/size
of that charge per step, so the indicator is blind to it and the starting mesh must know.
Faces that touch, side by side or along an edge, are no such neighbours.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from bem.geometry.flat_faces import FLATNESS
from bem.geometry.parts import INTERFACE
from bem.geometry.planes import NO_PLANES, Planes
from bem.panels.layer_walls import layer_walls, with_layer_mirrors
from bem.panels.planar import Patch

NEAR = 0.5
"""A face counts as facing if its distance is below this part of the smaller of both sizes."""
LEANING = 0.94
"""Least cosine between the normals of faces that count as facing (20 degrees)."""
MOST_FACING = 2000
"""Only so many of the largest patches are divided by what faces them: facets need it least."""
COINCIDENT, COINCIDENT_GAP = 1e-5, 0.02
"""Walls closer than this part of the patch's size, or of the gap, count as one."""


@dataclass(frozen=True)
class Walls:
    """Segments that divide a patch.

    Args:
        ends: (n, 2, 2) in the plane of the patch.
        outline: (n,) bool, those that bound the patch.
        gap: (n,) distance to what faces the patch there, infinite where nothing does.
    """

    ends: np.ndarray
    outline: np.ndarray
    gap: np.ndarray


@dataclass(frozen=True)
class _Shadow:
    """Outline of a facing patch projected on this one.

    Args:
        edges: (e, 2, 2) in the plane of this patch.
        gap: (e,) distance of both planes at the middle of each edge, infinite where they touch.
        rim_gap: (r,) the same at the middle of each edge of this patch's own outline.
        height: signed distance of the other patch's origin from this plane.
        body: that the facing patch belongs to.
        metal: whether it hides what lies behind.
    """

    edges: np.ndarray
    gap: np.ndarray
    rim_gap: np.ndarray
    height: float
    body: int
    metal: bool

    @property
    def box(self) -> np.ndarray:
        points = self.edges.reshape(-1, 2)
        return np.array([points.min(axis=0), points.max(axis=0)])


def _overlap(a: np.ndarray, b: np.ndarray, margin: float) -> bool:
    return bool(np.all(np.minimum(a[1], b[1]) > np.maximum(a[0], b[0]) + margin))


def _covers(a: np.ndarray, b: np.ndarray) -> bool:
    return bool(np.all(a[0] <= b[0] + 1e-9) and np.all(a[1] >= b[1] - 1e-9))


@dataclass(frozen=True)
class FacingTable:
    """All patches, with what is needed to find the parallel ones quickly.

    Args:
        patches: of all parts.
        normals: (n, 3).
        origins: (n, 3).
        sizes: (n,).
        bodies: (n,) body of each; images of opposite sign count as one of their own.
        least: smaller patches are not looked at.
        planes: grounded and mirror planes, and layers; a wall in a mirror is no rim.
        coincidence: faces nearer to each other than this touch.
    """

    patches: list[Patch]
    normals: np.ndarray
    origins: np.ndarray
    sizes: np.ndarray
    bodies: np.ndarray
    least: float
    planes: Planes
    coincidence: float

    @classmethod
    def of(
        cls, patches: list[Patch], planes: Planes = NO_PLANES, coincidence: float = 0.0
    ) -> FacingTable:
        """Table of the patches of all parts, followed by their images."""
        every = [(patch, where) for patch in patches for where in with_layer_mirrors(planes)]
        patches = [*patches, *(image for each in every for image in _images(*each))]
        sizes = np.array([p.size for p in patches])
        return cls(
            patches,
            np.array([p.axes[2] for p in patches]),
            np.array([p.origin for p in patches]),
            sizes,
            np.array([p.owner.body for p in patches]),
            float(np.sort(sizes)[-MOST_FACING]) if len(sizes) > MOST_FACING else 0.0,
            planes,
            coincidence,
        )

    def _facing(self, k: int) -> np.ndarray:
        """Indices of patches about parallel to patch k, near it in height and not in its plane.

        None if all of them are of its own body, which casts no shadow on itself.
        """
        if self.sizes[k] < self.least:
            return np.empty(0, dtype=int)
        cosine = np.abs(self.normals @ self.normals[k])
        height = np.abs((self.origins - self.origins[k]) @ self.normals[k])
        reach = NEAR * np.minimum(self.sizes, self.sizes[k])
        touching = max(1e-9 * self.sizes[k], self.coincidence)
        near = (cosine > LEANING) & (height < reach) & (height > touching)
        apart = np.linalg.norm(self.origins - self.origins[k], axis=1)
        near &= apart < self.sizes + self.sizes[k]
        found = np.flatnonzero(near)
        return found if (self.bodies[found] != self.bodies[k]).any() else found[:0]

    def _shadow(self, k: int, other: int) -> _Shadow:
        patch, facing = self.patches[k], self.patches[other]
        normal = self.normals[k]
        rim = facing.lift(facing.edges.mean(axis=1))
        own = patch.lift(patch.edges.mean(axis=1))
        slope = normal @ self.normals[other]
        least = 1e-4 * min(self.sizes[k], self.sizes[other])
        least = 0.0 if abs(slope) > 1.0 - 1e-12 else least
        return _Shadow(
            edges=patch.drop(facing.lift(facing.edges)),
            gap=self._gap((rim - patch.origin) @ normal, least),
            rim_gap=self._gap((own - facing.origin) @ self.normals[other] / slope, least),
            height=float((facing.origin - patch.origin) @ normal),
            body=facing.owner.body,
            metal=facing.conductor != INTERFACE,
        )

    def _gap(self, height: np.ndarray, least: float) -> np.ndarray:
        """Gaps of at least ``least`` from heights (e,), infinite where faces touch."""
        away = np.abs(height)
        return np.where(away < self.coincidence, np.inf, np.maximum(away, least))

    def shadows(self, k: int) -> list[_Shadow]:
        """Shadows on patch k of faces that see it; what lies behind metal is left out."""
        own = self.patches[k].edges.reshape(-1, 2)
        box = np.array([own.min(axis=0), own.max(axis=0)])
        found = [self._shadow(k, other) for other in self._facing(k)]
        found = [s for s in found if _overlap(s.box, box, self.coincidence)]
        found = sorted(found, key=lambda s: abs(s.height))
        seen: list[_Shadow] = []
        for shadow in found:
            hidden = any(
                s.metal and s.height * shadow.height > 0.0 and _covers(s.box, shadow.box)
                for s in seen
            )
            if not hidden:
                seen.append(shadow)
        return [s for s in seen if s.body != self.patches[k].owner.body]

    def walls(self, k: int) -> Walls:
        """Outline and shadows of patch k, and planes between layers that cut it."""
        patch = self.patches[k]
        ends, gap = patch.edges, np.full(len(patch.edges), np.inf)
        outline = len(ends)
        shadows = self.shadows(k)
        for shadow in shadows:
            gap = np.where(_touched(ends, shadow), np.minimum(gap, shadow.rim_gap), gap)
        for shadow in shadows:
            new = ~_coincident(
                shadow.edges, ends, COINCIDENT * patch.size + COINCIDENT_GAP * shadow.gap
            )
            ends = np.concatenate([ends, shadow.edges[new]])
            gap = np.concatenate([gap, shadow.gap[new]])
        cuts = layer_walls(patch, self.planes.layers)
        ends, gap = np.concatenate([ends, cuts]), np.append(gap, np.full(len(cuts), np.inf))
        gap[self.planes.mirrored(patch.lift(ends), FLATNESS * patch.size)] = np.inf
        return Walls(ends, np.arange(len(ends)) < outline, gap)


def _images(patch: Patch, planes: Planes) -> list[Patch]:
    """Images of a patch; those of opposite sign belong to a body of their own."""
    signs = planes.signs[1:]
    origins = planes.images(patch.origin)[1:]
    axes = planes.images(patch.origin + patch.axes)[1:] - origins[:, None]
    opposite = patch.owner._replace(body=-1 - patch.owner.body)
    owners = [patch.owner if sign > 0.0 else opposite for sign in signs]
    return [
        replace(patch, owner=owner, origin=origin, axes=frame)
        for owner, origin, frame in zip(owners, origins, axes, strict=True)
    ]


def _coincident(edges: np.ndarray, walls: np.ndarray, tolerance: np.ndarray) -> np.ndarray:
    """Which edges (e, 2, 2) lie along one of the walls (w, 2, 2) within their tolerance (e,)."""
    start, step = walls[:, 0], walls[:, 1] - walls[:, 0]
    length = np.linalg.norm(step, axis=1)
    gap = edges[:, None] - start[None, :, None]
    along = np.einsum("ewsc,wc->ews", gap, step) / length[:, None]
    off = np.abs(gap[..., 0] * step[:, None, 1] - gap[..., 1] * step[:, None, 0]) / length[:, None]
    limit = tolerance[:, None]
    inside = (along.min(axis=2) > -limit) & (along.max(axis=2) < length + limit)
    return np.any(inside & (off.max(axis=2) <= limit), axis=1)


def _touched(edges: np.ndarray, shadow: _Shadow) -> np.ndarray:
    """Which edges lie, at least in part, under the shadow or within two gaps of its rim."""
    t = np.linspace(0.02, 0.98, 13)[:, None]
    points = edges[:, None, 0] * (1 - t) + edges[:, None, 1] * t
    near = _distance(points, shadow.edges) < 2.0 * shadow.rim_gap[:, None]
    return np.any(_inside(points, shadow.edges) | near, axis=1)


def _inside(points: np.ndarray, edges: np.ndarray) -> np.ndarray:
    """Even-odd rule for points (..., 2) and edges (e, 2, 2)."""
    x, y = points[..., None, 0], points[..., None, 1]
    (x0, y0), (x1, y1) = edges[:, 0].T, edges[:, 1].T
    spans = (y0 > y) != (y1 > y)
    rise = np.where(y1 == y0, 1.0, y1 - y0)
    return (spans & (x < x0 + (y - y0) / rise * (x1 - x0))).sum(axis=-1) % 2 == 1


def _distance(points: np.ndarray, edges: np.ndarray) -> np.ndarray:
    """Distance of points (..., 2) to the nearest edge."""
    a, d = edges[:, 0], edges[:, 1] - edges[:, 0]
    gap = points[..., None, :] - a
    t = np.clip((gap * d).sum(axis=-1) / np.maximum((d * d).sum(axis=-1), 1e-300), 0.0, 1.0)
    return np.linalg.norm(gap - t[..., None] * d, axis=-1).min(axis=-1)
