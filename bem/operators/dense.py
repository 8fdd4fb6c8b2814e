"""The operator as a dense matrix, with blocks of unchanged panels taken over between rounds."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from bem.kernels import pairs
from bem.kernels.images import plain_energy
from bem.kernels.pairs import Sources
from bem.kernels.targets import Targets

NEAR = 1.5
"""Pairs nearer than this times the sum of both radii are integrated exactly."""
LEAST_FAR = 2.5
"""Expansions never begin nearer than this times both radii."""
FAR_ERROR, FAR_ORDER = 1e-7, 6
"""Error of the energy from expansions at LEAST_FAR, over the energy without cancellation
(measured on facing plates turned against each other), and the power of the distance with
which it falls."""
INNER = 2e-2
"""Part of the tolerance that the expansions may take."""


@dataclass(frozen=True)
class Reuse:
    """What an earlier operator can give to this one.

    Args:
        operator: of the mesh before.
        origin: (n,) index in it of the same panel, or -1.
    """

    operator: DenseOperator
    origin: np.ndarray


def far_reach(tolerance: float, cancellation: float = 1.0) -> float:
    """Distance over the sum of radii beyond which expansions serve a tolerance.

    Args:
        tolerance: of the final value.
        cancellation: energy that charges of one sign would have over that of the true ones;
            large where opposite charges face each other across a thin gap.
    """
    plain = LEAST_FAR * (1e-3 / tolerance) ** 0.125
    needed = LEAST_FAR * (FAR_ERROR * max(cancellation, 1.0) / (INNER * tolerance)) ** (
        1.0 / FAR_ORDER
    )
    return float(np.clip(max(plain, needed), LEAST_FAR, 12.0))


def _empty(n: int) -> pairs.Matrices:
    return pairs.Matrices(np.empty((n, n)), np.empty((4, n, n), dtype=np.float32))


class DenseOperator:
    """Dense single-layer operator of a panel set.

    Args:
        sources: n panels and their images.
        targets: samples and tests of the panels.
        far: distance over the sum of radii where expansions begin.
        reuse: an earlier operator, made with the same ``far``.
    """

    def __init__(
        self, sources: Sources, targets: Targets, far: float, reuse: Reuse | None = None
    ) -> None:
        n = len(targets.weights)
        self.sources = sources
        self.radius = sources.panels.radius[:n]
        self.matrices = _empty(n)
        known = reuse.operator.matrices if reuse is not None else _empty(0)
        origin = reuse.origin if reuse is not None else np.full(n, -1)
        self.far = far
        reach = np.array([NEAR, far])
        self.sampled_pairs = int(pairs.fill(sources, targets, reach, origin, known, self.matrices))

    def given(self, origin: np.ndarray) -> Reuse:
        """What this operator can give to that of a mesh whose panels (n,) are from ``origin``."""
        return Reuse(self, origin)

    @property
    def size(self) -> int:
        """Number of panels."""
        return len(self.radius)

    def matrix(self) -> np.ndarray:
        """Symmetric matrix (n, n), each pair from the row whose outer panel is smaller."""
        out = np.empty_like(self.matrices.single)
        pairs.symmetric(self.matrices.single, self.radius, out)
        return out

    def apply(self, density: np.ndarray) -> np.ndarray:
        """Potential integrated over each panel, (n, k), from densities (n, k)."""
        return self.matrix() @ density

    def tests(self, density: np.ndarray) -> np.ndarray:
        """Potential integrated against each test function, (4, n, k)."""
        single = density.astype(np.float32)
        return np.stack([rows @ single for rows in self.matrices.tests]).astype(float)

    def near_rows(self, rows: np.ndarray) -> np.ndarray:
        """Rows (r, n) of the operator before pairs are made symmetric."""
        return self.matrices.single[rows]

    def asymmetry(self, density: np.ndarray) -> np.ndarray:
        """(k, k) energy that the choice between both rows of each pair decides."""
        return pairs.asymmetry(self.matrices.single, self.radius, np.ascontiguousarray(density))

    @property
    def far_error(self) -> float:
        """Relative error of the energy of charges of one sign from expansions and layers."""
        return FAR_ERROR * (LEAST_FAR / self.far) ** FAR_ORDER + self.sources.error

    def magnitude(self, left: np.ndarray, right: np.ndarray) -> np.ndarray:
        """(k, m) energies |left|^T A |right| without cancellation, from (n, k) and (n, m)."""
        if (self.sources.images.weight < 0.0).any():
            return plain_energy(self.sources, np.abs(left), np.abs(right))
        return np.abs(left).T @ (self.matrices.single @ np.abs(right))
