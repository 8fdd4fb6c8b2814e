"""Galerkin's equations with a dense operator: Cholesky, all right-hand sides together."""

from __future__ import annotations

import numpy as np
from scipy.linalg import LinAlgError, cho_factor, cho_solve

from bem.errors import SolutionError
from bem.operators.dense import DenseOperator


def solve_dense(operator: DenseOperator, right: np.ndarray) -> np.ndarray:
    """Densities (n, k) with ``operator.apply(density) = right``.

    Args:
        operator: n panels.
        right: (n, k) potential integrated over each panel.

    Raises:
        SolutionError: the matrix is not positive definite, which the exact one always is:
            its integrals are too inaccurate for this geometry.
    """
    matrix = operator.matrix()
    scale = 1.0 / np.sqrt(np.diagonal(matrix))
    matrix *= scale
    matrix *= scale[:, None]
    try:
        factor = cho_factor(matrix, lower=True, overwrite_a=True, check_finite=False)
    except LinAlgError as error:
        raise SolutionError(
            f"the system of {operator.size} panels is not positive definite: "
            "faces of one body overlap or lie there twice, or two conductors are too close "
            "for their size; mend the mesh, and check the gaps with 'bem inspect'"
        ) from error
    density = scale[:, None] * cho_solve(factor, scale[:, None] * right, check_finite=False)
    if not np.isfinite(density).all():
        raise SolutionError(
            f"the densities on {operator.size} panels are not finite: the geometry is out of "
            "the range of double precision; run 'bem inspect' and check sizes and gaps"
        )
    return density
