"""Values known from outside the package, on files and shapes, with limits on the panels.

Sources are named in the records of ``reference_values``; what no record holds is checked
against bounds that are theorems and against a tighter run.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from made_bodies import cube
from reference_formulas import (
    box_half_mean_width,
    cylinder_fit,
    cylinder_half_mean_width,
    plate_bound,
    volume_radius,
)
from reference_values import BY_NAME
from scenes import (
    AXIS,
    check,
    in_lengths,
    meshed_box,
    meshed_plate,
    moved,
    one_quad_per_face,
    scene_from_files,
    scene_of,
    scene_of_reference,
    sliver_plate,
    slivers,
)

import bem
from bem.geometry import shapes
from bem.geometry.surface import Surface
from bem.scene.placing import rotation

RECORDS = (
    "unit cube, published",
    "unit cube",
    "unit square",
    "rectangle 1 x 2",
    "solid cylinder, half length 0.25",
    "solid cylinder, half length 1",
    "solid cylinder, half length 4",
    "open tube, half length 1",
    "annulus 0.5, 1",
    "two unit plates, gap 0.01",
    "two unit plates, gap 0.1",
    "two unit plates, gap 1",
    "two thick discs",
    "guard ring",
    "sphere over a plane, height 1.1",
    "sphere over a plane, height 2",
)
CUBES = {
    "12 triangles": cube(),
    "fine": meshed_box(6),
    "irregular": meshed_box(4, jitter=0.3, seed=1),
    "slivers": slivers(30),
}
SHEETS = {
    "2 triangles": meshed_plate(1),
    "fine": meshed_plate(8),
    "irregular": meshed_plate(7, jitter=0.3, seed=2),
    "slivers": sliver_plate(30),
}
CUBE, SQUARE = BY_NAME["unit cube"].matrix, BY_NAME["unit square"].matrix


@pytest.mark.parametrize("name", RECORDS)
def test_records_at_a_thousandth(name: str) -> None:
    record = BY_NAME[name]
    result = bem.extract(scene_of_reference(record), tolerance=1e-3, threads=1)
    check(result, record.matrix, record.uncertainty)


@pytest.mark.parametrize("degrees", [0.0, 37.0])
@pytest.mark.parametrize("name", CUBES)
def test_cube_from_a_file_at_a_thousandth(tmp_path: Path, name: str, degrees: float) -> None:
    """However it is meshed, turned and shifted: the same value with at most 700 panels."""
    scene = scene_from_files(tmp_path, [moved(CUBES[name], degrees)])
    result = bem.extract(scene, tolerance=1e-3, threads=1)
    check(result, CUBE, 0.0)
    assert result.panels <= 700


@pytest.mark.parametrize("name", ["12 triangles", "irregular"])
def test_cube_from_a_file_at_a_ten_thousandth(tmp_path: Path, name: str) -> None:
    scene = scene_from_files(tmp_path, [moved(CUBES[name], 71.0)])
    result = bem.extract(scene, tolerance=1e-4, threads=1)
    check(result, CUBE, 0.0)
    assert result.panels <= 1500


def test_cube_at_a_hundred_thousandth() -> None:
    """Against the ten digits of Helsing and Perfekt (from memory), with at most 6000 panels."""
    scene = scene_of([shapes.box(1.0, 1.0, 1.0)])
    result = bem.extract(scene, tolerance=1e-5, threads=1)
    check(result, CUBE, 0.0)
    assert result.panels <= 6000


@pytest.mark.parametrize("tolerance", [1e-2, 1e-3, 1e-4])
def test_cube_of_one_quadrilateral_per_face(tolerance: float) -> None:
    """The coarsest mesh there is does not stall."""
    result = bem.extract(scene_of([one_quad_per_face()]), tolerance=tolerance, threads=1)
    check(result, CUBE, 0.0)


@pytest.mark.parametrize("degrees", [0.0, 37.0])
@pytest.mark.parametrize("name", SHEETS)
def test_sheet_from_a_file_at_a_ten_thousandth(tmp_path: Path, name: str, degrees: float) -> None:
    scene = scene_from_files(tmp_path, [moved(SHEETS[name], degrees)])
    result = bem.extract(scene, tolerance=1e-4, threads=1)
    check(result, SQUARE, BY_NAME["unit square"].uncertainty)
    assert result.panels <= 1500


def above(surface: Surface, gap: float, aside: float = 0.0, degrees: float = 0.0) -> Surface:
    """Turn a body about z and move it up and aside."""
    return surface.placed(rotation((0.0, 0.0, 1.0), degrees), np.array([aside, 0.0, gap]))


def block(center: tuple[float, float, float] = (0.0, 0.0, 0.0)) -> Surface:
    return shapes.box(1.0, 1.0, 0.1, center)


@pytest.mark.parametrize("mesh", ["2 triangles", "irregular"])
@pytest.mark.parametrize("gap", [0.1, 0.01])
@pytest.mark.parametrize("degrees", [0.0, 37.0])
def test_plates_from_files(tmp_path: Path, mesh: str, gap: float, degrees: float) -> None:
    """Aligned plates, turned in space together, within 800 panels."""
    record = BY_NAME[f"two unit plates, gap {gap:g}"]
    pair = [moved(SHEETS[mesh], degrees), moved(above(SHEETS[mesh], gap), degrees)]
    result = bem.extract(scene_from_files(tmp_path, pair), tolerance=1e-3, threads=1)
    check(result, record.matrix, record.uncertainty)
    assert result.panels <= 800


def between_plates(result: bem.CapacitanceResult) -> tuple[float, float]:
    """Charge per volt between two equal plates at opposite potentials, and its bar, in L."""
    opposite = np.array([0.5, -0.5])
    value = opposite @ in_lengths(result.capacitance) @ opposite
    return float(value), float(0.25 * in_lengths(result.error).sum())


def check_close_plates(result: bem.CapacitanceResult, gap: float) -> None:
    """Between area / gap and that with Kirchhoff's fringe (1877) along the rim, enlarged.

    Both plates together have the capacitance of one thin body, which is bounded as well.
    """
    value, bar = between_plates(result)
    ideal = 1.0 / (4.0 * np.pi * gap)
    fringe = 4.0 * gap * np.log(2.0 * np.pi * np.e / gap) / (2.0 * np.pi)
    assert ideal - bar <= value <= ideal * (1.0 + fringe) + bar
    outside = in_lengths(result.row_sum).sum()
    slack = in_lengths(result.row_sum_error).sum()
    assert SQUARE[0, 0] - slack <= outside <= box_half_mean_width((1.0, 1.0, gap)) + slack


@pytest.mark.parametrize("mesh", ["2 triangles", "irregular"])
@pytest.mark.parametrize("gap", [1e-3, 1e-5])
def test_plates_very_close(mesh: str, gap: float) -> None:
    result = bem.extract(scene_of([SHEETS[mesh], above(SHEETS[mesh], gap)]), threads=1)
    assert result.converged and result.panels <= 800
    assert between_plates(result)[1] <= 1e-3 * between_plates(result)[0] * 1.01
    check_close_plates(result, gap)


@pytest.mark.parametrize("mesh", ["2 triangles", "irregular"])
def test_plates_very_close_from_files(tmp_path: Path, mesh: str) -> None:
    pair = [SHEETS[mesh], above(SHEETS[mesh], 1e-3)]
    result = bem.extract(scene_from_files(tmp_path, pair), threads=1)
    assert result.converged and result.panels <= 800
    check_close_plates(result, 1e-3)


def test_rounded_files_cannot_tell_a_tiny_gap(tmp_path: Path) -> None:
    """Single precision leaves a gap of 1e-5 uncertain: the bar says so, and it is marked."""
    pair = [moved(meshed_plate(1)), moved(above(meshed_plate(1), 1e-5))]
    result = bem.extract(scene_from_files(tmp_path, pair), threads=1)
    assert not result.converged and result.stopped_by == "input-rounding"
    value, bar = between_plates(result)
    assert abs(value - 1e5 / (4.0 * np.pi)) <= bar + 1e-4 * value


PAIRS = {
    "plates offset by half, gap 0.1": (shapes.plate(1.0, 1.0), 0.1, {"aside": 0.5}),
    "plates offset by half, gap 0.01": (shapes.plate(1.0, 1.0), 0.01, {"aside": 0.5}),
    "plates offset by half, gap 0.001": (shapes.plate(1.0, 1.0), 0.001, {"aside": 0.5}),
    "strip over a plate, gap 0.005": (shapes.plate(0.02, 1.0), 0.005, {}),
    "strip over a plate, gap 0.001": (shapes.plate(0.02, 1.0), 0.001, {}),
    "irregular plates, offset": (meshed_plate(5, 0.3, 3), 0.01, {"aside": 0.5}),
    "plates turned by 30 degrees, gap 0.1": (shapes.plate(1.0, 1.0), 0.1, {"degrees": 30.0}),
}
BOXES = {
    "boxes, gap 0.01": [block(), block((0.0, 0.0, 0.11))],
    "boxes, gap 0.001": [block(), block((0.0, 0.0, 0.101))],
    "boxes offset by half, gap 0.01": [block(), block((0.5, 0.0, 0.11))],
    "boxes at an edge": [block(), block((1.01, 0.0, 0.0))],
}
CASES = {
    name: [shapes.plate(1.0, 1.0), above(other, gap, **how)]
    for name, (other, gap, how) in PAIRS.items()
} | BOXES


def bars_meet(result: bem.CapacitanceResult, tight: bem.CapacitanceResult) -> None:
    """Require two results to agree within both bars, in every entry and row sum."""
    apart = np.abs(result.capacitance - tight.capacitance)
    assert np.all(apart <= result.error + tight.error)
    size = np.sqrt(np.diag(tight.capacitance))
    assert np.all(apart <= (result.tolerance + tight.tolerance) * np.outer(size, size))
    rows = np.abs(result.row_sum - tight.row_sum)
    assert np.all(rows <= result.row_sum_error + tight.row_sum_error)


@pytest.mark.parametrize("name", CASES)
def test_close_pairs_agree_with_a_tighter_run(name: str) -> None:
    """Turned in space at 1e-3 against a run with another mesh at 1e-4."""
    scene = scene_of([moved(s) for s in CASES[name]])
    result = bem.extract(scene, tolerance=1e-3, threads=1)
    tight = bem.extract(scene_of(CASES[name]), tolerance=1e-4, threads=1)
    assert result.converged and tight.converged
    assert result.panels <= 800
    bars_meet(result, tight)


@pytest.mark.parametrize("half_length", [0.5, 2.0])
def test_cylinders_agree_with_the_published_fit(half_length: float) -> None:
    """Smythe (J. Appl. Phys. 27, 917, 1956; 33, 2966, 1962): his fit holds within 0.6 %."""
    rod = shapes.cylinder(1.0, 2.0 * half_length)
    result = bem.extract(scene_of([rod]), tolerance=1e-3, threads=1)
    fit = cylinder_fit(1.0, half_length)
    assert abs(in_lengths(result.capacitance[0, 0]) / fit - 1.0) < 6e-3 + 1e-3


BOUNDED = {
    "box 1 x 2 x 3": (
        shapes.box(1.0, 2.0, 3.0),
        volume_radius(6.0),
        box_half_mean_width((1, 2, 3)),
    ),
    "slab": (shapes.box(1.0, 1.0, 0.05), plate_bound(1.0), box_half_mean_width((1, 1, 0.05))),
    "rectangle": (shapes.plate(1.0, 3.0), plate_bound(3.0), box_half_mean_width((1, 3, 0))),
    "cylinder": (
        shapes.cylinder(1.0, 3.0),
        volume_radius(3.0 * np.pi),
        cylinder_half_mean_width(1.0, 1.5),
    ),
}


@pytest.mark.parametrize("name", BOUNDED)
def test_isoperimetric_bounds(name: str) -> None:
    """Polya and Szego (1951): above the ball or disc of its size, below half the mean width."""
    surface, low, high = BOUNDED[name]
    result = bem.extract(scene_of([surface]), tolerance=1e-3, threads=1)
    assert low < in_lengths(result.capacitance[0, 0]) < high


AWKWARD = {
    "strip of 1000 : 1": [shapes.plate(1000.0, 1.0)],
    "rod of 100 : 1": [shapes.box(100.0, 1.0, 1.0)],
    "needle triangles": [sliver_plate(500)],
    "sizes of 1 to 10000": [shapes.box(1.0, 1.0, 1.0), shapes.box(1e-4, 1e-4, 1e-4, (0, 0, 0.51))],
}


@pytest.mark.parametrize("name", AWKWARD)
def test_awkward_bodies_converge(name: str) -> None:
    result = bem.extract(scene_of([moved(s) for s in AWKWARD[name]]), tolerance=1e-3, threads=1)
    tight = bem.extract(scene_of(AWKWARD[name]), tolerance=1e-4, threads=1)
    assert result.converged
    assert np.linalg.eigvalsh(result.capacitance)[0] > 0.0
    bars_meet(result, tight)


def test_plate_with_a_corner_just_off_its_edge() -> None:
    """A point 1e-9 beside an edge of the file changes nothing."""
    points = [(0, 0, 0), (1, 0, 0), (1, 1, 0), (0, 1, 0), (0.5, 1e-9, 0)]
    faces = [(0, 4, 3, -1), (4, 2, 3, -1), (4, 1, 2, -1)]
    nicked = Surface(np.array(points, dtype=float), np.array(faces))
    nicked = nicked.placed(rotation(AXIS, 11.0), np.zeros(3))
    check(bem.extract(scene_of([nicked]), tolerance=1e-3, threads=1), SQUARE, 2e-7)
