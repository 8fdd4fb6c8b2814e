"""Samples of a target: test functions of one panel against the layers of another.

Rows of ``work`` are those of ``moments``; results are ``single`` (6, 3), tests against V of
f0, f1, f2, and ``double`` (6, 6), tests against K of f0 to f5. Only what is stored is summed.
"""

from __future__ import annotations

from bem.compiled import njit
from bem.kernels.mixed_expansion import far_constant, far_double, far_single
from bem.kernels.moments import constant_moments, double_moments, moments

FAST = {"contract", "reassoc", "nsz"}


@njit(inline="always", error_model="numpy")
def _constant_test(block, t, weights, work, single, double):
    """Test t against V and K of f0."""
    v, k = 0.0, 0.0
    for q in range(work.shape[1]):
        w = weights[block, t, q]
        v += w * work[3, q]
        k += w * work[4, q]
    single[t, 0], double[t, 0] = v, k


@njit(inline="always", error_model="numpy")
def _linear_test(block, t, weights, work, double):
    """Test t against K of f0, f1, f2."""
    a, b, c = 0.0, 0.0, 0.0
    for q in range(work.shape[1]):
        w = weights[block, t, q]
        a += w * work[4, q]
        b += w * work[5, q]
        c += w * work[6, q]
    double[t, 0], double[t, 1], double[t, 2] = a, b, c


@njit(inline="always", error_model="numpy")
def _quadratic_test(block, t, weights, work, double):
    """Test t against K of f3, f4, f5."""
    a, b, c = 0.0, 0.0, 0.0
    for q in range(work.shape[1]):
        w = weights[block, t, q]
        a += w * work[7, q]
        b += w * work[8, q]
        c += w * work[9, q]
    double[t, 3], double[t, 4], double[t, 5] = a, b, c


@njit(inline="always", error_model="numpy")
def _potential_test(block, t, weights, work, single):
    """Test t against V of f0, f1, f2."""
    a, b, c = 0.0, 0.0, 0.0
    for q in range(work.shape[1]):
        w = weights[block, t, q]
        a += w * work[3, q]
        b += w * work[10, q]
        c += w * work[11, q]
    single[t, 0], single[t, 1], single[t, 2] = a, b, c


@njit(cache=True, error_model="numpy", fastmath=FAST)
def weigh_conductor(block, weights, work, single, double):
    """Layers of a conductor, V and K of f0, against all six tests."""
    for t in range(6):
        _constant_test(block, t, weights, work, single, double)


@njit(cache=True, error_model="numpy", fastmath=FAST)
def weigh_double(block, weights, work, double):
    """K of an interface on an interface: of f0, f1, f2 against all, of others against three."""
    for t in range(6):
        _linear_test(block, t, weights, work, double)
    for t in range(3):
        _quadratic_test(block, t, weights, work, double)


@njit(cache=True, error_model="numpy", fastmath=FAST)
def weigh_both(block, weights, work, single, double):
    """Layers of an interface on a conductor: K against the constant, V and K against others."""
    _quadratic_test(block, 0, weights, work, double)
    for t in range(5):
        _linear_test(block, t, weights, work, double)
    for t in range(1, 5):
        _potential_test(block, t, weights, work, single)


@njit(cache=True, error_model="numpy")
def sampled(source, setup, metal, block, points, weights, work, single, double):
    """Tests of a target at its samples against both layers of a source.

    Args:
        source: panel or image.
        setup: the ``MixedPanels``.
        metal: whether the target is a conductor.
        block: which of the blocks of points.
        points: (b, 3, k) samples.
        weights: (b, 6, k) test functions times integration weights.
        work: (12, k) scratch.
        single: (6, 3) result, tests against V.
        double: (6, 6) result, tests against K.
    """
    if source % setup.basis.shape[0] < setup.counts[0]:
        constant_moments(source, setup.panels, points, block, work)
        weigh_conductor(block, weights, work, single, double)
    elif metal:
        moments(source, setup.basis, setup.panels, points, block, work)
        weigh_both(block, weights, work, single, double)
    else:
        double_moments(source, setup.basis, setup.panels, points, block, work)
        weigh_double(block, weights, work, double)


@njit(cache=True, error_model="numpy")
def expanded(source, setup, metal, i, work, single, double):
    """The same for a far source, its layers expanded, at the samples of panel i."""
    panels, points, weights = setup.panels, setup.points, setup.weights
    moments_of = setup.far.moments
    if source % setup.basis.shape[0] < setup.counts[0]:
        far_constant(source, moments_of, panels, points, i, work)
        weigh_conductor(i, weights, work, single, double)
        return
    far_double(source, moments_of, panels, points, i, work)
    if metal:
        far_single(source, moments_of, panels, points, i, work)
        weigh_both(i, weights, work, single, double)
    else:
        weigh_double(i, weights, work, double)
