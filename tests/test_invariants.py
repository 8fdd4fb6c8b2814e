"""What holds for every scene: symmetry, signs, scaling, and indifference to its description."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from made_bodies import cube
from scenes import scene_of

import bem
from bem.geometry import shapes
from bem.geometry.surface import NO_CORNER, Surface
from bem.scene.placing import rotation

TOLERANCE = 1e-2
few = settings(max_examples=6, deadline=None, derandomize=True)
seeds = st.integers(0, 10**6)


def solved(surfaces: list[Surface], **medium: float) -> bem.CapacitanceResult:
    """Extract at the loose tolerance of these tests, in metres."""
    scene = scene_of(surfaces)
    return bem.extract(replace(scene, **medium), tolerance=TOLERANCE, threads=1)


def bodies(seed: int, count: int) -> list[Surface]:
    """Bodies of three kinds, one in each of ``count`` cells, none touching another."""
    random = np.random.default_rng(seed)
    made = []
    for cell in random.permutation(8)[:count]:
        kind = int(random.integers(3))
        size = random.uniform(0.3, 0.9, 3) / np.sqrt(3.0)
        body = (
            shapes.box(*size),
            shapes.plate(size[0], size[1]),
            cube(float(size[0])),
        )[kind]
        axis = tuple(random.normal(size=3).tolist())
        place = np.array([cell & 1, cell >> 1 & 1, cell >> 2], dtype=float)
        made.append(body.placed(rotation(axis, random.uniform(0, 360)), place))
    return made


def close_to(values: np.ndarray) -> object:
    """Equal up to rounding."""
    return pytest.approx(values, rel=1e-9, abs=0.0)


def same(first: np.ndarray, second: np.ndarray, bars: np.ndarray) -> bool:
    """Whether two matrices agree within their bars."""
    return bool(np.all(np.abs(first - second) <= bars))


@given(seeds, st.integers(2, 4))
@few
def test_maxwell_signs_and_reciprocity(seed: int, count: int) -> None:
    """Entries as every Maxwell matrix has them; reciprocity is judged before averaging."""
    result = solved(bodies(seed, count))
    off = ~np.eye(count, dtype=bool)
    assert result.converged
    assert np.all(result.capacitance[off] < 0.0)
    assert np.all(result.row_sum > 0.0)
    assert np.linalg.eigvalsh(result.capacitance)[0] > 0.0
    assert result.row_sum == close_to(result.capacitance.sum(axis=1))
    found = result.audit["asymmetry_before_averaging"]
    assert found["ok"] and 0.0 <= found["value"] <= 1e-3


@given(seeds, seeds)
@few
def test_turning_and_shifting_changes_nothing(seed: int, turn: int) -> None:
    random = np.random.default_rng(turn)
    axis = tuple(random.normal(size=3).tolist())
    matrix, shift = rotation(axis, random.uniform(0, 360)), random.uniform(-100, 100, 3)
    here = bodies(seed, 2)
    first = solved(here)
    second = solved([s.placed(matrix, shift) for s in here])
    assert same(first.capacitance, second.capacitance, first.error + second.error)


@given(seeds, st.sampled_from([1e-9, 1e-6, 1e-3, 1e3]))
@few
def test_capacitance_is_proportional_to_length(seed: int, factor: float) -> None:
    """From nanometres to kilometres the very same digits, up to rounding and its decisions."""
    here = bodies(seed, 2)
    first = solved(here)
    second = solved([s.placed(factor * np.eye(3), np.zeros(3)) for s in here])
    assert second.panels == first.panels
    assert same(first.capacitance, second.capacitance / factor, 1e-7 * first.capacitance.max())


def test_units_are_lengths_only() -> None:
    """One body given in several units: C in farad is that of its size in metres."""
    values = []
    for unit, size in (("m", 1e-3), ("mm", 1.0), ("um", 1e3), ("nm", 1e6), ("mil", 1e-3 / 2.54e-5)):
        scene = bem.Scene(unit=unit).add_conductor("cube", shapes.box(size, size, size))
        values.append(bem.extract(scene, tolerance=TOLERANCE, threads=1).capacitance[0, 0])
    assert values == close_to(np.full(5, values[0]))


@given(seeds, st.floats(1.0, 80.0))
@few
def test_capacitance_is_proportional_to_permittivity(seed: int, permittivity: float) -> None:
    here = bodies(seed, 2)
    vacuum, medium = solved(here), solved(here, relative_permittivity=permittivity)
    assert medium.capacitance == close_to(permittivity * vacuum.capacitance)
    assert medium.error == close_to(permittivity * vacuum.error)


@given(seeds)
@few
def test_another_conductor_never_lowers_a_diagonal_entry(seed: int) -> None:
    """Nor raises the capacitance of those there to the surroundings."""
    three = bodies(seed, 3)
    two, more = solved(three[:2]), solved(three)
    slack = np.diag(two.error) + np.diag(more.error)[:2]
    assert np.all(np.diag(more.capacitance)[:2] >= np.diag(two.capacitance) - slack)
    rows = two.row_sum_error + more.row_sum_error[:2]
    assert np.all(more.row_sum[:2] <= two.row_sum + rows)
    assert np.all(more.capacitance[:2, :2] >= two.capacitance - two.error - more.error[:2, :2])


@given(seeds)
@few
def test_orientation_of_faces_is_irrelevant(seed: int) -> None:
    """Random faces turned inside out: the very same numbers."""
    here = cube()
    flip = np.random.default_rng(seed).random(12) < 0.5
    faces = here.faces.copy()
    faces[flip] = np.column_stack([here.faces[flip][:, [0, 2, 1]], np.full(flip.sum(), NO_CORNER)])
    plate = shapes.plate(1.0, 1.0, (0.0, 0.0, 0.7))
    upside_down = Surface(plate.vertices, plate.faces[:, ::-1])
    first = solved([here, plate])
    second = solved([Surface(here.vertices, faces), upside_down])
    assert same(first.capacitance, second.capacitance, first.error + second.error)
    assert abs(second.panels - first.panels) < 0.2 * first.panels


@given(seeds)
@few
def test_order_of_conductors_is_irrelevant(seed: int) -> None:
    three = bodies(seed, 3)
    order = np.random.default_rng(seed + 1).permutation(3)
    first, second = solved(three), solved([three[k] for k in order])
    swapped = first.capacitance[np.ix_(order, order)]
    bars = first.error[np.ix_(order, order)] + second.error
    assert same(second.capacitance, swapped, bars)


@given(seeds, st.floats(1.05, 2.0))
@few
def test_a_bigger_body_has_more(seed: int, factor: float) -> None:
    """One body inside the other, as boxes about one centre."""
    size = np.random.default_rng(seed).uniform(0.2, 1.0, 3)
    grown = size * [factor, 1.0 + 0.5 * (factor - 1.0), 1.0]
    small, big = solved([shapes.box(*size)]), solved([shapes.box(*grown)])
    assert big.capacitance[0, 0] > small.capacitance[0, 0] - small.error[0, 0] - big.error[0, 0]
    hull = solved([shapes.box(*(1.2 * grown))])
    assert hull.capacitance[0, 0] > 1.1 * big.capacitance[0, 0]


@given(seeds)
@few
def test_a_box_in_a_shell_is_sound_at_a_thousandth(seed: int) -> None:
    """Row sums that ought to be zero may come out below: the bar then reaches zero."""
    inner = [s.placed(0.3 * np.eye(3), np.full(3, -0.15)) for s in bodies(seed, 1)]
    scene = scene_of([*inner, shapes.box(1.5, 1.5, 1.5)], shells=(1,))
    result = bem.extract(scene, tolerance=1e-3, threads=1)
    assert result.converged
    assert result.row_sum[0] + result.row_sum_error[0] >= 0.0
    assert abs(result.row_sum[0]) <= 2e-3 * result.capacitance[0, 0]


@given(seeds)
@few
def test_mirror_images_have_equal_entries(seed: int) -> None:
    """A body and its mirror image: equal diagonal entries within their bars."""
    body = bodies(seed, 1)[0].placed(np.eye(3), np.array([2.0, 0.0, 0.0]))
    image = Surface(body.vertices * (-1.0, 1.0, 1.0), body.faces)
    result = solved([body, image])
    apart = abs(result.capacitance[0, 0] - result.capacitance[1, 1])
    assert apart <= result.error[0, 0] + result.error[1, 1]


@given(seeds)
@few
def test_a_shell_screens_what_is_inside(seed: int) -> None:
    """Inside a closed shell rows sum to zero, as far as the tolerance; outside, it is alone."""
    inner = [s.placed(0.3 * np.eye(3), np.full(3, -0.15)) for s in bodies(seed, 1)]
    outer = shapes.box(1.5, 1.5, 1.5)
    scene = scene_of([*inner, outer], shells=(1,))
    result = bem.extract(scene, tolerance=TOLERANCE, threads=1)
    alone = solved([outer])
    assert abs(result.row_sum[0]) <= 2.0 * TOLERANCE * result.capacitance[0, 0]
    apart = abs(result.row_sum.sum() - alone.capacitance[0, 0])
    assert apart <= 2.0 * TOLERANCE * alone.capacitance[0, 0]
