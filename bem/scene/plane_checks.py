"""Grounded and mirror planes as the checks and the record see them."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np

from bem.errors import GeometryError
from bem.geometry.folding import folded, reflected, side_of
from bem.geometry.planes import AXES, Plane, Planes
from bem.geometry.surface import Surface
from bem.geometry.wording import metre_text
from bem.scene.body import Body
from bem.scene.pairs import CONTACT
from bem.scene.scene import Conductor
from bem.units import metres_per


def on_kept_side(conductor: Conductor, planes: Planes) -> Conductor:
    """The conductor, or its mirror image if it lies on the far side of a mirror plane."""
    surface = conductor.surface
    for mirror in planes.mirrors:
        surface = reflected(surface, mirror) if side_of(surface, mirror) < 0 else surface
    return conductor if surface is conductor.surface else replace(conductor, surface=surface)


def plane_findings(conductors: list[Conductor], planes: Planes, unit: str) -> list[str]:
    """Reasons why planes forbid a solution, one line each."""
    lines = [line for c in conductors if (line := _mirror_finding(c, planes)) is not None]
    if planes.ground is None:
        return lines
    sides = {c.name: side_of(_fine(c.surface), planes.ground) for c in conductors}
    lines += [
        _ground_reason(c, planes.ground, unit) for c in conductors if _meets(c, planes.ground)
    ]
    above = [name for name, side in sides.items() if side > 0]
    below = [name for name, side in sides.items() if side < 0]
    if above and below and not lines:
        lines.append(
            f'"{above[0]}" and "{below[0]}" lie on different sides of the grounded plane, which '
            "separates them completely; extract each side as a scene of its own"
        )
    return lines


def _mirror_finding(conductor: Conductor, planes: Planes) -> str | None:
    """What a mirror plane finds wrong with a body."""
    try:
        folded(conductor.surface, replace(planes, ground=None), conductor.body == "solid")
    except GeometryError as problem:
        return f'"{conductor.name}" {problem}'
    return None


def _fine(surface: Surface) -> Surface:
    """Facets of a curved surface that are close enough to it to decide about contact."""
    if surface.curve is None:
        return surface
    from bem.geometry.fine import fine_facets

    return fine_facets(surface.curve)


def ground_gap(body: Body, ground: Plane) -> float:
    """Distance of a body from the grounded plane, metres; 0 or less where it crosses."""
    low, high = ground.height(_fine(body.conductor.surface).bounds)
    return float(max(low, -high))


def _meets(conductor: Conductor, ground: Plane) -> bool:
    surface = _fine(conductor.surface)
    low, high = ground.height(surface.bounds)
    return bool(max(low, -high) <= CONTACT * surface.extent)


def _ground_reason(conductor: Conductor, ground: Plane, unit: str) -> str:
    low, high = ground.height(_fine(conductor.surface).bounds)
    crossing = min(high, -low)
    does = f"crosses by {metre_text(crossing)}" if crossing > 0.0 else "touches"
    return (
        f'"{conductor.name}" {does} the grounded plane {plane_text(ground, unit)}; '
        "leave a gap, or leave the body out if it is grounded"
    )


def plane_text(plane: Plane, unit: str) -> str:
    """Plane in the scene's unit, as in "z = 0.5 mm"."""
    return f"{AXES[plane.axis]} = {plane.at / metres_per(unit) + 0.0:.6g} {unit}"


def planes_record(planes: Planes) -> dict[str, Any]:
    """Planes as plain values in metres, for the settings of a result; empty without planes."""
    record: dict[str, Any] = {}
    if planes.ground is not None:
        record["ground_plane_m"] = _coordinate(planes.ground)
    if planes.mirrors:
        record["mirror_planes_m"] = [_coordinate(mirror) for mirror in planes.mirrors]
    return record


def _coordinate(plane: Plane) -> dict[str, float]:
    return {AXES[plane.axis]: float(np.float64(plane.at))}
