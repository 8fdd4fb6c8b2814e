"""The demo scenes are what their drawings say, solve, and show their symmetries."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

import bem
from bem.results.result import CapacitanceResult

MESHES = Path(__file__).parent.parent / "meshes"

SIZES_MM = {
    "grain_hopper": {
        "hopper": ((-120, -120, 0), (120, 120, 300)),
        "probe rod": ((-5, -5, 90), (5, 5, 300)),
        "guard sleeve": ((-10, -10, 230), (10, 10, 290)),
    },
    "touch_pad": {
        "row 1": ((-11, -8.5, 2), (11, -5.5, 2)),
        "row 2": ((-11, -1.5, 2), (11, 1.5, 2)),
        "row 3": ((-11, 5.5, 2), (11, 8.5, 2)),
        "column 1": ((-8.5, -11, 1.5), (-5.5, 11, 1.5)),
        "column 2": ((-1.5, -11, 1.5), (1.5, 11, 1.5)),
        "column 3": ((5.5, -11, 1.5), (8.5, 11, 1.5)),
        "back plate": ((-13, -13, 0), (13, 13, 0)),
    },
    "busbars": {
        "heat sink": ((-45, -40, 0), (45, 40, 33)),
        "positive bar": ((-30, -60, 35), (-10, 60, 40)),
        "negative bar": ((10, -60, 35), (30, 60, 40)),
    },
}

MIRRORED = {
    "touch_pad": (("row 1", "row 3"), ("column 1", "column 3")),
    "busbars": (("positive bar", "negative bar"),),
}


def scene_file(name: str) -> Path:
    return MESHES / name / f"{name}.toml"


@pytest.fixture(scope="module")
def solved() -> dict[str, CapacitanceResult]:
    return {
        name: bem.extract(bem.load_scene(scene_file(name)), tolerance=1e-2, threads=1)
        for name in SIZES_MM
    }


def test_the_script_writes_the_kept_files(tmp_path: Path) -> None:
    subprocess.run([sys.executable, MESHES / "make_demos.py", tmp_path], check=True)
    made = {path.relative_to(tmp_path): path.read_bytes() for path in tmp_path.glob("*/*.*")}
    kept = {
        path.relative_to(MESHES): path.read_bytes()
        for path in MESHES.glob("*/*")
        if path.suffix in (".stl", ".msh")
    }
    assert made == kept


@pytest.mark.parametrize("name", SIZES_MM)
def test_conductors_are_where_the_drawing_says(name: str) -> None:
    scene = bem.load_scene(scene_file(name))
    found = {conductor.name: conductor.surface.bounds * 1e3 for conductor in scene.conductors}
    assert found.keys() == SIZES_MM[name].keys()
    for conductor, box in SIZES_MM[name].items():
        np.testing.assert_allclose(found[conductor], box, atol=1e-4)


@pytest.mark.parametrize("name", SIZES_MM)
def test_every_scene_solves(name: str, solved: dict[str, CapacitanceResult]) -> None:
    result = solved[name]
    assert result.converged
    assert result.conductors == tuple(SIZES_MM[name])


@pytest.mark.parametrize("name", MIRRORED)
def test_mirrored_conductors_have_equal_entries(
    name: str, solved: dict[str, CapacitanceResult]
) -> None:
    """Entries that a mirror exchanges differ by no more than their bars."""
    result = solved[name]
    order = list(result.conductors)
    for one, other in MIRRORED[name]:
        i, j = order.index(one), order.index(other)
        order[i], order[j] = order[j], order[i]
    swap = [result.conductors.index(conductor) for conductor in order]
    mirrored = result.capacitance[np.ix_(swap, swap)]
    allowed = result.error + result.error[np.ix_(swap, swap)]
    assert np.all(np.abs(result.capacitance - mirrored) <= allowed)


def test_the_sleeve_takes_charge_off_the_rod(solved: dict[str, CapacitanceResult]) -> None:
    """A driven sleeve lowers what the rod sees: C11 + C12 is below C of the rod alone."""
    full = solved["grain_hopper"]
    scene = bem.load_scene(scene_file("grain_hopper"))
    scene.conductors = [c for c in scene.conductors if c.name != "guard sleeve"]
    bare = bem.extract(scene, tolerance=1e-2, threads=1)
    rod, sleeve = full.conductors.index("probe rod"), full.conductors.index("guard sleeve")
    guarded = full.capacitance[rod, rod] + full.capacitance[rod, sleeve]
    alone = bare.capacitance[1, 1]
    assert guarded + full.error[rod, rod] + full.error[rod, sleeve] < alone - bare.error[1, 1]


@pytest.fixture(scope="module")
def strips() -> CapacitanceResult:
    scene = bem.load_scene(MESHES / "board_pair" / "board_pair.toml")
    return bem.extract(scene, tolerance=1e-2, threads=1)


def test_the_scene_on_a_board_solves(strips: CapacitanceResult) -> None:
    assert strips.converged
    assert all(found["ok"] for found in strips.audit.values())
    assert [body["name"] for body in strips.settings["dielectrics"]] == ["board"]
    assert "dielectrics: board (4.4, loss tangent 0.02)" in str(strips)


def test_strips_on_the_board_are_alike(strips: CapacitanceResult) -> None:
    own, bar = np.diagonal(strips.capacitance), np.diagonal(strips.error)
    assert abs(own[0] - own[1]) <= bar.sum()


def test_the_board_raises_what_strips_have_to_the_ground(strips: CapacitanceResult) -> None:
    """Between those without a board and those wholly in its medium, beyond the bars."""
    scene = bem.load_scene(MESHES / "board_pair" / "board_pair.toml")
    permittivity = scene.dielectrics.pop().relative_permittivity
    bare = bem.extract(scene, tolerance=1e-2, threads=1)
    low, high = strips.row_sum - strips.row_sum_error, strips.row_sum + strips.row_sum_error
    assert np.all(low > bare.row_sum + bare.row_sum_error)
    assert np.all(high < permittivity * (bare.row_sum - bare.row_sum_error))


def test_the_probe_sees_the_grain(solved: dict[str, CapacitanceResult]) -> None:
    """Rod to hopper is more than when empty, and less than if grain filled all of space."""
    scene = bem.load_scene(MESHES / "grain_hopper" / "grain_full.toml")
    result = bem.extract(scene, tolerance=1e-2, threads=1)
    assert result.converged
    value, bar = -result.capacitance[0, 1], result.error[0, 1]
    bare, doubt = (array[0, 1] for array in (-solved["grain_hopper"].capacitance,
                                             solved["grain_hopper"].error))  # fmt: skip
    assert bare + doubt < value - bar
    assert value + bar < scene.dielectrics[0].relative_permittivity * (bare - doubt)
