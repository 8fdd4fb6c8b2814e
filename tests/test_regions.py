"""The partition of space: every face has one region on each side, whatever touches or overlaps."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from faceted_bodies import icosphere, uneven_sphere
from lattice_boxes import box, random_lattice, sheet
from made_bodies import cube, turned

from bem.errors import GeometryError
from bem.geometry.parts import INTERFACE, METAL
from bem.geometry.regions.parted import parted
from bem.geometry.regions.partition import Partition, Solid, area_of

EXACT, ROUNDED = 1e-10, 1e-4


def metal(surface, conductor: int = 0) -> Solid:
    return Solid(surface, "metal", conductor)


def skin(surface, conductor: int = 0) -> Solid:
    return Solid(surface, "skin", conductor)


def dielectric(surface) -> Solid:
    return Solid(surface, "dielectric")


def moved(bodies: list[Solid], seed: int, single: bool = False) -> list[Solid]:
    """Bodies turned together at random, with coordinates of single precision if asked for."""
    surfaces = [turned(body.surface, seed) for body in bodies]
    kind = np.float32 if single else np.float64
    rounded = [replace(s, vertices=s.vertices.astype(kind).astype(float)) for s in surfaces]
    return [replace(body, surface=s) for body, s in zip(bodies, rounded, strict=True)]


def vector_area(surface) -> np.ndarray:
    corners = surface.vertices[surface.triangles]
    return 0.5 * np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]).sum(axis=0)


def openness(partition: Partition) -> float:
    """Largest sum of the outward area vectors around a region, zero if all are closed."""
    regions = {r for part in partition.parts for r in (part.back, part.front)} - {METAL}
    sums = [
        sum(
            ((p.back == r) * 1.0 - (p.front == r)) * vector_area(p.surface) for p in partition.parts
        )
        for r in regions
    ]
    return float(np.abs(sums).max())


def assert_regions(partition: Partition, volumes: dict, areas: dict, limit: float = EXACT) -> None:
    assert openness(partition) <= limit
    assert partition.volumes == pytest.approx(volumes, abs=limit)
    assert partition.areas == pytest.approx(areas, abs=limit)


@pytest.mark.parametrize("seed", range(8))
def test_boxes_on_a_lattice_have_the_volumes_and_areas_of_their_cells(seed):
    lattice = random_lattice(seed)
    for bodies, limit in (
        (lattice.solids, EXACT),
        (moved(lattice.solids, seed), EXACT),
        (moved(lattice.solids, seed, single=True), ROUNDED),
    ):
        assert_regions(parted(bodies, 7e-6), lattice.volumes, lattice.areas, limit)


def test_bodies_apart_stay_as_they_are():
    bodies = [metal(cube(0.2)), dielectric(cube(1.0)), dielectric(cube(1.0, (3.0, 0.0, 0.0)))]
    partition = parted(bodies, 1e-6)
    assert [(p.back, p.front, p.conductor) for p in partition.parts] == [
        (METAL, 1, 0),
        (1, 0, INTERFACE),
        (2, 0, INTERFACE),
    ]
    for body, part in zip(bodies, partition.parts, strict=True):
        np.testing.assert_array_equal(part.surface.vertices, body.surface.vertices)
        np.testing.assert_array_equal(part.surface.faces, body.surface.faces)
    assert partition.volumes == pytest.approx({1: 1.0 - 0.2**3, 2: 1.0})
    assert partition.notes == []


def test_faces_are_turned_outward():
    inward = replace(cube(1.0), faces=cube(1.0).faces[:, [0, 2, 1, 3]])
    partition = parted([dielectric(inward)], 1e-6)
    assert partition.volumes == pytest.approx({1: 1.0})
    assert (partition.parts[0].back, partition.parts[0].front) == (1, 0)


def test_a_hollow_body_has_its_region_between_its_walls():
    hull, hole = cube(2.0), cube(1.0)
    vertices = np.concatenate([hull.vertices, hole.vertices])
    faces = np.concatenate([hull.faces, hole.faces + [8, 8, 8, 0]])
    partition = parted([dielectric(replace(hull, vertices=vertices, faces=faces))], 1e-6)
    assert_regions(partition, {1: 7.0}, {(0, 1): 30.0})


@pytest.mark.parametrize("seed", [None, 4])
def test_conductor_standing_on_a_block(seed):
    bodies = [metal(box([0.25, 0.25, 1], [0.5, 0.75, 1.5])), dielectric(box([0] * 3, [1] * 3))]
    partition = parted(bodies if seed is None else moved(bodies, seed), 1e-6)
    areas = {(METAL, 0): 0.875, (METAL, 1): 0.125, (0, 1): 5.875}
    assert_regions(partition, {1: 1.0}, areas)
    assert partition.notes == ["conductor 1 touches dielectric 1 over 0.125 m^2"]


def test_conductor_half_sunk_counts_before_the_block():
    bodies = [
        replace(metal(box([0.25, 0.25, 0.5], [0.75, 0.75, 1.5])), name="post"),
        replace(dielectric(box([0] * 3, [1] * 3)), name="block"),
    ]
    partition = parted(bodies, 1e-6)
    areas = {(METAL, 0): 1.25, (METAL, 1): 1.25, (0, 1): 5.75}
    assert_regions(partition, {1: 0.875}, areas)
    (note,) = partition.notes
    assert note.startswith('dielectric "block" overlaps conductor "post", about ')
    assert note.endswith(' deep: there conductor "post" counts')


def test_slab_flush_between_plates():
    bodies = [
        metal(box([0, 0, -0.1], [1, 1, 0])),
        metal(box([0, 0, 0.2], [1, 1, 0.3]), 1),
        dielectric(box([0.2, 0.2, 0], [0.8, 0.8, 0.2])),
    ]
    for single in (False, True):
        areas = {(METAL, 0): 4.08, (METAL, 1): 0.72, (0, 1): 0.48}
        limit = ROUNDED if single else EXACT
        assert_regions(parted(moved(bodies, 2, single), 1e-6), {1: 0.072}, areas, limit)


def test_the_same_body_twice_is_the_later_one():
    partition = parted([dielectric(cube()), dielectric(cube())], 1e-6)
    assert_regions(partition, {2: 1.0}, {(0, 2): 6.0})
    assert "nothing is left of dielectric 1: bodies that count before it fill it" in partition.notes


def test_a_core_given_before_what_encloses_it_is_gone():
    partition = parted([dielectric(cube(0.5)), dielectric(cube(1.0))], 1e-6)
    assert_regions(partition, {2: 1.0}, {(0, 2): 6.0})
    assert partition.notes[0].startswith("dielectric 1 overlaps dielectric 2, about 250 mm deep")
    assert "nothing is left of dielectric 1: bodies that count before it fill it" in partition.notes
    assert parted([dielectric(cube(1.0)), dielectric(cube(0.5))], 1e-6).notes == []


def test_sheet_in_an_interface_and_through_it():
    layers = [dielectric(box([0, 0, 0], [1, 1, 0.5])), dielectric(box([0, 0, 0.5], [1, 1, 1]))]
    flat = skin(sheet(2, 0.5, [0.2, 0.3], [0.6, 0.7]))
    areas = {(METAL, 1): 0.16, (METAL, 2): 0.16, (1, 2): 0.84, (0, 1): 3.0, (0, 2): 3.0}
    assert_regions(parted([flat, *layers], 1e-6), {1: 0.5, 2: 0.5}, areas)
    across = skin(sheet(0, 0.5, [0.3, 0.2], [0.7, 0.7]))
    areas = {(METAL, 1): 0.24, (METAL, 2): 0.16, (1, 2): 1.0, (0, 1): 3.0, (0, 2): 3.0}
    partition = parted([across, *layers], 1e-6)
    assert_regions(partition, {1: 0.5, 2: 0.5}, areas)
    assert all("overlaps" not in note for note in partition.notes)


def test_sheet_beyond_the_rim_of_a_board():
    bodies = [skin(sheet(2, 1.0, [0.5, 0.25], [1.5, 0.75])), dielectric(cube(1.0, (0.5, 0.5, 0.5)))]
    areas = {(METAL, 0): 0.75, (METAL, 1): 0.25, (0, 1): 5.75}
    assert_regions(parted(moved(bodies, 6), 1e-6), {1: 1.0}, areas)


@pytest.mark.parametrize("shift", [(1.0, 1.0, 0.3), (1.0, 1.0, 1.0), (1.0, 0.3, 0.4)])
def test_contact_along_an_edge_at_a_corner_and_over_part_of_a_face(shift):
    one, two = box([0] * 3, [1] * 3), box(shift, np.array(shift) + 1.0)
    shared = 0.7 * 0.6 if shift[1] < 1.0 else 0.0
    areas = {(0, 1): 6.0 - shared, (0, 2): 6.0 - shared} | ({(1, 2): shared} if shared else {})
    for bodies in (
        [dielectric(one), dielectric(two)],
        moved([dielectric(one), dielectric(two)], 9),
    ):
        assert_regions(parted(bodies, 1e-6), {1: 1.0, 2: 1.0}, areas)


@pytest.mark.parametrize("size", [1e-3, 1e-4])
def test_a_tiny_body_on_a_large_turned_one(size):
    """Its own corners say little about the plane that both lie in; the large face decides."""
    low = np.array([0.3, 0.4, 1.0])
    bodies = [metal(box(low, low + size)), dielectric(box([0] * 3, [1] * 3))]
    for seed in range(5):
        partition = parted(moved(bodies, seed, single=True), 2e-6)
        assert partition.volumes == pytest.approx({1: 1.0}, abs=ROUNDED)
        assert partition.areas[METAL, 1] == pytest.approx(size**2, rel=0.01)
        assert partition.areas[METAL, 0] == pytest.approx(5 * size**2, rel=0.01)


def test_a_gap_above_the_tolerance_is_a_gap():
    bodies = [metal(box([0.2, 0.2, 1.00001], [0.8, 0.8, 2])), dielectric(box([0] * 3, [1] * 3))]
    assert (METAL, 1) not in parted(bodies, 1e-6).areas
    assert parted(bodies, 1e-4).areas[METAL, 1] == pytest.approx(0.36, abs=1e-4)


def test_spheres_of_facets_that_cross_a_block():
    ball = icosphere(3).placed(0.5 * np.eye(3), np.array([0.5, 0.5, 1.0]))
    block = box([0] * 3, [1] * 3)
    partition = parted(moved([dielectric(block), dielectric(ball)], 3), 1e-6)
    whole = parted([dielectric(ball)], 1e-6).volumes[1]
    assert openness(partition) < 1e-9
    assert partition.volumes == pytest.approx({1: 1.0 - 0.5 * whole, 2: whole}, abs=1e-9)


def test_spheres_of_unlike_facets_that_run_through_one_another():
    one, two = uneven_sphere(150, 1), uneven_sphere(170, 2)
    partition = parted([dielectric(one), dielectric(two)], 1e-6)
    swapped = parted([dielectric(two), dielectric(one)], 1e-6)
    assert openness(partition) < 1e-6
    union = sum(partition.volumes.values())
    assert union == pytest.approx(sum(swapped.volumes.values()), abs=1e-6)
    assert partition.volumes[2] == pytest.approx(parted([dielectric(two)], 1e-6).volumes[1])


def test_corners_of_neighbouring_pieces_are_the_same_numbers():
    bodies = [metal(box([0.25, 0.25, 0.5], [0.75, 0.75, 1.5])), dielectric(box([0] * 3, [1] * 3))]
    partition = parted(moved(bodies, 5), 1e-6)
    points = np.concatenate([part.surface.vertices for part in partition.parts])
    distance = np.linalg.norm(points[:, None] - points[None], axis=2)
    assert ((distance == 0.0) | (distance > 1e-3)).all()


def test_an_open_dielectric_is_refused_with_the_place():
    surface = cube(1.0)
    opened = replace(surface, faces=surface.faces[1:])
    with pytest.raises(GeometryError, match=r"^dielectric 1 is not closed: 3 edges .* near \("):
        parted([dielectric(opened)], 1e-6)


def test_area_of_a_surface():
    assert area_of(cube(2.0)) == pytest.approx(24.0)


def test_a_coat_with_the_facets_of_its_core_is_not_cut():
    core, outer = icosphere(2), icosphere(2).placed(1.5 * np.eye(3), np.zeros(3))
    vertices = np.concatenate([outer.vertices, core.vertices])
    inner = core.faces[:, [0, 2, 1, 3]] + np.array([len(outer.vertices)] * 3 + [0])
    coat = replace(outer, vertices=vertices, faces=np.concatenate([outer.faces, inner]))
    for bodies in (
        [metal(core), dielectric(coat)],
        moved([metal(core), dielectric(coat)], 1, True),
    ):
        partition = parted(bodies, 4e-6)
        faces = [(p.conductor, p.back, p.front, len(p.surface.faces)) for p in partition.parts]
        assert faces == [(0, METAL, 1, 320), (INTERFACE, 1, 0, 320)]


def test_meshes_that_match_only_in_part_are_cut_where_they_do_not():
    """Two of the faces in contact are the same triangles, one has its diagonal the other way."""
    one, two = cube(1.0), cube(1.0, (1.0, 0.0, 0.0))
    swapped = two.faces.copy()
    left = np.flatnonzero((two.vertices[two.faces[:, :3], 0] == 0.5).all(axis=1))
    a, b, c, d = 0, 4, 6, 2
    swapped[left] = [[a, b, c, -1], [a, c, d, -1]]
    for faces in (two.faces, swapped):
        bodies = [dielectric(one), dielectric(replace(two, faces=faces))]
        partition = parted(moved(bodies, 7), 1e-6)
        assert_regions(partition, {1: 1.0, 2: 1.0}, {(0, 1): 5.0, (0, 2): 5.0, (1, 2): 1.0})
