"""Surfaces of revolution cut at the planes between layers, so that no panel crosses one.

Only the profile is cut: a further point on it, where panels end. The plane must be normal to
the axis; spheres are turned to suit. Flat faces get walls (``panels``) instead.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from bem.geometry.layers import Layers
from bem.geometry.revolved import Arc, Revolution
from bem.geometry.surface import Surface
from bem.geometry.symmetry import EXACT, split_at


def cut_in_layers(surface: Surface, layers: Layers) -> Surface:
    """The surface with its profile divided where planes between layers cross it.

    Args:
        surface: in the unit of the layers; left as it is if it has no profile, or its axis is
            not normal to the layers.
        layers: whose planes cut.
    """
    if surface.curve is None:
        return surface
    curve = _upright(surface.curve, layers.axis)
    row = curve.matrix[layers.axis]
    if np.abs(row[:2]).max() > EXACT * np.abs(row).max():
        return surface
    profile = curve.profile
    for plane in layers.between:
        level = (plane - curve.shift[layers.axis]) / row[2]
        profile = tuple(part for piece in profile for part in split_at(piece, level))
    return replace(surface, curve=replace(curve, profile=profile))


def _upright(curve: Revolution, axis: int) -> Revolution:
    """A whole sphere with its axis of revolution along a coordinate axis."""
    arc = curve.profile[0]
    ball = len(curve.profile) == 1 and isinstance(arc, Arc) and all(curve.poles)
    square = curve.matrix @ curve.matrix.T
    round_ = np.abs(square - square[0, 0] * np.eye(3)).max() <= EXACT * square[0, 0]
    if not (ball and isinstance(arc, Arc) and round_ and curve.turn == 1.0):
        return curve
    scale = np.sqrt(square[0, 0])
    matrix = scale * np.eye(3)[:, [(axis + 1) % 3, (axis + 2) % 3, axis]]
    center = curve.shift + curve.matrix[:, 2] * arc.centre[1]
    return replace(curve, matrix=matrix, shift=center - matrix[:, 2] * arc.centre[1])
