"""Panels of parts: what lies behind and in front of each, and which way it is turned."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from faceted_bodies import icosphere

from bem.geometry import shapes
from bem.geometry.parts import INTERFACE, METAL, SURROUNDINGS, Part
from bem.geometry.surface import NO_CORNER, Surface
from bem.panels.mesh import Mesh


def facets() -> Surface:
    """Facets of a ball, all looking outward."""
    ball = icosphere(1)
    corners = ball.vertices[ball.triangles]
    inward = (corners.mean(axis=1) * vectors(corners)).sum(axis=1) < 0.0
    return replace(ball, faces=np.where(inward[:, None], ball.faces[:, [1, 0, 2, 3]], ball.faces))


def vectors(corners: np.ndarray) -> np.ndarray:
    """(n, 3) area vectors of panels or triangles (n, 3 or 4, 3)."""
    return 0.5 * np.cross(corners[:, 2] - corners[:, 0], corners[:, -1] - corners[:, 1])


BALL = facets()
SMOOTH = replace(BALL, smooth=True)
BODIES = {
    "box": shapes.box(1.0, 1.0, 0.5),
    "prism of triangles": shapes.extrude([[0, 0], [1, 0], [0.2, 0.7]], 0.3),
    "facets": BALL,
    "fitted facets": SMOOTH,
    "sphere": shapes.sphere(1.0),
    "rod": shapes.cylinder(0.1, 2.0),
    "ring": shapes.torus(1.0, 0.2),
    "ellipsoid": shapes.ellipsoid(1.0, 0.5, 0.2),
}


def turned(surface: Surface) -> Surface:
    """The same faces run through the other way; the true surface stays as it is."""
    faces = np.where(
        (surface.faces[:, 3] == NO_CORNER)[:, None],
        surface.faces[:, [1, 0, 2, 3]],
        surface.faces[:, [3, 2, 1, 0]],
    )
    return replace(surface, faces=faces)


def outward(surface: Surface) -> Surface:
    """A closed surface with its faces run through so that they look outward."""
    corners = surface.vertices[surface.triangles]
    return surface if swept(corners) > 0.0 else turned(surface)


def swept(corners: np.ndarray) -> float:
    """Volume behind panels or triangles."""
    if corners.shape[1] == 3:
        corners = corners[:, [0, 1, 2, 2]]
    return float((corners.mean(axis=1) * vectors(corners)).sum() / 3.0)


def refined(mesh: Mesh, rounds: int = 3) -> Mesh:
    """Halve a third of the panels, several times, by a fixed choice."""
    random = np.random.default_rng(3)
    for _ in range(rounds):
        n = len(mesh.owner)
        mesh, _ = mesh.refine(random.random(n) < 0.3, random.integers(0, 2, n))
    return mesh


def dielectric(surface: Surface, back: int = 1, front: int = SURROUNDINGS, body: int = 0) -> Part:
    """An interface."""
    return Part(surface, INTERFACE, back, front, body)


@pytest.mark.parametrize("name", BODIES)
@pytest.mark.parametrize("inside_out", [False, True])
def test_panels_lead_from_back_to_front(name: str, inside_out: bool) -> None:
    """Refined as they may be; the volume behind them is that of the body, or minus it."""
    body = outward(BODIES[name])
    volume = swept(body.vertices[body.triangles])
    part = dielectric(turned(body), 0, 1) if inside_out else dielectric(body)
    mesh = refined(Mesh.start([part]))
    found = swept(mesh.corners)
    assert found == pytest.approx(-volume if inside_out else volume, rel=0.4)
    assert np.abs(vectors(mesh.corners).sum(axis=0)).max() < 1e-12


@pytest.mark.parametrize("name", ["fitted facets", "sphere", "rod", "ring"])
@pytest.mark.parametrize("inside_out", [False, True])
def test_the_true_surface_lies_in_front_where_the_offset_is_positive(
    name: str, inside_out: bool
) -> None:
    """Panels cut the corners of a convex body, so its surface lies outside them."""
    body = outward(BODIES[name])
    mesh = Mesh.start([dielectric(turned(body), 0, 1) if inside_out else dielectric(body)])
    moved = mesh.faceting().offset @ np.linalg.norm(vectors(mesh.corners), axis=1)
    assert np.sign(moved) == (-1.0 if inside_out else 1.0)
    assert not (mesh.faceting().sheet.any() or mesh.faceting().rim_offset.any())


def test_doubt_about_facets_has_the_sign_of_the_front() -> None:
    """Facets of a file, left as they are, stand inside the sphere that they may stand for."""
    body = BALL
    for part, sign in ((dielectric(body), 1.0), (dielectric(turned(body), 0, 1), -1.0)):
        assert (np.sign(Mesh.start([part]).doubtful().offset) == sign).all()


def half(surface: Surface, axis: int = 2, below: bool = False) -> Surface:
    """The faces of a surface above the middle, or those below, an open part of it."""
    middle = surface.vertices[surface.triangles].mean(axis=1)
    kept = surface.triangles[(middle[:, axis] > 0.0) ^ below]
    rows = np.concatenate([kept, np.full((len(kept), 1), NO_CORNER)], axis=1)
    return replace(surface, faces=rows)


@pytest.mark.parametrize("smooth", [False, True])
@pytest.mark.parametrize("inside_out", [False, True])
def test_open_parts_are_turned_as_their_faces(smooth: bool, inside_out: bool) -> None:
    """A bowl that is a part of a ball: nothing but its faces says where its front is."""
    bowl = half(replace(BALL, smooth=smooth))
    part = dielectric(turned(bowl) if inside_out else bowl)
    mesh = refined(Mesh.start([part]))
    away = np.einsum("ni,ni->n", mesh.corners.mean(axis=1), vectors(mesh.corners))
    assert (np.sign(away) == (-1.0 if inside_out else 1.0)).all()


def test_open_parts_have_no_free_rims() -> None:
    """The rim of a part is where another part begins; only that of a sheet is free."""
    bowl = half(SMOOTH)
    sheet, metal = Part(bowl, 0, 1, 0, 0), Part(bowl, 0, METAL, 0, 0)
    assert Mesh.start([sheet]).faceting().rim_offset.any()
    for part in (metal, dielectric(bowl)):
        mesh = Mesh.start([part])
        assert not (mesh.faceting().rim_offset.any() or mesh.faceting().rim_width.any())
        assert not (mesh.faceting().sheet.any() or mesh.doubtful().rim_offset.any())


@pytest.mark.parametrize("smooth", [True, None])
def test_a_sheet_has_a_rim_only_where_its_metal_ends(smooth: bool | None) -> None:
    """A bowl that a dielectric reaches in part: the rim between both parts is none."""
    bowl = half(replace(BALL, smooth=smooth))
    wet, dry = Part(half(bowl, 0), 0, 1, 0, 0), Part(half(bowl, 0, below=True), 0, 0, 0, 0)
    for parts in ([wet], [wet, replace(dry, body=1)], [wet, dry]):
        mesh = Mesh.start(parts)
        here = mesh.owner == 0
        seen = mesh.faceting() if smooth else mesh.doubtful()
        at = (seen.rim_offset != 0.0) & here
        lowest = np.sort(mesh.corners[at][..., 2], axis=1)[:, :2]
        between = lowest.max(axis=1) > 1e-9 + bowl.bounds[0, 2] + 0.4
        assert at.any() and between.any() == (parts != [wet, dry])


def test_panels_know_their_conductor_their_body_and_both_regions() -> None:
    """A metal ball in a coat, a board beside it, and a sheet between the board and the air."""
    parts = [
        Part(shapes.sphere(1.0), 0, METAL, 1, 0),
        Part(shapes.plate(1.0, 1.0, (3.0, 0.0, 0.0)), 1, 2, SURROUNDINGS, 1),
        dielectric(shapes.sphere(1.5), 1, SURROUNDINGS, 2),
        dielectric(shapes.box(1.0, 1.0, 0.5, (3.0, 0.0, -0.25)), 2, SURROUNDINGS, 3),
    ]
    mesh = Mesh.start(parts)
    for each in (mesh, refined(mesh)):
        assert sorted(set(each.owner)) == [0, 1, 2, 3]
        for k, part in enumerate(parts):
            here = each.owner == k
            assert (each.conductor[here] == part.conductor).all()
            assert (each.body[here] == part.body).all()
            assert (each.regions[here] == (part.back, part.front)).all()
    assert sorted(set(mesh.conductor)) == [INTERFACE, 0, 1]


def test_conductors_alone_are_parts_in_the_surroundings() -> None:
    """A solid has metal behind; a skin and an open sheet have the surroundings on both sides."""
    mesh = Mesh.start([shapes.sphere(0.5), shapes.sphere(1.0), shapes.disc(2.0)], hollow=[1])
    behind = [METAL, SURROUNDINGS, SURROUNDINGS]
    for k in range(3):
        here = mesh.conductor == k
        assert (mesh.regions[here] == (behind[k], SURROUNDINGS)).all()
        assert (mesh.body[here] == k).all()


def areas(mesh: Mesh, owner: int) -> np.ndarray:
    """Areas of the panels of one part."""
    return np.linalg.norm(vectors(mesh.corners[mesh.owner == owner]), axis=1)


def strip_on_board(dig: float) -> list[Part]:
    """The top of a board with a metal patch in the middle of it, ``dig`` below that top."""
    around = shapes.plate(1.0, 1.0, holes=[[[-0.1, -0.4], [0.1, -0.4], [0.1, 0.4], [-0.1, 0.4]]])
    patch = shapes.plate(0.2, 0.8, (0.0, 0.0, -dig))
    return [Part(patch, 0, 1, SURROUNDINGS, 0), dielectric(around, body=1)]


def roof(rise: float) -> list[Part]:
    """Two triangles that meet in an edge and nowhere else, one of metal."""
    triangles = np.array([[[0, 0, 0], [1, 0, 0], [0, 1, 0]], [[1, 0, 0], [1, 1, rise], [0, 1, 0]]])
    faces = np.array([[0, 1, 2, NO_CORNER]])
    near, far = (Surface(corners.astype(float), faces) for corners in triangles)
    return [Part(near, 0, 1, SURROUNDINGS, 0), dielectric(far, body=1)]


@pytest.mark.parametrize("parts", [strip_on_board(0.0), strip_on_board(3e-7), roof(0.0), roof(0.1)])
def test_faces_that_touch_are_not_graded(parts: list[Part]) -> None:
    """Side by side in one plane, nearly so by rounding, or in two that meet in an edge."""
    apart = [len(Mesh.start([part]).corners) for part in parts]
    mesh = Mesh.start(parts, coincidence=1e-6)
    assert [(mesh.owner == k).sum() for k in range(2)] == apart
    assert min(apart) >= 4
    for k, part in enumerate(parts):
        corners = part.surface.vertices[part.surface.triangles]
        true = np.linalg.norm(vectors(corners), axis=1).sum()
        assert areas(mesh, k).sum() == pytest.approx(true, rel=1e-12)


def test_panels_are_graded_through_a_thin_coat() -> None:
    """A face of the coat feels the metal below it, as another conductor would."""

    def parts(gap: float, conductor: int) -> list[Part]:
        top = shapes.plate(1.0, 1.0, (0.3, 0.0, gap))
        coat = dielectric(top, body=1) if conductor == INTERFACE else Part(top, 1, 0, 0, 1)
        return [Part(shapes.plate(1.0, 1.0), 0, 1, 0, 0), coat]

    counts = [len(Mesh.start(parts(gap, INTERFACE)).corners) for gap in (0.3, 1e-2, 1e-3)]
    assert counts[0] < counts[1] < counts[2]
    assert len(Mesh.start(parts(1e-2, 1)).corners) == counts[1]
    one_body = [replace(part, body=0) for part in parts(1e-3, INTERFACE)]
    assert len(Mesh.start(one_body).corners) < counts[0] + 1


def test_only_metal_hides_what_lies_behind() -> None:
    """Two plates with a film between them, or a third plate: only that one shields."""

    def plates(conductor: int) -> list[Part]:
        film = shapes.plate(1.8, 1.8, (0.0, 0.0, 0.02))
        between = dielectric(film, body=2) if conductor == INTERFACE else Part(film, 2, 0, 0, 2)
        upper = shapes.plate(1.0, 1.0, (0.3, 0.0, 0.05))
        return [Part(shapes.plate(1.0, 1.0), 0, 0, 0, 0), Part(upper, 1, 0, 0, 1), between]

    for conductor, walls in ((INTERFACE, True), (2, False)):
        mesh = Mesh.start(plates(conductor))
        at_the_rim = np.abs(mesh.corners[mesh.owner == 0][..., 0] + 0.2) < 1e-12
        assert at_the_rim.any() == walls


def test_a_panel_sees_a_small_neighbour_of_another_body() -> None:
    """A bead of dielectric beside a large plate, as a bead of metal."""
    plate = Part(shapes.plate(1.0, 1.0), 0, 0, 0, 0)
    bead = shapes.sphere(0.01).placed(np.eye(3), np.array([0.23, 0.13, 0.02]))
    alone = len(Mesh.start([plate]).corners)
    beside = Mesh.start([plate, dielectric(bead, body=1)])
    assert (beside.owner == 0).sum() > alone
