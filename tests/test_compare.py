"""The change between two scenes: within its bar of closed forms, and sharp for small changes."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from faceted_bodies import icosphere
from reference_formulas import concentric_spheres, two_discs, two_spheres
from reference_values import BY_NAME
from scenes import in_lengths, moved, scene_from_files, scene_of

import bem
from bem.extraction.compare import compare
from bem.geometry import shapes
from bem.geometry.surface import Surface
from bem.results.comparison import Comparison

CUBE = BY_NAME["unit cube"].matrix[0, 0]


def at(surface: Surface, z: float) -> Surface:
    """Lift a surface."""
    return surface.placed(np.eye(3), np.array([0.0, 0.0, z]))


def spheres(a: float, b: float, distance: float) -> list[Surface]:
    """Two balls on the z-axis."""
    return [shapes.sphere(a), at(shapes.sphere(b), distance)]


def discs(gap: float) -> list[Surface]:
    """Two equal discs of radius 1."""
    return [shapes.disc(1.0), at(shapes.disc(1.0), gap)]


def plates(gap: float) -> list[Surface]:
    """Two unit squares."""
    return [shapes.plate(1.0, 1.0), shapes.plate(1.0, 1.0, (0.0, 0.0, gap))]


def three(x: float) -> list[Surface]:
    """Two boxes and a plate at some place."""
    return [
        shapes.box(1.0, 1.0, 0.2),
        shapes.box(0.5, 0.5, 0.5, (1.2, 0.0, 0.0)),
        shapes.plate(0.6, 0.6, (x, 0.0, 0.6)),
    ]


def compared(before: list[Surface], after: list[Surface], **options: object) -> Comparison:
    """Compare two lists of bodies in metres, on one thread."""
    return compare(scene_of(before), scene_of(after), **{"threads": 1, **options})


def check_change(found: Comparison, exact: np.ndarray, part: float = 0.02) -> None:
    """Require the exact change (n, n) in L within the bars, and these below a part of it."""
    assert found.converged
    assert found.correlated
    apart = np.abs(in_lengths(found.change) - exact)
    assert np.all(apart <= in_lengths(found.change_error)), apart / in_lengths(found.change_error)
    rows = np.abs(in_lengths(found.row_sum_change) - exact.sum(axis=1))
    assert np.all(rows <= in_lengths(found.row_sum_change_error))
    largest = np.unravel_index(np.abs(exact / in_lengths(found.scale)).argmax(), exact.shape)
    assert found.change_error[largest] <= part * np.abs(found.change[largest])


CLOSED: dict[str, tuple[list[Surface], list[Surface], np.ndarray]] = {
    "spheres, gap 0.1 + 0.1 %": (
        spheres(1, 1, 2.1),
        spheres(1, 1, 2.1001),
        two_spheres(1, 1, 2.1001) - two_spheres(1, 1, 2.1),
    ),
    "spheres, distance 3 + 0.1 %": (
        spheres(1, 1, 3.0),
        spheres(1, 1, 3.003),
        two_spheres(1, 1, 3.003) - two_spheres(1, 1, 3.0),
    ),
    "one sphere of two grows": (
        spheres(1, 0.5, 2.0),
        spheres(1, 0.505, 2.0),
        two_spheres(1, 0.505, 2.0) - two_spheres(1, 0.5, 2.0),
    ),
    "spheres, moved far": (
        spheres(1, 1, 3.0),
        spheres(1, 1, 2.5),
        two_spheres(1, 1, 2.5) - two_spheres(1, 1, 3.0),
    ),
    "discs, gap 0.1 + 0.1 %": (
        discs(0.1),
        discs(0.1001),
        two_discs(0.1001, 1000) - two_discs(0.1, 1000),
    ),
    "cube grows": (
        [shapes.box(1, 1, 1)],
        [shapes.box(1.001, 1.001, 1.001)],
        np.array([[0.001 * CUBE]]),
    ),
}
"""Bodies before and after, and the change in L. Sources as in reference_formulas and _values."""


@pytest.mark.parametrize("name", CLOSED)
def test_closed_forms(name: str) -> None:
    before, after, exact = CLOSED[name]
    check_change(compared(before, after), exact)


def test_a_sphere_grows_inside_a_shell() -> None:
    before, after = (
        scene_of([shapes.sphere(r), shapes.sphere(2.0)], shells=(1,)) for r in (1.0, 1.001)
    )
    exact = concentric_spheres(1.001, 2.0) - concentric_spheres(1.0, 2.0)
    check_change(compare(before, after, threads=1), exact)


@pytest.mark.parametrize("gap", [0.1, 0.01])
def test_a_thousandth_of_the_gap_of_plates(gap: float) -> None:
    """The truth is a run to a tenth of the tolerance, whose own bar is counted."""
    found = compared(plates(gap), plates(1.001 * gap))
    sharp = compared(plates(gap), plates(1.001 * gap), tolerance=1e-4)
    assert np.all(found.change_error <= 0.02 * np.abs(found.change))
    assert np.all(np.abs(found.change - sharp.change) <= found.change_error + sharp.change_error)
    assert np.all(sharp.change_error < found.change_error)


def test_nothing_changes_between_equal_scenes() -> None:
    found = compared(three(0.1), three(0.1))
    assert found.correlated
    assert found.converged
    assert not found.change.any()
    assert not found.row_sum_change.any()
    assert not found.change_error.any()


@pytest.mark.parametrize(
    "move", [moved, lambda body: at(body, 0.37)], ids=["turned and shifted", "shifted"]
)
def test_moving_everything_changes_nothing(move: Callable[[Surface], Surface]) -> None:
    found = compared(three(0.1), [move(body) for body in three(0.1)])
    assert found.correlated
    assert np.all(np.abs(found.change) <= found.change_error)
    assert np.all(found.change_error <= 1e-6 * found.scale)


def test_the_way_back_is_the_opposite_change() -> None:
    forth, back = compared(three(0.1), three(0.102)), compared(three(0.102), three(0.1))
    assert np.all(np.abs(forth.change + back.change) <= forth.change_error + back.change_error)
    assert np.all(np.abs(forth.row_sum_change) > 0.0)


def test_the_finer_start_serves_both_ways() -> None:
    """The narrow gap needs the finer panels, whichever scene it is in."""
    forth, back = compared(plates(0.1), plates(0.02)), compared(plates(0.02), plates(0.1))
    assert np.array_equal(forth.change, -back.change)
    assert np.array_equal(forth.before.capacitance, back.after.capacitance)
    assert forth.panels == back.panels


def test_values_are_those_of_two_extractions() -> None:
    found = compared(three(0.1), three(0.13))
    for side, x in ((found.before, 0.1), (found.after, 0.13)):
        own = bem.extract(scene_of(three(x)), threads=1)
        assert side.converged
        assert np.all(np.abs(side.capacitance - own.capacitance) <= side.error + own.error)
        assert side.panel_corners is not None
    assert found.before.panels == found.after.panels
    difference = found.after.capacitance - found.before.capacitance
    assert np.all(
        np.abs(found.change - difference) <= 1e-2 * (found.before.error + found.after.error)
    )


def test_the_medium_alone() -> None:
    """Twice the permittivity is twice the matrix, and the bar grows alike."""
    before, after = scene_of(plates(0.1)), scene_of(plates(0.1))
    after.relative_permittivity = 2.0
    found = compare(before, after, threads=1)
    assert found.change == pytest.approx(found.before.capacitance, rel=1e-12, abs=0.0)
    assert np.all(found.change_error >= found.before.error)


def test_other_units_and_another_order_of_conductors() -> None:
    before = scene_of(plates(0.1))
    after = bem.Scene(unit="mm")
    for k in (1, 0):
        after.add_conductor(f"c{k}", plates(0.1)[k].placed(1e3 * np.eye(3), np.zeros(3)))
    found = compare(before, after, threads=1)
    assert found.correlated
    assert found.conductors == found.after.conductors == ("c0", "c1")
    assert np.all(np.abs(found.change) <= found.change_error)
    assert np.all(found.change_error <= 1e-7 * found.scale)


def test_a_body_of_another_kind_is_solved_apart() -> None:
    ball = at(shapes.sphere(0.5), 1.5)
    found = compared([shapes.box(1, 1, 1), ball], [shapes.cylinder(0.6, 1.0), ball])
    assert not found.correlated
    assert '"c0"' in found.notes[0]
    assert "errors do not cancel" in found.notes[0]
    assert np.array_equal(found.change_error, found.before.error + found.after.error)
    assert np.array_equal(found.change, found.after.capacitance - found.before.capacitance)


def test_a_rebuilt_mesh_of_the_same_kind_still_cancels() -> None:
    """An arm grows: its flat end goes by no affine map, so panels keep to the triangles."""
    from test_compare_panels import bracket

    before, after = ([bracket(arm)] for arm in (2.0, 2.002))
    found = compared(before, after, tolerance=1e-2)
    sharp = compared(before, after)
    assert found.correlated
    assert np.all(np.abs(found.change - sharp.change) <= found.change_error + sharp.change_error)
    assert found.change_error[0, 0] <= 0.02 * found.change[0, 0]


def test_saved_results_stand_for_scenes() -> None:
    before, after = (bem.extract(scene_of(plates(g)), threads=1) for g in (0.1, 0.12))
    saved = compare(before, after)
    assert not saved.correlated
    assert "both sides are saved results" in saved.notes[0]
    assert np.array_equal(saved.change_error, before.error + after.error)
    mixed = compare(before, scene_of(plates(0.12)), threads=1)
    assert "the first side is saved" in mixed.notes[0]
    assert np.array_equal(mixed.change, saved.change)


def test_one_and_the_same_result_has_no_change_and_no_bar() -> None:
    result = bem.extract(scene_of(plates(0.1)), threads=1)
    found = compare(result, result)
    assert not found.change.any()
    assert not found.change_error.any()
    assert not found.row_sum_change_error.any()


def test_the_accuracy_of_changes_is_kept() -> None:
    """More is asked of the change than the tolerance brings by itself."""
    loose = compared(plates(0.1), plates(0.1001), tolerance=1e-2)
    tight = compared(plates(0.1), plates(0.1001), tolerance=1e-2, change_accuracy=1e-3)
    assert tight.panels > loose.panels
    worst = (tight.change_error / tight.scale).max() / np.abs(tight.change / tight.scale).max()
    assert worst <= 1e-3


def test_panels_run_out() -> None:
    found = compared(plates(0.1), plates(0.1001), max_panels=120)
    assert not found.converged
    assert found.stopped_by == "max-panels"
    assert not found.before.converged
    sharp = compared(plates(0.1), plates(0.1001))
    assert np.all(np.abs(found.change - sharp.change) <= found.change_error + sharp.change_error)


def test_memory_is_planned_for_both() -> None:
    """A limit that one scene's start just meets refuses two of them."""
    start = bem.extract(scene_of(plates(0.1)), threads=1).rounds[0].panels
    with pytest.raises(bem.MemoryRefused, match="--memory"):
        compared(plates(0.1), plates(0.1001), memory=40 * start**2)


def test_rounded_input_of_a_moved_body_is_counted(tmp_path: Path) -> None:
    """What did not change was rounded alike; what was drawn anew was not."""
    low, high = moved(shapes.box(1, 1, 1)), moved(at(shapes.box(1, 1, 1), 1.2))
    there = at(high, 0.0012)
    (tmp_path / "after").mkdir()
    before = scene_from_files(tmp_path, [low, high])
    found = compare(before, scene_from_files(tmp_path / "after", [low, there]), threads=1)
    sharp = compared([low, high], [low, there])
    assert found.correlated
    extra = found.change_error - sharp.change_error
    assert extra[0, 0] < extra[1, 1]
    assert extra[1, 1] >= 0.1 * found.before.budget["input rounding"][1, 1] > 0.0
    assert np.all(np.abs(found.change - sharp.change) <= found.change_error)


@pytest.mark.parametrize(
    ("options", "words"),
    [
        ({"tolerance": 0.0}, "tolerance"),
        ({"change_accuracy": 0.0}, "change_accuracy: found 0.0"),
        ({"change_accuracy": "tight"}, "change_accuracy: found 'tight'"),
        ({"max_panels": 0}, "max_panels"),
        ({"memory": 0}, "memory"),
        ({"threads": 0}, "threads"),
    ],
)
def test_settings_out_of_range(options: dict[str, object], words: str) -> None:
    with pytest.raises(bem.UsageError, match=words):
        compared(plates(0.1), plates(0.2), **options)


def test_other_conductors_are_named() -> None:
    with pytest.raises(bem.UsageError, match='only in the first: "c1"'):
        compared(plates(0.1), plates(0.1)[:1])
    with pytest.raises(bem.UsageError, match='only in the second: "c2"'):
        compared(three(0.0)[:2], three(0.0))


def test_sides_that_are_neither_scene_nor_result() -> None:
    with pytest.raises(bem.UsageError, match="found str, needs a Scene"):
        compare("a.toml", scene_of(plates(0.1)))  # type: ignore[arg-type]


def test_a_scene_that_cannot_be_solved() -> None:
    with pytest.raises(bem.GeometryError, match="touch"):
        compared(plates(0.1), plates(0.0))


def ball_of_facets(scene: bem.Scene, smooth: bool | None, z: float) -> None:
    """Add a ball of 320 flat triangles, which may stand for the smooth one."""
    body = replace(at(icosphere(2), z), smooth=smooth)
    scene.add_conductor(f"ball {len(scene.conductors)}", body)


@pytest.mark.parametrize("smooth", [None, True])
def test_facets_that_stand_for_a_ball(smooth: bool | None) -> None:
    """Whether fitted or doubted, the bar of the change holds for true balls."""
    before, after = bem.Scene(unit="m"), bem.Scene(unit="m")
    for scene, distance in ((before, 3.0), (after, 3.003)):
        ball_of_facets(scene, smooth, 0.0)
        ball_of_facets(scene, smooth, distance)
    found = compare(before, after, 1e-2, threads=1)
    assert found.correlated
    exact = two_spheres(1, 1, 3.003) - two_spheres(1, 1, 3.0)
    apart = np.abs(in_lengths(found.change) - exact)
    assert np.all(apart <= in_lengths(found.change_error))
    part = 0.02 if smooth else 0.1
    assert np.all(found.change_error <= part * np.abs(found.change))


def over_ground(height: float, ground: float = 0.0) -> bem.Scene:
    """Ball of radius 1 over a grounded plane."""
    scene = scene_of([at(shapes.sphere(1.0), height)])
    scene.set_ground_plane(z=ground)
    return scene


def ball_over_plane(height: float) -> np.ndarray:
    """Ball and image at opposite potentials: C_11 - C_12 of two spheres (images, Maxwell)."""
    pair = two_spheres(1.0, 1.0, 2.0 * height)
    return np.array([[pair[0, 0] - pair[0, 1]]])


@pytest.mark.parametrize(("height", "ground"), [(1.2012, 0.0), (1.2, -0.0012)])
def test_a_ball_rises_or_the_grounded_plane_sinks(height: float, ground: float) -> None:
    found = compare(over_ground(1.2), over_ground(height, ground), 1e-2, threads=1)
    check_change(found, ball_over_plane(1.2012) - ball_over_plane(1.2))
    assert "ground_plane_m" in found.before.settings


def test_a_grounded_plane_comes_in() -> None:
    scene = scene_of([at(shapes.sphere(1.0), 4.0)])
    check_change(
        compare(scene, over_ground(4.0), 1e-2, threads=1), ball_over_plane(4.0) - np.array([[1.0]])
    )


def test_half_a_cube_beside_a_mirror_plane_grows() -> None:
    before, after = scene_of([shapes.box(1, 1, 1)]), scene_of([shapes.box(1.001, 1.001, 1.001)])
    for scene in (before, after):
        scene.add_mirror_plane(x=0.0)
    found = compare(before, after, threads=1)
    check_change(found, np.array([[0.001 * CUBE]]))
    whole = compare(scene_of([shapes.box(1, 1, 1)]), scene_of([shapes.box(1.001, 1.001, 1.001)]))
    assert found.panels < whole.panels


def test_states_are_noted() -> None:
    before, after = (scene_of(plates(g)) for g in (0.1, 0.1001))
    for scene in (before, after):
        scene.add_conductor("shield", shapes.plate(2, 2, (0, 0, 0.5)), state="grounded")
    found = compare(before, after, threads=1)
    assert found.conductors == ("c0", "c1", "shield")
    assert found.after.states == ("terminal", "terminal", "grounded")
    assert "grounded, floating or tied" in found.notes[0]
