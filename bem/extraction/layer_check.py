"""No panel may lie in two layers: bodies that panels cannot be made for are refused."""

from __future__ import annotations

from typing import Any

import numpy as np

from bem.errors import GeometryError
from bem.extraction.mixed_layers import check_regions
from bem.extraction.solution import Solution
from bem.extraction.solved import Solved
from bem.geometry.planes import AXES
from bem.panels.mesh import Mesh
from bem.scene.scene import Scene

TOLERANCE = 1e-7
"""Corners nearer to a plane than this part of the scene's size lie in it."""


def check_layers(scene: Scene, mesh: Mesh) -> None:
    """Refuse a mesh with panels on both sides of a plane between layers.

    Args:
        scene: whose conductors the messages name.
        mesh: in units of the scene's size.

    Raises:
        GeometryError: a dielectric crosses a plane, a curved body one that is not normal to its
            axis, or a smooth surface fitted to facets.
    """
    layers = mesh.planes.layers
    if layers is None:
        return
    check_regions(mesh, [d.name for d in scene.dielectrics])
    crossed = layers.crossed(mesh.corners, TOLERANCE)
    if crossed.any():
        name = scene.conductors[int(np.min(mesh.conductor[crossed]))].name
        raise GeometryError(
            f'"{name}" crosses a plane between layers, and its curved surface is not cut there; '
            f"turn its axis along {AXES[layers.axis]}, or give a mesh with smooth = false"
        )


def layer_record(solution: Solved) -> dict[str, Any]:
    """How many images stand for flat layers, and the error of the potential that they leave.

    The error is over the potential of the source itself; empty without layers.
    """
    planes = solution.mesh.planes
    if planes.layers is None:
        return {}
    if isinstance(solution, Solution):
        images, error = solution.sources.images, solution.sources.error
    else:
        images, error = solution.operator.setup.images, solution.operator.image_error
    return {
        "layer_images": int(images.weight.shape[2] // planes.copies),
        "layer_images_error": float(error),
    }
