"""Conductors among flat layers against exact and published values, and what is refused."""

from __future__ import annotations

import math

import pytest
from scenes import in_lengths

import bem
from bem.errors import GeometryError
from bem.geometry.surface import Surface
from bem.units import EPS0

CUBE = 0.66067815409957
"""Recalled from Helsing and Perfekt (2013), from memory; Hwang and Mascagni (2004) to 7 digits."""
SQUARE = 0.3667880
"""Unit square plate, by a graded Galerkin program; no published number known."""


def at(*shift: float) -> bem.Place:
    return bem.Place(shift=shift)


def over_half_space(
    shape: Surface, place: bem.Place, permittivity: float, **where: float
) -> bem.Scene:
    scene = bem.Scene(unit="m")
    scene.set_half_space(relative_permittivity=permittivity, **(where or {"below_z": 0.0}))
    return scene.add_conductor("body", shape, place=place)


def solved(scene: bem.Scene, tolerance: float = 1e-3) -> tuple[float, float]:
    """C_11 / (4 pi eps0) and its bar, of a converged result that passed its audit."""
    result = bem.extract(scene, tolerance)
    assert result.converged
    return in_lengths(result.capacitance)[0, 0], in_lengths(result.error)[0, 0]


def check(scene: bem.Scene, want: float, uncertainty: float = 0.0) -> None:
    """Within the bar, and the bar within the tolerance of 1e-3."""
    value, bar = solved(scene)
    assert abs(value - want) <= bar + uncertainty
    assert bar <= 1e-3 * want * (1.0 + 1e-9)


# ---------------------------------------------------------------- a half-space


@pytest.mark.parametrize("permittivity", [4.0, 80.0])
@pytest.mark.parametrize("where", [{"below_z": 0.1}, {"above_x": 0.1}])
def test_a_sphere_half_sunk(permittivity: float, where: dict[str, float]) -> None:
    """L = L0 (1 + e)/2, by symmetry (textbook)."""
    place = at(0.1, 0.0, 0.1)
    check(over_half_space(bem.sphere(1.0), place, permittivity, **where), 0.5 + 0.5 * permittivity)


@pytest.mark.parametrize("permittivity", [4.0, 80.0])
def test_a_plate_in_the_plane(permittivity: float) -> None:
    """L = L0 (1 + e)/2, by symmetry (textbook)."""
    want = SQUARE * (0.5 + 0.5 * permittivity)
    check(over_half_space(bem.plate(1.0, 1.0), at(0, 0, 0), permittivity), want, 1e-6 * want)


@pytest.mark.parametrize("axis", [(0, 0, 1), (1, 0, 0)])
def test_flat_faces_are_cut_at_the_plane(axis: tuple[float, float, float]) -> None:
    """A cube half sunk: L0 (1 + e)/2; the plane runs through its faces, or through its edges."""
    shape = bem.box(1.0, 1.0, 1.0, center=(0.0, 0.0, 0.0))
    place = bem.Place(turn_axis=axis, turn_degrees=45)
    check(over_half_space(shape, place, 4.0), 2.5 * CUBE)


@pytest.mark.parametrize("height", [2.0, 1.1, 1.01])
def test_a_sphere_above(height: float) -> None:
    """Sum k^n sinh a / sinh((n + 1) a), k = (e - 1)/(e + 1), cosh a = h (images; from memory)."""
    a = math.acosh(height)
    want = sum(0.6**n * math.sinh(a) / math.sinh((n + 1) * a) for n in range(200))
    if height == 2.0:
        assert want == pytest.approx(1.1785960286896, rel=1e-12)
    check(over_half_space(bem.sphere(1.0), at(0, 0, height), 4.0), want)


def test_a_half_space_like_the_surroundings_is_none() -> None:
    shape, place = bem.box(1.0, 0.5, 0.3, center=(0.0, 0.0, 0.0)), at(0.0, 0.0, 0.1)
    with_plane = solved(over_half_space(shape, place, 1.0))
    alone = solved(bem.Scene(unit="m").add_conductor("body", shape, place=place))
    assert abs(with_plane[0] - alone[0]) <= with_plane[1] + alone[1]


def test_relative_to_the_surroundings() -> None:
    """The whole of space filled: twice the capacitance of permittivities half as large."""
    thin = over_half_space(bem.sphere(1.0), at(0, 0, 1.2), 4.0)
    thick = bem.Scene(unit="m", relative_permittivity=2.0)
    thick.set_half_space(below_z=0.0, relative_permittivity=8.0)
    thick.add_conductor("body", bem.sphere(1.0), place=at(0, 0, 1.2))
    assert solved(thick)[0] == pytest.approx(2.0 * solved(thin)[0], rel=1e-12)


# ---------------------------------------------------------------- stacks


def strip(length: float, height: float, **layers: object) -> bem.Scene:
    scene = bem.Scene(unit="mm").set_flat_layers(from_z=0.0, grounded_below=True, **layers)
    return scene.add_conductor("strip", bem.plate(length, 1.0), place=at(0, 0, height))


def per_length(lengths: tuple[float, float], height: float, **layers: object) -> float:
    """Slope between two long strips, C' / eps0."""
    values = [
        bem.extract(strip(length, height, **layers), 1e-3).capacitance[0, 0] / (EPS0 * 1e-3)
        for length in lengths
    ]
    return (values[1] - values[0]) / (lengths[1] - lengths[0])


def test_microstrip() -> None:
    """Thin, w/h = 1, e = 4: N; Hammerstad and Jensen (1980) within 0.1 %, from memory."""
    found = per_length((20.0, 40.0), 1.0, thickness=[1.0], relative_permittivity=[4.0])
    assert found == pytest.approx(8.6906499506, rel=3e-3)


def test_stripline() -> None:
    """Symmetric, thin, w/b = 1, by conformal map (from memory)."""
    layers = {"thickness": [1.0], "relative_permittivity": [1.0], "grounded_above": True}
    found = per_length((8.0, 16.0), 0.5, **layers)
    assert found == pytest.approx(5.76448992428047, rel=3e-3)


def test_layers_in_series() -> None:
    """A strip close over ground: eps0 w / sum(d / e), and edges that go as the gap (textbook)."""
    excess = []
    for gap in (0.05, 0.025):
        layers = {"thickness": [0.4 * gap, 0.6 * gap], "relative_permittivity": [2.0, 5.0]}
        found = per_length((1.0, 2.0), gap, **layers)
        excess.append(found * gap * (0.4 / 2.0 + 0.6 / 5.0) - 1.0)
    assert 0.0 < excess[1] < 0.7 * excess[0] < 0.1


def test_a_grounded_layer_like_the_surroundings_is_a_ground_plane() -> None:
    layered = bem.Scene(unit="m").set_flat_layers(
        from_z=0.0, thickness=[0.5], relative_permittivity=[1.0], grounded_below=True
    )
    twin = bem.Scene(unit="m").set_ground_plane(z=0.0)
    for scene in (layered, twin):
        scene.add_conductor("body", bem.sphere(0.3), place=at(0, 0, 0.6))
    (a, bar_a), (b, bar_b) = solved(layered), solved(twin)
    assert abs(a - b) <= bar_a + bar_b


def test_mirror_planes_across_layers() -> None:
    """Twin: the whole device, and a quarter of it beside two mirrors."""
    values = []
    for mirrors in ((), ("x", "y")):
        scene = bem.Scene(unit="m").set_flat_layers(
            from_z=0.0, thickness=[0.2], relative_permittivity=[4.0], grounded_below=True
        )
        for axis in mirrors:
            scene.add_mirror_plane(**{axis: 0.0})
        scene.add_conductor("body", bem.box(1.0, 0.6, 0.2, center=(0.0, 0.0, 0.25)))
        values.append(solved(scene))
    (a, bar_a), (b, bar_b) = values
    assert abs(a - b) <= bar_a + bar_b


def test_a_comparison_across_layers() -> None:
    """The change of permittivity below, on the same panels, against two separate results."""
    scenes = [over_half_space(bem.sphere(1.0), at(0, 0, 0.3), value) for value in (4.0, 4.4)]
    found = bem.compare(*scenes)
    apart = [bem.extract(scene, 2e-4) for scene in scenes]
    change = (apart[1].capacitance - apart[0].capacitance)[0, 0]
    bar = found.change_error[0, 0] + apart[0].error[0, 0] + apart[1].error[0, 0]
    assert found.correlated and abs(found.change[0, 0] - change) <= bar
    lifted = bem.compare(scenes[0], over_half_space(bem.sphere(1.0), at(0, 0, 0.4), 4.0))
    assert not lifted.correlated


# ---------------------------------------------------------------- dielectric bodies


def coated(height: float, permittivity: float, medium: float = 1.0) -> bem.Scene:
    """A cube of side 1 in a coat of side 1.5 whose lower face is at a height."""
    center = (0.0, 0.0, height + 0.75)
    scene = bem.Scene(unit="m", relative_permittivity=medium)
    scene.add_conductor("cube", bem.box(1.0, 1.0, 1.0, center=center))
    coat = bem.box(1.5, 1.5, 1.5, center=center)
    return scene.add_dielectric("coat", coat, relative_permittivity=permittivity)


def test_a_coat_in_layers_all_alike() -> None:
    """0.862646 for a coat of 4 (high-order finite elements, 2e-5), twice that in a medium of 2."""
    alike = coated(0.25, 8.0, 2.0).set_half_space(below_z=0.0, relative_permittivity=2.0)
    check(alike, 2.0 * 0.862646, 4e-5)


def test_surroundings_and_half_space_may_change_places() -> None:
    upper = coated(0.05, 16.0).set_half_space(above_z=0.0, relative_permittivity=4.0)
    lower = coated(0.05, 16.0, 4.0).set_half_space(below_z=0.0, relative_permittivity=1.0)
    assert solved(upper, 1e-2)[0] == pytest.approx(solved(lower, 1e-2)[0], rel=1e-9)


@pytest.mark.parametrize("height", [0.0, 0.25])
def test_a_coat_on_or_over_a_half_space(height: float) -> None:
    """Twin: blocks of growing size instead, whose effect goes on as one over their size."""
    value, bar = solved(
        coated(height, 7.0).set_half_space(below_z=0.0, relative_permittivity=4.0), 3e-3
    )
    twins = []
    for size in (32.0, 64.0):
        block = bem.box(size, size, size, center=(0.0, 0.0, -0.5 * size))
        twin = coated(height, 7.0).add_dielectric("block", block, relative_permittivity=4.0)
        twins.append(solved(twin, 3e-3))
    limit = 2.0 * twins[1][0] - twins[0][0]
    left = 0.1 * (twins[1][0] - twins[0][0])  # what the next order may add
    assert abs(value - limit) <= bar + 2.0 * twins[1][1] + twins[0][1] + left


def test_a_dielectric_across_a_plane_is_refused() -> None:
    scene = coated(-0.5, 7.0).set_half_space(below_z=0.0, relative_permittivity=4.0)
    with pytest.raises(GeometryError, match='"coat" crosses a plane between layers; cut the'):
        bem.extract(scene)


# ---------------------------------------------------------------- refused


def test_bodies_that_cannot_be_cut_are_refused() -> None:
    rod = bem.cylinder(radius=0.2, length=2.0)
    leaning = bem.Place(turn_axis=(1, 0, 0), turn_degrees=30)
    with pytest.raises(GeometryError, match='"body" crosses a plane between layers, and its curve'):
        bem.extract(over_half_space(rod, leaning, 4.0))


def test_bodies_across_or_behind_grounded_layers_are_refused() -> None:
    for height, message in ((0.4, "crosses by"), (-2.0, "lies behind the grounded plane z = 0 mm")):
        scene = bem.Scene(unit="mm").set_flat_layers(
            from_z=0.0, thickness=[1.0], relative_permittivity=[4.0], grounded_below=True
        )
        scene.add_conductor("ball", bem.sphere(0.5), place=at(0, 0, height))
        with pytest.raises(GeometryError, match=message):
            bem.extract(scene)


def test_the_record_states_the_error_of_the_layers() -> None:
    scene = strip(3.0, 1.0, thickness=[1.0], relative_permittivity=[4.0])
    settings = bem.extract(scene, 1e-2).settings
    assert settings["layer_images"] > 2
    assert 0.0 < settings["layer_images_error"] < 2e-6
