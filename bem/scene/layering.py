"""Flat layers as images need them."""

from __future__ import annotations

from dataclasses import replace

from bem.geometry.layers import Layers
from bem.geometry.planes import Planes
from bem.scene.scene import Scene


def planes_of(scene: Scene) -> Planes:
    """Grounded and mirror planes of a scene with its flat layers, in metres."""
    stack = scene.stack
    if stack is None:
        return scene.planes
    values = [material.relative_permittivity for material in stack.materials]
    if stack.grounded_below:
        values[0] = values[1]
    if stack.grounded_above:
        values[-1] = values[-2]
    relative = tuple(value / scene.relative_permittivity for value in values)
    layers = Layers(stack.axis, stack.planes, relative, stack.grounded_below, stack.grounded_above)
    return replace(scene.planes, layers=layers)
