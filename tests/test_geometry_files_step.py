"""STEP assemblies: bodies by name, the file's unit, the size of facets, a process of its own."""

from __future__ import annotations

import subprocess
import sys
import threading

import gmsh
import numpy as np
import pytest
from step_boxes import StepWriter, two_in_an_assembly
from test_geometry_files_formats import check_boxes, refused, save
from two_boxes import box

from bem.geometry.reading import step
from bem.geometry.reading.files import Bodies, bodies_in, read_surface
from bem.geometry.reading.step import FACETS_PER_TURN
from bem.scene.body import body_of
from bem.scene.scene import Scene
from bem.units import METRES_PER

MM = 1e-3


@pytest.mark.parametrize(
    ("stated", "unit"),
    [
        ({}, "mm"),
        ({"unit": "(LENGTH_UNIT()NAMED_UNIT(*)SI_UNIT($,.METRE.))"}, "m"),
        ({"unit": "( LENGTH_UNIT() NAMED_UNIT(*) SI_UNIT( .CENTI. , .METRE. ) )"}, "cm"),
        ({"inch": "INCH"}, "in"),
        ({"inch": "inch"}, "in"),
    ],
)
def test_an_assembly_of_two_boxes(tmp_path, stated, unit):
    """Names and places of the parts, lengths in the unit that the file states."""
    path = save(tmp_path / "two.step", two_in_an_assembly(**stated))
    check_boxes(path, unit)
    check_boxes(path, unit, part="can")
    assert bodies_in(path) == Bodies(("rod", "can"), 0)
    assert len(read_surface(path, METRES_PER[unit], "pair")[0].faces) == 24
    assert f"its lengths are in {unit}, " in refused(path, unit=METRES_PER["um"])


def test_bodies_of_one_name_are_numbered(tmp_path):
    path = save(tmp_path / "two.stp", two_in_an_assembly(("bolt", "bolt")))
    assert bodies_in(path) == Bodies(("bolt 1", "bolt 2"), 0)
    check_boxes(path, "mm", part="bolt 2")
    check_boxes(path, "mm")


def test_a_surface_that_belongs_to_no_solid(tmp_path):
    writer = StepWriter()
    shield = writer.part("shield", writer.sheet(box((0, 0, 5), (4, 4, 9)), 5))
    rod = writer.part("rod", writer.solid(box((0, 0, 0), (1, 1, 1))))
    writer.assembly("all", [shield, rod], [(0, 0, 0), (0, 0, 0)])
    path = save(tmp_path / "two.step", writer.text())
    assert sorted(bodies_in(path).names) == ["rod", "shield"]
    surface, _ = read_surface(path, MM, "shield")
    assert len(surface.faces) == 10
    assert surface.bounds == pytest.approx(MM * np.array([[0, 0, 5], [4, 4, 9]]))


def test_bodies_of_one_product(tmp_path):
    """Solids of one product keep their names; those without are numbered after it."""
    boxes = [box((0, 0, 0), (1, 1, 1)), box((3, 0, 0), (4, 2, 1))]
    for names, found in (
        (("rod", "pin \\X2\\00B5\\X0\\''s"), ("rod", "pin \u00b5's")),
        (("", ""), ("part 1", "part 2")),
    ):
        writer = StepWriter()
        solids = [writer.solid(b, name) for b, name in zip(boxes, names, strict=True)]
        writer.bodies("part", solids)
        path = save(tmp_path / "two.step", writer.text())
        assert bodies_in(path) == Bodies(found, 0)
        check_boxes(path, "mm", part=found[1])
        assert len(read_surface(path, MM, "part")[0].faces) == 24


@pytest.fixture
def round_bodies(tmp_path):
    """A long thin cylinder and a large ball, written by the CAD kernel itself."""
    path = tmp_path / "round.step"
    script = (
        "import sys, gmsh; gmsh.initialize(); o = gmsh.model.occ; "
        "o.addCylinder(0, 0, 0, 0, 0, 100, 0.5); o.addSphere(50, 0, 0, 20); o.synchronize(); "
        "gmsh.write(sys.argv[1])"
    )
    command = [sys.executable, "-c", script, str(path)]
    subprocess.run(command, check=True, capture_output=True)
    return path


def test_size_of_facets(round_bodies):
    """The documented facets per turn, around the thin body and the large one; both closed."""
    wire, ball = (
        body_of(Scene("mm").add_conductor("it", mesh=round_bodies, part=name).conductors[0])
        for name in bodies_in(round_bodies).names
    )
    rim = wire.surface.vertices[np.abs(wire.surface.vertices[:, 2]) < 1e-9]
    assert len(rim) == FACETS_PER_TURN
    assert len(wire.triangles) < 8 * FACETS_PER_TURN, "none are wasted along the axis"
    n = FACETS_PER_TURN
    exact = 0.5 * n * np.sin(2 * np.pi / n) * 0.5**2 * 100 * MM**3
    assert wire.volume == pytest.approx(exact, rel=1e-9, abs=0.0)
    off = ball.corners.mean(axis=1) - [0.05, 0.0, 0.0]
    sagitta = 1.0 - np.linalg.norm(off, axis=1) / 0.02
    assert 0.0 < sagitta.max() < 2 * (1 - np.cos(2 * np.pi / n))
    assert ball.volume == pytest.approx(4 / 3 * np.pi * 0.02**3, rel=0.02, abs=0.0)


def test_beside_threads_and_a_gmsh_in_use(tmp_path):
    """The state of the caller's Gmsh is left alone, and threads do not disturb one another."""
    path = save(tmp_path / "two.step", two_in_an_assembly())
    gmsh.initialize(interruptible=False)
    try:
        gmsh.model.add("mine")
        found: list[int] = []

        def read() -> None:
            found.append(len(step.read_step(path).faces))

        threads = [threading.Thread(target=read) for _ in range(2)]
        for thread in threads:
            thread.start()
        for thread in threads:
            thread.join()
        assert found == [24, 24]
        assert gmsh.model.getCurrent() == "mine"
        assert gmsh.model.getEntities() == []
    finally:
        gmsh.finalize()


def test_without_the_extra(tmp_path, monkeypatch):
    path = save(tmp_path / "two.step", two_in_an_assembly())
    monkeypatch.setattr(step.importlib.util, "find_spec", lambda name: None)
    assert refused(path, unit=MM) == (
        "is a STEP file, which needs an extra: pip install 'bem-capacitance[step]'"
    )


def test_an_extra_that_cannot_be_loaded(tmp_path, monkeypatch):
    (tmp_path / "gmsh.py").write_text("raise OSError('libGLU.so.1: no such file')\n")
    monkeypatch.setenv("PYTHONPATH", str(tmp_path))
    path = save(tmp_path / "two.step", two_in_an_assembly())
    assert refused(path, unit=MM) == (
        "is a STEP file, but Gmsh cannot be loaded (libGLU.so.1: no such file)"
    )


TWO = two_in_an_assembly()


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("", "is empty (0 bytes)"),
        ("hello", "is not STEP: it does not start with ISO-10303-21; export it again"),
        (TWO[:-30], "is cut short: it does not end with END-ISO-10303-21; export it again"),
        (TWO[: TWO.index("#1=")] + "ENDSEC;\nEND-ISO-10303-21;\n",
         "is STEP without a solid or a surface; export it again"),
        (TWO.replace("#40=", "#9999=", 1), "is damaged: it uses #40, which it does not hold; "
         "export it again"),
        (TWO.replace("CLOSED_SHELL", "GARBAGE"),
         "is STEP without a solid or a surface; export it again"),
    ],
)  # fmt: skip
def test_damaged_step(tmp_path, text, message, capfd):
    assert refused(save(tmp_path / "bad.step", text), unit=MM) == message
    assert capfd.readouterr() == ("", "")
