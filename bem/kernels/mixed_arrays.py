"""Arrays of the mixed formulation: panels with unknowns of two kinds, and their matrices.

Of n panels the first nC are conductors, which carry a constant charge density, and the other
nI interfaces, which carry a potential linear on each panel. Unknowns are numbered alike in
rows and columns: panel i of the conductors has number i, function b of the interface k
number nC + 3 k + b. N = nC + 3 nI.

Residuals are seen by test functions beyond these: conductor i has four, numbers 4 i + t (the
Legendre polynomials of ``targets``), interface k three, numbers 4 nC + 3 k + t (quadratic).
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from bem.kernels.arrays import PanelArrays, panel_arrays, side_frames
from bem.kernels.basis import LINEAR, long_frames, panel_basis, values
from bem.kernels.mixed_samples import FarPanels, far_panels
from bem.kernels.targets import ETA, XI, Targets, make_targets

TESTS = 4
"""Test functions of a conductor panel, beside the constant."""
QUADRATIC = 3
"""Test functions of an interface panel, beside the linear ones."""


class Images(NamedTuple):
    """Images of all panels behind planes, the panels themselves first.

    Args:
        weight: (layers, layers, g) factor of image g on its potential, by the layers of the
            target and of the source; double layers take it over that of the source itself.
        parity: (g,) 1, or -1 where the image is reflected: the normal that follows from
            reflected corners points backward.
        layer: (n,) layer of each panel.
    """

    weight: np.ndarray
    parity: np.ndarray
    layer: np.ndarray


class MixedPanels(NamedTuple):
    """All that the mixed integrals know of n panels and their images.

    Args:
        panels: n panels, conductors first, then all n of each image in turn.
        basis: (n, 6, 6) functions of each panel, alike on its images.
        points: (n, 3, 16) samples.
        weights: (n, 6, 16) test functions times integration weights: of conductors the
            constant, four Legendre polynomials, zero; of interfaces the six functions.
        mean: (n, 4) means of the Legendre polynomials.
        counts: (2,) conductor and interface panels.
        images: their weights.
        far: what the expansions know of the n panels.
    """

    panels: PanelArrays
    basis: np.ndarray
    points: np.ndarray
    weights: np.ndarray
    mean: np.ndarray
    counts: np.ndarray
    images: Images
    far: FarPanels


def no_images(count: int) -> Images:
    """Images of ``count`` panels in open space: only themselves."""
    return Images(np.ones((1, 1, 1)), np.ones(1), np.zeros(count, dtype=np.int64))


def mixed_panels(corners: np.ndarray, conductors: int, images: Images) -> MixedPanels:
    """Arrays for the mixed integrals.

    Args:
        corners: (g, n, 4, 3) panels and their images, conductors first; the normal, about
            which the corners run counter-clockwise, leads from back to front.
        conductors: number nC of conductor panels.
        images: weights of the g images.
    """
    copies, count = corners.shape[:2]
    flat = np.ascontiguousarray(corners.reshape(-1, 4, 3), dtype=float)
    metal = np.tile(np.arange(count) < conductors, copies)
    axes = np.where(metal[:, None, None], side_frames(flat), long_frames(flat))
    panels = panel_arrays(flat, axes)
    own = PanelArrays(*(part[:count] for part in panels))
    targets, basis = make_targets(own), panel_basis(own)
    weights = _test_weights(own, targets, basis, conductors)
    return MixedPanels(
        panels=panels,
        basis=basis,
        points=targets.points,
        weights=weights,
        mean=_polynomial_means(own, targets),
        counts=np.array([conductors, count - conductors]),
        images=images,
        far=far_panels(own, basis, weights),
    )


def _test_weights(
    panels: PanelArrays, targets: Targets, basis: np.ndarray, conductors: int
) -> np.ndarray:
    """(n, 6, 16) test functions times integration weights."""
    out = np.zeros((len(basis), 6, targets.weights.shape[1]))
    out[:, 0] = targets.weights
    out[:conductors, 1:5] = targets.tests[:conductors]
    apart = targets.points[conductors:] - panels.center[conductors:, :, None]
    at = np.einsum("nck,nac->nka", apart, panels.axes[conductors:, :2])
    functions = values(basis[conductors:], at)
    out[conductors:] = functions * targets.weights[conductors:, None]
    return out


def _polynomial_means(panels: PanelArrays, targets: Targets) -> np.ndarray:
    """(n, 4) means of P1(xi), P1(eta), P2(xi), P2(eta) over each panel."""
    raw = np.array([XI, ETA, 1.5 * XI**2 - 0.5, 1.5 * ETA**2 - 0.5])
    return np.einsum("nk,tk->nt", targets.weights, raw) / panels.area[:, None]


class MixedMatrices(NamedTuple):
    """Integrals over all pairs, with their tests.

    Rows are unknowns or tests, columns unknowns; V and K are the single and the double layer
    of the module ``moments``.

    Args:
        single: (N, nC) float64, V of a constant density on conductors.
        double: (N, N) float64, K of the unknowns' functions (constant, or 1, f1, f2).
        single_tests: (4 nC + 3 nI, nC) float32, V of a constant density on conductors.
        double_tests: (4 nC + 3 nI, N) float32, K of the unknowns' functions.
        linear: (4 nC, 3 nI) float32, conductors' tests of V of 1, f1, f2 on interfaces.
        quadratic: (N, 3 nI) float32, K of f3, f4, f5 on interfaces.
    """

    single: np.ndarray
    double: np.ndarray
    single_tests: np.ndarray
    double_tests: np.ndarray
    linear: np.ndarray
    quadratic: np.ndarray


def _shapes(conductors: int, interfaces: int) -> list[tuple[tuple[int, int], type]]:
    unknowns = conductors + LINEAR * interfaces
    tests = TESTS * conductors + QUADRATIC * interfaces
    return [
        ((unknowns, conductors), np.float64),
        ((unknowns, unknowns), np.float64),
        ((tests, conductors), np.float32),
        ((tests, unknowns), np.float32),
        ((TESTS * conductors, LINEAR * interfaces), np.float32),
        ((unknowns, QUADRATIC * interfaces), np.float32),
    ]


def mixed_bytes(conductors: int, interfaces: int) -> int:
    """Bytes of the matrices of so many panels of both kinds."""
    shapes = _shapes(conductors, interfaces)
    return sum(rows * columns * np.dtype(kind).itemsize for (rows, columns), kind in shapes)


def empty_matrices(conductors: int, interfaces: int) -> MixedMatrices:
    """Matrices to be filled."""
    shapes = _shapes(conductors, interfaces)
    return MixedMatrices(*(np.empty(shape, dtype=kind) for shape, kind in shapes))
