"""Capacitances of boxes and cylinders among dielectrics by general hp finite elements (ngsolve).

    pip install ngsolve
    python benchmarks/dielectric_elements.py [--only TEXT]

Computes the values of tests/dielectric_values.py anew. Bodies of revolution are solved in the half
plane, boxes in the part of space that their planes of symmetry leave. The mesh is refined
geometrically toward all edges and corners of conductors and dielectrics. On a far sphere stands
du/dn + u/R - (R/2) div_s grad_s u = 0, which is exact for charge and dipole; what is left falls as
R^-5. Energies fall from above as the space of functions grows (Dirichlet's principle), by a sixth
to a tenth of the last step from one of the two meshes to the next: the table holds the finer
value less a sixth of the step.
"""

from __future__ import annotations

import argparse
import math
import os
import sys
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

for _variable in ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS"):
    os.environ.setdefault(_variable, "1")

import numpy as np  # noqa: E402

sys.path.append(str(Path(__file__).resolve().parent.parent / "tests"))

from dielectric_values import BY_ELEMENTS, DielectricReference  # noqa: E402
from peer_finite_elements import load_ngsolve  # noqa: E402
from reference_values import Body  # noqa: E402

REACH = 6.0
"""Radius of the outer sphere over the half diagonal of the scene."""
FACTOR = 0.15
ROUND = ("cylinder", "disc")


@dataclass(frozen=True)
class Effort:
    """Layers of geometric refinement toward edges, polynomial order, largest size near bodies."""

    levels: int
    order: int
    largest: float = math.inf


SPACE = (Effort(3, 5), Effort(4, 6))
HALF_PLANE = (Effort(6, 8), Effort(9, 11))


def low_corner(body: Body) -> np.ndarray:
    """Corner (3,) of the bounding box with the smallest coordinates."""
    return np.array(body.centre) - 0.5 * extent(body)


def extent(body: Body) -> np.ndarray:
    """Sides (3,) of the bounding box."""
    sizes = body.sizes
    if body.kind in ROUND:
        return np.array([2 * sizes["radius"]] * 2 + [sizes.get("length", 0.0)])
    return np.array([sizes["x"], sizes["y"], sizes.get("z", 0.0)])


def outer_radius(record: DielectricReference) -> float:
    """Radius of the far sphere."""
    far = [np.abs(low_corner(b)) + extent(b) for b in record.bodies]
    return REACH * float(np.linalg.norm(np.max(far, axis=0))) * 0.5


def mirrors(record: DielectricReference) -> list[bool]:
    """Tell for x, y, z whether all bodies are centred on that plane."""
    return [all(b.centre[axis] == 0.0 for b in record.bodies) for axis in range(3)]


# --- geometry ------------------------------------------------------------------------------


def half_disc(radius: float) -> Any:
    """Right half of a disc, its arc named."""
    from netgen.occ import Circle, WorkPlane

    disc = Circle((0, 0), radius).Face()
    disc.edges.name = "sphere"
    right = WorkPlane().MoveTo(0, -2 * radius).Rectangle(2 * radius, 4 * radius).Face()
    return disc * right


def section(body: Body) -> Any:
    """Half of the section of a body of revolution: a rectangle, or a segment for a disc."""
    from netgen.occ import Segment, WorkPlane

    _, _, low = low_corner(body)
    radius = body.sizes["radius"]
    if body.kind == "disc":
        return Segment((0, low, 0), (radius, low, 0))
    return WorkPlane().MoveTo(0, low).Rectangle(radius, body.sizes["length"]).Face()


def ball_part(radius: float, flat: Sequence[bool]) -> Any:
    """Ball cut to the positive side of each plane of symmetry."""
    from netgen.occ import Box, Sphere

    ball = Sphere((0.0, 0.0, 0.0), radius)
    ball.faces.name = "sphere"
    low = [0.0 if cut else -2 * radius for cut in flat]
    return ball * Box(tuple(low), (2 * radius,) * 3) if any(flat) else ball


def block(body: Body) -> Any:
    """Box, or a rectangle for a plate."""
    from netgen.occ import Box, WorkPlane

    low, sides = low_corner(body), extent(body)
    if body.kind == "plate":
        return WorkPlane().MoveTo(*low[:2]).Rectangle(*sides[:2]).Face().Move((0, 0, low[2]))
    return Box(tuple(low), tuple(low + sides))


def glued(record: DielectricReference, space: Any, make: Any) -> Any:
    """Space with all bodies in it: conductors cut out, materials and sheets marked by name."""
    from netgen.occ import Glue

    thin, pieces = [], [space]
    for number, material in enumerate(record.materials):
        piece = make(material.body) * space
        piece.name = ""
        pieces = [p - piece for p in pieces] + [_named(piece, f"m{number}")]
    for number, body in enumerate(record.conductors):
        metal = make(body)
        if body.kind in ("disc", "plate"):
            metal.name = f"c{number}"
            thin.append(metal)
        else:
            (metal.edges if body.kind in ROUND else metal.faces).name = f"c{number}"
            pieces = [p - metal for p in pieces]
    return Glue([*pieces, *thin])


def _named(piece: Any, name: str) -> Any:
    """Name the material of a piece."""
    for part in (*piece.solids, *piece.faces) if not len(piece.solids) else piece.solids:
        part.name = name
    return piece


def meshed(record: DielectricReference, effort: Effort) -> Any:
    """Mesh refined toward every edge (space) or corner (half plane) of the bodies."""
    from netgen.occ import OCCGeometry

    ng, flat = load_ngsolve(), is_round(record)
    radius = outer_radius(record)
    space = half_disc(radius) if flat else ball_part(radius, mirrors(record))
    shape = glued(record, space, section if flat else block)
    sharpen(record, shape, flat)
    geometry = OCCGeometry(shape, dim=2 if flat else 3)
    mesh = ng.Mesh(geometry.GenerateMesh(grading=0.4))
    mesh.RefineHP(effort.levels, FACTOR)
    mesh.Curve(effort.order)
    return mesh


def sharpen(record: DielectricReference, shape: Any, flat: bool) -> None:
    """Ask for refinement at the edges and corners that belong to a body."""
    parts = shape.vertices if flat else (*shape.edges, *shape.vertices)
    for part in parts:
        middle = part.p if hasattr(part, "p") else part.center
        if any(on_edge(body, np.array([*middle]), flat) for body in record.bodies):
            part.hpref = 1


def on_edge(body: Body, point: np.ndarray, flat: bool) -> bool:
    """Tell whether a point lies on an edge of the body, other than by symmetry."""
    if flat:
        point = np.array([point[0], 0.0, point[1]])
    away = np.abs(point - body.centre) - 0.5 * extent(body)
    if flat:
        away = away[[0, 2]]
    return bool(np.all(away < 1e-9) and np.sum(np.abs(away) < 1e-9) >= 2)


def is_round(record: DielectricReference) -> bool:
    """Tell whether all bodies are of revolution about z."""
    return all(body.kind in ROUND for body in record.bodies)


# --- solution ------------------------------------------------------------------------------


def forms(record: DielectricReference, space: Any) -> Any:
    """Energy over 4 pi of the whole scene, in the part that is meshed."""
    ng = load_ngsolve()
    u, v = space.TnT()
    radius, flat = outer_radius(record), is_round(record)
    values = {f"m{k}": m.permittivity for k, m in enumerate(record.materials)}
    eps = space.mesh.MaterialCF(values, default=1.0)
    weight = 0.5 * ng.x if flat else 2.0 ** sum(mirrors(record)) / (4.0 * math.pi)
    far = u.Trace() * v.Trace() / radius
    far += 0.5 * radius * ng.grad(u).Trace() * ng.grad(v).Trace()
    form = ng.BilinearForm(space, symmetric=True, condense=True)
    form += weight * eps * ng.grad(u) * ng.grad(v) * ng.dx
    form += weight * far * ng.ds("sphere")
    return form


def maxwell(record: DielectricReference, effort: Effort) -> tuple[np.ndarray, int]:
    """(n, n) L = C / (4 pi eps0), and the number of unknowns."""
    ng = load_ngsolve()
    mesh = meshed(record, effort)
    names = [f"c{k}" for k in range(len(record.conductors))]
    space = ng.H1(mesh, order=effort.order, dirichlet="|".join(names))
    form = forms(record, space)
    form.Assemble()
    inverse = form.mat.Inverse(space.FreeDofs(True), inverse="sparsecholesky")
    potentials = []
    for name in names:
        potential = ng.GridFunction(space)
        potential.Set(1.0, definedon=mesh.Boundaries(name))
        pull = potential.vec.CreateVector()
        pull.data = -form.mat * potential.vec
        potential.vec.data += inverse * pull
        potentials.append(potential)
    matrix = [[ng.InnerProduct(form.mat * a.vec, b.vec) for b in potentials] for a in potentials]
    return np.array(matrix), space.ndof


def main() -> None:
    """Print each value of the table beside what is computed."""
    parser = argparse.ArgumentParser(description="Dielectric references by finite elements.")
    parser.add_argument("--only", default="", help="records whose name holds this")
    options = parser.parse_args()
    for record in [r for r in BY_ELEMENTS if options.only in r.name]:
        print(record.name)
        for effort in HALF_PLANE if is_round(record) else SPACE:
            matrix, unknowns = maxwell(record, effort)
            text = " ".join(f"{x:.9f}" for x in matrix[np.triu_indices(len(matrix))])
            print(
                f"  levels {effort.levels} order {effort.order}: {unknowns:7d}  {text}", flush=True
            )
        table = " ".join(f"{x:.9f}" for x in record.matrix[np.triu_indices(len(record.matrix))])
        print(f"  table: {table} +- {record.uncertainty:.1e}")


if __name__ == "__main__":
    main()
