"""Panels carried over from one scene to another: the same ones, where the other scene has them."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from made_bodies import faces_of
from scenes import meshed_box, moved, tidy

from bem.geometry import shapes
from bem.geometry.planes import Plane, Planes
from bem.geometry.surface import Surface
from bem.panels.mesh import Body, Mesh
from bem.panels.motion import Affine, ByFaces, Recurved, loosened, motion_of
from bem.panels.transport import Other, transported, unmoved

UP = np.array([0.0, 0.0, 0.01])


def lifted(surface: Surface, shift: np.ndarray = UP) -> Surface:
    """Shift a surface."""
    return surface.placed(np.eye(3), shift)


def carried(before: list[Surface], after: list[Surface], rounds: int = 3) -> tuple[Mesh, Mesh]:
    """A mesh of the first surfaces, refined at random, and what becomes of it."""
    motions = [motion for motion in map(motion_of, before, after) if motion is not None]
    assert len(motions) == len(before)
    mesh = refined(Mesh.start(before), rounds)
    bodies = tuple(Body.of(surface, False) for surface in after)
    return mesh, transported(mesh, Other(motions, bodies))


def refined(mesh: Mesh, rounds: int) -> Mesh:
    """Halve a third of the panels, several times, by a fixed choice."""
    random = np.random.default_rng(5)
    for _ in range(rounds):
        n = len(mesh.conductor)
        mesh, _ = mesh.refine(random.random(n) < 0.3, random.integers(0, 2, n))
    return mesh


def corner_sets(mesh: Mesh) -> np.ndarray:
    """Corners (n, 12) of all panels in an order that does not depend on how they were made."""
    corners = mesh.corners.reshape(len(mesh.conductor), -1)
    return corners[np.lexsort(corners.round(9).T)]


TWINS = {
    "box, shifted": (shapes.box(1, 1, 0.1), lifted(shapes.box(1, 1, 0.1))),
    "box, stretched": (shapes.box(1, 1, 0.1), shapes.box(1, 1.02, 0.1)),
    "cube of triangles, grown": (meshed_box(2), meshed_box(2).placed(1.01 * np.eye(3), UP)),
    "sphere, grown": (shapes.sphere(1.0), shapes.sphere(1.01)),
    "tube, longer": (shapes.tube(1.0, 2.0), shapes.tube(1.0, 2.02)),
    "torus, thinner": (shapes.torus(2.0, 0.6), shapes.torus(2.0, 0.595)),
}


@pytest.mark.parametrize("name", TWINS)
def test_carried_panels_are_those_that_the_other_scene_gets_by_itself(name: str) -> None:
    """Both meshes are refined alike, one before and the other after the change."""
    before, after = TWINS[name]
    _, there = carried([before], [after])
    own = refined(Mesh.start([after]), 3)
    assert corner_sets(there) == pytest.approx(corner_sets(own), abs=1e-12)
    assert there.faceting().offset == pytest.approx(own.faceting().offset, abs=1e-13)


def test_what_stays_keeps_every_bit() -> None:
    plate, box = shapes.plate(1, 1), shapes.box(1, 1, 0.1)
    ball = lifted(shapes.sphere(0.3), 100.0 * UP)
    here, there = carried([plate, ball, box], [plate, lifted(ball), box])
    assert np.array_equal(unmoved(here, there), here.conductor != 1)
    assert np.abs(there.corners - here.corners)[here.conductor == 1] == pytest.approx(
        np.broadcast_to(UP, ((here.conductor == 1).sum(), 4, 3)), abs=1e-15
    )


def test_beside_another_plane_nothing_stays() -> None:
    """Panels see their images, and these move with the plane."""
    plate = shapes.plate(1, 1)
    here, there = carried([plate], [plate])
    assert unmoved(here, there).all()
    grounded = replace(there, planes=Planes(Plane(2, -0.1)))
    assert not unmoved(here, grounded).any()
    assert unmoved(grounded, grounded).all()


def test_the_simplest_map_is_found() -> None:
    box = shapes.box(1.0, 2.0, 3.0)
    same = motion_of(box, box)
    assert same is not None
    assert same.still
    shifted = motion_of(box, lifted(box))
    assert isinstance(shifted, Affine)
    assert np.array_equal(shifted.matrix, np.eye(3))
    assert np.array_equal(shifted.shift[:2], [0.0, 0.0])
    wide = motion_of(box, shapes.box(1.0, 2.1, 3.0))
    assert isinstance(wide, Affine)
    assert np.count_nonzero(wide.matrix) == 3
    turned = motion_of(box, moved(box))
    assert isinstance(turned, Affine)
    assert turned(box.vertices) == pytest.approx(moved(box).vertices, abs=1e-12)


def test_rounded_numbers_do_not_bend_a_shift() -> None:
    """Both bodies went through single precision, as in binary STL."""
    body = moved(meshed_box(2))
    rough = [
        Surface(s.vertices.astype(np.float32).astype(float), s.faces, rounding=6e-8)
        for s in (body, lifted(body))
    ]
    motion = motion_of(*rough)
    assert isinstance(motion, Affine)
    assert np.array_equal(motion.matrix, np.eye(3))
    assert motion.shift == pytest.approx(UP, abs=1e-7)


def cut_otherwise(surface: Surface) -> Surface:
    """The quadrilaterals of a surface as triangles along their other diagonal, in other order."""
    quads = surface.faces[::-1]
    return tidy(surface.vertices, np.concatenate([quads[:, [0, 1, 3]], quads[:, [1, 2, 3]]]))


def test_faces_cut_into_other_triangles_are_matched_by_their_outlines() -> None:
    box, other = shapes.box(1, 1, 0.1), shapes.box(1, 1.03, 0.1, (0, 0, 0.2))
    motion = motion_of(tidy(box.vertices, box.triangles), cut_otherwise(other))
    assert isinstance(motion, Affine)
    assert motion(box.vertices) == pytest.approx(other.vertices, abs=1e-12)


def prism(outline: list[tuple[float, float]], cuts: list[list[int]]) -> Surface:
    """Body of height 0.2 over an outline whose ends are cut into quadrilaterals."""
    n = len(outline)
    points = [(x, y, z) for z in (0.0, 0.2) for x, y in outline]
    sides = [[k, (k + 1) % n, (k + 1) % n + n, k + n] for k in range(n)]
    ends = [[k + shift for k in cut] for cut in cuts for shift in (0, n)]
    return Surface(np.array(points), np.array(sides + ends))


def bracket(arm: float) -> Surface:
    """L-shaped body with one arm of a given length."""
    outline = [(0.0, 0.0), (2.0, 0.0), (2.0, 1.0), (1.0, 1.0), (1.0, arm), (0.0, arm)]
    return prism(outline, [[0, 1, 2, 3], [0, 3, 4, 5]])


def test_a_face_that_goes_by_no_affine_map_goes_by_its_triangles() -> None:
    """Panels stay within the triangles, so neighbours keep their common sides and the area."""
    before, after = bracket(2.0), bracket(2.03)
    motion = motion_of(before, after)
    assert isinstance(motion, ByFaces)
    assert motion.loose
    mesh = refined(Mesh.start([loosened(before)]), 2)
    there = transported(mesh, Other([motion], mesh.bodies))
    assert np.ptp(there.corners.reshape(-1, 3), axis=0) == pytest.approx([2.0, 2.03, 0.2])
    assert area(there) == pytest.approx(2.0 * 3.03 + 0.2 * (2 + 1 + 1 + 1.03 + 1 + 2.03))


def area(mesh: Mesh) -> float:
    """Total area of all panels."""
    c = mesh.corners
    return float(0.5 * np.linalg.norm(np.cross(c[:, 2] - c[:, 0], c[:, 3] - c[:, 1]), axis=1).sum())


def two_blocks(shift: float) -> Surface:
    """One conductor of two boxes, the second one shifted."""
    first, second = shapes.box(1, 1, 1), shapes.box(1, 1, 0.5, (2.0 + shift, 0, 0))
    faces = np.concatenate([first.faces, second.faces + 8])
    return Surface(np.concatenate([first.vertices, second.vertices]), faces)


def test_parts_of_a_conductor_move_by_themselves() -> None:
    before, after = two_blocks(0.0), two_blocks(0.01)
    motion = motion_of(before, after)
    assert isinstance(motion, ByFaces)
    assert not motion.loose
    here, there = carried([before], [after])
    first = here.corners[:, :, 0].max(axis=1) < 1.0
    assert np.array_equal(unmoved(here, there), first)
    assert there.corners[~first] - here.corners[~first] == pytest.approx(
        np.broadcast_to([0.01, 0.0, 0.0], ((~first).sum(), 4, 3)), abs=1e-12
    )


@pytest.mark.parametrize(
    ("before", "after"),
    [
        (shapes.box(1, 1, 1), shapes.sphere(1.0)),
        (shapes.sphere(1.0), shapes.cylinder(1.0, 2.0)),
        (shapes.disc(1.0), shapes.annulus(0.5, 1.0)),
        (bracket(2.0), shapes.box(2, 2, 0.2)),
    ],
)
def test_bodies_of_another_kind_are_not_matched(before: Surface, after: Surface) -> None:
    assert motion_of(before, after) is None


def test_a_curve_that_stays_is_still() -> None:
    ball = lifted(shapes.sphere(1.0))
    same, grown = motion_of(ball, ball), motion_of(ball, lifted(shapes.sphere(1.01)))
    assert isinstance(same, Recurved)
    assert isinstance(grown, Recurved)
    assert same.still
    assert not grown.still


def test_loose_triangles_share_no_vertex() -> None:
    loose = loosened(meshed_box(1))
    assert len(loose.vertices) == 36
    assert len(np.unique(faces_of(loose.triangles))) == 37
