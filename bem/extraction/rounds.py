"""Which system a scene leads to: conductors alone, or conductors and interfaces."""

from __future__ import annotations

from collections.abc import Callable
from functools import partial
from typing import Any

import numpy as np

from bem.extraction.solution import solve_round
from bem.extraction.solved import Solved
from bem.panels.mesh import Mesh

Solver = Callable[[Mesh, int, float, Any], Solved]


def solver_of(mesh: Mesh, permittivity: np.ndarray) -> Solver:
    """Return what solves a mesh, given the number of conductors, where expansions begin, and reuse.

    Args:
        mesh: with the regions of its panels.
        permittivity: (r,) of each region over that of the surroundings.
    """
    regions = mesh.regions
    if np.all(permittivity[np.unique(regions[regions >= 0])] == 1.0):
        if (mesh.conductor >= 0).all():
            return solve_round
    from bem.extraction.mixed import solve_dielectric

    return partial(solve_dielectric, permittivity=permittivity)
