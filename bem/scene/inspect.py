"""Checks of a scene before solving: each body, each pair, and what forbids a solution."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from bem.errors import GeometryError, InputError
from bem.geometry.planes import Planes
from bem.geometry.repair.repair import SEAMS
from bem.geometry.wording import counted, metre_text, point_text
from bem.scene.body import Body, body_of
from bem.scene.facet_notes import facet_notes
from bem.scene.pairs import ALL_PAIRS, CONTACT, PairReport, all_pairs
from bem.scene.plane_checks import ground_gap, on_kept_side, plane_findings
from bem.scene.scene import Scene
from bem.scene.support import check_support

ALMOST_CLOSED = 0.02
"""A surface with less than this part of its edges open is probably meant to be closed."""

ONE_FACET = 3
"""So many open edges are a missing facet, however coarse the mesh."""

SOUP = 20
"""So many triangles or more without a shared corner are told as such."""

SLIVER = 1e4
"""Triangles this many times longer than high get a note."""


@dataclass(frozen=True)
class BodyReport:
    """What one conductor is like.

    Args:
        name: of the conductor.
        body: "solid" or "shell".
        triangles: number of triangular faces.
        quads: number of quadrilateral faces.
        vertices: number of vertices.
        bounds: (2, 3) lowest and highest coordinates, metres.
        area: of the faces, m^2.
        volume: enclosed, m^3, or None if open.
        closed: whether every piece is closed.
        open_edges: number of edges that leave it open.
        pieces: number of pieces that share no vertex.
        worst_aspect: largest ratio of longest edge to smallest height of a triangle.
        curved: whether the facets stand for a true surface.
        changes: what reading changed, one line each.
    """

    name: str
    body: str
    triangles: int
    quads: int
    vertices: int
    bounds: np.ndarray
    area: float
    volume: float | None
    closed: bool
    open_edges: int
    pieces: int
    worst_aspect: float
    curved: bool
    changes: tuple[str, ...]

    @property
    def faces(self) -> int:
        """Number of faces."""
        return self.triangles + self.quads


@dataclass(frozen=True)
class Inspection:
    """Findings about a scene.

    Args:
        unit: of the scene.
        bodies: one report per conductor.
        pairs: sorted by gap; with many conductors those far apart are left out.
        fatal: reasons not to solve, one line each.
        warnings: what may be wrong with a body, one line each.
        notes: what is worth knowing, one line each, the warnings among it.
        ground_gaps: distance of each conductor from the grounded plane, metres; none without it.
    """

    unit: str
    bodies: tuple[BodyReport, ...]
    pairs: tuple[PairReport, ...]
    fatal: list[str]
    warnings: list[str]
    notes: list[str]
    ground_gaps: tuple[float, ...] = ()


def inspect(scene: Scene, facets: bool = True) -> Inspection:
    """Look at every conductor and every pair of conductors.

    Args:
        scene: what to look at.
        facets: also compare facets with the smooth surfaces that they may stand for.

    Raises:
        InputError: the scene has no conductors.
    """
    if not scene.conductors:
        raise InputError("the scene has no conductors; add at least one")
    planes = scene.planes
    bodies = [body_of(on_kept_side(conductor, planes)) for conductor in scene.conductors]
    reports = tuple(_body_report(body) for body in bodies)
    pairs = tuple(all_pairs(bodies))
    solid = {c.name: c.body == "solid" for c in scene.conductors}
    bad = [pair for pair in pairs if _is_fatal(pair, solid)]
    warnings = _all_body_notes(reports, bodies, scene.unit)
    return Inspection(
        unit=scene.unit,
        bodies=reports,
        pairs=pairs,
        fatal=[
            *plane_findings(scene.conductors, planes, scene.unit),
            *(_reason(pair, scene.unit) + _image_hint(planes) for pair in bad),
        ],
        ground_gaps=tuple(ground_gap(b, planes.ground) for b in bodies) if planes.ground else (),
        warnings=warnings,
        notes=[
            *warnings,
            *(facet_notes(scene.conductors) if facets else ()),
            *_junctions(bodies, scene.unit),
            *_pair_notes([p for p in pairs if p not in bad], len(bodies)),
        ],
    )


def check_scene(scene: Scene) -> Inspection:
    """Inspect a scene that is about to be solved.

    Raises:
        GeometryError: conductors touch, cross, or lie in solid metal.
        InputError: the scene has no conductors, or something that no solver knows.
    """
    check_support(scene)
    inspection = inspect(scene, facets=False)
    if inspection.fatal:
        more = len(inspection.fatal) - 1
        rest = f" (and {counted(more, 'more finding')}: see bem inspect)" if more else ""
        raise GeometryError(inspection.fatal[0] + rest)
    return inspection


def _body_report(body: Body) -> BodyReport:
    surface = body.conductor.surface
    return BodyReport(
        name=body.conductor.name,
        body=body.conductor.body,
        triangles=int(surface.is_triangle.sum()),
        quads=int((~surface.is_triangle).sum()),
        vertices=len(body.surface.vertices),
        bounds=body.bounds,
        area=body.area,
        volume=body.volume,
        closed=body.closed,
        open_edges=len(body.open_edges),
        pieces=body.pieces[0],
        worst_aspect=body.worst_aspect,
        curved=surface.curve is not None,
        changes=body.conductor.source.changes,
    )


def _outer(pair: PairReport) -> str:
    return pair.second if pair.inner == pair.first else pair.first


def _is_fatal(pair: PairReport, solid: dict[str, bool]) -> bool:
    if pair.relation == "inside":
        return solid[_outer(pair)]
    return pair.relation in ("touch", "cross")


def _reason(pair: PairReport, unit: str) -> str:
    place = point_text(pair.place, unit)
    if pair.relation == "inside":
        return (
            f'"{pair.inner}" lies inside "{_outer(pair)}", which is solid metal; '
            f'if "{_outer(pair)}" is hollow, give it body = "shell"'
        )
    if pair.relation == "cross":
        return (
            f'"{pair.first}" and "{pair.second}" cross near {place}; '
            "move them apart, or make them one conductor"
        )
    return (
        f'"{pair.first}" and "{pair.second}" touch or overlap near {place}: '
        f"their gap of {metre_text(pair.gap)} is within {CONTACT:g} of the smaller body; "
        "move them apart, or make them one conductor"
    )


def _image_hint(planes: Planes) -> str:
    """What to think of where bodies were folded onto one side of mirror planes."""
    if not planes.mirrors:
        return ""
    return " (with the mirror planes a body stands for its images too: leave those out)"


def _pair_notes(pairs: list[PairReport], number: int) -> list[str]:
    notes = [
        f'"{pair.inner}" lies inside "{_outer(pair)}"'
        for pair in pairs
        if pair.relation == "inside"
    ]
    if number > ALL_PAIRS:
        every = counted(number * (number - 1) // 2, "pair")
        notes.append(
            f"gaps of {len(pairs):,} of {every} found, with each conductor's smallest among them; "
            "the other pairs are farther apart"
        )
    return notes


def _all_body_notes(reports: tuple[BodyReport, ...], bodies: list[Body], unit: str) -> list[str]:
    return [
        line
        for report, body in zip(reports, bodies, strict=True)
        for line in _body_notes(report, body, unit)
    ]


def _body_notes(report: BodyReport, body: Body, unit: str) -> list[str]:
    lines = []
    if _is_soup(body):
        lines.append(
            f'"{report.name}" falls apart into {counted(report.pieces, "single triangle")}: they '
            f"miss each other by more than {SEAMS[-1]:g} of its size; export it with more digits"
        )
    if _is_almost_closed(report, body):
        end = body.edges.ends[body.open_edges[0], 0]
        lines.append(
            f'"{report.name}" is almost closed: {counted(report.open_edges, "open edge")}, '
            f"the first at {point_text(body.surface.vertices[end], unit)}; "
            "it counts as a sheet, not as solid metal"
        )
    if report.worst_aspect > SLIVER:
        lines.append(
            f'"{report.name}" has slivers: one triangle is {report.worst_aspect:.1e} times as '
            "long as high"
        )
    return lines


def _is_soup(body: Body) -> bool:
    return body.pieces[0] == len(body.triangles) >= SOUP


def _is_almost_closed(report: BodyReport, body: Body) -> bool:
    """Whether few edges are open, or those of a single facet."""
    most = max(ALMOST_CLOSED * len(body.edges.uses), ONE_FACET if report.triangles > 3 else 0)
    return 0 < report.open_edges <= most


def _junctions(bodies: list[Body], unit: str) -> list[str]:
    """Tell of edges where more than two faces meet."""
    lines = []
    for body in bodies:
        many = np.flatnonzero(body.edges.uses > 2)
        if len(many):
            start = body.surface.vertices[body.edges.ends[many[0], 0]]
            lines.append(
                f'"{body.conductor.name}" has {counted(len(many), "edge")} of three faces or more, '
                f"the first at {point_text(start, unit)}: fins and walls are fine on a conductor"
            )
    return lines
