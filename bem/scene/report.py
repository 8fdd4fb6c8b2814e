"""An inspection as lines of text, lengths in the scene's unit or one that suits them."""

from __future__ import annotations

import itertools

import numpy as np

from bem.geometry.planes import Plane
from bem.geometry.wording import counted, metre_text, point_text, shown
from bem.scene.body_report import BodyReport
from bem.scene.inspect import Inspection
from bem.scene.pairs import PairReport
from bem.scene.plane_checks import plane_text
from bem.scene.regions import Regions
from bem.scene.scene import Conductor, Dielectric, Scene
from bem.scene.states import TERMINAL
from bem.units import metres_per

MOST_PAIRS = 60
"""Most gaps that are listed, smallest first."""
MOST_BORDERS = 12
"""Most neighbours of one region that are listed, the largest area first."""


def report(scene: Scene, inspection: Inspection) -> str:
    """Text of an inspection: unit, bodies, gaps, regions, notes, and what forbids a solution."""
    lines = [_head(scene, inspection)]
    reports = (*inspection.bodies, *inspection.dielectrics)
    for body, found in zip(scene.bodies, reports, strict=True):
        lines += ["", *_body(body, found, scene.unit)]
    if inspection.pairs:
        lines += ["", "smallest gaps", *_pairs(inspection.pairs)]
    if inspection.ground_gaps:
        lines += ["", "gaps to the grounded plane", *_ground_gaps(inspection)]
    if inspection.regions:
        lines += ["", "regions", *region_lines(inspection.regions, scene.unit)]
    if inspection.notes:
        lines += ["", "notes", *(f"  {line}" for line in inspection.notes)]
    if inspection.fatal:
        lines += ["", "cannot be solved", *(f"  {line}" for line in inspection.fatal)]
    else:
        lines += ["", "can be solved"]
    return "\n".join(lines)


def _head(scene: Scene, inspection: Inspection) -> str:
    reports = (*inspection.bodies, *inspection.dielectrics)
    faces = sum(body.faces for body in reports)
    low = np.min([body.bounds[0] for body in reports], axis=0)
    high = np.max([body.bounds[1] for body in reports], axis=0)
    kinds = [counted(len(inspection.bodies), "conductor")]
    if inspection.dielectrics:
        kinds.append(counted(len(inspection.dielectrics), "dielectric"))
    found = f"{', '.join(kinds)}, {counted(faces, 'face')}"
    return "\n".join(
        [
            f"{found}, unit {scene.unit}, {scene.surroundings}",
            f"  box     {_box(np.array([low, high]), scene.unit)}",
            *_planes(scene),
            *_layers(scene),
            *_coincidence(scene, inspection),
        ]
    )


def _coincidence(scene: Scene, inspection: Inspection) -> list[str]:
    """Say at which distance faces coincide, where that matters."""
    if not inspection.dielectrics:
        return []
    length = inspection.coincidence / metres_per(scene.unit)
    return [
        f"  contact faces closer than {length:.3g} {scene.unit} coincide "
        f"({scene.coincidence:g} of the size)"
    ]


def _layers(scene: Scene) -> list[str]:
    """Lines about a half-space or flat layers, from above downward as in a drawing."""
    stack = scene.stack
    if stack is None:
        return []
    planes = [plane_text(Plane(stack.axis, at), scene.unit) for at in stack.planes]
    below = ["behind the grounded plane"] if stack.grounded_below else [f"below {planes[0]}"]
    above = ["behind the grounded plane"] if stack.grounded_above else [f"above {planes[-1]}"]
    between = [f"{low} to {high}" for low, high in itertools.pairwise(planes)]
    rows = zip([*below, *between, *above], stack.materials, strict=True)
    lines = [
        f"  layer   {where}: {'no field' if 'grounded' in where else medium}"
        for where, medium in rows
    ]
    grounds = [plane_text(Plane(stack.axis, at), scene.unit) for at in stack.grounded]
    return [*lines[::-1], *(f"  ground  infinite plane {at} at potential zero" for at in grounds)]


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


def _body(body: Conductor | Dielectric, found: BodyReport, unit: str) -> list[str]:
    return [
        f"{body.name}{_origin(body)}",
        f"  box     {_box(found.bounds, unit)}",
        f"  faces   {_faces(found)}",
        f"  kind    {_kind(found, unit)}",
        *(_wiring(body) if isinstance(body, Conductor) else ()),
        *(f"  change  {line}" for line in found.changes),
    ]


def _wiring(conductor: Conductor) -> list[str]:
    node = [] if conductor.node is None else [f"node {shown(conductor.node)}"]
    state = [] if conductor.state == TERMINAL else [conductor.state]
    return [f"  state   {', '.join(state + node)}"] if state or node else []


def _origin(body: Conductor | Dielectric) -> str:
    source = body.source
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
    if body.material is not None and body.volume is not None:
        volume = f"volume {body.volume / metres**3:.6g} {unit}^3"
        return f"dielectric, {body.material}; {pieces}, {area}, {volume}"
    if body.volume is None:
        edges = counted(body.open_edges, "open edge")
        return f"open, {edges}: metal sheet without thickness; {pieces}, {area}"
    metal = "solid metal" if body.body == "solid" else "hollow shell"
    return f"closed, {metal}; {pieces}, {area}, volume {body.volume / metres**3:.6g} {unit}^3"


def region_lines(regions: Regions, unit: str) -> list[str]:
    """Each region by its number: what fills it, its volume, and what it borders on."""
    metres = metres_per(unit)
    lines = []
    for region in regions.reports:
        size = "" if region.volume is None else f", volume {region.volume / metres**3:.6g} {unit}^3"
        lines.append(f"  {region.number} {region.name}: {region.material}{size}")
        borders = [f"{name} {area / metres**2:.6g}" for name, area in region.borders.items()]
        if borders:
            more = [f"{len(borders) - MOST_BORDERS} more"] if len(borders) > MOST_BORDERS else []
            found = ", ".join(borders[:MOST_BORDERS] + more)
            lines.append(f"    borders on ({unit}^2): {found}")
    return lines


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
