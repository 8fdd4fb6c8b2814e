"""What each body is like by itself, and what may be wrong with it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from bem.geometry.repair.repair import SEAMS
from bem.geometry.wording import counted, point_text
from bem.scene.body import Body
from bem.scene.material import Material
from bem.scene.scene import Dielectric

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
    """What one conductor or dielectric is like.

    Args:
        name: of the body.
        body: "solid", "shell" or "dielectric".
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
        material: of a dielectric.
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
    material: Material | None = None

    @property
    def faces(self) -> int:
        """Number of faces."""
        return self.triangles + self.quads


def report_of(body: Body) -> BodyReport:
    """Describe a body."""
    owner, surface = body.owner, body.owner.surface
    return BodyReport(
        name=owner.name,
        body="dielectric" if isinstance(owner, Dielectric) else owner.body,
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
        changes=owner.source.changes,
        material=owner.material if isinstance(owner, Dielectric) else None,
    )


def all_body_notes(reports: Sequence[BodyReport], bodies: Sequence[Body], unit: str) -> list[str]:
    """What may be wrong with bodies, one line each."""
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


def junctions(bodies: Sequence[Body], unit: str) -> list[str]:
    """Tell of edges where more than two faces meet."""
    lines = []
    for body in bodies:
        many = np.flatnonzero(body.edges.uses > 2)
        if len(many):
            start = body.surface.vertices[body.edges.ends[many[0], 0]]
            lines.append(
                f'"{body.owner.name}" has {counted(len(many), "edge")} of three faces or more, '
                f"the first at {point_text(start, unit)}: fins and walls are fine on a conductor"
            )
    return lines
