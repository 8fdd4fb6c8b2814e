"""Repairs one by one: what they do, where they stop, and that legal sheets stay sheets."""

from __future__ import annotations

import damages
import numpy as np
import pytest
from damages import BODIES, box, cracked, joined, rectangle, sizes, unwelded
from made_bodies import ball, cube, faces_of, ring, turned

import bem
from bem.errors import GeometryError
from bem.geometry.repair import repair as repair_module
from bem.geometry.repair.holes import fill_holes
from bem.geometry.repair.joints import join_corners
from bem.geometry.repair.repair import repair
from bem.geometry.repair.seams import weld_seams
from bem.geometry.repair.walls import drop_walls
from bem.geometry.surface import Surface
from bem.geometry.topology import edges_of
from bem.geometry.weld import weld
from bem.scene.inspect import inspect


def mended(surface: Surface, solid: bool = True) -> tuple[Surface, list[str]]:
    return repair(weld(surface)[0], solid, "m")


def area(surface: Surface) -> float:
    return float(sizes(surface).sum())


def is_closed(surface: Surface) -> bool:
    return bool((edges_of(surface.triangles).uses % 2 == 0).all())


def tube(length: float, around: int = 8, radius: float = 1.0) -> Surface:
    """Tube with open ends, of quadrilaterals."""
    turn = 2.0 * np.pi * np.arange(around) / around
    rim = np.stack([radius * np.cos(turn), radius * np.sin(turn), 0.0 * turn], axis=1)
    low = np.arange(around)
    right = np.roll(low, -1)
    faces = np.stack([low, right, right + around, low + around], axis=1)
    return Surface(np.concatenate([rim, rim + [0.0, 0.0, length]]), faces)


# sound surfaces


@pytest.mark.parametrize(
    "surface",
    [*BODIES.values(), ring(2.0, 0.5), joined(cube(3.0), cube()), rectangle((0, 0), (1, 2))],
)
def test_sound_surfaces_come_back_as_they_are(surface):
    same, changes = mended(surface)
    assert changes == []
    assert np.array_equal(same.vertices, surface.vertices)
    assert np.array_equal(same.faces, surface.faces)


def test_curved_shapes_are_never_touched():
    shape = bem.sphere(1.0)
    assert repair(shape, True, "m").surface is shape


@pytest.mark.parametrize("length", [1.0, 3000.0])
def test_a_tube_keeps_its_open_ends(length):
    """Also where they are a tiny part of it: the rim is sharp all round."""
    same, changes = mended(tube(length))
    assert changes == [] and len(same.faces) == 8 and not is_closed(same)


def test_a_box_without_a_lid_stays_open():
    lidless = Surface(cube().vertices, cube().faces[2:])
    assert mended(lidless)[1] == []


# seams


@pytest.mark.parametrize("relative", [1e-6, 1e-5, 1e-4])
@pytest.mark.parametrize("name", BODIES)
def test_seams_close_and_the_moves_are_told(name, relative):
    body = BODIES[name]
    closed, changes = mended(cracked(body, relative))
    assert is_closed(closed) and len(closed.faces) == len(body.faces)
    assert len(changes) == 1 and " on open seams welded, largest move " in changes[0]
    width = relative * body.extent
    assert 0.2 * width < closed.rounding < 2.0 * width
    assert area(closed) == pytest.approx(area(body), rel=1e-3)


def test_seams_that_do_not_close_the_surface_stay():
    """A box of cracked sides without a lid may be meant so."""
    lidless = Surface(cube().vertices, cube().faces[2:])
    soup_of_it = cracked(lidless)
    same, changes = mended(soup_of_it)
    assert changes == [] and np.array_equal(same.vertices, soup_of_it.vertices)


def test_seams_as_wide_as_the_faces_are_left():
    """A thin plate is not pressed flat: its two sides are nearer than four tolerances."""
    plate = Surface(cube().vertices * [1.0, 1.0, 1e-4], cube().faces[2:])
    assert weld_seams(plate, 1e-4).vertices == 0
    assert weld_seams(plate, 1e-6).vertices == 0
    assert mended(plate)[1] == []


def test_only_open_vertices_move():
    """A closed speck beside a torn body, smaller than the tolerance, keeps its corners."""
    both = joined(Surface(cube().vertices, cube().faces[1:]), cube(1e-5, (0.0, 0.0, 2.0)))
    assert weld_seams(both, 1e-4).vertices == 0


# corners on edges


def test_many_corners_on_one_edge():
    """One long side against nine short ones."""
    fine = [rectangle((k / 9, 0.0), ((k + 1) / 9, 1.0)) for k in range(9)]
    sheet = weld(joined(rectangle((0.0, -1.0), (1.0, 0.0)), *fine))[0]
    joint, corners = join_corners(sheet, 1e-9)
    edges = edges_of(joint.triangles)
    assert corners == 8
    assert area(joint) == pytest.approx(2.0)
    outline = edges.ends[edges.uses == 1]
    assert np.isin(np.abs(joint.vertices[outline][..., 1]), [0.0, 1.0]).all()
    inner = (np.abs(joint.vertices[outline][..., 1]) < 1e-9).all(axis=1)
    assert not inner.any()


def test_joining_that_closes_nothing_is_undone():
    """Two sheets that meet at a corner only."""
    triangle = unwelded(np.array([[[0.5, 1.0, 0.0], [0.2, 2.0, 0.0], [0.8, 2.0, 0.0]]]))
    apart = joined(rectangle((0, 0), (2, 1)), triangle)
    same, corners = join_corners(apart, 1e-9)
    assert same is apart and corners == 0


# holes


def test_holes_that_touch_at_a_corner_are_told_apart():
    body = ball(1.0, 24)
    torn = Surface(body.vertices, body.faces[3:])
    filled = fill_holes(torn)
    assert filled.holes == 3 and is_closed(filled.surface)
    assert area(filled.surface) == pytest.approx(area(body), rel=1e-12)
    assert filled.area == pytest.approx(sizes(body)[:3].max())


def test_a_hole_of_several_facets_gets_the_best_fan():
    body = BODIES["cube"]
    inside = np.flatnonzero((np.abs(body.vertices - [0.0, 0.0, 0.5]) < 1e-9).all(axis=1))
    gone = (body.faces == inside[0]).any(axis=1)
    torn = Surface(body.vertices, body.faces[~gone])
    assert fill_holes(torn).holes == 0
    small = joined(torn, cube(9.0, (20.0, 0.0, 0.0)))
    assert fill_holes(small).holes == 0
    fine = damages.finer(cube(), 3)
    inside = np.flatnonzero((np.abs(fine.vertices - [0.0, 0.0, 0.5]) < 1e-9).all(axis=1))
    torn = Surface(fine.vertices, fine.faces[(fine.faces != inside[0]).all(axis=1)])
    filled = fill_holes(torn)
    assert filled.holes == 1 and is_closed(filled.surface)
    assert area(filled.surface) == pytest.approx(6.0, rel=1e-12)


def test_a_hole_in_a_shell_stays():
    """What lies in a hollow body may see the outside through it."""
    torn = damages.without_a_facet(BODIES["ball"])
    assert mended(torn, solid=False)[1] == []
    assert mended(torn)[1][0].startswith("1 small hole filled, the largest 0.0")


def test_a_sheet_beside_a_torn_body_does_not_keep_it_open():
    torn = joined(damages.without_a_facet(BODIES["ball"]), rectangle((5, 5), (6, 6)))
    assert "1 small hole filled" in mended(torn)[1][0]


def test_a_hole_too_many_stays():
    """All holes of a piece are filled or none."""
    both = Surface(BODIES["ball"].vertices, BODIES["ball"].faces[1:])
    large = Surface(both.vertices, np.delete(both.faces, np.arange(40, 60), axis=0))
    assert fill_holes(large).holes == 0


# faces inside metal


@pytest.mark.parametrize("seed", [None, 1])
@pytest.mark.parametrize(("cells", "walls"), [((2, 1, 1), 2), ((2, 2, 1), 8), ((2, 2, 2), 24)])
def test_walls_between_cells_leave(cells, walls, seed):
    cubes = [cube(1.0, place) for place in np.ndindex(cells)]
    body = joined(*cubes) if seed is None else turned(joined(*cubes), seed)
    outside, changes = mended(body)
    assert changes == [f"{walls} faces inside the solid dropped"]
    assert is_closed(outside)
    a, b, c = cells
    assert area(outside) == pytest.approx(2.0 * (a * b + b * c + c * a))


def test_three_cells_around_an_edge():
    """Each wall ends at an edge where all three meet."""
    prisms = []
    for k in range(3):
        turn = 2.0 * np.pi * (k + np.array([0.0, 1.0])) / 3.0
        base = np.array([[0.0, 0.0, 0.0], *np.stack([np.cos(turn), np.sin(turn), 0 * turn], 1)])
        points = np.concatenate([base, base + [0.0, 0.0, 1.0]])
        sides = [[0, 1, 4], [0, 4, 3], [1, 2, 5], [1, 5, 4], [2, 0, 3], [2, 3, 5]]
        prisms.append(Surface(points, faces_of(np.array([[0, 2, 1], [3, 4, 5], *sides]))))
    outside, changes = mended(joined(*prisms))
    assert changes[-1] == "6 faces inside the solid dropped"
    assert is_closed(outside) and len(outside.faces) == 12


def test_walls_of_a_shell_stay():
    wall = joined(cube(), cube(1.0, (1.0, 0.0, 0.0)))
    same, changes = mended(wall, solid=False)
    assert changes == [] and len(same.faces) == 22


def test_a_fin_outside_stays_and_one_inside_goes():
    edge = np.array([[0.5, -0.5, 0.5], [0.5, 0.5, 0.5]])
    for step, left in (([1.0, 0.0, 0.0], 14), ([-0.3, 0.0, -0.3], 12)):
        fin = Surface(np.concatenate([edge, edge[::-1] + step]), np.array([[0, 1, 2, 3]]))
        flap = Surface(fin.vertices, faces_of(fin.triangles))
        body, dropped = drop_walls(weld(joined(cube(), flap))[0])
        assert (len(body.faces), dropped) == (left, 14 - left)


def test_a_cell_that_leaks_keeps_its_wall():
    leaky = weld(joined(Surface(cube().vertices, cube().faces[2:]), cube(1.0, (1.0, 0.0, 0.0))))[0]
    body, dropped = drop_walls(leaky)
    assert dropped == 0 and body is not None and len(body.faces) == len(leaky.faces)


# pieces and planes

UNITED = "2 pieces that overlap or touch united"


@pytest.mark.parametrize("seed", [None, 2])
@pytest.mark.parametrize(
    "shift", [(0.5, 0.4, 0.3), (0.5, 0.0, 0.0), (1.0, 0.3, 0.2), (0.9, 0.9, 0.0)]
)
def test_solids_that_overlap_or_touch_are_united(shift, seed):
    body = joined(cube(), cube(1.0, shift))
    united, changes = mended(body if seed is None else turned(body, seed))
    assert changes[-1] in (UNITED, "2 faces inside the solid dropped")
    common = np.prod(1.0 - np.array(shift))
    report = inspect(bem.Scene("m").add_conductor("a", united)).bodies[0]
    assert report.volume == pytest.approx(2.0 - common) and report.changes == ()


def test_pieces_apart_are_not_united():
    two = joined(ball(1.0), ball(1.0).placed(np.eye(3), np.array([1.9, 1.9, 0.0])))
    assert mended(two)[1] == []


SHEETS = {
    "side by side": (joined(rectangle((0, 0), (1.2, 1)), rectangle((0.8, 0), (2, 1))), 2.0),
    "one on the other": (joined(rectangle((0, 0), (2, 1)), rectangle((0, 0), (1, 1))), 2.0),
    "cross": (joined(rectangle((0, 0), (2, 1)), rectangle((0.5, -1), (1, 2))), 3.0),
    "three": (
        joined(*(rectangle((a, 0.2 * a), (a + 1, 1 + 0.2 * a)) for a in (0.0, 0.5, 0.9))),
        3.0 - 0.5 * 0.9 - 0.6 * 0.92 - 0.1 * 0.82 + 0.1 * 0.82,
    ),
}


@pytest.mark.parametrize("seed", [None, 3])
@pytest.mark.parametrize("name", SHEETS)
def test_sheets_that_overlap_are_kept_once(name, seed):
    sheet, expected = SHEETS[name]
    laid, changes = mended(sheet if seed is None else turned(sheet, seed))
    assert "overlapping in one plane cut and kept once" in changes[-1]
    assert area(laid) == pytest.approx(expected, rel=1e-7)


def test_the_capacitance_of_overlapping_sheets():
    """Of a plate drawn twice in one half, which alone makes the system singular."""
    values = []
    for sheet in (rectangle((0, 0), (2, 1)), SHEETS["one on the other"][0]):
        result = bem.extract(bem.Scene("m").add_conductor("a", sheet), tolerance=1e-2, threads=1)
        values.append((result.capacitance[0, 0], result.error[0, 0]))
    (one, bar), (two, other) = values
    assert abs(one - two) <= bar + other


def test_faces_that_cannot_be_parted_are_refused_with_the_place(monkeypatch):
    monkeypatch.setattr(repair_module, "overlay", lambda surface, *_: surface)
    with pytest.raises(GeometryError) as caught:
        repair(SHEETS["cross"][0], True, "mm")
    assert str(caught.value) == (
        "faces lie on one another near (1333.33, 333.333, 0) mm, and could not be parted; "
        "leave out one of them and mesh again"
    )


def test_a_refusal_names_the_conductor(monkeypatch):
    monkeypatch.setattr(repair_module, "overlay", lambda surface, *_: surface)
    with pytest.raises(GeometryError, match=r'^conductor 1 \("pad"\): faces lie on one another'):
        bem.Scene("m").add_conductor("pad", SHEETS["cross"][0])


def test_solids_that_the_library_refuses_are_left_with_a_word(monkeypatch):
    monkeypatch.setattr(repair_module, "unite_pieces", lambda surface, _: (surface, 0))
    crossing = joined(cube(), cube(1.0, (0.5, 0.4, 0.3)))
    same, changes = mended(crossing)
    assert len(changes) == 1 and changes[0].startswith("pieces cross near (")
    assert len(same.faces) == 24


def test_a_box_on_a_larger_one_in_a_shell_keeps_the_wall_once():
    both = joined(box((0, 0, 0), (2, 2, 1)), box((0.5, 0.5, 1), (1, 1, 1.5)))
    laid, _ = mended(both, solid=False)
    assert area(laid) == pytest.approx(2 * 4 + 8 + 4 * 0.25 + 0.25)


# at random, against counted cells


def lattice_boxes(seed: int) -> tuple[Surface, np.ndarray]:
    """Some boxes with corners on a lattice, as one body, and the cells that they fill."""
    random = np.random.default_rng(seed)
    cells, boxes = np.zeros((7, 7, 7), dtype=bool), []
    for _ in range(random.integers(2, 6)):
        low = random.integers(0, 4, 3)
        high = np.minimum(low + random.integers(1, 3, 3), 5)
        cells[tuple(slice(a + 1, b + 1) for a, b in zip(low, high, strict=True))] = True
        boxes.append(box(tuple(low.astype(float)), tuple(high.astype(float))))
    return joined(*boxes), cells


@pytest.mark.parametrize("seed", range(12))
def test_boxes_on_a_lattice_become_their_union(seed):
    body, cells = lattice_boxes(seed)
    report = inspect(bem.Scene("m").add_conductor("a", body)).bodies[0]
    outside = sum(int(np.diff(cells.astype(int), axis=k).astype(bool).sum()) for k in range(3))
    assert report.volume == pytest.approx(cells.sum())
    assert report.area == pytest.approx(outside)


@pytest.mark.parametrize("seed", range(12))
def test_turned_rectangles_on_a_lattice_become_their_union(seed):
    """In two parallel planes, turned and in single precision."""
    random = np.random.default_rng(seed)
    cells, sheets = np.zeros((2, 6, 6), dtype=bool), []
    for _ in range(8):
        low, plane = random.integers(0, 4, 2), int(random.integers(0, 2))
        high = low + random.integers(1, 3, 2)
        cells[plane, low[0] : high[0], low[1] : high[1]] = True
        sheets.append(rectangle(tuple(low.astype(float)), tuple(high.astype(float)), plane))
    sheet = turned(joined(*sheets), seed)
    rounded = Surface(sheet.vertices.astype(np.float32).astype(float), sheet.faces)
    assert area(mended(rounded)[0]) == pytest.approx(cells.sum(), rel=1e-5)


@pytest.mark.parametrize("seed", range(12))
def test_a_patch_whose_corners_lie_on_sides(seed):
    """Rounding puts them just beside: the largest facet must not be kept whole under it."""
    body = turned(BODIES["ball"], seed)
    laid, _ = mended(damages.with_a_patch(body))
    assert area(laid) == pytest.approx(area(body), rel=1e-9)
