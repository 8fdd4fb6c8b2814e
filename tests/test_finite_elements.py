"""Two boxes inside a closed cubic shell, checked by finite elements that share nothing with bem.

The space between the boxes and the shell is bounded, so finite elements need no outer treatment.
Both boxes are mirror symmetric in y and z: a quarter of the space is meshed, by bricks with
quadratic functions, graded toward the edges of the boxes as (i/n)^3, where the energy error falls
as n^-4. The energy of two meshes is extrapolated with that rate; the bar is the whole step from
the finer mesh to the extrapolated value. The shell's outside is that of a cube of side 1, whose
capacitance is known.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pytest
import skfem
from reference_values import BY_NAME
from scipy.sparse import csr_matrix
from scipy.sparse.linalg import LinearOperator, cg
from skfem.models.poisson import laplace

import bem
from bem.geometry.surface import Surface
from bem.units import EPS0

GRADING = 3.0
RATE = 4.0
COARSE, FINE = 3, 5
TINY = 1e-9
SHELL_SIDE = 1.0


@dataclass(frozen=True)
class Box:
    """Box with faces at ``low`` and ``high``."""

    low: tuple[float, float, float]
    high: tuple[float, float, float]

    def holds(self, points: np.ndarray) -> np.ndarray:
        """Tell which of the points (3, n) lie inside or on the box."""
        low, high = np.array(self.low)[:, None], np.array(self.high)[:, None]
        return np.all((points > low - TINY) & (points < high + TINY), axis=0)

    def surface(self) -> Surface:
        """Six quadrilaterals."""
        corner = np.array([(i >> 2, i >> 1 & 1, i & 1) for i in range(8)])
        quads = [[0, 1, 3, 2], [4, 5, 7, 6], [0, 1, 5, 4], [2, 3, 7, 6], [0, 2, 6, 4], [1, 3, 7, 5]]
        return Surface(np.where(corner, self.high, self.low).astype(float), np.array(quads))


WIDE = Box((-0.35, -0.2, -0.2), (-0.05, 0.2, 0.2))
FLAT = Box((0.1, -0.2, -0.1), (0.3, 0.2, 0.1))
SHELL = Box((-0.5,) * 3, (0.5,) * 3)

BREAKS = (
    (-0.5, -0.35, -0.05, 0.1, 0.3, 0.5),
    (0.0, 0.2, 0.5),
    (0.0, 0.1, 0.2, 0.5),
)
"""Planes of the box faces along x, y, z between the first, a wall or a mirror, and the wall."""


@dataclass(frozen=True)
class Estimate:
    """Maxwell matrix (n, n) and its bars, both in L = C / (4 pi eps0)."""

    capacitance: np.ndarray
    error: np.ndarray


def graded(start: float, stop: float, cells: int, ends: tuple[bool, bool]) -> np.ndarray:
    """Nodes from ``start`` to ``stop``, ``cells`` to each graded end."""
    t = (np.arange(cells + 1) / cells) ** GRADING
    if all(ends):
        t = np.concatenate([0.5 * t, (1.0 - 0.5 * t[::-1])[1:]])
    elif ends[1]:
        t = 1.0 - t[::-1]
    return start + (stop - start) * t


def nodes_along(breaks: tuple[float, ...], cells: int) -> np.ndarray:
    """Nodes through all ``breaks``, graded toward all but the first and the last."""
    parts = [np.array(breaks[:1])]
    for i in range(len(breaks) - 1):
        ends = (i > 0, i < len(breaks) - 2)
        parts.append(graded(breaks[i], breaks[i + 1], cells, ends)[1:])
    return np.concatenate(parts)


def quarter_mesh(cells: int) -> skfem.MeshHex:
    """Bricks between the boxes and the shell where y and z are positive."""
    mesh = skfem.MeshHex.init_tensor(*(nodes_along(breaks, cells) for breaks in BREAKS))
    middles = mesh.p[:, mesh.t].mean(axis=1)
    return mesh.remove_elements(np.nonzero(WIDE.holds(middles) | FLAT.holds(middles))[0])


def unknowns_on(basis: skfem.Basis) -> list[np.ndarray]:
    """Unknowns on the wide box, the flat box and the shell, in this order."""
    mesh = basis.mesh
    facets = mesh.boundary_facets()
    middles = mesh.p[:, mesh.facets[:, facets]].mean(axis=1)
    wall = np.any(np.abs(middles) > 0.5 - TINY, axis=0)
    mirror = np.any(middles[1:] < TINY, axis=0)
    chosen = [WIDE.holds(middles) & ~mirror, FLAT.holds(middles) & ~mirror, wall]
    return [basis.get_dofs(facets[which]).all() for which in chosen]


def solve_spd(matrix: csr_matrix, right: np.ndarray) -> np.ndarray:
    """Conjugate gradients with diagonal scaling."""
    diagonal = matrix.diagonal()
    scaling = LinearOperator(matrix.shape, matvec=lambda x: x / diagonal)
    solution, failure = cg(matrix, right, rtol=1e-7, M=scaling)
    assert not failure
    return solution


def energy_matrix(cells: int) -> np.ndarray:
    """(2, 2) in L: energies of the potentials that are 1 on one box and 0 elsewhere."""
    basis = skfem.Basis(quarter_mesh(cells), skfem.ElementHex2(), intorder=4)
    stiffness = laplace.assemble(basis).tocsr()
    fixed = unknowns_on(basis)
    free = np.setdiff1d(np.arange(basis.N), np.concatenate(fixed))
    potential = np.zeros((basis.N, 2))
    for column in range(2):
        potential[fixed[column], column] = 1.0
        pull = -stiffness[free] @ potential[:, column]
        potential[free, column] = solve_spd(stiffness[free][:, free], pull)
    return 4.0 * potential.T @ (stiffness @ potential) / (4.0 * np.pi)


def with_shell(boxes: np.ndarray, outside: float) -> np.ndarray:
    """(3, 3) from the (2, 2) of the boxes: inside a closed shell their rows sum to zero."""
    to_shell = -boxes.sum(axis=1)
    return np.block(
        [[boxes, to_shell[:, None]], [to_shell[None, :], np.array([[boxes.sum() + outside]])]]
    )


@pytest.fixture(scope="module")
def by_elements() -> Estimate:
    """Finite elements, extrapolated."""
    coarse, fine = energy_matrix(COARSE), energy_matrix(FINE)
    step = (coarse - fine) / ((FINE / COARSE) ** RATE - 1.0)
    outside = BY_NAME["unit cube"].exact[0][0] * SHELL_SIDE
    bars = with_shell(np.abs(step), 0.0)
    return Estimate(with_shell(fine - step, outside), np.abs(bars))


def test_energy_falls_as_the_mesh_is_refined(by_elements: Estimate) -> None:
    """Dirichlet's principle: the energies of finer elements are lower, and near the limit."""
    fine = energy_matrix(FINE - 1)
    drop = fine - by_elements.capacitance[:2, :2]
    assert np.all(np.linalg.eigvalsh(drop) > 0)
    assert np.all(np.diag(drop) < 2e-3 * np.diag(fine))


def test_boxes_in_a_shell_agree_with_finite_elements(by_elements: Estimate) -> None:
    """All nine entries agree within the sum of both bars, and both bars are small."""
    scene = bem.Scene(unit="m")
    scene.add_conductor("wide", WIDE.surface())
    scene.add_conductor("flat", FLAT.surface())
    scene.add_conductor("shell", SHELL.surface(), body="shell")
    result = bem.extract(scene, tolerance=3e-4, threads=1)
    unit = 4.0 * np.pi * EPS0
    apart = np.abs(result.capacitance / unit - by_elements.capacitance)
    allowed = result.error / unit + by_elements.error
    assert result.converged
    assert np.all(apart <= allowed), f"apart {apart}, allowed {allowed}"
    size = np.sqrt(np.diag(by_elements.capacitance))
    assert np.all(allowed <= 1.5e-3 * np.outer(size, size))
