"""Known values among dielectrics follow from formulas and from two kinds of finite elements."""

from __future__ import annotations

import math

import dielectric_formulas as formulas
import numpy as np
import pytest
from axial_elements import axial_capacitance
from dielectric_values import ALL, BY_ELEMENTS, BY_NAME, DielectricReference, Material, rod
from reference_formulas import two_spheres
from reference_values import BY_NAME as VACUUM

ALONE = {"cube": VACUUM["unit cube"].exact[0][0], "disc": 2.0 / math.pi}


def test_coat_and_layers_are_one_series() -> None:
    """1.6 and 4: values noted with the textbook formula (T)."""
    assert formulas.coated_sphere(1.0, 2.0, 4.0) == pytest.approx(1.6, rel=1e-14)
    assert formulas.layered_spheres((1.0, 1.5, 2.0), (4.0, 1.0)) == pytest.approx(4.0, rel=1e-14)
    open_ended = formulas.layered_spheres((1.0, 2.0, math.inf), (4.0, 1.0))
    assert open_ended == pytest.approx(1.6, rel=1e-14)


def test_multipoles_against_a_noted_value() -> None:
    """Distance 3, er 4: 1.0071020601632 by an independent series (N)."""
    value = formulas.sphere_and_dielectric_sphere(1.0, 1.0, 3.0, 4.0)
    assert value == pytest.approx(1.0071020601632, rel=1e-12)


def test_multipoles_have_the_right_limits() -> None:
    """Without contrast a lone sphere; with a huge one a floating conductor (Maxwell's series)."""
    assert formulas.sphere_and_dielectric_sphere(1.0, 0.5, 2.0, 1.0) == 1.0
    matrix = two_spheres(1.0, 0.5, 2.0)
    floating = matrix[0, 0] - matrix[0, 1] ** 2 / matrix[1, 1]
    value = formulas.sphere_and_dielectric_sphere(1.0, 0.5, 2.0, 1e9)
    assert value == pytest.approx(floating, rel=1e-8)


def test_half_space_series() -> None:
    """Noted: 1.1785960286896 at height 2, er 4 (M); metal below in the limit; air: alone."""
    value = formulas.sphere_over_half_space(1.0, 2.0, 4.0)
    assert value == pytest.approx(1.1785960286896, rel=1e-12)
    assert formulas.sphere_over_half_space(1.0, 1.1, 1.0) == pytest.approx(1.0, rel=1e-14)
    metal = VACUUM["sphere over a plane, height 1.1"].exact[0][0]
    assert formulas.sphere_over_half_space(1.0, 1.1, 1e14) == pytest.approx(metal, rel=1e-10)


def test_touching_half_space_is_a_logarithm() -> None:
    """In contact sum k^n / (n+1) = -ln(1 - k) / k, which heights near 1 approach."""
    k = 0.6
    near = formulas.sphere_over_half_space(1.0, 1.0 + 1e-7, 4.0)
    assert near == pytest.approx(-math.log(1.0 - k) / k, rel=1e-5)


CHEAP = (
    "disc on a cylinder of radius 1, er 10",
    "cylinder between two discs, er 10",
    "cylinder standing on a wider one, er 4",
)


@pytest.mark.parametrize("name", CHEAP)
def test_rectangles_confirm_triangles(name: str) -> None:
    """Graded rectangles in scikit-fem against graded triangles of higher order elsewhere.

    Energies fall toward the true ones: both meshes lie above, the finer one by at most 5e-5.
    """
    record = BY_NAME[name]
    coarse, fine = (axial_capacitance(record, k, k) for k in (3, 4))
    size = np.diag(record.matrix)
    above = np.linalg.eigvalsh(fine - record.matrix)
    assert np.all(above > -record.uncertainty) and above[-1] < 5e-5 * size.max()
    assert np.all(np.linalg.eigvalsh(coarse - fine) > 0.0)


def test_rectangles_know_a_lone_cylinder() -> None:
    """A material of permittivity 1 is none: half length 1 in vacuum (N, spectral method)."""
    vacuum = VACUUM["solid cylinder, half length 1"]
    coat = (Material(rod(1.5, 3.0), 1.0),)
    record = DielectricReference("lone", vacuum.bodies, coat, vacuum.exact, 1e-9, "N", "spectral")
    value = axial_capacitance(record, 4, 4)[0, 0]
    assert 0.0 < value - vacuum.exact[0][0] < 5e-5


@pytest.mark.parametrize("record", ALL, ids=lambda record: record.name)
def test_every_record_is_a_possible_maxwell_matrix(record: DielectricReference) -> None:
    """Symmetric, positive definite, off-diagonal entries and row sums with the right sign."""
    matrix = record.matrix
    assert matrix.shape == (len(record.conductors),) * 2
    assert np.array_equal(matrix, matrix.T)
    assert np.linalg.eigvalsh(matrix)[0] > 0
    assert np.all(matrix[~np.eye(len(matrix), dtype=bool)] < 0)
    assert np.all(matrix.sum(axis=1) >= 0)
    assert 0 < record.uncertainty <= 1e-4 * matrix.max()
    assert record.mark in "TPMN" and record.source


def test_more_permittivity_is_more_capacitance() -> None:
    """Of one kind of scene in several permittivities, and never less than without."""
    families: dict[str, list[DielectricReference]] = {}
    for record in BY_ELEMENTS:
        families.setdefault(record.name.split(", er")[0], []).append(record)
    several = [f for f in families.values() if len(f) > 1]
    assert len(several) >= 4
    for family in several:
        by_contrast = sorted(family, key=lambda r: r.materials[0].permittivity)
        assert np.all(np.diff([r.exact[0][0] for r in by_contrast]) > 0)


def test_a_coat_of_metal_bounds_the_coat() -> None:
    """Cube in a cubic coat: more than the bare cube, less than a cube of the coat's size."""
    coats = [r for r in BY_ELEMENTS if "cubic coat" in r.name]
    assert len(coats) >= 3
    for record in coats:
        assert ALONE["cube"] < record.exact[0][0] < 1.5 * ALONE["cube"]
