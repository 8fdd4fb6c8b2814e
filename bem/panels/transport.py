"""The panels of one scene carried over to another: same panels, same order, other places.

Panels of what did not change are the same to the last bit, so that whatever is wrong with
them is wrong alike in both scenes and drops out of the difference.
"""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, NamedTuple

import numpy as np

from bem.geometry.flat_faces import FLATNESS
from bem.geometry.planes import NO_PLANES, Planes
from bem.panels.fitted import FittedFamily
from bem.panels.flat import FlatFamily
from bem.panels.mesh import Body, Mesh
from bem.panels.motion import Affine, ByFaces, Motion, Recurved
from bem.panels.planar import Patch

if TYPE_CHECKING:
    from bem.panels.curved import CurvedFamily
    from bem.panels.mesh import Family


class Other(NamedTuple):
    """The scene that panels are carried to: how, what its conductors are, and its planes.

    Args:
        motions: one per conductor.
        bodies: one per conductor.
        planes: grounded and mirror planes.
    """

    motions: list[Motion]
    bodies: tuple[Body, ...]
    planes: Planes = NO_PLANES


def transported(mesh: Mesh, other: Other) -> Mesh:
    """The panels of ``mesh`` where the motions of their conductors take them."""
    families = tuple(
        _carried(family, owner, other.motions)
        for family, owner in zip(mesh.families, mesh.owners, strict=True)
    )
    return replace(mesh, families=families, bodies=other.bodies, planes=other.planes)


def unmoved(before: Mesh, after: Mesh) -> np.ndarray:
    """(n,) bool: panels that are the same to the last bit in both meshes, images included."""
    if before.planes != after.planes:
        return np.zeros(len(before.conductor), dtype=bool)
    return (before.corners == after.corners).all(axis=(1, 2))


def _carried(family: Family, owner: np.ndarray, motions: list[Motion]) -> Family:
    if isinstance(family, FlatFamily):
        return _carried_flat(family, motions)
    motion = motions[owner[0]]
    if motion.still:
        return family
    if isinstance(family, FittedFamily):
        return _carried_fitted(family, motion)
    return _carried_curved(family, motion)


def _carried_fitted(family: FittedFamily, motion: Motion) -> FittedFamily:
    if not isinstance(motion, Affine):
        raise TypeError(f"a fitted surface cannot go by {type(motion).__name__}")
    return family.placed(motion.matrix, motion.shift)


def _carried_curved(family: CurvedFamily, motion: Motion) -> CurvedFamily:
    if not isinstance(motion, Recurved):
        raise TypeError(f"a curved body cannot go by {type(motion).__name__}")
    return family.on(motion.curve)


def _carried_flat(family: FlatFamily, motions: list[Motion]) -> FlatFamily:
    corners, size = family.corners.copy(), np.ones(len(family.owner))
    for k in np.unique(family.owner):
        here, motion = family.owner == k, motions[k]
        if isinstance(motion, ByFaces):
            corners[here] = _each_face(corners[here], motion)
        elif isinstance(motion, Affine) and not motion.still:
            corners[here] = motion(corners[here])
            size[here] = np.cbrt(abs(np.linalg.det(motion.matrix)))
    sagitta, rim = family.sagitta * size, family.rim * size[:, None]
    return replace(family, corners=corners, sagitta=sagitta, rim=rim)


def _each_face(corners: np.ndarray, motion: ByFaces) -> np.ndarray:
    """Images (n, 4, 3) of panels, each by the map of the flat face that it lies on."""
    out = corners.copy()
    for patch, move in zip(motion.patches, motion.maps, strict=True):
        here = _on_patch(corners, patch)
        out[here] = move(corners[here])
    return out


def _on_patch(corners: np.ndarray, patch: Patch) -> np.ndarray:
    """(n,) bool: panels (n, 4, 3) in the plane of a patch whose middle is on one of its faces."""
    middle = corners.mean(axis=1)
    height = (corners - patch.origin) @ patch.axes[2]
    flat = np.abs(height).max(axis=1) <= 10.0 * FLATNESS * patch.size
    inside = np.zeros(len(corners), dtype=bool)
    rows = np.flatnonzero(flat)
    points = patch.drop(middle[rows])
    step = np.roll(patch.faces, -1, axis=1) - patch.faces
    gap = points[:, None, None] - patch.faces
    side = step[..., 0] * gap[..., 1] - step[..., 1] * gap[..., 0]
    slack = 1e-9 * patch.size**2
    inside[rows] = ((side >= -slack).all(axis=2) | (side <= slack).all(axis=2)).any(axis=1)
    return inside
