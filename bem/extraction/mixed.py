"""One round with dielectrics: densities, potentials, and what they fail to satisfy.

For each conductor j at unit potential the mixed system (``operators/mixed.py``) gives the free
charge density on conductors and the potential on interfaces, and

    L_ij = sum over panels of i of area * density_j

The transposed system with "area on conductor i" on its right side gives the total charge
densities. What a test t beyond the unknowns would add to L_ij is the product of its two
residuals over its energy, <V t, t> on conductors and m <t, t> on interfaces (dual-weighted
residuals: Becker and Rannacher 2001).
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from bem.extraction.solution import SIDE_STEP, Sums, incidence, with_all
from bem.kernels.arrays import PanelArrays
from bem.kernels.indicator_energy import indicator_energies
from bem.kernels.mixed_arrays import Images, MixedPanels, mixed_panels
from bem.kernels.mixed_potential import mixed_potential
from bem.kernels.targets import make_targets
from bem.operators.mixed import FOUR_PI, LINEAR, Layout, MixedOperator, MixedReuse
from bem.panels.mesh import Faceting, Mesh
from bem.solve.mixed import solve_mixed

NEIGHBOURS = 0.7
"""How much more a test on an interface of high contrast adds, as neighbours answer it: the series
of the double layer's operator goes on with the square of the contrast (measured on coated cubes
and on boxes standing on blocks)."""
LAYER_ERROR = 2e-4
"""Error of the double layer of linear potentials by samples, near and far together."""
RIMS = 5
"""Which of the products of ``pushes`` is that of free rims."""
SAME = 1e-12
"""Permittivities closer than this, relative, are one: the interface does nothing."""


@dataclass(frozen=True)
class MixedSolution:
    """A solved round with interfaces, in scaled units; arrays of panels are in mesh order.

    Args:
        mesh: n panels of k conductors and of interfaces.
        panels: their arrays.
        own: (n,) number of images of each panel that coincide with it, itself among them.
        operator: their operator.
        density: (n, k) free charge, zero on interfaces.
        charge: (n, 3, k) total charge, by the functions 1, f1, f2 of each panel.
        field: (n, 3, k) potential on interfaces by the same functions.
        residual: (4, n, k) residual against each test over the root of its energy.
        dual: (4, n, k) the same of the transposed system.
    """

    mesh: Mesh
    panels: PanelArrays
    own: np.ndarray
    operator: MixedOperator
    density: np.ndarray
    charge: np.ndarray
    field: np.ndarray
    residual: np.ndarray
    dual: np.ndarray

    @property
    def conductor(self) -> np.ndarray:
        """(n,) owner of each panel, negative on interfaces."""
        return self.mesh.conductor

    @cached_property
    def sides(self) -> tuple[np.ndarray, np.ndarray]:
        """(n,) permittivity behind and in front of each panel, in mesh order."""
        layout = self.operator.layout
        back, front = (side[:, None] for side in layout.sides)
        return layout.to_mesh(back)[:, 0], layout.to_mesh(front)[:, 0]

    def potential(self, points: np.ndarray, column: int) -> np.ndarray:
        """(m,) potential at points (m, 3) with conductor ``column`` at 1 and the others at 0."""
        setup, layout = self.operator.setup, self.operator.layout
        charge = self.charge[layout.order, :, column]
        weight = np.repeat(setup.images.weight[0, 0][:, None], len(charge), axis=1)
        found = mixed_potential(setup, points, np.ascontiguousarray(charge.real), weight)
        if np.iscomplexobj(charge):
            lossy = np.ascontiguousarray(charge.imag)
            return found + 1j * mixed_potential(setup, points, lossy, weight)
        return found

    @cached_property
    def slope(self) -> np.ndarray:
        """(n, 2, k) in-plane gradient of the potential on interfaces."""
        layout, basis = self.operator.layout, self.operator.setup.basis
        field = self.field[layout.order]
        found = np.einsum("nfa,nfk->nak", basis[:, 1:LINEAR, 1:LINEAR], field[:, 1:])
        out = np.empty_like(found)
        out[layout.order] = found
        return out

    def pushes(self, faceting: Faceting) -> tuple[np.ndarray, ...]:
        """What moves of the surface do to L.

        A sum over panels of left (p, n, k) times right (p, n, k), p kinds of products; the
        normal move of conductors, with the field in front and that behind, of interfaces along
        and across, and of free rims.

        Returns:
            Left and right factors.
        """
        area = self.panels.area
        metal, rim = self.conductor >= 0, faceting.rim_offset * faceting.rim_width
        push = (area * faceting.offset)[:, None]
        back, front = self.sides
        left = np.zeros((6, *self.density.shape), dtype=self.density.dtype)
        right = np.zeros_like(left)
        total, right[:2] = self._on_both_sides(faceting)
        left[0], left[1] = FOUR_PI * push * total[0], -FOUR_PI * push * total[1]
        left[:2, ~metal] = 0.0
        for axis in (0, 1):
            left[2 + axis] = push * ((back - front) / FOUR_PI)[:, None] * self.slope[:, axis]
            right[2 + axis] = self.slope[:, axis]
        left[4] = FOUR_PI * push * _across(back, front)[:, None] * self.charge[:, 0]
        right[4] = self.charge[:, 0]
        left[2:5, metal] = 0.0
        left[RIMS] = (0.5 * np.pi**2 * self.own * area * rim)[:, None] * self.charge[:, 0]
        right[RIMS] = self.density
        return left, right

    def _on_both_sides(self, faceting: Faceting) -> tuple[np.ndarray, np.ndarray]:
        """Total and free charge in front of conductor panels and behind them, (2, n, k) each."""
        total = np.stack([self.charge[:, 0], np.zeros_like(self.density)])
        free = np.stack([self.density, np.zeros_like(self.density)])
        rows = np.flatnonzero(faceting.sheet & (faceting.offset != 0.0) & (self.conductor >= 0))
        if len(rows) == 0:
            return total, free
        back, front = (side[rows, None] for side in self.sides)
        half = self._normal_slope(rows) / FOUR_PI
        both, apart = total[0, rows], np.array([-1.0, 1.0])[:, None, None]
        less = 0.5 * (front - back) * both - (front + back) * half
        total[:, rows] = 0.5 * both + apart * half
        free[:, rows] = 0.5 * (free[0, rows] - apart * less)
        return total, free

    def _normal_slope(self, rows: np.ndarray) -> np.ndarray:
        """(r, k) slope of the potential along the normal of sheets, mean of both sides."""
        step = SIDE_STEP * self.panels.radius[rows, None]
        normal, center = self.panels.axes[rows, 2], self.panels.center[rows]
        points = np.concatenate([center + step * normal, center - step * normal])
        found = [self.potential(points, column) for column in range(self.density.shape[1])]
        u = np.array(found).T
        return (u[: len(rows)] - u[len(rows) :]) / (2.0 * step)

    def sums(self) -> Sums:
        """What the round says of every entry."""
        return mixed_sums(self)

    def facet_shares(self) -> np.ndarray:
        """(k,) relative change of each L_ii if facets of files became what they may stand for."""
        area = self.panels.area[:, None]
        left, right = self.pushes(self.mesh.doubtful())
        owner = incidence(self.conductor, self.density.shape[1])
        change = np.einsum("pnk,pnk->k", left, right)
        return change / (owner * area * self.density).sum(axis=0)

    def shape_energy(self, weight: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(n,) rates at which moves along the normal, and of rims, change weighted entries."""
        faceting = self.mesh.faceting()
        left, right = self.pushes(faceting)
        found = np.abs(np.einsum("pnk,pnk,k->pn", left, right, weight))
        return found[:RIMS].sum(axis=0), found[RIMS]


def _across(back: np.ndarray, front: np.ndarray) -> np.ndarray:
    """1/(1/front - 1/back), zero where both are alike or one is metal."""
    apart = np.abs(back - front) > SAME * np.maximum(np.abs(back), np.abs(front))
    return np.where(apart, back * front / np.where(apart, back - front, 1.0), 0.0)


def solve_dielectric(
    mesh: Mesh, count: int, far: float, reuse: MixedReuse | None, permittivity: np.ndarray
) -> MixedSolution:
    """Assemble, solve both systems and test the residuals on a mesh of ``count`` conductors.

    Args:
        mesh: n panels of conductors and interfaces.
        count: number of conductors.
        far: distance over the sum of radii where expansions begin.
        reuse: what an earlier operator can give.
        permittivity: (r,) of each region over that of the surroundings.
    """
    layout = Layout.of(mesh.conductor, mesh.regions, permittivity)
    setup = _setup(mesh, layout)
    operator = MixedOperator(setup, layout, far, reuse)
    owner = incidence(layout.owner, count)
    area = setup.panels.area[: len(layout.order)]
    goal = np.zeros((len(layout.unknown), count))
    goal[: layout.metal] = area[: layout.metal, None] * owner
    matrix = operator.system()
    sides = operator.right(owner), goal
    x, z = solve_mixed(matrix, _scales(matrix, layout, area), sides)
    full = np.concatenate([owner, x[layout.metal :]])
    own = _coincident(setup, len(area))
    root = 1.0 / np.sqrt(_energies(setup, layout, own))
    residual = operator.test(x[: layout.metal], full)
    dual = operator.test_adjoint(z)
    density = np.zeros((len(area), count), dtype=x.dtype)
    density[: layout.metal] = x[: layout.metal]
    by_function = _by_function(layout, layout.turn[layout.unknown][:, None] * z)
    free = np.concatenate([np.zeros_like(owner), x[layout.metal :]])
    panels = PanelArrays(*(part[: len(area)] for part in setup.panels))
    inverse = np.argsort(layout.order)
    return MixedSolution(
        mesh,
        PanelArrays(*(part[inverse] for part in panels)),
        own[inverse],
        operator,
        layout.to_mesh(density),
        by_function[inverse],
        _by_function(layout, free)[inverse],
        layout.to_mesh(_by_test(layout, residual) * root[:, :, None]),
        layout.to_mesh(_by_test(layout, dual) * root[:, :, None]),
    )


def _setup(mesh: Mesh, layout: Layout) -> MixedPanels:
    corners = mesh.corners[layout.order]
    planes = mesh.planes
    images = Images(
        planes.signs[None, None], planes.parities, np.zeros(len(corners), dtype=np.int64)
    )
    return mixed_panels(planes.images(corners), layout.metal, images)


def _scales(matrix: np.ndarray, layout: Layout, area: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """(N,) factors of rows and of columns that bring the diagonal near 1."""
    metal = layout.metal
    density = 1.0 / np.sqrt(np.diagonal(matrix)[:metal])
    root = 1.0 / np.sqrt(np.repeat(area[metal:], LINEAR))
    mean = np.repeat(layout.mean[metal:], LINEAR)
    return np.concatenate([density, root / mean]), np.concatenate([density, root])


def _coincident(setup: MixedPanels, count: int) -> np.ndarray:
    """(count,) how many images of each panel lie where it lies itself, the panel among them."""
    from bem.kernels.images import COINCIDENT

    center = setup.panels.center.reshape(-1, count, 3)
    apart = np.linalg.norm(center - center[0], axis=2)
    return (apart <= COINCIDENT * setup.panels.radius[:count]).sum(axis=0)


def _energies(setup: MixedPanels, layout: Layout, own: np.ndarray) -> np.ndarray:
    """(4, n) energy of each test."""
    metal, count = layout.metal, len(layout.order)
    panels = PanelArrays(*(part[:metal] for part in setup.panels))
    out = np.empty((4, count), dtype=layout.mean.dtype)
    out[:, :metal] = indicator_energies(panels, make_targets(panels)).T * own[:metal]
    contrast = np.abs(layout.step / (2.0 * layout.mean)) ** 2
    gain = 1.0 + NEIGHBOURS * contrast
    out[:, metal:] = (layout.mean * setup.panels.area[:count] / gain)[metal:]
    return out


def _by_function(layout: Layout, values: np.ndarray) -> np.ndarray:
    """(n, 3, k) coefficients of panels from those of unknowns (N, k)."""
    out = np.zeros((len(layout.order), LINEAR, values.shape[1]), dtype=values.dtype)
    out[: layout.metal, 0] = values[: layout.metal]
    out[layout.metal :] = values[layout.metal :].reshape(-1, LINEAR, values.shape[1])
    return out


def _by_unknown(layout: Layout, values: np.ndarray) -> np.ndarray:
    """(N, k) coefficients of unknowns from those of panels (n, 3, k)."""
    behind = values[layout.metal :].reshape(-1, values.shape[2])
    return np.concatenate([values[: layout.metal, 0], behind])


def _by_test(layout: Layout, values: np.ndarray) -> np.ndarray:
    """(4, n, k) residuals by direction: P1 and P2, or xy in halves and xx, yy on interfaces."""
    metal, k = layout.metal, values.shape[1]
    out = np.empty((4, len(layout.order), k), dtype=values.dtype)
    out[:, :metal] = values[: 4 * metal].reshape(metal, 4, k).swapaxes(0, 1)
    xx, yy, xy = values[4 * metal :].reshape(-1, 3, k).swapaxes(0, 1)
    out[:, metal:] = xy / np.sqrt(2.0), xy / np.sqrt(2.0), xx, yy
    return out


def mixed_sums(solution: MixedSolution) -> Sums:
    """Collect the sums of a round."""
    area, density = solution.panels.area, solution.density
    count = density.shape[1]
    owner = incidence(solution.conductor, count)
    raw = (owner * area[:, None]).T @ density
    w, d = (x.reshape(-1, count) for x in (solution.residual, solution.dual))
    signed = d.T @ w
    unsure = np.tile(solution.mesh.unsure(), 4)[:, None]
    absolute = 0.5 * ((unsure * np.abs(d)).T @ np.abs(with_all(w)))
    absolute += 0.5 * ((unsure * np.abs(w)).T @ np.abs(with_all(d)))
    faceting = solution.mesh.faceting()
    left, right = solution.pushes(faceting)
    change = _symmetric(np.einsum("pni,pnj->ij", left, right))
    rims = np.abs(left[RIMS]).T @ np.abs(with_all(right[RIMS]))
    return Sums(
        panels=len(area),
        value=with_all(_symmetric(raw)),
        signed=with_all(_symmetric(signed)),
        absolute=absolute,
        quadrature=quadrature_effect(solution) + with_all(0.5 * np.abs(raw - raw.T)),
        cancellation=cancellation(solution, raw),
        faceting=with_all(change),
        rims=rims,
        rounding=rounding_effect(solution),
        files=file_facet_bound(solution),
    )


def _symmetric(value: np.ndarray) -> np.ndarray:
    return 0.5 * (value + value.T)


def cancellation(solution: MixedSolution, value: np.ndarray) -> float:
    """Energy of charges of one sign over that of the true ones, the largest."""
    metal = solution.operator.layout.metal
    order = solution.operator.layout.order[:metal]
    density, charge = solution.density[order], solution.charge[order, 0]
    single = solution.operator.matrices.single[:metal]
    plain = np.einsum("nk,nk->k", np.abs(charge), np.abs(single) @ np.abs(density))
    return float((plain / np.abs(np.diagonal(value))).max())


def quadrature_effect(solution: MixedSolution) -> np.ndarray:
    """(k, k + 1) effect of rules and expansions on L.

    Single layer: the choice between both rows of a pair. Double layer: what region by region
    was missed before it was put right, times how far the potential varies about there, and a
    part of what the linear terms of the potential do.
    """
    operator, layout = solution.operator, solution.operator.layout
    metal = layout.metal
    order = layout.order[:metal]
    density, charge = solution.density[order], solution.charge[order, 0]
    rows = np.abs(operator.asymmetry(charge, density))
    single = np.abs(operator.matrices.single[:metal])
    far = 2.0 * operator.far_error * (np.abs(charge).T @ (single @ np.abs(density)))
    missed = np.abs(operator.missed[layout.constant]) @ np.abs(operator.boundaries.weight)
    variation = np.abs(solution.field[layout.order, 1:]).sum(axis=1)
    near = operator.boundaries.nearest.max(axis=1)
    variation[:metal] = variation[near[:metal]]
    layers = np.abs(solution.charge[layout.order, 0]).T @ (missed[:, None] * variation)
    turned = np.abs(_by_unknown(layout, solution.charge[layout.order]))
    linear = solution.field[layout.order].copy()
    linear[:, 0] = 0.0
    stepped = np.abs(operator.stepped(_by_unknown(layout, linear)))
    sampled = LAYER_ERROR * (turned.T @ (np.abs(operator.matrices.double) @ stepped))
    return with_all(_symmetric(rows + far + layers + sampled))


def rounding_effect(solution: MixedSolution) -> np.ndarray:
    """Bound (k, k + 1) on the change of L if every panel moves by its file's rounding."""
    zero = np.zeros(len(solution.panels.area))
    return _bound(solution, Faceting(solution.mesh.rounding, zero, zero, zero > 1.0))


def file_facet_bound(solution: MixedSolution) -> np.ndarray:
    """Bound (k, k + 1) on the change of L if facets of files stand for a smooth surface."""
    return _bound(solution, solution.mesh.doubtful())


def _bound(solution: MixedSolution, faceting: Faceting) -> np.ndarray:
    count = solution.density.shape[1]
    if faceting.exact:
        return np.zeros((count, count + 1))
    left, right = solution.pushes(faceting)
    bound = np.einsum("pni,pnj->ij", np.abs(left), np.abs(with_all(right)))
    bound[:, :-1] = _symmetric(bound[:, :-1])
    return bound
