"""The mixed system of conductors and interfaces: identities that hold on any mesh."""

from __future__ import annotations

import numpy as np
import pytest
from dielectric_formulas import sphere_and_dielectric_sphere

import bem
from bem.extraction.mixed import MixedSolution, solve_dielectric
from bem.extraction.scaled import ScaledScene
from bem.extraction.solution import solve_round
from bem.operators.mixed import FOUR_PI
from bem.panels.mesh import Faceting, Mesh

FAR = 2.5


def with_dielectrics(conductors, fillings):
    """Scene with conductors c0, c1, ... and dielectrics d0, d1, ... of given permittivities."""
    scene = bem.Scene(unit="m")
    for k, surface in enumerate(conductors):
        scene.add_conductor(f"c{k}", surface)
    for k, (surface, permittivity) in enumerate(fillings):
        scene.add_dielectric(f"d{k}", surface, relative_permittivity=permittivity)
    return scene


def at(surface, *shift):
    return surface.placed(np.eye(3), np.array(shift, dtype=float))


def standing(permittivity):
    """Two boxes standing on a dielectric block."""
    block = at(bem.box(2.0, 1.0, 0.5), 0.0, 0.0, -0.25)
    boxes = [at(bem.box(0.4, 0.4, 0.3), x, 0.0, 0.15) for x in (-0.5, 0.4)]
    return with_dielectrics(boxes, [(block, permittivity)])


def solved(scene, permittivity=None):
    """Mesh and solution of the start."""
    scaled = ScaledScene.of(scene)
    mesh = Mesh.start(scaled.parts, (), lambda _: None, scaled.planes, scaled.coincidence)
    rho = scaled.permittivity if permittivity is None else permittivity
    return mesh, solve_dielectric(mesh, len(scene.conductors), FAR, None, rho)


@pytest.fixture(scope="module")
def block() -> MixedSolution:
    return solved(standing(20.0))[1]


def test_both_systems_give_one_matrix(block):
    """L_ij from the free charge, and from the total charge times the right sides."""
    operator, layout = block.operator, block.operator.layout
    owner = (layout.owner[:, None] == np.arange(2)).astype(float)
    turned = block.charge[layout.order] * layout.turn[:, None, None]
    z = np.concatenate([turned[: layout.metal, 0], turned[layout.metal :].reshape(-1, 2)])
    z[: layout.metal] = block.charge[layout.order][: layout.metal, 0]
    area = block.panels.area[layout.order][: layout.metal, None]
    free = (owner * area).T @ block.density[layout.order][: layout.metal]
    assert z.T @ operator.right(owner) == pytest.approx(free, rel=1e-9)


def test_the_sums_of_a_region_are_those_of_a_closed_surface(block):
    """A potential of 1 everywhere has the known double layer, row by row."""
    operator, layout = block.operator, block.operator.layout
    ones = np.zeros((len(layout.unknown), 1))
    ones[layout.constant] = 1.0
    back, front = layout.sides
    number = np.arange(len(layout.permittivity))
    sides = sum((layout.regions[:, k, None] == number).astype(float) for k in (0, 1))
    seen = -0.5 * sides @ layout.permittivity + layout.permittivity[0]
    area = block.panels.area[layout.order]
    assert operator.layer(ones)[layout.constant, 0] == pytest.approx(seen * area, rel=1e-12)
    assert operator.layer(ones)[layout.metal + 1 :: 3] == pytest.approx(0.0, abs=1e-12)
    assert back.min() == 0.0 and front.min() > 0.0


def test_columns_of_the_system_are_the_layer(block):
    """What is put right in the matrix is what is put right in products with it."""
    operator, layout = block.operator, block.operator.layout
    full = np.random.default_rng(3).normal(size=(len(layout.unknown), 2))
    full[: layout.metal] = 0.0
    area = block.panels.area[layout.order][layout.unknown]
    own = (layout.mean[layout.unknown] * area)[:, None] * full
    want = own - layout.turn[layout.unknown][:, None] * operator.layer(full)
    scale = np.abs(operator.missed).max()
    assert scale > 1e-9
    assert operator.system() @ full == pytest.approx(want, rel=1e-12, abs=1e-4 * scale)


def test_what_the_sums_missed_is_small_already(block):
    missed = np.abs(block.operator.missed) / (FOUR_PI * block.panels.area.max())
    assert missed.max() < 1e-3


@pytest.mark.parametrize("value", [1.0, 7.0])
def test_one_permittivity_everywhere_is_that_of_the_conductors_alone(value):
    """Interfaces between equal media do nothing; the conductors' equations are multiplied."""
    mesh, mixed = solved(standing(3.0), np.full(2, value))
    rows = np.flatnonzero(mesh.conductor >= 0)
    area, owner = mixed.panels.area[rows], mesh.conductor[rows]
    from bem.kernels.arrays import panel_arrays
    from bem.kernels.images import plain_sources
    from bem.kernels.targets import make_targets
    from bem.operators.dense import DenseOperator

    panels = panel_arrays(mesh.corners[rows])
    operator = DenseOperator(plain_sources(panels), make_targets(panels), FAR)
    right = area[:, None] * (owner[:, None] == np.arange(2))
    density = np.linalg.solve(operator.matrix(), right)
    assert mixed.density[rows] == pytest.approx(value * density, rel=2e-4, abs=1e-4)


def test_both_residuals_are_one_where_interfaces_do_nothing():
    """The conductors' system is then its own transpose, and no interface carries charge."""
    mesh, mixed = solved(standing(3.0), np.ones(2))
    metal = mesh.conductor >= 0
    assert np.abs(mixed.charge[~metal]).max() < 1e-6
    scale = np.abs(mixed.residual[:, metal]).max()
    assert mixed.dual[:, metal] == pytest.approx(mixed.residual[:, metal], abs=1e-5 * scale)
    assert np.abs(mixed.dual[:, ~metal]).max() < 1e-6 < 1e-3 < scale


@pytest.mark.parametrize("permittivity", [4.0, 0.25])
def test_moves_of_an_interface_change_the_value_as_growth_does(permittivity):
    """A dielectric ball beside a conducting one: slope of the series of multipoles.

    Facets lie within the balls, so that the slope is about a tenth too small.
    """
    ball = at(bem.sphere(0.5), 2.0, 0.0, 0.0)
    scene = with_dielectrics([bem.sphere(1.0)], [(ball, permittivity)])
    mesh, _ = solved(scene)
    for direction in (0, 1):
        every = np.ones(len(mesh.conductor), dtype=bool)
        mesh, _ = mesh.refine(every, np.full(len(every), direction))
    mixed = solve_dielectric(mesh, 1, FAR, None, ScaledScene.of(scene).permittivity)
    outward = np.where(mesh.conductor < 0, 1.0, 0.0)
    none = np.zeros(len(outward))
    left, right = mixed.pushes(Faceting(outward, none, none, none > 0.0))
    radii = 0.5 - 1e-4, 0.5 + 1e-4
    low, high = (sphere_and_dielectric_sphere(1.0, r, 2.0, permittivity) for r in radii)
    slope = (high - low) / 2e-4
    assert np.einsum("pni,pni->", left, right) == pytest.approx(slope, rel=0.15)


def test_reuse_changes_nothing():
    """A refined mesh solved afresh, and with what the mesh before knew."""
    scene = standing(20.0)
    mesh, first = solved(scene)
    rho = ScaledScene.of(scene).permittivity
    marked = np.arange(len(mesh.conductor)) % 5 == 0
    finer, origin = mesh.refine(marked, np.zeros(len(marked), dtype=int))
    fresh = solve_dielectric(finer, 2, FAR, None, rho)
    again = solve_dielectric(finer, 2, FAR, first.operator.given(origin), rho)
    assert again.operator.sampled_pairs < fresh.operator.sampled_pairs
    assert again.density == pytest.approx(fresh.density, rel=1e-6, abs=1e-9)
    assert again.residual == pytest.approx(fresh.residual, rel=1e-3, abs=1e-5)


def test_solve_round_is_kept_for_conductors_alone():
    from bem.extraction.rounds import solver_of

    scaled = ScaledScene.of(with_dielectrics([bem.box(1.0, 1.0, 1.0)], []))
    mesh = Mesh.start(scaled.surfaces)
    assert solver_of(mesh, scaled.permittivity) is solve_round
