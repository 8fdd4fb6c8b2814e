"""Conductors among dielectrics with closed forms or convergent series, at a thousandth."""

from __future__ import annotations

import dielectric_formulas as formulas
import numpy as np
import pytest
from dielectric_scenes import Filling, solve, turned_by, with_dielectrics
from scenes import FARAD, check

from bem.geometry import shapes
from bem.geometry.surface import Surface

ROUNDED = 1e-12


def up(surface: Surface, z: float) -> Surface:
    """Shift along z."""
    return surface.placed(np.eye(3), np.array([0.0, 0.0, z]))


def one(value: float) -> np.ndarray:
    """Matrix of one conductor."""
    return np.array([[value]])


COATS = [(1.05, er) for er in (2.0, 80.0, 1e5)]
COATS += [(1.5, er) for er in (4.0, 1000.0)]
COATS += [(3.0, er) for er in (2.0, 80.0, 1e5)]
"""Ratio of radii and permittivity; ``benchmarks/bench_bars.py`` has all combinations."""


@pytest.mark.parametrize(("outer", "permittivity"), COATS)
def test_coated_sphere(outer: float, permittivity: float) -> None:
    """1 / [(1/a - 1/b) / er + 1/b], any textbook, at any contrast."""
    scene = with_dielectrics([shapes.sphere(1.0)], [(shapes.sphere(outer), permittivity)])
    check(solve(scene), one(formulas.coated_sphere(1.0, outer, permittivity)), ROUNDED)


def test_two_layers_between_concentric_spheres() -> None:
    """Layers in series, any textbook: 4 for 1, 1.5, 2 and 4, 1; the shell also sees outside."""
    fillings = [(shapes.sphere(2.0), 1.0), (shapes.sphere(1.5), 4.0)]
    scene = with_dielectrics([shapes.sphere(1.0), shapes.sphere(2.0)], fillings, shells=(1,))
    inside = formulas.layered_spheres((1.0, 1.5, 2.0), (4.0, 1.0))
    exact = np.array([[inside, -inside], [-inside, inside + 2.0]])
    check(solve(scene, 3e-3), exact, ROUNDED)


@pytest.mark.parametrize("permittivity", [4.0, 1e5])
def test_sphere_beside_a_dielectric_sphere(permittivity: float) -> None:
    """Multipoles about both centres, from memory; 1.0071020601632 at a distance of 3, er 4."""
    scene = with_dielectrics([shapes.sphere(1.0)], [(up(shapes.sphere(1.0), 3.0), permittivity)])
    exact = formulas.sphere_and_dielectric_sphere(1.0, 1.0, 3.0, permittivity)
    check(solve(scene), one(exact), ROUNDED)


def test_close_dielectric_sphere_turned() -> None:
    """Gap of a tenth, series of multipoles, the whole turned and shifted."""
    place, exact = turned_by(3), formulas.sphere_and_dielectric_sphere(1.0, 1.0, 2.1, 80.0)
    fillings = [(place(up(shapes.sphere(1.0), 2.1)), 80.0)]
    check(solve(with_dielectrics([place(shapes.sphere(1.0))], fillings)), one(exact), ROUNDED)


def test_a_coat_of_two_layers() -> None:
    """Nested bodies, the inner one later: layers in series out to infinity, any textbook."""
    fillings: list[Filling] = [(shapes.sphere(2.0), 3.0), (shapes.sphere(1.4), 30.0)]
    exact = formulas.layered_spheres((1.0, 1.4, 2.0, np.inf), (30.0, 3.0, 1.0))
    check(solve(with_dielectrics([shapes.sphere(1.0)], fillings)), one(exact), ROUNDED)


def test_dielectric_with_a_hollow_inside() -> None:
    """A later body of permittivity 1 is a cavity: coat between 1.5 and 2 about a sphere of 1."""
    fillings: list[Filling] = [(shapes.sphere(2.0), 8.0), (shapes.sphere(1.5), 1.0)]
    exact = formulas.layered_spheres((1.0, 1.5, 2.0, np.inf), (1.0, 8.0, 1.0))
    check(solve(with_dielectrics([shapes.sphere(1.0)], fillings)), one(exact), ROUNDED)


def plates(gap: float, permittivity: float, filled: float) -> np.ndarray:
    """Mutual capacitance of unit plates, a slab filling the lower part of the gap, flush."""
    thick = 0.1
    low = shapes.box(1.0, 1.0, thick, (0.0, 0.0, -0.5 * thick))
    high = shapes.box(1.0, 1.0, thick, (0.0, 0.0, gap + 0.5 * thick))
    slab = shapes.box(1.0, 1.0, filled * gap, (0.0, 0.0, 0.5 * filled * gap))
    result = solve(with_dielectrics([low, high], [(slab, permittivity)]), 3e-3)
    assert result.converged
    return np.array([result.mutual[0, 1], result.error[0, 1]])


@pytest.mark.parametrize(("permittivity", "filled"), [(4.0, 1.0), (1000.0, 1.0), (10.0, 0.5)])
def test_plates_tend_to_the_textbook_value(permittivity: float, filled: float) -> None:
    """A / sum(d / er): what the edges add falls with the gap, and is never negative."""
    surplus = []
    for gap in (0.1, 0.02):
        layers = [(filled * gap, permittivity), ((1.0 - filled) * gap, 1.0)]
        ideal = formulas.ideal_plates(1.0, layers) * FARAD
        value, bar = plates(gap, permittivity, filled)
        surplus.append((value - ideal) / ideal)
        assert value + bar > ideal
    assert surplus[1] < 0.5 * surplus[0] + 6e-3
    assert surplus[1] < 0.07
