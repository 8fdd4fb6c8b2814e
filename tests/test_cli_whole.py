"""From a mesh file to a saved result, with nothing played."""

from __future__ import annotations

import math
from itertools import product
from pathlib import Path

import numpy as np
import pytest

from bem.cli.live import Live
from bem.cli.main import main
from bem.extraction.progress import Progress
from bem.results.result import load_result
from bem.units import EPS0

UNIT_CUBE = 0.6606782 * 4.0 * math.pi * EPS0
"""Capacitance in F of a cube with edges of 1 m (Hwang & Mascagni 2003)."""


@pytest.fixture
def cube(tmp_path: Path) -> Path:
    """Write a text STL file of a cube with edges of 10, two triangles a face."""
    corner = {bits: 10.0 * np.array(bits) for bits in product((0, 1), repeat=3)}
    facets = []
    for axis, side in product(range(3), (0, 1)):
        around = [(0, 0), (1, 0), (1, 1), (0, 1)]
        square = [corner[(*pair[:axis], side, *pair[axis:])] for pair in around]
        facets += [[square[0], square[1], square[2]], [square[0], square[2], square[3]]]
    path = tmp_path / "cube.stl"
    path.write_text("solid\n" + "".join(map(_facet, facets)) + "endsolid\n")
    return path


def _facet(corners: list[np.ndarray]) -> str:
    lines = "".join(f"vertex {x} {y} {z}\n" for x, y, z in corners)
    return f"facet normal 0 0 0\nouter loop\n{lines}endloop\nendfacet\n"


def test_a_cube_from_file_to_table(cube: Path, capsys: pytest.CaptureFixture[str]) -> None:
    saved = cube.with_name("cube.json")
    code = main(["extract", str(cube), "--unit", "mm", "--tolerance", "1%", "--json", str(saved)])
    out, err = capsys.readouterr()
    assert code == 0 and "tolerance 0.01 reached" in out and "round 2, " in err
    result = load_result(saved)
    assert str(result) + "\n" == out
    assert result.conductors == ("cube",) and result.inputs[0]["unit"] == "mm"
    assert abs(result.capacitance[0, 0] - 0.01 * UNIT_CUBE) <= result.error[0, 0]
    assert result.error[0, 0] <= 0.01 * result.capacitance[0, 0]


def test_interrupted_in_the_third_round(
    cube: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    def interrupt(_: Live, progress: Progress) -> None:
        if progress.round == 3:
            raise KeyboardInterrupt

    monkeypatch.setattr(Live, "__call__", interrupt)
    saved = cube.with_name("cube.json")
    assert main(["extract", str(cube), "--unit", "mm", "--json", str(saved)]) == 130
    result = load_result(saved)
    assert (result.stopped_by, result.converged, len(result.rounds)) == ("interrupt", False, 2)
    assert "NOT REACHED" in capsys.readouterr().out


def test_interrupted_in_the_first_round(
    cube: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    def interrupt(_: Live, progress: Progress) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr(Live, "__call__", interrupt)
    saved = cube.with_name("cube.json")
    assert main(["extract", str(cube), "--unit", "mm", "--json", str(saved)]) == 130
    assert not saved.exists() and "nothing was written" in capsys.readouterr().err


def test_too_few_panels_and_too_little_memory(
    cube: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["extract", str(cube), "--unit", "mm", "--max-panels", "60", "--quiet"]) == 4
    assert "raise max-panels" in capsys.readouterr().err
    assert main(["extract", str(cube), "--unit", "mm", "--memory", "1kB", "--quiet"]) == 5
    assert capsys.readouterr().out == ""
