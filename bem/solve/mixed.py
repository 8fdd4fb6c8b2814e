"""The mixed system and its transpose, by one factorisation."""

from __future__ import annotations

import numpy as np
from scipy.linalg import LinAlgError, lu_factor, lu_solve

from bem.errors import SolutionError


def solve_mixed(
    matrix: np.ndarray, scale: tuple[np.ndarray, np.ndarray], sides: tuple[np.ndarray, np.ndarray]
) -> tuple[np.ndarray, np.ndarray]:
    """Solutions (N, k) of matrix x = sides[0] and of matrix^T z = sides[1].

    Args:
        matrix: (N, N), overwritten.
        scale: (N,) factors of rows and of columns that bring the diagonal near 1.
        sides: right sides (N, k) of the system and of its transpose.

    Raises:
        SolutionError: the matrix is singular to working precision, or something is not finite.
    """
    rows, columns = (s[:, None] for s in scale)
    matrix *= rows
    matrix *= scale[1]
    try:
        factor = lu_factor(matrix, overwrite_a=True, check_finite=False)
    except LinAlgError as error:
        raise SolutionError(_unsolvable(len(matrix))) from error
    x = columns * lu_solve(factor, rows * sides[0], check_finite=False)
    z = rows * lu_solve(factor, columns * sides[1], trans=1, check_finite=False)
    if not (np.isfinite(x).all() and np.isfinite(z).all()):
        raise SolutionError(_unsolvable(len(matrix)))
    return x, z


def _unsolvable(unknowns: int) -> str:
    return (
        f"the system of {unknowns} unknowns has no solution in double precision: faces overlap or "
        "lie there twice, or bodies are too close for their size; mend the meshes, and check the "
        "regions with 'bem inspect'"
    )
