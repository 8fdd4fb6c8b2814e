"""Bodies of revolution among dielectrics by finite elements of high order (scikit-fem).

Shares nothing with bem, nor with the tetrahedra of the benchmark. The half plane is cut into
rectangles by the lines of all faces, graded geometrically toward these lines from both sides, and
grows by a factor of 3 from cell to cell outside, out to a million times the size of the scene,
where the potential is set to zero: that adds a millionth to the capacitance.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import skfem
from dielectric_values import DielectricReference
from reference_values import Body
from scipy.sparse import csc_matrix
from scipy.sparse.linalg import splu
from skfem.helpers import dot, grad

FACTOR = 0.15
GROWTH = 3.0
REACH = 1e6
TINY = 1e-9


@dataclass(frozen=True)
class Rectangle:
    """Half of the section of a body: ``r`` up to ``radius``, z from ``low`` to ``high``."""

    radius: float
    low: float
    high: float

    def holds(self, points: np.ndarray) -> np.ndarray:
        """Tell which points (2, n) lie inside or on it."""
        r, z = points
        return (r < self.radius + TINY) & (z > self.low - TINY) & (z < self.high + TINY)


def rectangle(body: Body) -> Rectangle:
    """Section of a cylinder or a disc about the z axis."""
    half = 0.5 * body.sizes.get("length", 0.0)
    return Rectangle(body.sizes["radius"], body.centre[2] - half, body.centre[2] + half)


def _inner(start: float, stop: float, layers: int, at_start: bool) -> np.ndarray:
    """Nodes from ``start`` to ``stop``, graded toward the end and, if told, the start."""
    steps = FACTOR ** np.arange(layers, -1, -1.0)
    if not at_start:
        return np.concatenate([[start], stop - (stop - start) * steps[::-1], [stop]])
    half = 0.5 * (stop - start)
    left, right = start + half * steps, stop - half * steps[::-1]
    return np.concatenate([[start], left, right[1:], [stop]])


def _outer(start: float, size: float, layers: int) -> np.ndarray:
    """Nodes away from ``start``, graded toward it, then growing out to the far end."""
    far = int(np.ceil(np.log(REACH) / np.log(GROWTH)))
    steps = [FACTOR ** np.arange(layers, 0, -1.0), GROWTH ** np.arange(far + 1)]
    return start + size * np.concatenate(steps)


def _nodes(breaks: Sequence[float], layers: int, axis: bool) -> np.ndarray:
    """Nodes along one direction through all breaks; ``axis``: nothing is left of the first."""
    lines = np.unique(np.round(breaks, 12))
    size = float(np.abs(lines).max())
    parts = [
        _inner(a, b, layers, not axis or k > 0)
        for k, (a, b) in enumerate(zip(lines[:-1], lines[1:], strict=True))
    ]
    parts.append(_outer(lines[-1], size, layers))
    if not axis:
        parts.append(-_outer(-lines[0], size, layers))
    return np.unique(np.concatenate(parts))


def _mesh(record: DielectricReference, layers: int) -> skfem.MeshQuad:
    """Half plane without the solid conductors."""
    cuts = [rectangle(body) for body in record.bodies]
    r = _nodes([0.0, *(c.radius for c in cuts)], layers, axis=True)
    z = _nodes([x for c in cuts for x in (c.low, c.high)], layers, axis=False)
    mesh = skfem.MeshQuad.init_tensor(r, z)
    middles = mesh.p[:, mesh.t].mean(axis=1)
    metal = np.any([rectangle(body).holds(middles) for body in record.conductors], axis=0)
    return mesh.remove_elements(np.flatnonzero(metal))


def _permittivity(record: DielectricReference, mesh: skfem.MeshQuad) -> np.ndarray:
    """Of every element."""
    middles = mesh.p[:, mesh.t].mean(axis=1)
    value = np.ones(mesh.nelements)
    for material in record.materials:
        value[rectangle(material.body).holds(middles)] = material.permittivity
    return value


@skfem.BilinearForm
def _energy(u, v, w):
    return 0.5 * w.x[0] * w.permittivity * dot(grad(u), grad(v))


def _stiffness(record: DielectricReference, basis: skfem.Basis) -> csc_matrix:
    eps = np.repeat(_permittivity(record, basis.mesh)[:, None], basis.X.shape[-1], axis=1)
    return _energy.assemble(basis, permittivity=eps).tocsc()


def _far(mesh: skfem.MeshQuad) -> np.ndarray:
    """Facets at the far end."""
    facets = mesh.boundary_facets()
    middles = np.abs(mesh.p[:, mesh.facets[:, facets]].mean(axis=1))
    limits = np.abs(mesh.p).max(axis=1)[:, None] - TINY
    return facets[np.any(middles > limits, axis=0)]


def axial_capacitance(record: DielectricReference, degree: int, layers: int) -> np.ndarray:
    """(n, n) L = C / (4 pi eps0): energies of the potentials that are 1 on one conductor.

    They lie above the true ones (Dirichlet's principle).

    Args:
        record: made of cylinders and discs about the z axis.
        degree: of the polynomials.
        layers: cells graded toward each line.
    """
    basis = skfem.Basis(_mesh(record, layers), skfem.ElementQuadP(degree), intorder=2 * degree)
    matrix = _stiffness(record, basis)
    middles = basis.mesh.p[:, basis.mesh.facets].mean(axis=1)
    on = [np.flatnonzero(rectangle(body).holds(middles)) for body in record.conductors]
    fixed = np.unique(np.concatenate([basis.get_dofs(f).all() for f in (*on, _far(basis.mesh))]))
    free = np.setdiff1d(np.arange(basis.N), fixed)
    potential = np.zeros((basis.N, len(on)))
    for column, facets in enumerate(on):
        nodes = np.unique(basis.mesh.facets[:, facets])
        potential[basis.nodal_dofs[0, nodes], column] = 1.0
    potential[free] = splu(matrix[free][:, free]).solve(-(matrix[free] @ potential))
    return potential.T @ (matrix @ potential)
