"""An inspection as lines of text, lengths in the scene's unit or one that suits them."""

from __future__ import annotations

import numpy as np

from bem.geometry.wording import counted, metre_text, point_text, shown
from bem.scene.inspect import BodyReport, Inspection
from bem.scene.pairs import PairReport
from bem.scene.plane_checks import plane_text
from bem.scene.scene import Conductor, Scene
from bem.scene.states import TERMINAL
from bem.units import metres_per

MOST_PAIRS = 60
"""Most gaps that are listed, smallest first."""


def report(scene: Scene, inspection: Inspection) -> str:
    """Text of an inspection: unit, bodies, gaps, notes, and what forbids a solution."""
    lines = [_head(scene, inspection)]
    for conductor, body in zip(scene.conductors, inspection.bodies, strict=True):
        lines += ["", *_body(conductor, body, scene.unit)]
    if inspection.pairs:
        lines += ["", "smallest gaps", *_pairs(inspection.pairs)]
    if inspection.ground_gaps:
        lines += ["", "gaps to the grounded plane", *_ground_gaps(inspection)]
    if inspection.notes:
        lines += ["", "notes", *(f"  {line}" for line in inspection.notes)]
    if inspection.fatal:
        lines += ["", "cannot be solved", *(f"  {line}" for line in inspection.fatal)]
    else:
        lines += ["", "can be solved"]
    return "\n".join(lines)


def _head(scene: Scene, inspection: Inspection) -> str:
    faces = sum(body.faces for body in inspection.bodies)
    low = np.min([body.bounds[0] for body in inspection.bodies], axis=0)
    high = np.max([body.bounds[1] for body in inspection.bodies], axis=0)
    return "\n".join(
        [
            f"{counted(len(inspection.bodies), 'conductor')}, {counted(faces, 'face')}, "
            f"unit {scene.unit}, relative permittivity {scene.relative_permittivity:g}",
            f"  box     {_box(np.array([low, high]), scene.unit)}",
            *_planes(scene),
        ]
    )


def _planes(scene: Scene) -> list[str]:
    """Lines about grounded and mirror planes."""
    ground, mirrors = scene.planes.ground, scene.planes.mirrors
    lines = []
    if ground is not None:
        lines.append(f"  ground  infinite plane {plane_text(ground, scene.unit)} at potential zero")
    if mirrors:
        where = ", ".join(plane_text(mirror, scene.unit) for mirror in mirrors)
        lines.append(
            f"  mirror  {where}: a body and its images are one conductor, "
            "results are for the whole; bodies are shown on the side of larger coordinates"
        )
    return lines


def _box(bounds: np.ndarray, unit: str) -> str:
    low, high = bounds
    size = " x ".join(f"{length / metres_per(unit):.6g}" for length in high - low)
    return f"{size} {unit}, from {point_text(low, unit)} to {point_text(high, unit)}"


def _body(conductor: Conductor, body: BodyReport, unit: str) -> list[str]:
    return [
        f"{conductor.name}{_origin(conductor)}",
        f"  box     {_box(body.bounds, unit)}",
        f"  faces   {_faces(body)}",
        f"  kind    {_kind(body, unit)}",
        *_wiring(conductor),
        *(f"  change  {line}" for line in body.changes),
    ]


def _wiring(conductor: Conductor) -> list[str]:
    node = [] if conductor.node is None else [f"node {shown(conductor.node)}"]
    state = [] if conductor.state == TERMINAL else [conductor.state]
    return [f"  state   {', '.join(state + node)}"] if state or node else []


def _origin(conductor: Conductor) -> str:
    source = conductor.source
    if source.file is None:
        return " (shape)"
    part = "" if source.part is None else f', part "{source.part}"'
    return f" ({source.file}{part}, numbers in {source.unit})"


def _faces(body: BodyReport) -> str:
    kinds = [counted(body.triangles, "triangle")] if body.triangles else []
    if body.quads:
        kinds.append(counted(body.quads, "quadrilateral"))
    curved = "; facets of a curved surface, gaps are theirs" if body.curved else ""
    return (
        f"{', '.join(kinds)}, {counted(body.vertices, 'vertex', 'vertices')}; "
        f"worst aspect {body.worst_aspect:.3g}{curved}"
    )


def _kind(body: BodyReport, unit: str) -> str:
    metres = metres_per(unit)
    area = f"area {body.area / metres**2:.6g} {unit}^2"
    pieces = counted(body.pieces, "piece")
    if body.volume is None:
        edges = counted(body.open_edges, "open edge")
        return f"open, {edges}: metal sheet without thickness; {pieces}, {area}"
    metal = "solid metal" if body.body == "solid" else "hollow shell"
    return f"closed, {metal}; {pieces}, {area}, volume {body.volume / metres**3:.6g} {unit}^3"


def _pairs(pairs: tuple[PairReport, ...]) -> list[str]:
    names = [f"{pair.first} - {pair.second}" for pair in pairs[:MOST_PAIRS]]
    width = max(map(len, names))
    lines = [f"  {name:<{width}}  {_gap(pair)}" for name, pair in zip(names, pairs, strict=False)]
    if len(pairs) > MOST_PAIRS:
        lines.append(f"  {counted(len(pairs) - MOST_PAIRS, 'wider gap')} not listed")
    return lines


def _ground_gaps(inspection: Inspection) -> list[str]:
    """Smallest gaps first."""
    gaps = sorted(zip(inspection.ground_gaps, inspection.bodies, strict=True), key=lambda g: g[0])
    width = max(len(body.name) for _, body in gaps)
    lines = [f"  {body.name:<{width}}  {metre_text(max(gap, 0.0))}" for gap, body in gaps]
    more = [f"  {counted(len(gaps) - MOST_PAIRS, 'wider gap')} not listed"]
    return lines[:MOST_PAIRS] + (more if len(gaps) > MOST_PAIRS else [])


def _gap(pair: PairReport) -> str:
    if pair.relation == "cross":
        return "cross"
    if pair.relation == "touch":
        return f"{metre_text(pair.gap)}, touch"
    inside = f", {pair.inner} inside" if pair.inner else ""
    return metre_text(pair.gap) + inside
