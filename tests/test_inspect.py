"""Checks of bodies and pairs before solving."""

from __future__ import annotations

import itertools
import math

import numpy as np
import pytest
from made_bodies import ball, cube, faces_of, ring, soup, stl_text, turned

import bem
from bem.errors import GeometryError, InputError
from bem.geometry.distance import nearest_points
from bem.geometry.surface import Surface
from bem.scene.inspect import check_scene, inspect
from bem.scene.scene import Place, Scene, rotation


def scene_of(*bodies: tuple[str, Surface, str]) -> Scene:
    scene = Scene("mm")
    for name, surface, body in bodies:
        scene.add_conductor(name, surface, body=body)
    return scene


def pair_of(first: Surface, second: Surface, seed: int | None = None, bodies=("solid", "solid")):
    """Inspect two bodies, turned together if a seed is given; returns all and the pair."""
    if seed is not None:
        first, second = turned(first, seed), turned(second, seed)
    found = inspect(scene_of(("a", first, bodies[0]), ("b", second, bodies[1])))
    return found, found.pairs[0]


def joined(*surfaces: Surface) -> Surface:
    """One surface of several pieces."""
    start = np.cumsum([0] + [len(s.vertices) for s in surfaces])
    faces = [s.faces + k * (s.faces >= 0) for s, k in zip(surfaces, start, strict=False)]
    return Surface(np.concatenate([s.vertices for s in surfaces]), np.concatenate(faces))


def moved(surface: Surface, *shift: float) -> Surface:
    return surface.placed(np.eye(3), np.array(shift))


def patch(size: float = 1.0) -> Surface:
    corners = size * np.array([[0.0, 0, 0], [1, 0, 0], [1, 1, 0], [0, 1, 0]])
    return Surface(corners, np.array([[0, 1, 2, 3]]))


SEEDS = [None, 1, 2]

# one body


@pytest.mark.parametrize("seed", SEEDS)
def test_a_closed_body(seed):
    body = cube(2.0) if seed is None else turned(cube(2.0), seed)
    report = inspect(scene_of(("a", body, "solid"))).bodies[0]
    assert (report.faces, report.triangles, report.quads, report.vertices) == (12, 12, 0, 8)
    assert (report.closed, report.open_edges, report.pieces) == (True, 0, 1)
    assert report.area == pytest.approx(24e-6)
    assert report.volume == pytest.approx(8e-9)
    assert report.worst_aspect == pytest.approx(2.0)
    assert report.bounds == pytest.approx(1e-3 * body.bounds)


def test_an_open_body_of_quadrilaterals():
    report = inspect(scene_of(("a", patch(3.0), "solid"))).bodies[0]
    assert (report.triangles, report.quads, report.vertices) == (0, 1, 4)
    assert (report.closed, report.open_edges, report.volume) == (False, 4, None)
    assert report.area == pytest.approx(9e-6)


@pytest.mark.parametrize("seed", range(3))
def test_volume_does_not_depend_on_orientation(seed):
    body = turned(ring(2.0, 0.5), seed)
    triangles = body.triangles
    flip = np.random.default_rng(seed).random(len(triangles)) < 0.5
    mixed = Surface(body.vertices, faces_of(np.where(flip[:, None], triangles[:, ::-1], triangles)))
    sound = inspect(scene_of(("a", body, "solid"))).bodies[0].volume
    assert inspect(scene_of(("a", mixed, "solid"))).bodies[0].volume == pytest.approx(sound)
    section = 0.5 * 8 * math.sin(2 * math.pi / 8) * 0.25e-6
    path = 24 * math.tan(math.pi / 24) * math.cos(math.pi / 24) ** 2 * 4e-3
    assert sound == pytest.approx(section * path, rel=0.02)


@pytest.mark.parametrize("flipped", [False, True])
def test_a_cavity_counts_against_the_volume(flipped):
    inner = cube(1.0)
    if flipped:
        inner = Surface(inner.vertices, faces_of(inner.triangles[:, ::-1]))
    hollow = joined(cube(2.0), inner, cube(1.0, (4.0, 0.0, 0.0)))
    report = inspect(scene_of(("a", hollow, "solid"))).bodies[0]
    assert report.pieces == 3
    assert report.volume == pytest.approx((8 - 1 + 1) * 1e-9)


def test_slivers_and_holes_are_noted():
    fine = ball(1.0, 32)
    torn = Surface(fine.vertices, fine.faces[1:])
    sliver = Surface(np.array([[0.0, 0, 5], [1, 0, 5], [1, 2e-5, 5]]), np.array([[0, 1, 2, -1]]))
    notes = inspect(scene_of(("torn", torn, "shell"), ("thin", sliver, "solid"))).notes
    assert notes[0].startswith('"torn" is almost closed: 3 open edges, the first at (')
    assert notes[0].endswith(" mm; it counts as a sheet, not as solid metal")
    assert notes[1] == '"thin" has slivers: one triangle is 5.0e+04 times as long as high'
    assert notes[2].startswith('facets of "torn" are up to ')
    assert len(notes) == 3


def test_repairs_are_reported(tmp_path):
    path = tmp_path / "cube.stl"
    corners = np.concatenate([soup(cube()), soup(cube())[:2], soup(cube())[:1, [0, 0, 1]]])
    path.write_text(stl_text({"": corners}))
    report = inspect(Scene("mm").add_conductor("a", mesh=path)).bodies[0]
    assert report.changes == (
        "45 corners as read joined into 8 vertices",
        "1 face without area dropped",
        "2 duplicate faces dropped",
    )
    assert (report.faces, report.closed) == (12, True)


@pytest.mark.parametrize(
    ("shape", "closed", "volume"),
    [
        (bem.sphere(1.0), True, 4 / 3 * math.pi),
        (bem.cylinder(1.0, 2.0), True, 2 * math.pi),
        (bem.disc(1.0), False, None),
        (bem.box(1, 2, 3), True, 6.0),
    ],
)
def test_shapes(shape, closed, volume):
    report = inspect(scene_of(("a", shape, "solid"))).bodies[0]
    assert report.closed == closed
    assert report.curved == (shape.curve is not None)
    assert report.pieces == 1
    assert report.volume == (None if volume is None else pytest.approx(1e-9 * volume, rel=0.02))


# two bodies


@pytest.mark.parametrize("seed", SEEDS)
@pytest.mark.parametrize("gap", [1.0, 1e-2, 1e-5])
def test_gap_of_two_cubes(seed, gap):
    found, pair = pair_of(cube(), cube(1.0, (1.0 + gap, 0.25, 0.0)), seed)
    assert (pair.first, pair.second, pair.relation, pair.inner) == ("a", "b", "apart", None)
    assert pair.gap == pytest.approx(1e-3 * gap, rel=1e-9)
    assert found.fatal == []


def test_interlocked_rings_do_not_touch():
    """Their boxes overlap; the gap is that of the best pair of facets, however turned."""
    one = ring(2.0, 0.5, 12, 6)
    two = one.placed(rotation((1, 0, 0), 90.0), np.array([2.0, 0.0, 0.0]))
    facets = itertools.product(soup(one).tolist(), soup(two).tolist())
    best = min(nearest_points(tuple(map(tuple, a)), tuple(map(tuple, b)))[0] for a, b in facets)
    assert 0.8 < best < 1.0
    for seed in SEEDS:
        found, pair = pair_of(one, two, seed)
        assert pair.relation == "apart"
        assert pair.gap == pytest.approx(1e-3 * math.sqrt(best), rel=1e-9)
        assert found.fatal == []


@pytest.mark.parametrize("seed", SEEDS)
@pytest.mark.parametrize(
    "other",
    [
        cube(1.0, (1.0, 0.0, 0.0)),
        cube(1.0, (1.0, 0.3, 0.2)),
        cube(1.0, (1.0, 1.0, 0.0)),
        cube(1.0, (1.0, 1.0, 1.0)),
        cube(0.5, (0.0, 0.0, 0.25)),
        cube(1.0, (1.0 + 1e-8, 0.0, 0.0)),
        cube(1.0, (0.9, 0.0, 0.0)),
        cube(),
        moved(patch(), -0.5, -0.5, 0.5),
    ],
)
def test_contact(seed, other):
    """Face on face, edge on edge, corner on corner, from outside, inside and slid along."""
    found, pair = pair_of(cube(), other, seed)
    assert pair.relation == "touch"
    assert pair.gap <= 1.8e-9
    assert len(found.fatal) == 1
    assert found.fatal[0].startswith('"a" and "b" touch or overlap near (')
    assert " is within 1e-06 of the smaller body; move them apart" in found.fatal[0]


@pytest.mark.parametrize("seed", SEEDS)
@pytest.mark.parametrize(
    "other",
    [
        cube(1.0, (0.9, 0.8, 0.7)),
        cube(1.0, (1.0 - 1e-4, 0.3, 0.2)),
        moved(patch(3.0), -1.5, -1.5, 0.1),
        moved(patch(3.0), 0.0, 0.0, 0.1),
        moved(turned(ball(0.6), 9), 0.0, 0.0, 0.1),
    ],
)
def test_crossing(seed, other):
    found, pair = pair_of(cube(), other, seed)
    assert (pair.relation, pair.gap) == ("cross", 0.0)
    assert len(found.fatal) == 1
    assert found.fatal[0].startswith('"a" and "b" cross near (')
    assert found.fatal[0].endswith(" mm; move them apart, or make them one conductor")


def test_the_place_of_a_crossing_is_named():
    found, pair = pair_of(cube(), cube(1.0, (0.9, 0.9, 0.9)))
    assert np.abs(np.array(pair.place) - 0.45e-3).max() <= 0.051e-3
    text = found.fatal[0].split("near (")[1].split(")")[0]
    assert [float(x) for x in text.split(",")] == pytest.approx(1e3 * np.array(pair.place))


@pytest.mark.parametrize("seed", SEEDS)
@pytest.mark.parametrize("inner", [cube(0.2, (0.1, 0.2, -0.3)), moved(patch(0.1), 0.0, 0.0, 0.0)])
def test_a_body_in_solid_metal(seed, inner):
    found, pair = pair_of(cube(), inner, seed)
    assert (pair.relation, pair.inner) == ("inside", "b")
    assert found.fatal == [
        '"b" lies inside "a", which is solid metal; if "a" is hollow, give it body = "shell"'
    ]
    found, pair = pair_of(inner, cube(), seed)
    assert pair.inner == "a"
    assert found.fatal[0].startswith('"a" lies inside "b", which')


@pytest.mark.parametrize("seed", SEEDS)
def test_a_body_in_a_shell(seed):
    found, pair = pair_of(cube(), cube(0.5), seed, ("shell", "solid"))
    assert (pair.relation, pair.inner) == ("inside", "b")
    assert pair.gap == pytest.approx(0.25e-3, rel=1e-9)
    assert found.fatal == []
    assert found.notes == ['"b" lies inside "a"']


def test_nested_shells_around_a_solid():
    bodies = [
        ("outer", cube(3.0), "shell"),
        ("middle", cube(2.0), "shell"),
        ("core", cube(), "solid"),
    ]
    assert inspect(scene_of(*bodies)).fatal == []
    bodies[1] = ("middle", cube(2.0), "solid")
    assert inspect(scene_of(*bodies)).fatal == [
        '"core" lies inside "middle", which is solid metal; '
        'if "middle" is hollow, give it body = "shell"'
    ]


def test_a_body_in_the_cavity_of_a_solid_is_fine():
    found, pair = pair_of(joined(cube(3.0), cube(2.0)), cube())
    assert (pair.relation, found.fatal) == ("apart", [])


def test_one_piece_inside_is_enough():
    found, pair = pair_of(cube(), joined(cube(0.5), cube(0.5, (5.0, 0.0, 0.0))))
    assert (pair.relation, pair.inner) == ("inside", "b")
    assert len(found.fatal) == 1


def test_open_pieces_enclose_nothing():
    opened = Surface(cube().vertices, cube().faces[1:])
    found, pair = pair_of(opened, cube(0.5))
    assert (pair.relation, found.fatal) == ("apart", [])
    mixed = joined(cube(1.0, (9.0, 0.0, 0.0)), opened)
    assert pair_of(mixed, cube(0.5))[1].relation == "apart"
    assert pair_of(mixed, cube(0.5, (9.0, 0.0, 0.0)))[1].relation == "inside"


def test_a_ring_around_a_rod_does_not_contain_it():
    rod = cube().placed(np.diag([0.2, 0.2, 8.0]), np.zeros(3))
    found, pair = pair_of(ring(2.0, 0.5), rod)
    assert (pair.relation, found.fatal) == ("apart", [])


def test_curved_shapes_count_as_faceted():
    scene = Scene("mm").add_conductor("a", bem.sphere(1.0))
    scene.add_conductor("b", bem.sphere(1.0), place=Place(shift=(3.0, 0.0, 0.0)))
    assert inspect(scene).pairs[0].gap == pytest.approx(1e-3, rel=1e-2)


def curved_pair(first: Surface, second: Surface, degrees: float, second_scale: float = 1.0):
    """Inspect a hollow curved body and another one, turned about the common axis."""
    scene = Scene("mm").add_conductor("outer", first, body="shell")
    place = Place(turn_degrees=degrees, scale=second_scale)
    found = inspect(scene.add_conductor("inner", second, place=place))
    return found, found.pairs[0]


@pytest.mark.parametrize("shape", [bem.cylinder(1.0, 1.0), bem.sphere(1.0)])
def test_narrow_gaps_between_curved_bodies_are_no_contact(shape):
    """The ordinary facets cross here, since one body is turned by half a facet."""
    found, pair = curved_pair(shape, shape, 3.75, 0.999)
    assert (pair.relation, pair.inner, found.fatal) == ("inside", "inner", [])
    expected = 0.5e-6 if shape.curve.pieces > 2 else 1e-6
    assert pair.gap == pytest.approx(expected, rel=0.04)


def test_curved_bodies_that_cross_are_found():
    found, pair = curved_pair(bem.cylinder(1.0, 1.0), bem.cylinder(0.999, 1.1), 3.75)
    assert (pair.relation, len(found.fatal)) == ("cross", 1)


# many bodies, and the check


def grid_scene(gaps: np.ndarray) -> Scene:
    """Put unit cubes in a row along x with the given gaps."""
    scene = Scene("mm")
    for i, x in enumerate(np.cumsum([0.0, *(1.0 + gaps)])):
        scene.add_conductor(f"c{i}", cube(1.0, (x, 0.0, 0.0)))
    return scene


def test_all_pairs_up_to_thirty():
    found = inspect(grid_scene(np.linspace(0.1, 0.4, 29)))
    assert len(found.pairs) == 30 * 29 // 2
    assert found.notes == []
    gaps = [pair.gap for pair in found.pairs]
    assert gaps == sorted(gaps)


def test_nearest_neighbours_beyond_thirty():
    """Each conductor's smallest gap is among those reported, and exact."""
    gaps = np.random.default_rng(3).uniform(0.1, 0.9, 39)
    found = inspect(grid_scene(gaps))
    nearest = {f"c{i}": min(gaps[max(i - 1, 0) : i + 1]) for i in range(40)}
    for name, expected in nearest.items():
        own = [pair.gap for pair in found.pairs if name in (pair.first, pair.second)]
        assert min(own) == pytest.approx(1e-3 * expected, rel=1e-9)
    assert len(found.pairs) < 100
    assert found.notes == [
        f"gaps of {len(found.pairs)} of 780 pairs found, with each conductor's smallest among "
        "them; the other pairs are farther apart"
    ]


@pytest.mark.parametrize("seed", range(4))
def test_the_search_for_neighbours_misses_nothing(seed, monkeypatch):
    """Same findings and same smallest gaps as from all pairs, boxes overlapping at will."""
    random = np.random.default_rng(seed)
    scene = Scene("mm")
    for i in range(14):
        sheet = turned(patch(2.0), seed * 100 + i)
        scene.add_conductor(f"s{i}", moved(sheet, *random.uniform(-2.0, 2.0, 3)))
        scene.add_conductor(f"b{i}", cube(0.4, tuple(random.uniform(-3.0, 3.0, 3))))
    everything = inspect(scene)
    monkeypatch.setattr("bem.scene.pairs.ALL_PAIRS", 0)
    some = inspect(scene)
    assert len(some.pairs) < len(everything.pairs)
    assert sorted(some.fatal) == sorted(everything.fatal)
    assert len(some.fatal) > 3
    for conductor in scene.conductors:
        one, two = (
            min(p.gap for p in found.pairs if conductor.name in (p.first, p.second))
            for found in (some, everything)
        )
        assert one == two


def test_contact_and_containment_are_found_among_many():
    """Also where a body has an even nearer neighbour than the one it lies in."""
    scene = grid_scene(np.full(35, 0.5))
    scene.add_conductor("can", cube(0.9, (1.5, 0.0, 0.0)))
    scene.add_conductor("on", cube(0.5, (0.0, 0.75, 0.0)))
    scene.add_conductor("big", cube(500.0))
    found = inspect(scene)
    said = {tuple(line.split('"')[1:4]) for line in found.fatal}
    everyone = [conductor.name for conductor in scene.conductors]
    assert said == {
        *((name, " lies inside ", "big") for name in everyone[:-1]),
        ("can", " lies inside ", "c1"),
        ("c0", " and ", "on"),
    }


def test_check_passes_a_sound_scene():
    found = check_scene(scene_of(("a", cube(), "solid"), ("b", cube(1.0, (2, 0, 0)), "solid")))
    assert found.fatal == []
    assert found.unit == "mm"


def test_check_refuses_with_the_first_finding():
    bodies = [("a", cube(), "solid"), ("b", cube(1.0, (0.5, 0, 0)), "solid")]
    with pytest.raises(GeometryError) as caught:
        check_scene(scene_of(*bodies))
    assert str(caught.value) == inspect(scene_of(*bodies)).fatal[0]
    bodies += [("c", cube(1.0, (0.7, 0, 0)), "solid")]
    with pytest.raises(GeometryError) as caught:
        check_scene(scene_of(*bodies))
    assert str(caught.value).endswith("one conductor (and 2 more findings: see bem inspect)")


def test_an_empty_scene():
    with pytest.raises(InputError) as caught:
        inspect(Scene("mm"))
    assert str(caught.value) == "the scene has no conductors; add at least one"
