"""Conductors and dielectric interfaces in one system, as dense matrices.

Unknowns are the free charge density on conductor panels, constant, and the potential on interface
panels, linear. With the permittivity rho_b behind and rho_f in front of each panel, the normal
leading from back to front, D = rho_b - rho_f and m = (rho_b + rho_f) / 2 (zero in metal), Green's
third identity for each region, weighted by its permittivity and summed, gives

    conductor panel:  sum V s - sum over interfaces D/(4 pi) K phi
                          = m V_i + sum over conductors D/(4 pi) K V_j
    interface panel:  m phi + sum over interfaces D/(4 pi) K phi - sum V s
                          = - sum over conductors D/(4 pi) K V_j

with V and K the potentials of single and double layers (Costabel 1987; Steinbach 2008). The
transposed system has the total charge densities as its solution, constant on conductors and
linear on interfaces, up to a sign on interfaces.

The sum of K over the boundary of a region is known exactly. What the computed sums miss, times
its permittivity, is put on the constant of the panel itself or of the nearest panel of that
boundary: without it a high contrast multiplies every error of quadrature.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.spatial import cKDTree

from bem.geometry.parts import SURROUNDINGS
from bem.kernels import pairs
from bem.kernels.mixed import fill_mixed
from bem.kernels.mixed_arrays import (
    QUADRATIC,
    TESTS,
    MixedPanels,
    empty_matrices,
)
from bem.operators.dense import FAR_ERROR, FAR_ORDER, LEAST_FAR, NEAR

FOUR_PI = 4.0 * np.pi
LINEAR = 3
"""Unknowns of an interface panel."""
CLOSED = 1e-6
"""A boundary whose vector areas add up to less than this part of its area is closed."""


@dataclass(frozen=True)
class Layout:
    """Panels of a mixed system, those of conductors first.

    Args:
        order: (n,) index of each in the mesh.
        owner: (c,) conductor of each of the first c panels.
        regions: (n, 2) region behind and in front of each, METAL where negative.
        permittivity: (r,) of each region over that of the surroundings; complex with loss.
        share: (n, 2) of the flux from a point on each panel that goes to the back and to the
            front; halves, but where the panel lies in a plane between layers.
    """

    order: np.ndarray
    owner: np.ndarray
    regions: np.ndarray
    permittivity: np.ndarray
    share: np.ndarray

    @classmethod
    def of(
        cls,
        conductor: np.ndarray,
        regions: np.ndarray,
        permittivity: np.ndarray,
        share: np.ndarray | None = None,
    ) -> Layout:
        """Sort the panels of a mesh, by their conductors (n,), negative on interfaces."""
        order = np.argsort(conductor < 0, kind="stable")
        owner = conductor[order][: int((conductor >= 0).sum())]
        share = np.full((len(order), 2), 0.5) if share is None else share[order]
        return cls(order, owner, regions[order], np.asarray(permittivity), share)

    @property
    def metal(self) -> int:
        """Number of conductor panels c."""
        return len(self.owner)

    @property
    def interfaces(self) -> int:
        """Number of interface panels."""
        return len(self.order) - self.metal

    @property
    def sides(self) -> tuple[np.ndarray, np.ndarray]:
        """(n,) permittivity behind and in front of each panel, zero in metal."""
        inside = self.regions < 0
        found = np.where(inside, 0.0, self.permittivity[np.where(inside, 0, self.regions)])
        return found[:, 0], found[:, 1]

    @property
    def step(self) -> np.ndarray:
        """(n,) D, permittivity behind less that in front."""
        back, front = self.sides
        return back - front

    @property
    def mean(self) -> np.ndarray:
        """(n,) m, mean permittivity of both sides."""
        back, front = self.sides
        return self.share[:, 0] * back + self.share[:, 1] * front

    def spread(self, each: int, every: int) -> np.ndarray:
        """Panel of each of ``each`` rows to a conductor panel and ``every`` to an interface."""
        metal = np.repeat(np.arange(self.metal), each)
        return np.concatenate([metal, np.repeat(self.metal + np.arange(self.interfaces), every)])

    @property
    def unknown(self) -> np.ndarray:
        """(N,) panel of each unknown."""
        return self.spread(1, LINEAR)

    @property
    def constant(self) -> np.ndarray:
        """(n,) unknown that is the constant of each panel."""
        behind = self.metal + LINEAR * np.arange(self.interfaces)
        return np.concatenate([np.arange(self.metal), behind])

    @property
    def turn(self) -> np.ndarray:
        """(n,) 1 on conductors, -1 on interfaces: the sign of their rows."""
        return np.where(np.arange(len(self.order)) < self.metal, 1.0, -1.0)

    def to_mesh(self, values: np.ndarray) -> np.ndarray:
        """Values (..., n, k) of panels in the order of the mesh."""
        out = np.empty_like(values)
        out[..., self.order, :] = values
        return out


@dataclass(frozen=True)
class Boundaries:
    """What is known of the double layers of the boundaries of regions.

    Args:
        sign: (n, r) 1 where a region lies behind a panel, -1 where in front, 0 elsewhere.
        seen: (n, r) sum of K over the boundary as seen from each panel.
        nearest: (n, r) panel of the boundary that is nearest to each panel.
        weight: (r,) permittivity over 4 pi, zero for a boundary that planes leave open.
    """

    sign: np.ndarray
    seen: np.ndarray
    nearest: np.ndarray
    weight: np.ndarray

    @classmethod
    def of(cls, layout: Layout, setup: MixedPanels) -> Boundaries:
        """Look at which regions each panel bounds."""
        number = np.arange(len(layout.permittivity))
        behind, before = (layout.regions[:, side, None] == number for side in (0, 1))
        sides = behind.astype(float) + before
        seen = -FOUR_PI * (layout.share[:, :1] * behind + layout.share[:, 1:] * before)
        seen[:, SURROUNDINGS] += FOUR_PI
        sign = behind - before.astype(float)
        closed = _closed(sign, setup)
        center = setup.panels.center[: len(sign)]
        return cls(
            sign,
            seen,
            _nearest(sides > 0.0, center),
            np.where(closed, layout.permittivity, 0.0) / FOUR_PI,
        )


def _closed(sign: np.ndarray, setup: MixedPanels) -> np.ndarray:
    """(r,) whether the boundary of each region is closed, images with their signs included."""
    panels, images = setup.panels, setup.images
    vector = (panels.area[:, None] * panels.axes[:, 2]).reshape(-1, len(sign), 3)
    home = np.unique(images.layer)
    over = images.weight[home, home] / images.weight[home, home, :1]
    mirrored = np.cumprod((np.abs(over) == 1.0).all(axis=0))  # before those that stand for layers
    factor = images.parity * np.sign(over[0]) * mirrored
    total = np.einsum("g,nr,gnx->rx", factor, sign, vector)
    area = np.abs(sign).T @ panels.area[: len(sign)]
    return np.linalg.norm(total, axis=1) <= CLOSED * area


def _nearest(on: np.ndarray, center: np.ndarray) -> np.ndarray:
    """(n, r) nearest panel of the boundary of each region; the panel itself where it is on."""
    own = np.arange(len(on))
    nearest = np.repeat(own[:, None], on.shape[1], axis=1)
    for region in np.flatnonzero(on.any(axis=0)):
        here = np.flatnonzero(on[:, region])
        found = here[cKDTree(center[here]).query(center)[1]]
        nearest[:, region] = np.where(on[:, region], own, found)
    return nearest


def _narrow(values: np.ndarray) -> np.ndarray:
    """Values in single precision, real or complex."""
    return values.astype(np.complex64 if np.iscomplexobj(values) else np.float32)


@dataclass(frozen=True)
class MixedReuse:
    """What an earlier operator can give to this one.

    Args:
        operator: of the mesh before.
        origin: (n,) index in that mesh of the same panel, or -1, in the order of this mesh.
    """

    operator: MixedOperator
    origin: np.ndarray

    def known(self, layout: Layout) -> np.ndarray:
        """(n,) index of each panel of a layout among those of the earlier operator, or -1."""
        before = np.argsort(self.operator.layout.order)
        origin = self.origin[layout.order]
        return np.where(origin >= 0, before[origin], -1)


class MixedOperator:
    """Dense system of conductors and interfaces.

    Args:
        setup: n panels, those of conductors first, and their images.
        layout: their conductors and permittivities.
        far: distance over the sum of radii where expansions begin.
        reuse: an earlier operator, made with the same ``far``.
        image_error: of the potential over that of the source itself, where images stand for layers.
    """

    def __init__(
        self,
        setup: MixedPanels,
        layout: Layout,
        far: float,
        reuse: MixedReuse | None = None,
        image_error: float = 0.0,
    ) -> None:
        self.setup, self.layout, self.far, self.image_error = setup, layout, far, image_error
        self.matrices = empty_matrices(layout.metal, layout.interfaces)
        known, origin = empty_matrices(0, 0), np.full(len(layout.order), -1)
        if reuse is not None:
            known, origin = reuse.operator.matrices, reuse.known(layout)
        reach = np.array([NEAR, far])
        self.sampled_pairs = fill_mixed(setup, reach, origin, known, self.matrices)
        self.boundaries = Boundaries.of(layout, setup)
        self.missed = self._missed(self.matrices.double, layout.unknown)
        self.missed[layout.constant] += self._area[:, None] * self.boundaries.seen

    @property
    def _area(self) -> np.ndarray:
        return self.setup.panels.area[: len(self.layout.order)]

    def given(self, origin: np.ndarray) -> MixedReuse:
        """What this operator can give to that of a mesh whose panels (n,) are from ``origin``."""
        return MixedReuse(self, origin)

    @property
    def size(self) -> int:
        """Number of conductor panels, whose rows ``near_rows`` gives."""
        return self.layout.metal

    def _missed(self, double: np.ndarray, panel: np.ndarray) -> np.ndarray:
        """(rows, r) minus the computed sums of K over the boundaries of regions."""
        sums = double[:, self.layout.constant].astype(float) @ self.boundaries.sign
        return -sums[: len(panel)]

    def _single(self) -> np.ndarray:
        """(c, c) symmetric single layer of the conductors."""
        metal = self.layout.metal
        rows = np.ascontiguousarray(self.matrices.single[:metal])
        out = np.empty_like(rows)
        pairs.symmetric(rows, self.setup.panels.radius[:metal], out)
        return out

    def system(self) -> np.ndarray:
        """Matrix (N, N) of the unknowns: densities, then potentials."""
        layout, metal = self.layout, self.layout.metal
        unknown = layout.unknown
        out = np.empty(self.matrices.double.shape, dtype=self.boundaries.weight.dtype)
        out[:, :metal] = self.matrices.single
        out[:metal, :metal] = self._single()
        out[:, metal:] = -self._layer_columns(slice(metal, None))
        for region, weight in enumerate(self.boundaries.weight):
            column = layout.constant[self.boundaries.nearest[unknown, region]]
            rows = np.flatnonzero(column >= metal)
            out[rows, column[rows]] -= weight * self.missed[rows, region]
        out *= layout.turn[unknown][:, None]
        own = np.arange(metal, len(unknown))
        out[own, own] += (layout.mean * self._area)[unknown[metal:]]
        return out

    def _layer_columns(self, columns: slice) -> np.ndarray:
        step = self.layout.step[self.layout.unknown[columns]] / FOUR_PI
        return self.matrices.double[:, columns] * step

    def right(self, potential: np.ndarray) -> np.ndarray:
        """Right sides (N, k) for potentials (c, k) of the conductor panels."""
        layout, metal = self.layout, self.layout.metal
        full = np.zeros((len(layout.unknown), potential.shape[1]))
        full[:metal] = potential
        out = layout.turn[layout.unknown][:, None] * self.layer(full)
        out[:metal] += (layout.mean * self._area)[:metal, None] * potential
        return out

    def layer(self, full: np.ndarray) -> np.ndarray:
        """Weighted double layer (N, k) of potentials (N, k), of conductors and interfaces."""
        out = self.matrices.double @ self.stepped(full)
        return out + self._corrected(self.missed, self.layout.unknown, full)

    def stepped(self, full: np.ndarray) -> np.ndarray:
        """Potentials (N, k) times D/(4 pi) of their panels."""
        return (self.layout.step[self.layout.unknown] / FOUR_PI)[:, None] * full

    def _corrected(self, missed: np.ndarray, panel: np.ndarray, full: np.ndarray) -> np.ndarray:
        """What the double layer of region by region misses, by the nearest potential."""
        near = full[self.layout.constant][self.boundaries.nearest[panel]]
        return np.einsum("r,pr,prk->pk", self.boundaries.weight, missed, near)

    def test(self, density: np.ndarray, full: np.ndarray) -> np.ndarray:
        """Residuals (4 c + 3 i, k) against the tests, from densities (c, k), potentials (N, k)."""
        layout, kept = self.layout, self.matrices
        panel = layout.spread(TESTS, QUADRATIC)
        single = kept.single_tests @ _narrow(density)
        double = kept.double_tests @ _narrow(self.stepped(full))
        correction = self._corrected(self._missed(kept.double_tests, panel), panel, full)
        return -layout.turn[panel][:, None] * (single - double - correction)

    def test_adjoint(self, charge: np.ndarray) -> np.ndarray:
        """Residuals (4 c + 3 i, k) of the transposed system for its solution (N, k)."""
        layout, kept, metal = self.layout, self.matrices, self.layout.metal
        turned = _narrow(layout.turn[layout.unknown][:, None] * charge)
        rows = TESTS * metal
        on_metal = kept.single_tests[:rows] @ turned[:metal] + kept.linear @ turned[metal:]
        step = layout.step[metal:] / FOUR_PI
        on_interfaces = np.repeat(step, QUADRATIC)[:, None] * (kept.quadratic.T @ turned)
        return np.concatenate([-on_metal, on_interfaces])

    def near_rows(self, rows: np.ndarray) -> np.ndarray:
        """Rows (r, c) of the single layer between conductors, before they are made symmetric."""
        return self.matrices.single[rows]

    def asymmetry(self, charge: np.ndarray, density: np.ndarray) -> np.ndarray:
        """(k, k) energy that the choice between both rows of each pair of conductors decides."""
        metal = self.layout.metal
        rows = self.matrices.single[:metal]
        return charge[:metal].T @ ((rows - self._single()) @ density)

    @property
    def far_error(self) -> float:
        """Relative error of the energy of charges of one sign that expansions may cause."""
        return FAR_ERROR * (LEAST_FAR / self.far) ** FAR_ORDER + self.image_error
