"""What the report says of facets that seem to stand for a smooth surface."""

from __future__ import annotations

from typing import Any

import numpy as np

from bem.extraction.scaled import ScaledScene
from bem.extraction.solved import Solved
from bem.geometry.parts import INTERFACE
from bem.geometry.wording import listed, metre_text
from bem.scene.scene import Conductor, Scene


def facet_record(scene: Scene, scaled: ScaledScene, solution: Solved) -> dict[str, Any]:
    """Sagitta and estimated effect for each conductor whose facets seem to stand for a curve.

    Returns:
        By name: ``smooth`` as the user gave it, ``crease_degrees``, ``largest_sagitta_m``, and
        ``change``, the relative change of its C_ii if its facets became that curve; of panels on
        the fit, what is not known of it. It has a sign only for solid bodies left as they are.
    """
    change = solution.facet_shares()
    sagitta = np.zeros(len(scene.conductors))
    for body in solution.mesh.bodies:
        if body.conductor != INTERFACE:
            sagitta[body.conductor] = max(sagitta[body.conductor], body.sagitta)
    return {
        conductor.name: {
            "smooth": conductor.surface.smooth,
            "crease_degrees": float(np.degrees(conductor.surface.crease)),
            "largest_sagitta_m": float(sagitta[k]) * scaled.length,
            "change": float(change[k]),
        }
        for k, conductor in enumerate(scene.conductors)
        if sagitta[k] > 0.0
    }


def facet_lines(scene: Scene, record: dict[str, Any]) -> list[str]:
    """One line for each conductor whose user has not said what its facets stand for."""
    return [
        _line(conductor, record[conductor.name])
        for conductor in scene.conductors
        if conductor.name in record and conductor.surface.smooth is None
    ]


def _line(conductor: Conductor, found: dict[str, Any]) -> str:
    size = f"{100.0 * abs(found['change']):.2g} %"
    larger = "larger" if found["change"] > 0.0 else "smaller"
    name = listed([conductor.name])
    return (
        f"facets of {name} are up to {metre_text(found['largest_sagitta_m'])} off the curve that "
        f"they seem to follow: its own C would be about {size} {larger}; this is in the bars; "
        "give smooth = true, or smooth = false if the facets are the shape"
    )
