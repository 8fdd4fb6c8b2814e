"""The compiler for geometry, with its cache in a folder that can be written."""

from __future__ import annotations

import bem.kernels  # noqa: F401, chooses the folder before the compiler looks for one

# isort: split
from numba import njit

__all__ = ["njit"]
