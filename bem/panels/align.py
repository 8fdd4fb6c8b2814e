"""Snapping of nearly parallel and nearly perpendicular patches, so that closed forms apply.

Rounded files tilt faces by a part of their rounding over the size of the face. A patch
whose axes lie that close to axes seen before takes those; no corner moves by more than
about the flatness tolerance.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from bem.geometry.flat_faces import FLATNESS
from bem.panels.planar import Patch


def align_patches(patches: list[Patch], extent: float) -> list[Patch]:
    """The same patches in the same order, with their axes snapped to shared directions.

    Args:
        patches: of all parts.
        extent: size of the largest body.
    """
    directions: list[np.ndarray] = []
    out: list[Patch | None] = [None] * len(patches)
    for k in sorted(range(len(patches)), key=lambda k: -patches[k].size):
        patch = patches[k]
        slack = 2.0 * FLATNESS * extent / patch.size
        out[k] = _snap(patch, directions, slack)
    return [patch for patch in out if patch is not None]


def _nearest(direction: np.ndarray, known: list[np.ndarray], slack: float) -> np.ndarray | None:
    if not known:
        return None
    table = np.array(known[:200])
    cosine = table @ direction
    k = int(np.argmax(np.abs(cosine)))
    if np.linalg.norm(direction - np.sign(cosine[k]) * table[k]) > slack:
        return None
    return np.sign(cosine[k]) * table[k]


def _snap(patch: Patch, known: list[np.ndarray], slack: float) -> Patch:
    normal = _nearest(patch.axes[2], known, slack)
    along = _nearest(patch.axes[0], known, slack)
    normal_fixed = patch.axes[2] if normal is None else normal
    first = patch.axes[0] if along is None else along
    first = first - normal_fixed * (first @ normal_fixed)
    first = first / np.linalg.norm(first)
    axes = np.stack([first, np.cross(normal_fixed, first), normal_fixed])
    for axis in axes:
        if len(known) < 200 and _nearest(axis, known, 1e-12) is None:
            known.append(axis)
    return replace(patch, axes=axes)
