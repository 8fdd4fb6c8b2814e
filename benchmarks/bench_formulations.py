"""Which equations for dielectrics: four formulations on the same panels.

    python benchmarks/bench_formulations.py [--only TEXT]

N   one density of all charge, free and bound; normal field at the centroid of each panel
G   the same density, Gauss's law exact on each panel (flux by solid angles, averaged)
D   one equation per region; potential and normal displacement on interfaces, both constant
T0  Green's third identity weighted by permittivity, potential constant on interface panels
T1  the same, linear: what bem solves

Everything is dense and plain: closed forms for source panels, samples for rows, direct solution;
no refinement, no extrapolation. Printed for each: relative error of C_11 against the known value,
iterations of GMRES with diagonal scaling to 1e-6, and the condition number of the matrix scaled
in that way.
"""

from __future__ import annotations

import argparse
import os
import sys
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import NamedTuple

for _variable in ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS"):
    os.environ.setdefault(_variable, "1")

import numpy as np  # noqa: E402
import trimesh  # noqa: E402
from scipy.sparse.linalg import gmres  # noqa: E402

sys.path.append(str(Path(__file__).resolve().parent.parent / "tests"))

from dielectric_formulas import coated_sphere  # noqa: E402
from dielectric_values import BY_NAME  # noqa: E402

METAL = -1
NEAR = 1.5
CHUNK = 200_000
FULL = 4.0 * np.pi


class Panels(NamedTuple):
    """Flat panels: corners (n, 4, 3) about normals from back to front, conductor or -1, regions."""

    corners: np.ndarray
    conductor: np.ndarray
    back: np.ndarray
    front: np.ndarray


class Frame(NamedTuple):
    """Centre (n, 3), two axes in the plane and the normal (n, 3, 3), area and size (n,)."""

    centre: np.ndarray
    axes: np.ndarray
    area: np.ndarray
    size: np.ndarray


@dataclass(frozen=True)
class Case:
    """Panels, permittivity of each region from 0, and the known C_11 in L."""

    name: str
    panels: Panels
    permittivity: tuple[float, ...]
    exact: float


# --- panels --------------------------------------------------------------------------------


def graded(low: float, high: float, cells: int) -> np.ndarray:
    """Nodes closer together at both ends: 1 - cos."""
    return low + 0.5 * (high - low) * (1.0 - np.cos(np.pi * np.arange(cells + 1) / cells))


def patch(axis: int, at: float, u: np.ndarray, v: np.ndarray) -> np.ndarray:
    """Panels (n, 4, 3) of a rectangle normal to ``axis``, normals toward its positive end."""
    a, b = np.meshgrid(u, v, indexing="ij")
    ring = [(a[:-1, :-1], b[:-1, :-1]), (a[1:, :-1], b[1:, :-1]), (a[1:, 1:], b[1:, 1:])]
    ring.append((a[:-1, 1:], b[:-1, 1:]))
    corners = np.empty((ring[0][0].size, 4, 3))
    corners[..., axis] = at
    for k, (first, second) in enumerate(ring):
        corners[:, k, (axis + 1) % 3] = first.ravel()
        corners[:, k, (axis + 2) % 3] = second.ravel()
    return corners


class Faces:
    """Collects rectangles with what lies behind and in front."""

    def __init__(self, cells: int) -> None:
        self.cells, self.parts = cells, []

    def add(self, corners: np.ndarray, conductor: int, back: int, front: int) -> None:
        """Add panels of one kind."""
        self.parts.append((corners, *(np.full(len(corners), k) for k in (conductor, back, front))))

    def side(self, low, high, axis: int, up: bool, kind: tuple[int, int, int]) -> None:
        """Add one side of the box from ``low`` to ``high``, normal outward."""
        u, v = (graded(low[k % 3], high[k % 3], self.cells) for k in (axis + 1, axis + 2))
        corners = patch(axis, (high if up else low)[axis], u, v)
        self.add(corners if up else corners[:, ::-1], *kind)

    def panels(self) -> Panels:
        """Return all of them."""
        return Panels(*(np.concatenate(p) for p in zip(*self.parts, strict=True)))


def cube_in_coat(cells: int) -> Panels:
    """Unit cube in a cubic coat of side 1.5."""
    faces = Faces(cells)
    for half, kind in ((0.5, (0, METAL, 1)), (0.75, (-1, 1, 0))):
        for axis in range(3):
            for up in (False, True):
                faces.side((-half,) * 3, (half,) * 3, axis, up, kind)
    return faces.panels()


def slab_between_plates(cells: int) -> Panels:
    """Unit slab, 0.2 thick, flush between plates of 0.1."""
    faces = Faces(cells)
    for sign, conductor in ((1, 0), (-1, 1)):
        z = sorted((0.1 * sign, 0.2 * sign))
        low, high = (-0.5, -0.5, z[0]), (0.5, 0.5, z[1])
        for axis in range(3):
            for up in (False, True):
                touching = axis == 2 and up == (sign < 0)
                faces.side(low, high, axis, up, (conductor, METAL, 1 if touching else 0))
    for axis in range(2):
        for up in (False, True):
            faces.side((-0.5, -0.5, -0.1), (0.5, 0.5, 0.1), axis, up, (-1, 1, 0))
    return faces.panels()


def sheet_on_block(cells: int) -> Panels:
    """Unit sheet in the middle of the top of a block of 2 x 2 x 0.5."""
    faces = Faces(cells)
    low, high = (-1.0, -1.0, -0.5), (1.0, 1.0, 0.0)
    for axis, up in ((0, False), (0, True), (1, False), (1, True), (2, False)):
        faces.side(low, high, axis, up, (-1, 1, 0))
    third = max(2, cells // 2)
    spans = [
        graded(*ends, n)
        for ends, n in (((-1, -0.5), third), ((-0.5, 0.5), cells), ((0.5, 1), third))
    ]
    for i, u in enumerate(spans):
        for j, v in enumerate(spans):
            faces.add(patch(2, 0.0, u, v), 0 if i == j == 1 else -1, 1, 0)
    return faces.panels()


def sphere_in_coat(ratio: float, subdivisions: int) -> Panels:
    """Facets of both spheres, each scaled to the volume of its ball."""
    faces = Faces(0)
    ball = trimesh.creation.icosphere(subdivisions)
    triangles = ball.triangles * (FULL / 3.0 / ball.volume) ** (1.0 / 3.0)
    corners = triangles[:, [0, 1, 2, 2]]
    faces.add(corners, 0, METAL, 1)
    faces.add(ratio * corners, -1, 1, 0)
    return faces.panels()


# --- integrals -----------------------------------------------------------------------------


def frame_of(corners: np.ndarray) -> Frame:
    """Local coordinates of panels."""
    fan = 0.5 * np.cross(corners[:, 1:3] - corners[:, :1], corners[:, 2:] - corners[:, :1])
    normal = fan.sum(axis=1)
    area = np.linalg.norm(normal, axis=1)
    thirds = (corners[:, :1] + corners[:, 1:3] + corners[:, 2:]) / 3.0
    share = np.linalg.norm(fan, axis=2) / area[:, None]
    first = corners[:, 1] - corners[:, 0]
    first /= np.linalg.norm(first, axis=1)[:, None]
    normal /= area[:, None]
    axes = np.stack([first, np.cross(normal, first), normal], axis=1)
    size = np.linalg.norm(np.ptp(corners, axis=1), axis=1)
    return Frame((share[..., None] * thirds).sum(axis=1), axes, area, size)


def moments(points: np.ndarray, corners: np.ndarray, frame: Frame) -> np.ndarray:
    """(4, p): V of 1 and K of 1, x, y of panel k at point k, coordinates about its centroid.

    Wilton, Rao, Glisson, Schaubert, Al-Bundak, Butler (1984); K is the solid angle from the front.
    """
    local = np.einsum("pij,pkj->pki", frame.axes, corners - points[:, None])
    height = -local[:, 0, 2]
    flat = np.abs(height) < 1e-9 * frame.size
    start, end = local[..., :2], np.roll(local, -1, axis=1)[..., :2]
    side = end - start
    length = np.linalg.norm(side, axis=2)
    tangent = side / np.where(length > 0.0, length, 1.0)[..., None]
    outward = np.stack([tangent[..., 1], -tangent[..., 0]], axis=-1)
    reach = np.einsum("pki,pki->pk", outward, start)
    t0, t1 = (np.einsum("pki,pki->pk", tangent, x) for x in (start, end))
    square = reach**2 + height[:, None] ** 2
    r0, r1 = np.sqrt(t0**2 + square), np.sqrt(t1**2 + square)
    floor = np.maximum(square, 1e-30)
    log = np.arcsinh(t1 / np.sqrt(floor)) - np.arcsinh(t0 / np.sqrt(floor))
    log = np.where(length > 0.0, log, 0.0)
    high = np.abs(height)[:, None]
    below = square + high * r1, square + high * r0
    turn = np.arctan2(reach * t1, below[0]) - np.arctan2(reach * t0, below[1])
    angle = np.where(flat, 0.0, np.sign(height) * turn.sum(axis=1))
    value = (reach * log).sum(axis=1) - np.abs(height) * turn.sum(axis=1)
    foot = np.einsum("pij,pj->pi", frame.axes[:, :2], points - frame.centre)
    flux = np.where(flat, 0.0, height)[:, None] * np.einsum("pki,pk->pi", outward, log)
    return np.vstack([value, angle, (foot * angle[:, None] - flux).T])


def gauss(count: int, clustered: bool) -> tuple[np.ndarray, np.ndarray]:
    """Nodes and weights on [0, 1], drawn to the ends by 3x^2 - 2x^3 if told."""
    x, w = np.polynomial.legendre.leggauss(count)
    x, w = 0.5 * (x + 1.0), 0.5 * w
    return (3 * x**2 - 2 * x**3, w * 6 * x * (1 - x)) if clustered else (x, w)


class Samples(NamedTuple):
    """Points (n, s, 3) of panels, weights (n, s) that sum to 1, tests (n, s, 3): 1, x, y."""

    points: np.ndarray
    weights: np.ndarray
    tests: np.ndarray


def samples_of(corners: np.ndarray, frame: Frame, count: int, clustered: bool) -> Samples:
    """Tensor rule on every quadrilateral."""
    x, w = gauss(count, clustered)
    u, v = (g.ravel() for g in np.meshgrid(x, x, indexing="ij"))
    shape = np.stack([(1 - u) * (1 - v), u * (1 - v), u * v, (1 - u) * v])
    slopes = [np.stack([v - 1, 1 - v, v, -v]), np.stack([u - 1, -u, u, 1 - u])]
    du, dv = (np.einsum("ks,nkd->nsd", s, corners) for s in slopes)
    points = np.einsum("ks,nkd->nsd", shape, corners)
    weights = np.outer(w, w).ravel() * np.linalg.norm(np.cross(du, dv), axis=2)
    weights /= weights.sum(axis=1)[:, None]
    inside = np.einsum("nid,nsd->nsi", frame.axes[:, :2], points - frame.centre[:, None])
    inside /= frame.size[:, None, None]
    return Samples(points, weights, np.concatenate([np.ones_like(inside[..., :1]), inside], axis=2))


@dataclass(frozen=True)
class Integrals:
    """Averages over rows: (3 tests, 4 functionals, n, n), and at the centroids (4, n, n)."""

    rows: np.ndarray
    frame: Frame
    slopes: np.ndarray
    mass: np.ndarray


def _pick(frame: Frame, index: np.ndarray) -> Frame:
    return Frame(*(part[index] for part in frame))


def _averages(panels: Panels, frame: Frame, pairs: np.ndarray, samples: Samples) -> np.ndarray:
    """(3, 4, p) for pairs (p, 2) of row and source."""
    found, per = [], samples.weights.shape[1]
    for block in np.array_split(pairs, max(1, len(pairs) * per // CHUNK)):
        j = np.repeat(block[:, 1], per)
        points = samples.points[block[:, 0]].reshape(-1, 3)
        values = moments(points, panels.corners[j], _pick(frame, j)).reshape(4, -1, per)
        tested = samples.weights[block[:, 0]][..., None] * samples.tests[block[:, 0]]
        values[2:] /= frame.size[block[:, 1]][None, :, None]
        found.append(np.einsum("pst,fps->tfp", tested, values))
    return np.concatenate(found, axis=2)


def normal_fields(panels: Panels, frame: Frame) -> np.ndarray:
    """(n, n) n_i . grad of the potential of panel j at the centroid of i: central differences."""
    n, step = len(panels.corners), 1e-4
    j = np.tile(np.arange(n), n)
    i = np.repeat(np.arange(n), n)
    values = []
    for sign in (1.0, -1.0):
        away = sign * step * frame.size[:, None] * frame.axes[:, 2]
        points = (frame.centre + away)[i]
        blocks = np.array_split(np.arange(n * n), max(1, n * n // CHUNK))
        values.append(
            np.concatenate(
                [moments(points[b], panels.corners[j[b]], _pick(frame, j[b]))[0] for b in blocks]
            )
        )
    slope = (values[0] - values[1]).reshape(n, n) / (2.0 * step * frame.size[:, None])
    np.fill_diagonal(slope, 0.0)
    return slope


def integrate(panels: Panels) -> Integrals:
    """All integrals of a set of panels; rows that are near are sampled toward the rim."""
    frame, n = frame_of(panels.corners), len(panels.corners)
    every = np.stack(np.divmod(np.arange(n * n), n), axis=1)
    far = samples_of(panels.corners, frame, 3, False)
    rows = _averages(panels, frame, every, far)
    apart = np.linalg.norm(frame.centre[every[:, 0]] - frame.centre[every[:, 1]], axis=1)
    near = np.flatnonzero(apart < NEAR * (frame.size[every[:, 0]] + frame.size[every[:, 1]]))
    close = samples_of(panels.corners, frame, 8, True)
    rows[..., near] = _averages(panels, frame, every[near], close)
    mass = np.einsum("ns,nst,nsu->ntu", close.weights, close.tests, close.tests)
    return Integrals(rows.reshape(3, 4, n, n), frame, normal_fields(panels, frame), mass)


# --- formulations --------------------------------------------------------------------------


class System(NamedTuple):
    """Matrix, right side for 1 V on conductor 0, and the charge as a row on the solution."""

    matrix: np.ndarray
    right: np.ndarray
    charge: np.ndarray


class Setting(NamedTuple):
    """What all formulations start from; indices of conductor and interface panels."""

    panels: Panels
    integrals: Integrals
    back: np.ndarray
    front: np.ndarray
    metal: np.ndarray
    between: np.ndarray
    permittivity: tuple[float, ...]

    @property
    def step(self) -> np.ndarray:
        """Permittivity behind less that in front, over 4 pi."""
        return (self.back - self.front) / FULL

    @property
    def middle(self) -> np.ndarray:
        """Mean permittivity of both sides."""
        return 0.5 * (self.back + self.front)

    @property
    def live(self) -> np.ndarray:
        """(n,) 1 on panels of conductor 0."""
        return (self.panels.conductor == 0).astype(float)


def setting_of(case: Case, integrals: Integrals) -> Setting:
    """Permittivity on both sides of every panel."""
    eps = np.array([*case.permittivity, 0.0])
    owned = case.panels.conductor >= 0
    index = np.flatnonzero(owned), np.flatnonzero(~owned)
    both = eps[case.panels.back], eps[case.panels.front]
    return Setting(case.panels, integrals, *both, *index, case.permittivity)


def _densities(s: Setting, flux: np.ndarray) -> System:
    """One density of all charge, by the flux (n, n) that each panel sends through another."""
    matrix = s.integrals.rows[0, 0].copy()
    law = FULL * np.diag(s.middle) + FULL * s.step[:, None] * flux
    matrix[s.between] = law[s.between]
    solid = s.back == 0.0
    free = np.where(solid[:, None], np.diag(s.front), law / FULL)
    area = s.integrals.frame.area * s.live
    return System(matrix, s.live, area @ free)


def centroid_density(s: Setting) -> System:
    """N."""
    return _densities(s, s.integrals.slopes)


def gauss_density(s: Setting) -> System:
    """G: flux through i of panel j is the solid angle of i, averaged over j."""
    area = s.integrals.frame.area
    return _densities(s, (s.integrals.rows[0, 1] * area[:, None]).T / area[:, None])


class Sides(NamedTuple):
    """Sides of panels that see a field: panel, region, permittivity, sign of the outward normal."""

    panel: np.ndarray
    region: np.ndarray
    permittivity: np.ndarray
    sign: np.ndarray


def _sides(s: Setting) -> Sides:
    """Backs of interfaces, all sides of conductors, fronts of interfaces, in this order."""
    behind = s.metal[s.back[s.metal] > 0.0]
    backs, fronts = (s.between, behind), (s.metal, s.between)
    panel = np.concatenate([*backs, *fronts])
    back = np.arange(len(panel)) < len(s.between) + len(behind)
    region = np.where(back, s.panels.back[panel], s.panels.front[panel])
    permittivity = np.where(back, s.back[panel], s.front[panel])
    return Sides(panel, region, permittivity, np.where(back, 1.0, -1.0))


def direct(s: Setting) -> System:
    """D: for each region 2 pi u = V du/dn - K u, normals outward; sheets have two fluxes."""
    sides, count = _sides(s), len(s.between)
    pairs = np.ix_(sides.panel, sides.panel)
    same = sides.region[:, None] == sides.region
    potential, double = (same * kernel[pairs] for kernel in s.integrals.rows[0, :2])
    total, rest = len(sides.panel), len(sides.panel) - count
    flux = np.vstack([np.eye(rest), -np.eye(count, rest)])
    value = np.vstack([np.eye(count), np.zeros((rest - count, count)), np.eye(count)])
    drive = sides.sign * double + 0.5 * FULL * np.eye(total)
    matrix = np.hstack([-(potential / sides.permittivity) @ flux, drive @ value])
    charge = np.zeros(total)
    charge[count:rest] = (s.integrals.frame.area * s.live)[sides.panel[count:rest]] / FULL
    return System(matrix, -drive @ s.live[sides.panel], charge)


def _missing(s: Setting, test: int) -> np.ndarray:
    """(n,) what sums of K over whole regions miss of -2 pi on their rim, times permittivity."""
    missing = np.zeros(len(s.back))
    for region, permittivity in enumerate(s.permittivity):
        sign = (s.panels.back == region) * 1.0 - (s.panels.front == region)
        inner = -0.5 if region else 0.5
        expected = inner * FULL * s.integrals.mass[:, 0, test]
        lost = s.integrals.rows[test, 1] @ sign - expected
        missing += np.where(sign != 0.0, permittivity / FULL * lost, 0.0)
    return missing


def weighted(s: Setting, linear: bool) -> System:
    """T0 or T1: free charge on conductors and potential on interfaces."""
    rows, metal, between = s.integrals.rows, s.metal, s.between
    tests = (0, 1, 2) if linear else (0,)
    on_metal = [-s.step[between] * rows[0, 1 + f][np.ix_(metal, between)] for f in tests]
    lines = [np.hstack([rows[0, 0][np.ix_(metal, metal)], *on_metal])]
    lines += [_interface_row(s, t, tests) for t in tests]
    known = (s.middle - _missing(s, 0)) * s.live + rows[0, 1] @ (s.step * s.live)
    right = [known[metal]] + [-(rows[t, 1] @ (s.step * s.live))[between] for t in tests]
    area = s.integrals.frame.area[metal] * s.live[metal]
    charge = np.concatenate([area, np.zeros(len(tests) * len(between))])
    return System(np.vstack(lines), np.concatenate(right), charge)


def _interface_row(s: Setting, test: int, functions: tuple[int, ...]) -> np.ndarray:
    """Equations of one test on all interface panels."""
    rows, between = s.integrals.rows[test], s.between
    blocks = [-rows[0][np.ix_(between, s.metal)]]
    for f in functions:
        own = s.middle[between] * s.integrals.mass[between, test, f]
        own = own - (_missing(s, test)[between] if f == 0 else 0.0)
        blocks.append(s.step[between] * rows[1 + f][np.ix_(between, between)] + np.diag(own))
    return np.hstack(blocks)


FORMULATIONS: dict[str, Callable[[Setting], System]] = {
    "N": centroid_density,
    "G": gauss_density,
    "D": direct,
    "T0": lambda s: weighted(s, False),
    "T1": lambda s: weighted(s, True),
}


class Found(NamedTuple):
    """Value of C_11 in L, iterations, condition."""

    value: float
    iterations: int
    condition: float


def solved(system: System) -> Found:
    """Direct solution, and what an iteration would need."""
    solution = np.linalg.solve(system.matrix, system.right)
    diagonal = np.abs(np.diag(system.matrix))
    scale = np.where(diagonal > 0.0, diagonal, np.abs(system.matrix).max(axis=1))
    scaled = system.matrix / scale[:, None]
    steps: list[float] = []
    gmres(
        scaled, system.right / scale, rtol=1e-6, restart=400, maxiter=1,
        callback=steps.append, callback_type="pr_norm",
    )  # fmt: skip
    return Found(system.charge @ solution, len(steps), float(np.linalg.cond(scaled)))


# --- table ---------------------------------------------------------------------------------


def _sphere_cases(ratio: float, subdivisions: int) -> list[Case]:
    panels = sphere_in_coat(ratio, subdivisions)
    return [
        Case(f"sphere, coat {ratio:g}, er {er:g}", panels, (1.0, er), coated_sphere(1.0, ratio, er))
        for er in (1.0, 4.0, 80.0, 1000.0, 1e5)
    ]


def _box_cases(panels: Panels, name: str, contrasts: tuple[float, ...]) -> list[Case]:
    names = [(f"{name}, er {er:g}", er) for er in contrasts]
    return [Case(n, panels, (1.0, er), BY_NAME[n].exact[0][0]) for n, er in names]


def all_cases() -> list[list[Case]]:
    """Cases by panels that they share."""
    return [
        _sphere_cases(1.5, 2),
        _sphere_cases(1.05, 2),
        _box_cases(cube_in_coat(7), "cube in a cubic coat of side 1.5", (4.0, 80.0, 1000.0, 1e5)),
        _box_cases(slab_between_plates(7), "slab flush between two plates", (10.0, 1000.0)),
        _box_cases(sheet_on_block(8), "square sheet on a block", (10.0, 1000.0)),
    ]


def main() -> None:
    """Print the table."""
    parser = argparse.ArgumentParser(description="Formulations of dielectrics side by side.")
    parser.add_argument("--only", default="", help="cases whose name holds this")
    only = parser.parse_args().only
    print("relative error of C_11, iterations, condition")
    for group in [[c for c in g if only in c.name] for g in all_cases()]:
        integrals = integrate(group[0].panels) if group else None
        for case in group:
            setting = setting_of(case, integrals)
            print(f"{case.name}, {len(setting.metal)} + {len(setting.between)} panels")
            for name, form in FORMULATIONS.items():
                found = solved(form(setting))
                error = found.value / case.exact - 1.0
                print(
                    f"  {name:3} {error:+10.1e} {found.iterations:5d} {found.condition:9.1e}",
                    flush=True,
                )


if __name__ == "__main__":
    main()
