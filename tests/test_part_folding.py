"""Parts folded onto the kept side of mirror planes, with the regions that they keep."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from bem.geometry import shapes
from bem.geometry.part_folding import folded_parts
from bem.geometry.parts import INTERFACE, METAL, SURROUNDINGS, Part
from bem.geometry.planes import Plane, Planes
from bem.geometry.surface import Surface
from bem.panels.mesh import Mesh

TOLERANCE = 1e-6
BODIES = {
    "box": shapes.box(1.0, 0.8, 0.6),
    "sphere": shapes.sphere(0.5),
    "rod": shapes.cylinder(0.2, 1.0),
    "ring": shapes.torus(0.5, 0.2),
}


def mirrors(axes: str) -> Planes:
    """Mirror planes through the origin."""
    return Planes(None, tuple(Plane("xyz".index(axis), 0.0) for axis in axes))


def outward(surface: Surface) -> Surface:
    """The same closed surface; all shapes used here have their faces look outward."""
    corners = surface.vertices[surface.triangles]
    normal = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    assert (corners.mean(axis=1) * normal).sum() > 0.0
    return surface


def coat(surface: Surface) -> Part:
    """The surface of a dielectric in the surroundings."""
    return Part(outward(surface), INTERFACE, 1, SURROUNDINGS, 0)


def vectors(mesh: Mesh) -> np.ndarray:
    """(n, 3) area vectors of panels."""
    c = mesh.corners
    return 0.5 * np.cross(c[:, 2] - c[:, 0], c[:, 3] - c[:, 1])


def swept(mesh: Mesh) -> float:
    """Volume behind panels, seen from the origin."""
    return float((mesh.corners.mean(axis=1) * vectors(mesh)).sum() / 3.0)


@pytest.mark.parametrize("name", BODIES)
@pytest.mark.parametrize("axes", ["x", "z", "xy", "xyz"])
def test_a_share_of_the_volume_stays_and_is_closed_by_the_planes(name: str, axes: str) -> None:
    """A mirror plane is seen edge-on from the origin, so it adds nothing to the volume."""
    part, planes = coat(BODIES[name]), mirrors(axes)
    whole, kept = Mesh.start([part]), Mesh.start(folded_parts([part], planes, TOLERANCE))
    assert swept(kept) == pytest.approx(swept(whole) / planes.multiplicity, rel=0.05)
    for axis in range(3):
        if "xyz"[axis] in axes:
            assert kept.corners[..., axis].min() >= -1e-15
        else:
            assert abs(vectors(kept)[:, axis].sum()) < 1e-12


def test_faces_in_a_mirror_plane_go_and_sheets_there_stay() -> None:
    """A block beside the plane is half of a larger one; a sheet has one region all round."""
    block = shapes.box(1.0, 1.0, 1.0, (0.5, 0.0, 0.0))
    turn = np.array([[0, 0, 1.0], [0, 1, 0], [-1, 0, 0]])
    sheet = shapes.plate(0.5, 0.5).placed(turn, np.zeros(3))
    parts = [
        Part(sheet, 0, SURROUNDINGS, 1, 0),
        Part(block, 1, METAL, SURROUNDINGS, 1),
        replace(coat(block), body=2),
    ]
    found = folded_parts(parts, mirrors("x"), TOLERANCE)
    assert [part.conductor for part in found] == [0, 1, INTERFACE]
    assert (found[0].back, found[0].front) == (1, 1)
    for part in found[1:]:
        assert np.abs(part.surface.vertices[part.surface.triangles][..., 0]).max(axis=1).min() > 0
        assert len(part.surface.triangles) == 10


def test_the_side_of_a_sheet_that_is_kept_follows_its_normal() -> None:
    """The same sheet with its faces run through the other way, and both regions exchanged."""
    turn = np.array([[0, 0, 1.0], [0, 1, 0], [-1, 0, 0]])
    for way, regions in ((turn, (0, 1)), (turn @ np.diag([1.0, 1.0, -1.0]), (1, 0))):
        sheet = shapes.plate(0.5, 0.5).placed(way, np.zeros(3))
        corners = sheet.vertices[sheet.triangles[0]]
        ahead = np.cross(corners[1] - corners[0], corners[2] - corners[0])[0] > 0.0
        (found,) = folded_parts([Part(sheet, 0, *regions, 0)], mirrors("x"), TOLERANCE)
        assert found.back == found.front == regions[1 if ahead else 0]


def test_curved_sheets_in_a_mirror_plane_stay_once() -> None:
    """A disc that lies in the plane, with a dielectric above it."""
    (found,) = folded_parts([Part(shapes.disc(0.5), 0, 0, 1, 0)], mirrors("z"), TOLERANCE)
    assert found.back == found.front and found.surface.curve is not None
    assert np.linalg.norm(vectors(Mesh.start([found])), axis=1).sum() > 0.6


def test_parts_beyond_the_plane_go() -> None:
    """Of two parts of one body only that on the kept side stays, curved or not."""
    for shape in (shapes.sphere(0.3), shapes.box(0.3, 0.3, 0.3)):
        there = shape.placed(np.eye(3), np.array([-1.0, 0.0, 0.0]))
        here = shape.placed(np.eye(3), np.array([1.0, 0.0, 0.0]))
        found = folded_parts([coat(there), coat(here)], mirrors("x"), TOLERANCE)
        assert len(found) == 1 and found[0].surface.bounds[0, 0] > 0.0


def test_a_dielectric_stands_on_the_ground_without_a_face_there() -> None:
    """With its image of opposite charge the face in the plane is inside."""
    ground = Planes(Plane(2, 0.0))
    for shape in (shapes.box(1.0, 1.0, 0.5), shapes.cylinder(0.5, 0.5)):
        for side in (-1.0, 1.0):
            part = coat(shape.placed(np.eye(3), np.array([0.0, 0.0, 0.25 * side])))
            (found,) = folded_parts([part], ground, TOLERANCE)
            mesh = Mesh.start([found])
            assert np.abs(mesh.corners[..., 2]).max(axis=1).min() > 0.0
            assert vectors(mesh)[:, 2].sum() * side > 0.5
            assert swept(mesh) == pytest.approx(swept(Mesh.start([part])), rel=0.01)
    lifted = coat(shapes.box(1.0, 1.0, 0.5, (0.0, 0.0, 1.0)))
    assert folded_parts([lifted], ground, TOLERANCE) == [lifted]
