"""The README keeps its word: its example runs and prints what it says, its commands stand."""

from __future__ import annotations

import re
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parent.parent
README = (ROOT / "README.md").read_text(encoding="utf-8")


def blocks(language: str) -> list[str]:
    return re.findall(rf"^```{language}\n(.*?)^```", README, flags=re.M | re.S)


def test_the_python_example_prints_what_it_says() -> None:
    """Run as a user would, in a process of its own, and compare to the last digit shown."""
    example = blocks("python")[-1]
    done = subprocess.run(
        [sys.executable, "-c", example], capture_output=True, text=True, timeout=300, check=False
    )
    assert done.returncode == 0, done.stderr
    assert done.stdout == blocks("text")[0]


def test_the_example_with_a_dielectric_runs() -> None:
    done = subprocess.run(
        [sys.executable, "-c", blocks("python")[0]],
        capture_output=True,
        text=True,
        timeout=600,
        check=False,
    )
    assert done.returncode == 0, done.stderr
    assert done.stdout.endswith("inside the bar: True\n")


def test_the_exact_value_lies_inside_the_printed_bar() -> None:
    computed, bar, exact = (float(n) for n in re.findall(r"(\d\.\d+) pF", blocks("text")[0]))
    assert abs(computed - exact) <= bar


def test_the_first_two_commands_install_and_run() -> None:
    """The check that runs them for real takes them from here."""
    first, second = blocks("sh")[:2]
    assert "pip install" in first and "bem extract meshes/" in first
    assert "[test]" in second and "pytest" in second
    assert 'block "$n"' in (ROOT / ".ci" / "run").read_text(encoding="utf-8")


@pytest.mark.parametrize(
    "path", sorted(set(re.findall(r"`((?:meshes|benchmarks)/[^`]*)`", README)))
)
def test_files_that_are_named_exist(path: str) -> None:
    assert (ROOT / path).exists()


@pytest.mark.parametrize(("number", "missing"), [(0, "probe_rod.stl"), (1, "electrode.stl")])
def test_scene_examples_have_only_known_keys(tmp_path: Path, number: int, missing: str) -> None:
    """Reading one stops at the missing mesh file, not at a key."""
    import bem

    scene = tmp_path / "scene.toml"
    scene.write_text(blocks("toml")[number], encoding="utf-8")
    with pytest.raises(bem.InputError, match=f"{missing}: no such file"):
        bem.load_scene(scene)


def test_the_example_with_dielectrics_reads(tmp_path: Path) -> None:
    """With shapes instead of its files it is a scene with dielectrics and a half-space."""
    import bem

    box = "shape = { kind = 'box', lx = 1, ly = 1, lz = 1 }"
    text = re.sub(r"^mesh = .*$", box, blocks("toml")[1], flags=re.M)
    (tmp_path / "scene.toml").write_text(text, encoding="utf-8")
    scene = bem.load_scene(tmp_path / "scene.toml")
    assert scene.dielectrics[0].loss_tangent == 0.01
    assert scene.half_space is not None
