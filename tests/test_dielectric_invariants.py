"""What holds for every scene with dielectrics: symmetry, scaling, and indifference to drawing."""

from __future__ import annotations

import numpy as np
import pytest
from dielectric_scenes import Filling, bars_meet, rough_box, solve, turned_by, with_dielectrics
from scenes import scene_of

import bem
from bem.geometry import shapes
from bem.geometry.surface import Surface

TOLERANCE = 1e-2


def boxes(permittivity: float = 6.0) -> tuple[list[Surface], list[Filling]]:
    """Box on a wider block, a sheet beside it on the block, and a block in the air above."""
    metal = shapes.box(0.8, 0.8, 0.4, (-0.5, 0.0, 0.2))
    sheet = shapes.plate(0.6, 0.8, (0.6, 0.0, 0.0))
    board = shapes.box(2.4, 1.6, 0.4, (0.0, 0.0, -0.2))
    cover = shapes.box(0.5, 0.5, 0.3, (0.6, 0.1, 0.5))
    return [metal, sheet], [(board, permittivity), (cover, 3.0)]


def solved(
    conductors: list[Surface], fillings: list[Filling], tolerance: float = TOLERANCE
) -> bem.CapacitanceResult:
    return solve(with_dielectrics(conductors, fillings), tolerance)


def placed(matrix: np.ndarray, shift: np.ndarray) -> tuple[list[Surface], list[Filling]]:
    """Both lists of ``boxes``, moved."""
    metal, fillings = boxes()
    moved = [surface.placed(matrix, shift) for surface in metal]
    return moved, [(surface.placed(matrix, shift), er) for surface, er in fillings]


@pytest.fixture(scope="module")
def plain() -> bem.CapacitanceResult:
    """Boxes as they are drawn."""
    return solved(*boxes())


def test_signs_and_reciprocity(plain: bem.CapacitanceResult) -> None:
    """Entries as every Maxwell matrix has them; reciprocity is judged before averaging."""
    assert plain.converged
    assert plain.capacitance[0, 1] < 0.0
    assert np.all(plain.row_sum > 0.0)
    assert np.linalg.eigvalsh(plain.capacitance)[0] > 0.0
    found = plain.audit["asymmetry_before_averaging"]
    assert found["ok"] and 0.0 <= found["value"] <= TOLERANCE


@pytest.mark.parametrize("seed", [1, 2])
def test_turning_and_shifting_changes_nothing(plain: bem.CapacitanceResult, seed: int) -> None:
    move, (metal, fillings) = turned_by(seed), boxes()
    turned = solved([move(s) for s in metal], [(move(s), er) for s, er in fillings])
    bars_meet(plain, turned)


@pytest.mark.parametrize("factor", [1e-6, 1e3])
def test_capacitance_is_proportional_to_length(plain: bem.CapacitanceResult, factor: float) -> None:
    """The same panels, up to rounding and its decisions."""
    scaled = solved(*placed(factor * np.eye(3), np.zeros(3)))
    assert abs(scaled.panels - plain.panels) <= 0.05 * plain.panels
    apart = np.abs(scaled.capacitance / factor - plain.capacitance)
    assert np.all(apart <= 0.2 * plain.error)


def test_only_ratios_of_permittivity_count(plain: bem.CapacitanceResult) -> None:
    """All media times 2.5: so is the capacitance."""
    metal, fillings = boxes()
    scene = bem.Scene(unit="m", relative_permittivity=2.5)
    for k, surface in enumerate(metal):
        scene.add_conductor(f"c{k}", surface)
    for k, (surface, er) in enumerate(fillings):
        scene.add_dielectric(f"d{k}", surface, relative_permittivity=2.5 * er)
    raised = solve(scene, TOLERANCE)
    assert raised.capacitance == pytest.approx(2.5 * plain.capacitance, rel=1e-9, abs=0.0)


def test_permittivity_of_the_surroundings_is_no_dielectric() -> None:
    """1.0 everywhere: as without dielectrics, for touching and for separate bodies."""
    metal, fillings = boxes()
    empty = solved(metal, [(surface, 1.0) for surface, _ in fillings], 1e-3)
    alone = solve(scene_of(metal), 1e-3)
    bars_meet(empty, alone)


def test_two_halves_are_one_body() -> None:
    """A block cut in two touching pieces of one permittivity, meshed differently."""
    metal = [shapes.box(0.8, 0.8, 0.4, (0.1, 0.0, 0.2))]
    whole = solved(metal, [(shapes.box(2.0, 1.6, 0.5, (0.0, 0.0, -0.25)), 10.0)])
    left = rough_box((1.2, 1.6, 0.5), (-0.4, 0.0, -0.25), 2, seed=6)
    right = shapes.box(0.8, 1.6, 0.5, (0.6, 0.0, -0.25))
    bars_meet(whole, solved(metal, [(left, 10.0), (right, 10.0)]))


def test_overlap_is_settled_by_precedence() -> None:
    """A later body displaces an earlier one, a conductor both: as if they were cut to fit."""
    metal = [shapes.box(0.6, 0.6, 0.6, (0.0, 0.0, 0.0))]
    low = shapes.box(1.4, 1.4, 0.7, (0.0, 0.0, -0.35))
    high = shapes.box(1.4, 1.4, 0.5, (0.0, 0.0, 0.25))
    cut = solved(metal, [(low, 4.0), (high, 9.0)])
    deep = shapes.box(1.4, 1.4, 1.2, (0.0, 0.0, -0.1))
    bars_meet(cut, solved(metal, [(deep, 4.0), (high, 9.0)]))


def test_order_of_bodies_that_do_not_overlap_is_irrelevant(plain: bem.CapacitanceResult) -> None:
    metal, fillings = boxes()
    other = solved(metal[::-1], fillings[::-1])
    apart = np.abs(other.capacitance[::-1, ::-1] - plain.capacitance)
    assert np.all(apart <= other.error + plain.error[::-1, ::-1])


def test_orientation_of_faces_is_irrelevant(plain: bem.CapacitanceResult) -> None:
    """Bodies turned inside out are the same bodies."""
    metal, fillings = boxes()
    inside_out = [(Surface(s.vertices, s.faces[:, ::-1]), er) for s, er in fillings]
    bars_meet(plain, solved([Surface(s.vertices, s.faces[:, ::-1]) for s in metal], inside_out))


def test_more_permittivity_never_lowers_a_diagonal_entry() -> None:
    """Nor the sum of the whole matrix, which is that of all conductors joined."""
    values = [solved(*boxes(er)) for er in (1.5, 6.0, 60.0)]
    for small, large in zip(values[:-1], values[1:], strict=True):
        slack = np.diag(small.error) + np.diag(large.error)
        assert np.all(np.diag(large.capacitance) >= np.diag(small.capacitance) - slack)
        assert large.row_sum.sum() > small.row_sum.sum()


def test_high_contrast_tends_to_a_floating_conductor() -> None:
    """Permittivity 1e5 of a block that touches nothing: as if it were metal without charge."""
    metal = shapes.box(1.0, 1.0, 1.0)
    block = shapes.box(0.8, 0.8, 0.8, (1.2, 0.1, 0.0))
    filled = solved([metal], [(block, 1e5)], 3e-3)
    scene = bem.Scene(unit="m").add_conductor("metal", metal)
    scene.add_conductor("block", block, state="floating")
    floating = solve(scene, 3e-3).terminals
    assert filled.converged
    apart = abs(filled.capacitance[0, 0] - floating.capacitance[0, 0])
    assert apart <= filled.error[0, 0] + floating.error[0, 0] + 1e-4 * floating.capacitance[0, 0]


def test_a_grounded_plane_is_an_image_of_dielectrics_too() -> None:
    """A board on a grounded plane: half of the board doubled, with opposite potentials."""
    pad = shapes.plate(0.6, 0.8, (0.0, 0.0, 0.4))
    board = shapes.box(1.2, 1.4, 0.4, (0.0, 0.0, 0.2))
    over = with_dielectrics([pad], [(board, 6.0)]).set_ground_plane(z=0.0)
    half = solve(over)
    mirrored = shapes.plate(0.6, 0.8, (0.0, 0.0, -0.4))
    double = solve(with_dielectrics([pad, mirrored], [(shapes.box(1.2, 1.4, 0.8), 6.0)]))
    exact = double.capacitance[0, 0] - double.capacitance[0, 1]
    bar = half.error[0, 0] + double.error[0, 0] + double.error[0, 1]
    assert half.converged and double.converged
    assert abs(half.capacitance[0, 0] - exact) <= bar
