"""Grounded and mirror planes as the checks and the record see them."""

from __future__ import annotations

from dataclasses import replace
from typing import Any, TypeVar

import numpy as np

from bem.errors import GeometryError
from bem.geometry.folding import folded, reflected, side_of
from bem.geometry.planes import AXES, Plane, Planes
from bem.geometry.surface import Surface
from bem.geometry.wording import metre_text
from bem.scene.body import Body
from bem.scene.pairs import CONTACT
from bem.scene.scene import Conductor, Dielectric, Scene
from bem.units import metres_per

AnyBody = TypeVar("AnyBody", Conductor, Dielectric, Conductor | Dielectric)


def on_kept_side(body: AnyBody, planes: Planes) -> AnyBody:
    """The body, or its mirror image if it lies on the far side of a mirror plane."""
    surface = body.surface
    for mirror in planes.mirrors:
        surface = reflected(surface, mirror) if side_of(surface, mirror) < 0 else surface
    return body if surface is body.surface else replace(body, surface=surface)


def plane_findings(scene: Scene) -> list[str]:
    """Reasons why planes forbid a solution, one line each."""
    lines = [line for b in scene.bodies if (line := _mirror_finding(b, scene.planes)) is not None]
    if scene.planes.ground is not None:
        lines += _ground_findings(scene, scene.planes.ground, not lines)
    return lines + _stack_findings(scene)


def _ground_findings(scene: Scene, ground: Plane, sides_too: bool) -> list[str]:
    """What the grounded plane forbids; ``sides_too`` also looks for bodies on both sides."""
    lines = [reason for b in scene.bodies if (reason := _ground_reason(b, ground, scene))]
    sides = {b.name: side_of(_fine(b.surface), ground) for b in scene.bodies}
    above = [name for name, side in sides.items() if side > 0]
    below = [name for name, side in sides.items() if side < 0]
    if above and below and sides_too and not lines:
        lines.append(
            f'"{above[0]}" and "{below[0]}" lie on different sides of the grounded plane, which '
            "separates them completely; extract each side as a scene of its own"
        )
    return lines


def _stack_findings(scene: Scene) -> list[str]:
    """What the grounded planes of flat layers forbid."""
    if scene.stack is None:
        return []
    lines = []
    for at in scene.stack.grounded:
        plane = Plane(scene.stack.axis, at)
        inner = 1 if at == scene.stack.planes[0] and scene.stack.grounded_below else -1
        for body in scene.bodies:
            reason = _ground_reason(body, plane, scene)
            if reason is None and side_of(_fine(body.surface), plane) != inner:
                reason = (
                    f'"{body.name}" lies behind the grounded plane {plane_text(plane, scene.unit)} '
                    "of the layers, where there is no field of theirs; leave it out"
                )
            lines += [] if reason is None else [reason]
    return lines


def _mirror_finding(body: Conductor | Dielectric, planes: Planes) -> str | None:
    """What a mirror plane finds wrong with a body."""
    solid = isinstance(body, Dielectric) or body.body == "solid"
    try:
        folded(body.surface, replace(planes, ground=None), solid)
    except GeometryError as problem:
        return f'"{body.name}" {problem}'
    return None


def _fine(surface: Surface) -> Surface:
    """Facets of a curved surface that are close enough to it to decide about contact."""
    if surface.curve is None:
        return surface
    from bem.geometry.fine import fine_facets

    return fine_facets(surface.curve)


def ground_gap(body: Body, ground: Plane) -> float:
    """Distance of a body from the grounded plane, metres; 0 or less where it crosses."""
    low, high = ground.height(_fine(body.owner.surface).bounds)
    return float(max(low, -high))


def _ground_reason(body: Conductor | Dielectric, ground: Plane, scene: Scene) -> str | None:
    """Say that a conductor touches or crosses a grounded plane, or a dielectric crosses it."""
    surface = _fine(body.surface)
    low, high = ground.height(surface.bounds)
    crossing = min(high, -low)
    plane = f"the grounded plane {plane_text(ground, scene.unit)}"
    if isinstance(body, Dielectric):
        if crossing <= max(CONTACT * surface.extent, scene.coincidence * scene.size):
            return None
        return (
            f'"{body.name}" crosses {plane} by {metre_text(crossing)}; '
            "end it in the plane, which it may touch"
        )
    if -crossing > CONTACT * surface.extent:
        return None
    does = f"crosses by {metre_text(crossing)}" if crossing > 0.0 else "touches"
    return f'"{body.name}" {does} {plane}; leave a gap, or leave the body out if it is grounded'


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
