"""Grounded and mirror planes: images against exact values, and against the whole device."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from reference_values import BY_NAME, PER_LENGTH
from scenes import in_lengths

import bem
from bem.errors import GeometryError, InputError
from bem.geometry import shapes
from bem.geometry.clip import clipped
from bem.geometry.folding import folded
from bem.geometry.planes import Plane, Planes
from bem.geometry.surface import Surface
from bem.geometry.topology import edges_of
from bem.kernels.arrays import panel_arrays
from bem.kernels.images import plain_energy, plain_sources, reflections, sources_of, with_images
from bem.kernels.targets import make_targets
from bem.operators.dense import DenseOperator
from bem.panels.curved import CurvedFamily
from bem.panels.mesh import Mesh
from bem.scene.inspect import inspect
from bem.scene.report import report

FAR = 3.0
EVERYTHING = Planes(Plane(2, -0.3), (Plane(0, 0.1), Plane(1, -0.2)))
UPRIGHT = bem.Place(turn_axis=(0, 1, 0), turn_degrees=90)


def scene_with(
    bodies: list[tuple[Surface, bem.Place | None]], ground: str = "", mirrors: str = ""
) -> bem.Scene:
    """Scene in metres with planes through the origin."""
    scene = bem.Scene(unit="m")
    for axis in ground:
        scene.set_ground_plane(**{axis: 0.0})
    for axis in mirrors:
        scene.add_mirror_plane(**{axis: 0.0})
    for k, (surface, place) in enumerate(bodies):
        scene.add_conductor(f"c{k}", surface, place=place)
    return scene


def lengths(result: bem.CapacitanceResult) -> tuple[np.ndarray, np.ndarray]:
    """Value and bar in units of 4 pi eps0."""
    return in_lengths(result.capacitance), in_lengths(result.error)


# ---------------------------------------------------------------- the images themselves


def test_images_are_all_products_of_reflections_with_their_signs() -> None:
    point = np.array([1.0, 2.0, 3.0])
    images, signs = EVERYTHING.images(point), EVERYTHING.signs
    assert len(images) == EVERYTHING.copies == 8
    assert EVERYTHING.multiplicity == 4
    assert np.array_equal(images[0], point) and signs[0] == 1.0
    below = np.isclose(images[:, 2], -3.6)
    assert np.array_equal(signs, np.where(below, -1.0, 1.0))
    assert len(np.unique(images.round(12), axis=0)) == 8
    maps = reflections(EVERYTHING)
    assert maps.of(point) == pytest.approx(images, abs=1e-15)
    assert np.array_equal(maps.parity, [1, -1, -1, 1, -1, 1, 1, -1])
    assert set(images[:, 0].round(12)) == {1.0, -0.8} and set(images[:, 1].round(12)) == {2.0, -2.4}


def test_a_matrix_with_images_is_the_signed_sum_of_matrices_with_each() -> None:
    """Twin: all panels and images as panels of their own, summed by hand."""
    mesh = Mesh.start([shapes.box(0.5, 0.3, 0.2, center=(0.5, 0.3, 0.1)), shapes.sphere(0.1)])
    corners = mesh.corners[::3]
    count, planes = len(corners), EVERYTHING
    sources = sources_of(corners, planes)
    operator = DenseOperator(sources, make_targets(panel_arrays(corners)), FAR)
    every = panel_arrays(planes.images(corners).reshape(-1, 4, 3))
    plain = DenseOperator(plain_sources(every), make_targets(every), FAR)
    blocks = plain.matrices.single[:count].reshape(count, planes.copies, count)
    assert operator.matrices.single == pytest.approx(
        np.einsum("igj,g->ij", blocks, planes.signs), rel=1e-12, abs=1e-9
    )
    tests = plain.matrices.tests[:, :count].reshape(4, count, planes.copies, count)
    assert operator.matrices.tests == pytest.approx(
        np.einsum("tigj,g->tij", tests, planes.signs), rel=1e-5, abs=1e-6
    )
    density = np.random.default_rng(1).random(count)
    every_density = (planes.signs[:, None] * density).ravel()
    assert np.array_equal(with_images(density, sources), every_density)


def test_magnitude_counts_images_of_either_sign_as_positive() -> None:
    """Twin: the matrix of the same planes, all of them mirrors."""
    corners = Mesh.start([shapes.box(1.0, 1.0, 0.2, center=(0.0, 0.0, 0.2))]).corners
    right = np.random.default_rng(3).uniform(-1.0, 1.0, (len(corners), 2))
    ground, mirror = Planes(Plane(2, 0.0)), Planes(None, (Plane(2, 0.0),))
    targets = make_targets(panel_arrays(corners))
    found = DenseOperator(sources_of(corners, ground), targets, FAR)
    twin = DenseOperator(sources_of(corners, mirror), targets, FAR)
    assert found.magnitude(right, right) == pytest.approx(twin.magnitude(right, right), rel=0.15)
    density = np.abs(right)
    panels = found.sources.panels
    point = panels.center[:, None] - panels.center
    inverse = 1.0 / np.maximum(np.linalg.norm(point, axis=2), panels.radius[:, None])
    weight = panels.area[:, None] * np.tile(density, (2, 1))
    slow = weight[: len(corners)].T @ (inverse[: len(corners)] @ weight)
    assert plain_energy(found.sources, density, density) == pytest.approx(slow, rel=1e-12)


# ---------------------------------------------------------------- exact and published values


@pytest.mark.parametrize(
    ("gap", "panels"), [(0.1, 150), (0.01, 150), (0.001, 250)], ids=["wide", "thin", "thinner"]
)
def test_plate_over_a_grounded_plane_is_half_of_a_driven_pair(gap: float, panels: int) -> None:
    """C of a plate at half the gap is C11 - C12 of the pair, solved as two bodies."""
    place = bem.Place(shift=(0, 0, 0.5 * gap))
    other = bem.Place(shift=(0, 0, -0.5 * gap))
    plate = shapes.plate(1.0, 1.0)
    over = bem.extract(scene_with([(plate, place)], ground="z"), 1e-3)
    pair = bem.extract(scene_with([(plate, place), (plate, other)]), 1e-3)
    wanted = pair.capacitance[0, 0] - pair.capacitance[0, 1]
    doubt = pair.error[0, 0] + pair.error[0, 1] + over.error[0, 0]
    assert abs(over.capacitance[0, 0] - wanted) <= doubt
    assert over.converged and over.panels <= panels
    published = BY_NAME.get(f"two unit plates, gap {gap:g}")
    if published:
        exact = published.exact[0][0] - published.exact[0][1]
        assert lengths(over)[0][0, 0] == pytest.approx(exact, rel=1e-3)


LYING = bem.Place(shift=(0, 0, 2.0), turn_axis=(0, 1, 0), turn_degrees=90)
LONG = {
    "wire over a plane": (lambda length: shapes.cylinder(1.0, length), LYING),
    "strip over a plane, in air": (
        lambda length: shapes.plate(length, 1.0), bem.Place(shift=(0, 0, 1.0))),
}  # fmt: skip


@pytest.mark.parametrize("name", LONG)
def test_long_bodies_over_a_grounded_plane_per_length(name: str) -> None:
    """Slope between two lengths; a quarter of each stands for the whole.

    End effects fall with the square of the length over the height: below 0.1 % from 20 to 40.
    """
    shape, place = LONG[name]
    lengths = 20.0 * place.shift[2], 40.0 * place.shift[2]
    total = [
        bem.extract(scene_with([(shape(x), place)], ground="z", mirrors="xy"), 1e-3)
        for x in lengths
    ]
    slope = (total[1].capacitance[0, 0] - total[0].capacitance[0, 0]) / lengths[0]
    exact = next(record.exact for record in PER_LENGTH if record.name == name)
    assert slope / bem.EPS0 == pytest.approx(exact, rel=2e-3)


def test_a_long_thin_wire_needs_few_panels() -> None:
    """Facets around it are made finer, not those along it: bars shrink with few panels."""
    wire = shapes.wire([(-20.0, 0.0, 0.0), (20.0, 0.0, 0.0)], radius=0.1)
    scene = scene_with([(wire, bem.Place(shift=(0, 0, 1.0)))], ground="z")
    result = bem.extract(scene, 1e-3)
    ideal = 40.0 * 2.0 * np.pi * bem.EPS0 / np.arccosh(10.0)
    assert result.converged and result.panels <= 1000
    assert 1.0 < result.capacitance[0, 0] / ideal < 1.05


# ---------------------------------------------------------------- mirrors against the whole

WHOLE = {
    "cube": [(shapes.box(1.0, 1.0, 1.0), None)],
    "plates": [
        (shapes.plate(1.0, 1.0), bem.Place(shift=(0, 0, 0.1))),
        (shapes.plate(1.0, 0.6), bem.Place(shift=(0, 0, -0.1))),
    ],
    "ring": [(shapes.torus(2.0, 0.5), None)],
    "ring and ball": [(shapes.torus(2.0, 0.5), UPRIGHT), (shapes.sphere(0.5), None)],
    "turned ball": [
        (shapes.sphere(1.0), bem.Place(turn_axis=(1, 2, 3), turn_degrees=33)),
    ],
    "ellipsoid": [(shapes.ellipsoid(3.0, 2.0, 1.0), None)],
    "lying cylinder": [(shapes.cylinder(1.0, 2.0), UPRIGHT)],
    "flat sheets": [(shapes.annulus(0.5, 1.0), None), (shapes.disc(0.4), None)],
    "square ring": [
        (shapes.revolve([(1.0, -0.2), (1.4, -0.2), (1.4, 0.2), (1.0, 0.2), (1.0, -0.2)]), None)
    ],
}
CUTS = [
    ("cube", "x"), ("cube", "xy"), ("cube", "xyz"), ("plates", "x"), ("plates", "xy"),
    ("ring", "z"), ("ring", "xy"), ("ring", "xyz"), ("ring and ball", "xz"),
    ("ring and ball", "xyz"), ("turned ball", "xyz"), ("ellipsoid", "xz"),
    ("lying cylinder", "xyz"), ("flat sheets", "yz"), ("square ring", "xyz"),
]  # fmt: skip
_DONE: dict[str, bem.CapacitanceResult] = {}


def whole(name: str) -> bem.CapacitanceResult:
    """Extraction without planes, done once."""
    if name not in _DONE:
        _DONE[name] = bem.extract(scene_with(WHOLE[name]), 1e-3)
    return _DONE[name]


@pytest.mark.parametrize(("name", "mirrors"), CUTS)
def test_mirror_planes_give_the_whole_with_a_part_of_the_panels(name: str, mirrors: str) -> None:
    without, cut = whole(name), bem.extract(scene_with(WHOLE[name], mirrors=mirrors), 1e-3)
    apart = np.abs(cut.capacitance - without.capacitance)
    assert np.all(apart <= cut.error + without.error)
    rows = np.abs(cut.row_sum - without.row_sum)
    assert np.all(rows <= cut.row_sum_error + without.row_sum_error)
    assert cut.converged
    # A sheet that lies in a plane keeps its panels; outlines may need a few more than their share.
    halvings = len(mirrors) - (name == "flat sheets" and "z" in mirrors)
    assert cut.panels <= 1.5 * without.panels / 2**halvings


def test_density_is_that_of_the_real_body() -> None:
    """Density of the kept half, times area, is half of the charge."""
    result = bem.extract(scene_with(WHOLE["cube"], mirrors="x"), 1e-2)
    panels = panel_arrays(result.panel_corners)
    charge = float(panels.area @ result.density[:, 0])
    assert 2.0 * charge == pytest.approx(result.capacitance[0, 0], rel=0.05, abs=0.0)


def test_a_body_and_its_image_are_one_conductor() -> None:
    """Two cubes as one conductor, against one cube beside a mirror and against a tied pair."""
    side = [(shapes.box(1.0, 1.0, 1.0), bem.Place(shift=(s, 0, 0))) for s in (1.0, -1.0)]
    pair = bem.extract(scene_with(side), 1e-3)
    for body in side:
        single = bem.extract(scene_with([body], mirrors="x"), 1e-3)
        doubt = single.error[0, 0] + pair.error.sum()
        assert abs(single.capacitance[0, 0] - pair.capacitance.sum()) <= doubt


def test_ground_and_mirrors_together() -> None:
    body = [(shapes.box(1.0, 0.6, 0.3), bem.Place(shift=(0, 0, 0.3)))]
    alone = bem.extract(scene_with(body, ground="z"), 1e-3)
    cut = bem.extract(scene_with(body, ground="z", mirrors="xy"), 1e-3)
    assert np.all(np.abs(cut.capacitance - alone.capacitance) <= cut.error + alone.error)
    assert cut.panels <= 0.4 * alone.panels


def test_half_bodies_count_as_closed_by_their_images() -> None:
    """A half cube with a lid in the plane, one open there, and the whole cube: one value."""
    lidded = shapes.box(0.5, 1.0, 1.0, center=(0.25, 0.0, 0.0))
    opened = clipped(shapes.box(1.0, 1.0, 1.0), Plane(0, 0.0), 1e-9, False)
    assert (edges_of(opened.triangles).uses == 1).any()
    for surface in (lidded, opened):
        result = bem.extract(scene_with([(surface, None)], mirrors="x"), 1e-3)
        apart = np.abs(result.capacitance - whole("cube").capacitance)
        assert np.all(apart <= result.error + whole("cube").error)
        assert (
            Mesh.start(
                [folded(surface, Planes(None, (Plane(0, 0.0),)), True)],
                planes=Planes(None, (Plane(0, 0.0),)),
            )
            .bodies[0]
            .solid
        )


# ---------------------------------------------------------------- cutting


def test_clipping_keeps_area_and_leaves_no_crack() -> None:
    box = shapes.box(2.0, 1.0, 1.0)
    half = clipped(box, Plane(0, 0.25), 1e-9, False)
    corners = half.vertices[half.triangles]
    cross = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    area = 0.5 * float(np.linalg.norm(cross, axis=1).sum())
    assert area == pytest.approx(1.0 + 4 * 0.75)
    edges = edges_of(half.triangles)
    open_ends = half.vertices[edges.ends[edges.uses == 1]]
    assert np.all(open_ends[..., 0] == 0.25)
    assert half.bounds[0, 0] == 0.25 and half.bounds[1, 0] == 1.0


@pytest.mark.parametrize("mirrors", ["x", "z", "xz", "xyz"])
@pytest.mark.parametrize("shape", ["torus", "cylinder", "tilted ellipsoid"])
def test_the_kept_part_of_a_curved_body_has_its_share_of_the_surface(
    shape: str, mirrors: str
) -> None:
    """Panels of the part lie on the kept side, and are as many and as large as they must be."""
    body = {
        "torus": shapes.torus(2.0, 0.5),
        "cylinder": shapes.cylinder(1.0, 2.0),
        "tilted ellipsoid": shapes.ellipsoid(1.0, 2.0, 3.0).placed(
            np.array([[0.0, 0, 1], [1, 0, 0], [0, 1, 0]]), np.zeros(3)
        ),
    }[shape]
    planes = Planes(None, tuple(Plane("xyz".index(axis), 0.0) for axis in mirrors))
    part = folded(body, planes, True)
    family = CurvedFamily.start(part.curve, around=16)
    everything = CurvedFamily.start(body.curve, around=16)
    area, total = (
        panel_arrays(family.corners).area.sum(),
        panel_arrays(everything.corners).area.sum(),
    )
    assert area * 2 ** len(mirrors) == pytest.approx(total, rel=0.03)
    for plane in planes.mirrors:
        assert plane.height(family.corners).min() >= -1e-12


# ---------------------------------------------------------------- what is refused, what is said


def refused(scene: bem.Scene) -> str:
    """The first reason not to solve."""
    with pytest.raises(GeometryError) as caught:
        bem.extract(scene, 1e-2)
    return str(caught.value)


def test_bodies_must_keep_off_a_grounded_plane() -> None:
    cube = shapes.box(1.0, 1.0, 1.0)
    crossing = refused(scene_with([(cube, None)], ground="z"))
    assert '"c0" crosses by 500 mm the grounded plane z = 0 m' in crossing
    touching = refused(scene_with([(cube, bem.Place(shift=(0, 0, 0.5)))], ground="z"))
    assert '"c0" touches the grounded plane' in touching and "leave a gap" in touching
    ball = refused(scene_with([(shapes.sphere(1.0), bem.Place(shift=(0, 0, 1.0)))], ground="z"))
    assert "touches" in ball
    sides = [(cube, bem.Place(shift=(0, 0, s))) for s in (1.0, -1.0)]
    assert "different sides of the grounded plane" in refused(scene_with(sides, ground="z"))


def test_a_cut_body_must_be_its_own_image() -> None:
    cone = shapes.revolve([(0.0, 0.0), (1.0, 0.0), (0.0, 2.0)])
    for body, place in [
        (shapes.box(1.0, 1.0, 1.0), bem.Place(shift=(0.2, 0, 0))),
        (shapes.cylinder(1.0, 3.0), replace(UPRIGHT, turn_degrees=30)),
        (shapes.hemisphere(1.0), replace(UPRIGHT, shift=(0.4, 0, 0))),
        (cone, replace(UPRIGHT, shift=(-1.0, 0.0, 0.0))),
    ]:
        line = refused(scene_with([(body, place)], mirrors="x"))
        assert '"c0" is cut by the mirror plane x = 0 m but is not its own mirror image' in line


def test_a_body_drawn_together_with_its_image_is_found() -> None:
    sides = [(shapes.box(1.0, 1.0, 1.0), bem.Place(shift=(s, 0, 0))) for s in (1.0, -1.0)]
    assert "with the mirror planes a body stands for its images too" in refused(
        scene_with(sides, mirrors="x")
    )


def test_planes_are_checked_at_the_door() -> None:
    scene = bem.Scene(unit="mm").set_ground_plane(z=1.0)
    assert scene.planes.ground == Plane(2, 1e-3)
    for given, message in [
        ({"z": 2.0}, "second plane normal to z"),
        ({}, "needs one of x, y, z"),
        ({"x": 1.0, "y": 1.0}, "needs one of x, y, z"),
        ({"x": float("nan")}, "needs a finite number"),
    ]:
        with pytest.raises(InputError, match=message):
            scene.add_mirror_plane(**given)
    with pytest.raises(InputError, match="at most one"):
        scene.set_ground_plane(x=1.0)


SCENE = """
unit = "mm"
[ground_plane]
z = -2.0
[[mirror_plane]]
x = 0.0
[[mirror_plane]]
y = 0.5
[[conductor]]
name = "cube"
mesh = "cube.stl"
"""


def test_scene_files_have_planes(tmp_path: Path) -> None:
    from made_bodies import write_cube

    write_cube(tmp_path / "cube.stl", center=(0.0, 0.5, 0.0))
    (tmp_path / "a.toml").write_text(SCENE)
    scene = bem.load_scene(tmp_path / "a.toml")
    assert scene.planes == Planes(Plane(2, -2e-3), (Plane(0, 0.0), Plane(1, 5e-4)))
    text = report(scene, inspect(scene))
    assert "infinite plane z = -2 mm at potential zero" in text
    assert "mirror  x = 0 mm, y = 0.5 mm: a body and its images are one conductor" in text
    assert "gaps to the grounded plane\n  cube  1.5 mm" in text
    result = bem.extract(scene, 1e-2)
    assert "infinite grounded plane z = -2 mm" in str(result).replace("\n  ", " ")
    assert "To the surroundings and the grounded plane (row sums)" in str(result)
    assert "all values are for the whole" in str(result).replace("\n  ", " ")
    assert result.settings["mirror_planes_m"] == [{"x": 0.0}, {"y": 5e-4}]


@pytest.mark.parametrize(
    ("entry", "message"),
    [
        ("[ground_plane]\nw = 1.0", 'unknown key "w"'),
        ("[ground_plane]\nz = \"low\"", "ground_plane: z: found"),
        ("[mirror_plane]\nz = 1.0", "write [[mirror_plane]]"),
        ("[[mirror_plane]]\n[[mirror_plane]]\nx = 1.0", "mirror_plane 1: found {}"),
        ("ground_plane = 3", "needs a table"),
    ],
)  # fmt: skip
def test_damaged_plane_entries_get_one_line(tmp_path: Path, entry: str, message: str) -> None:
    path = tmp_path / "a.toml"
    path.write_text(f'unit = "mm"\n{entry}\n[[conductor]]\nname = "a"\nmesh = "a.stl"\n')
    with pytest.raises(InputError) as caught:
        bem.load_scene(path)
    assert message in str(caught.value) and "\n" not in str(caught.value)
