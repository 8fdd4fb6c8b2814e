"""One round: the densities on a mesh, their matrix, and what they fail to satisfy.

With L = C / (4 pi eps), the density s_j of conductor j at unit potential solves

    sum over panels q of A_pq s_q = area_p where p is on conductor j, else 0
    L_ij = sum over panels of i of area * s_j

The error indicator of a panel, test k and entry (i, j) is the product of two residuals over
the energy of the test, which is what that test would add to L_ij if it stood alone (Mund,
Stephan and Weisse 1998; Erath, Ferraz-Leite, Funken and Praetorius 2009):

    eta = <r_i, psi> <r_j, psi> / <A psi, psi>,    <r_j, psi> = - sum over panels T_pq s_q
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from bem.kernels.arrays import PanelArrays
from bem.kernels.images import originals, own_images, sources_of, with_images
from bem.kernels.indicator_energy import indicator_energies
from bem.kernels.pairs import Sources
from bem.kernels.potential import potential_of_panels
from bem.kernels.targets import make_targets
from bem.operators.dense import DenseOperator, Reuse
from bem.operators.operator import Operator
from bem.panels.mesh import Faceting, Mesh
from bem.solve.dense import solve_dense

SIDE_STEP = 1e-3
"""Distance from a sheet, over the panel's radius, at which its two sides are told apart."""


@dataclass(frozen=True)
class Solution:
    """A solved round, in scaled units.

    Args:
        mesh: n panels of k conductors.
        panels: their arrays.
        sources: panels and their images behind planes.
        own: (n,) weight of the images of each panel that coincide with it, itself among them.
        operator: their operator.
        density: (n, k).
        residual: (4, n, k) residual against each test over the root of its energy.
    """

    mesh: Mesh
    panels: PanelArrays
    sources: Sources
    own: np.ndarray
    operator: Operator
    density: np.ndarray
    residual: np.ndarray

    @property
    def conductor(self) -> np.ndarray:
        """(n,) owner of each panel."""
        return self.mesh.conductor

    @property
    def dual(self) -> np.ndarray:
        """(4, n, k) residual of the transposed system, which is the same one."""
        return self.residual

    def sums(self) -> Sums:
        """What the round says of every entry."""
        return sums(self)

    def shape_energy(self, weight: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(n,) effects of moves to the true surface, normal and of rims, on weighted entries.

        Args:
            weight: (k,) of each L_kk.
        """
        charge = np.einsum("nk,k->n", self.density**2, weight)
        normal, rim = _pushes(self, self.mesh.faceting())
        return np.abs(normal) * charge, np.abs(rim) * charge

    def facet_shares(self) -> np.ndarray:
        """(k,) relative change of each L_ii if the facets of i became what they may stand for."""
        return file_facet_shares(self)

    @property
    def direct(self) -> np.ndarray:
        """(n,) weight of each panel itself: 1 over the permittivity that it lies in."""
        layer = self.sources.images.layer
        return self.sources.images.weight[layer, layer, 0]

    def potential(
        self, points: np.ndarray, column: int, layer: np.ndarray | None = None
    ) -> np.ndarray:
        """(m,) potential with conductor ``column`` at 1 and the others at 0.

        Args:
            points: (m, 3).
            column: conductor.
            layer: (m,) layers that count as those of the points; left out, where they lie.
        """
        layer = self.mesh.planes.layer_of(points) if layer is None else layer
        total = np.empty(len(points))
        for k in np.unique(layer):
            charge = with_images(self.density[:, column], self.sources, k)
            at = np.ascontiguousarray(points[layer == k].T)
            total[layer == k] = potential_of_panels(self.sources.panels, at, charge)
        return total


def incidence(conductor: np.ndarray, count: int) -> np.ndarray:
    """(n, count) 1 where a panel belongs to a conductor."""
    return (conductor[:, None] == np.arange(count)).astype(float)


def with_all(columns: np.ndarray) -> np.ndarray:
    """The last axis extended by its sum: all conductors at unit potential together."""
    return np.concatenate([columns, columns.sum(axis=-1, keepdims=True)], axis=-1)


def solve_round(mesh: Mesh, count: int, far: float, reuse: Reuse | None) -> Solution:
    """Assemble, solve and test the residual on a mesh of ``count`` conductors."""
    sources = sources_of(mesh.corners, mesh.planes)
    panels = originals(sources)
    targets = make_targets(panels)
    operator = DenseOperator(sources, targets, far, reuse)
    right = panels.area[:, None] * incidence(mesh.conductor, count)
    density = solve_dense(operator, right)
    own = own_images(sources)
    energy = indicator_energies(panels, targets) * own[:, None]
    residual = -operator.tests(density) / np.sqrt(energy.T)[:, :, None]
    return Solution(mesh, panels, sources, own, operator, density, residual)


@dataclass(frozen=True)
class Sums:
    """What one round says of every entry, (k, k + 1) each; the last column is the row sum.

    Args:
        panels: number of panels.
        value: L from the density.
        signed: summed indicator.
        absolute: summed absolute indicator.
        quadrature: effect of choosing between the two rows of each pair, and of expansions.
        cancellation: energy of charges of one sign over that of the true ones, the largest.
        faceting: first-order effect of the true surface lying off the panels.
        rims: the part of it at curved free rims, all of one sign.
        rounding: largest effect of the rounded numbers of the input files.
        files: largest effect of the smooth surface that facets of files may stand for.
        moves: what is believed of ``faceting`` with all its terms of one sign, where terms of
            several bodies may cancel; None: its absolute value.
    """

    panels: int
    value: np.ndarray
    signed: np.ndarray
    absolute: np.ndarray
    quadrature: np.ndarray
    cancellation: float
    faceting: np.ndarray
    rims: np.ndarray
    rounding: np.ndarray
    files: np.ndarray
    moves: np.ndarray | None = None

    @property
    def facet_moves(self) -> np.ndarray:
        """(k, k + 1) size of the faceting effect before terms cancel."""
        return np.abs(self.faceting) if self.moves is None else self.moves


def sums(solution: Solution) -> Sums:
    """Collect the sums of a round."""
    density, area = solution.density, solution.panels.area
    count = density.shape[1]
    owner = incidence(solution.conductor, count)
    value = (owner * area[:, None]).T @ density
    value = 0.5 * (value + value.T)
    w = solution.residual.reshape(-1, count)
    every = with_all(w)
    operator = solution.operator
    magnitude = operator.magnitude(density, with_all(density))
    rows = with_all(np.abs(operator.asymmetry(density)))
    return Sums(
        panels=len(area),
        value=with_all(value),
        signed=w.T @ every,
        absolute=(np.tile(solution.mesh.unsure(), 4) * np.abs(w).T) @ np.abs(every),
        quadrature=rows + 2.0 * operator.far_error * magnitude,
        cancellation=float((np.diagonal(magnitude) / np.diagonal(value)).max()),
        faceting=faceting_effect(solution),
        rims=rim_effect(solution),
        rounding=rounding_effect(solution),
        files=file_facet_bound(solution),
    )


def faceting_effect(solution: Solution) -> np.ndarray:
    """First-order change of L (k, k + 1) when the panels move out to the true surface.

    With a and b the densities on the outer and the inner side of a panel the change is 4 pi
    times the integral of (a_i a_j - b_i b_j) times the displacement along the normal
    (Hadamard 1908), over the permittivity; inside a closed body b is zero. At a curved free
    rim of a sheet the density is K / sqrt(r) and the change is 2 pi^2 times the integral along
    the rim of K_i K_j times the in-plane displacement (the energy release of a crack front,
    with the constant of the disk); a panel of width w at the rim has the mean density
    2 K / sqrt(w).
    """
    faceting, density = solution.mesh.faceting(), solution.density
    count = density.shape[1]
    if faceting.exact:
        return np.zeros((count, count + 1))
    normal, rim = _pushes(solution, faceting)
    excess = _side_difference(solution, faceting)
    change = density.T @ (normal[:, None] * excess)
    change = 0.5 * (change + change.T) + density.T @ (rim[:, None] * density)
    return with_all(change)


def rim_effect(solution: Solution) -> np.ndarray:
    """(k, k + 1) effect of curved free rims by ``faceting_effect``, with absolute values."""
    rim = np.abs(_pushes(solution, solution.mesh.faceting())[1])
    return np.abs(solution.density).T @ (rim[:, None] * np.abs(with_all(solution.density)))


def _pushes(solution: Solution, faceting: Faceting) -> tuple[np.ndarray, np.ndarray]:
    """Factors (n,) of products of densities: for moves along the normal, and of a free rim."""
    area = solution.panels.area
    normal = 4.0 * np.pi * solution.direct * area * faceting.offset
    rim = 0.5 * np.pi**2 * solution.own * area * faceting.rim_offset * faceting.rim_width
    return normal, rim


def file_facet_bound(solution: Solution) -> np.ndarray:
    """Bound (k, k + 1) on the change of L if facets of files stand for a smooth surface.

    The first-order formulas of ``faceting_effect`` with absolute values.
    """
    density = solution.density
    if solution.mesh.doubtful().exact:
        return np.zeros((density.shape[1], density.shape[1] + 1))
    bound = np.abs(density).T @ np.abs(file_facet_factors(solution)).sum(axis=0)
    bound[:, :-1] = 0.5 * (bound[:, :-1] + bound[:, :-1].T)
    return bound


def file_facet_factors(solution: Solution) -> np.ndarray:
    """(2, n, k + 1) what each density is multiplied by, for moves along the normal and of rims."""
    faceting = solution.mesh.doubtful()
    normal, rim = (push[:, None] for push in _pushes(solution, faceting))
    excess = with_all(_side_difference(solution, faceting))
    return np.stack([normal * excess, rim * with_all(solution.density)])


def file_facet_shares(solution: Solution) -> np.ndarray:
    """(k,) relative change of each L_ii if the facets of i became what they may stand for.

    The outer side of a sheet is not known: there the sign only says what the most would be.
    """
    faceting, density = solution.mesh.doubtful(), solution.density
    normal, rim = _pushes(solution, faceting)
    own = incidence(solution.conductor, density.shape[1]) * density
    excess = _side_difference(solution, faceting)
    moved = normal[:, None] * np.where(faceting.sheet[:, None], np.abs(excess), excess)
    change = (own * (moved + rim[:, None] * density)).sum(axis=0)
    return change / (own * solution.panels.area[:, None]).sum(axis=0)


def rounding_effect(solution: Solution) -> np.ndarray:
    """Bound (k, k + 1) on the change of L if every panel moves by its file's rounding."""
    size = np.abs(solution.density)
    weight = 4.0 * np.pi * solution.own * solution.panels.area * solution.mesh.rounding
    return size.T @ (weight[:, None] * np.abs(with_all(solution.density)))


def _side_difference(solution: Solution, faceting: Faceting) -> np.ndarray:
    """(n, k) density on the outer side less that on the inner side of each panel.

    On a sheet it is -1/(2 pi) times the mean normal derivative of the potential, taken from
    the potential a little above and below the centroid.
    """
    difference = solution.density.copy()
    rows = np.flatnonzero(faceting.sheet & (faceting.offset != 0.0))
    if len(rows) == 0:
        return difference
    panels = solution.panels
    step = SIDE_STEP * panels.radius[rows, None]
    normal = panels.axes[rows, 2]
    points = np.concatenate(
        [panels.center[rows] + step * normal, panels.center[rows] - step * normal]
    )
    for column in range(solution.density.shape[1]):
        u = solution.potential(points, column, np.tile(solution.sources.images.layer[rows], 2))
        slope = (u[: len(rows)] - u[len(rows) :]) / (2.0 * step[:, 0])
        difference[rows, column] = -slope / (2.0 * np.pi * solution.direct[rows])
    return difference
