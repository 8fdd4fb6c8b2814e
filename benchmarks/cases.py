"""Scenes whose capacitances are known: from outside, or by a tight run of the solver itself."""

from __future__ import annotations

import math
import sys
from collections.abc import Callable
from dataclasses import dataclass, field, replace
from pathlib import Path

import numpy as np
from bodies import (
    JITTER,
    block,
    cube_with_point_near_edge,
    moved,
    needle,
    needles,
    sheet,
    turned_about_z,
)

import bem
from bem.geometry import shapes
from bem.geometry.surface import Surface
from bem.units import EPS0

sys.path.append(str(Path(__file__).resolve().parent.parent / "tests"))

from dielectric_formulas import (  # noqa: E402
    coated_sphere,
    layered_spheres,
    sphere_and_dielectric_sphere,
)
from dielectric_values import BY_ELEMENTS, DielectricReference  # noqa: E402
from reference_values import LEFT_OUT as NOT_IN_TABLES  # noqa: E402
from reference_values import PER_LENGTH, REFERENCES, Body, Reference  # noqa: E402

FARAD = 4.0 * math.pi * EPS0
"""Farad of one metre of L = C / (4 pi eps0)."""


@dataclass(frozen=True)
class Part:
    """One conductor of a case: its faces in metres, and whether it is "solid" or a "shell"."""

    name: str
    surface: Surface
    body: str = "solid"


@dataclass(frozen=True)
class Filling:
    """One dielectric body of a case: its faces in metres, and its relative permittivity."""

    name: str
    surface: Surface
    permittivity: float


@dataclass(frozen=True)
class Truth:
    """What a result is compared with; the last column is the row sum.

    Args:
        columns: (n, n + 1) L in metres.
        slack: (n, n + 1) m, what is not known of it.
        published: whether it comes from outside the solver.
    """

    columns: np.ndarray
    slack: np.ndarray
    published: bool


@dataclass(frozen=True)
class Case:
    """A scene and its truth.

    Args:
        name: unique.
        parts: its conductors.
        truth: if known from outside; otherwise a tight run finds it.
        like: name of another case whose truth is this one's too.
        gap: smallest gap, m, which tells how rounded coordinates move the truth.
        may_refuse: whether an error in place of a result is acceptable.
        grounded: whether the plane z = 0 is at potential zero.
        mirrors: axes of mirror planes through the origin, as in "xy".
        fillings: its dielectric bodies, a later one before an earlier one.
    """

    name: str
    parts: tuple[Part, ...]
    truth: Truth | None = None
    like: str | None = None
    gap: float = math.inf
    may_refuse: bool = False
    grounded: bool = False
    mirrors: str = ""
    fillings: tuple[Filling, ...] = ()

    @property
    def bodies(self) -> tuple[Part | Filling, ...]:
        """Conductors, then dielectrics."""
        return (*self.parts, *self.fillings)

    @property
    def flat(self) -> bool:
        """Whether all faces are true faces, so that a mesh file can hold the case."""
        return all(body.surface.curve is None for body in self.bodies)

    def scene(self) -> bem.Scene:
        """Make the scene."""
        scene = bem.Scene(unit="m")
        if self.grounded:
            scene.set_ground_plane(z=0.0)
        for axis in self.mirrors:
            scene.add_mirror_plane(**{axis: 0.0})
        for part in self.parts:
            scene.add_conductor(part.name, part.surface, body=part.body)
        for filling in self.fillings:
            scene.add_dielectric(
                filling.name, filling.surface, relative_permittivity=filling.permittivity
            )
        return scene


@dataclass(frozen=True)
class Slope:
    """Two lengths of one cross-section; the difference of C_11 over that of the lengths is known.

    Args:
        name: unique.
        short: the shorter one.
        long: the longer one.
        lengths: of both, m.
        exact: the slope, L per metre.
    """

    name: str
    short: Case
    long: Case
    lengths: tuple[float, float]
    exact: float


def columns(matrix: np.ndarray, row_sum: np.ndarray | None = None) -> np.ndarray:
    """(n, n + 1): a matrix and its row sums, by default the sums of its rows."""
    return np.column_stack([matrix, matrix.sum(axis=1) if row_sum is None else row_sum])


def _bowl(radius: float, polar_angle: float) -> Surface:
    middle, end = 0.5 * polar_angle, polar_angle
    points = [(radius * math.sin(a), radius * math.cos(a)) for a in (middle, end)]
    return shapes.revolve([(0.0, radius), shapes.ArcTo(*points)])


def _half_ball(radius: float) -> Surface:
    side = radius * math.sqrt(0.5)
    return shapes.revolve([(0.0, 0.0), (radius, 0.0), shapes.ArcTo((side, side), (0.0, radius))])


_SHAPES: dict[str, Callable[..., Surface]] = {
    "sphere": shapes.sphere,
    "spherical shell": shapes.sphere,
    "spheroid": lambda radius, half_axis: shapes.spheroid(radius, half_axis),
    "ellipsoid": shapes.ellipsoid,
    "torus": shapes.torus,
    "bowl": _bowl,
    "half ball": _half_ball,
    "box": lambda x, y, z: shapes.box(x, y, z),
    "plate": lambda x, y: shapes.plate(x, y),
    "disc": shapes.disc,
    "annulus": shapes.annulus,
    "tube": shapes.tube,
    "cylinder": shapes.cylinder,
}


def _part(number: int, described: Body) -> Part:
    surface = moved(_SHAPES[described.kind](**described.sizes), *described.centre)
    body = "shell" if described.kind == "spherical shell" else "solid"
    return Part(f"body {number}", surface, body)


def _published_case(record: Reference) -> Case:
    n = len(record.bodies)
    slack = np.full((n, n + 1), record.uncertainty)
    slack[:, -1] *= n
    parts = tuple(_part(k + 1, described) for k, described in enumerate(record.bodies))
    truth = Truth(columns(record.matrix), slack, True)
    return Case(record.name, parts, truth, grounded=record.grounded)


def published_cases() -> list[Case]:
    """Every value from outside that needs no dielectric, as shapes."""
    return [_published_case(r) for r in REFERENCES if _has_shape(r)]


def _has_shape(record: Reference) -> bool:
    return all(described.kind in _SHAPES for described in record.bodies)


FLAT_TO_Z = (
    "sphere", "spheroid", "ellipsoid", "torus", "box", "plate", "disc", "annulus", "tube",
    "cylinder",
)  # fmt: skip
"""Kinds that are their own mirror image in the plane z = 0."""


def mirrored_cases() -> list[Case]:
    """The same with two mirror planes and, for single bodies, with three."""
    cases = []
    for record in filter(_has_shape, REFERENCES):
        single = len(record.bodies) == 1 and record.bodies[0].kind in FLAT_TO_Z
        for mirrors in ("xy", "xyz") if single and not record.grounded else ("xy",):
            case = _published_case(record)
            cases.append(replace(case, name=f"{case.name}, mirrors {mirrors}", mirrors=mirrors))
    return cases


def plates_over_a_plane() -> list[Case]:
    """A plate over a grounded plane has C11 - C12 of the pair at twice the distance."""
    cases = []
    for record in REFERENCES:
        if record.name.startswith("two unit plates"):
            gap = record.bodies[1].centre[2]
            own = record.matrix[0, 0] - record.matrix[0, 1]
            truth = Truth(np.full((1, 2), own), np.full((1, 2), 2.0 * record.uncertainty), True)
            plate = Part("plate", moved(shapes.plate(1.0, 1.0), 0, 0, 0.5 * gap))
            cases.append(Case(f"plate {0.5 * gap:g} over a plane", (plate,), truth, grounded=True))
    return cases


def _dielectric_case(record: DielectricReference) -> Case:
    n = len(record.conductors)
    slack = np.full((n, n + 1), record.uncertainty)
    slack[:, -1] *= n
    truth = Truth(columns(record.matrix), slack, True)
    parts = tuple(_part(k + 1, described) for k, described in enumerate(record.conductors))
    fillings = tuple(
        Filling(f"material {k}", _part(k, m.body).surface, m.permittivity)
        for k, m in enumerate(record.materials, 1)
    )
    return Case(record.name, parts, truth, fillings=fillings)


def _ball_case(name: str, other: Surface, permittivity: float, exact: float) -> Case:
    truth = Truth(np.full((1, 2), exact), np.full((1, 2), 1e-12), True)
    filling = Filling("material", other, permittivity)
    return Case(name, (Part("ball", shapes.sphere(1.0)),), truth, fillings=(filling,))


def ball_cases() -> list[Case]:
    """Unit sphere in a coat, and beside a dielectric sphere."""
    contrasts = (2.0, 4.0, 80.0, 1000.0, 1e5)
    coats = [
        _ball_case(
            f"sphere, coat {b:g}, er {er:g}", shapes.sphere(b), er, coated_sphere(1.0, b, er)
        )
        for b in (1.05, 1.5, 3.0)
        for er in contrasts
    ]
    beside = [
        _ball_case(
            f"sphere {d:g} from a dielectric one, er {er:g}",
            moved(shapes.sphere(1.0), 0.0, 0.0, d),
            er,
            sphere_and_dielectric_sphere(1.0, 1.0, d, er),
        )
        for d in (2.1, 3.0)
        for er in contrasts
    ]
    return [*coats, *beside, _layers()]


def _layers() -> Case:
    """Gap between concentric spheres 1 and 2 in two layers, meeting at 1.5."""
    inside = layered_spheres((1.0, 1.5, 2.0), (4.0, 1.0))
    exact = columns(np.array([[inside, -inside], [-inside, inside + 2.0]]))
    parts = (Part("ball", shapes.sphere(1.0)), Part("shell", shapes.sphere(2.0), "shell"))
    filling = Filling("layer", shapes.sphere(1.5), 4.0)
    truth = Truth(exact, np.full_like(exact, 1e-12), True)
    return Case("two layers between spheres, er 4", parts, truth, fillings=(filling,))


def dielectric_cases() -> list[Case]:
    """All scenes with dielectrics whose value is known from outside."""
    return [*ball_cases(), *(_dielectric_case(record) for record in BY_ELEMENTS)]


def _coaxial(length: float) -> Case:
    outer = shapes.cylinder(2.0, length + 2.0)
    parts = (Part("core", shapes.cylinder(1.0, length)), Part("can", outer, "shell"))
    return Case(f"core {length:g} long in a can", parts)


def slopes() -> list[Slope]:
    """Long bodies whose ends do not see each other."""
    per_length = {record.name: record.exact for record in PER_LENGTH}
    exact = per_length["coaxial line"] / (4.0 * math.pi)
    return [Slope("coaxial line", _coaxial(4.0), _coaxial(6.0), (4.0, 6.0), exact)]


LEFT_OUT: dict[str, str] = {
    "two spheres in contact": "no shape is two spheres; as two conductors they touch",
    "wire and strip over a plane": "slopes with end effects: checked by the tests",
    "two wires": "open ends are felt as 1/length: a slope to 1e-4 needs wires 1e4 radii long",
    "cross-capacitance of quarter shells": "slits without width: conductors that touch are refused",
    **{record.name: record.reason for record in NOT_IN_TABLES},
}
"""Known values that no case uses, and why."""


@dataclass
class _Table:
    """Collects cases made of flat faces."""

    cases: list[Case] = field(default_factory=list)

    def one(self, name: str, surface: Surface, like: str | None = None) -> None:
        self.cases.append(Case(name, (Part("body", surface),), like=like))

    def two(
        self, name: str, pair: tuple[Surface, Surface], gap: float, like: str | None = None
    ) -> None:
        parts = (Part("lower", pair[0]), Part("upper", pair[1]))
        self.cases.append(Case(name, parts, like=like, gap=gap))


def _single_bodies(table: _Table) -> None:
    cube, square = "unit cube", "unit square"
    table.one("cube, 12 triangles", block((1, 1, 1)), cube)
    table.one("cube, fine uniform", block((6, 6, 6)), cube)
    table.one("cube, irregular", block((4, 4, 4), jitter=JITTER), cube)
    table.one("cube, slivers", block((24, 1, 1)), cube)
    table.one("cube, point 1e-9 off an edge", cube_with_point_near_edge(1e-9), cube)
    table.one("square, 2 triangles", sheet((1, 1)), square)
    table.one("square, fine uniform", sheet((12, 12)), square)
    table.one("square, irregular", sheet((8, 8), jitter=JITTER), square)
    table.one("square, slivers", sheet((40, 1)), square)
    table.one("square, needles", needles(1.0, 40), square)
    table.one("strip 1000 : 1", shapes.plate(1.0, 1e-3))
    table.one("strip 1000 : 1, 2 triangles", sheet((1, 1), (1.0, 1e-3)), "strip 1000 : 1")
    table.one("needle 1000 : 1", needle(1.0, 1e-3))
    table.one("plate 1 x 10", shapes.plate(1.0, 10.0))
    table.one("foil 1e4 : 1", shapes.box(1.0, 1.0, 1e-4))
    table.one("wire 1e4 : 1", shapes.box(1.0, 1e-4, 1e-4))


def _facing_sheets(table: _Table, gap: float) -> None:
    label = f"two unit plates, gap {gap:g}"
    plain = shapes.plate(1.0, 1.0)
    if not any(case.name == label for case in published_cases()):
        table.two(label, (plain, moved(plain, 0, 0, gap)), gap)
    rough = sheet((5, 5), jitter=JITTER)
    rough_pair = (rough, moved(turned_about_z(rough, 90.0), 0, 0, gap))
    table.two(f"plates, gap {gap:g}, irregular", rough_pair, gap, label)
    shifted = f"plates, gap {gap:g}, offset by half"
    table.two(shifted, (plain, moved(plain, 0.5, 0, gap)), gap)
    table.two(f"{shifted}, irregular", (rough, moved(rough, 0.5, 0, gap)), gap, shifted)
    askew = f"plates, gap {gap:g}, turned by 30 degrees"
    table.two(askew, (plain, moved(turned_about_z(plain, 30.0), 0, 0, gap)), gap)


def _strips_and_boxes(table: _Table) -> None:
    plain, strip = shapes.plate(1.0, 1.0), shapes.plate(1.0, 0.02)
    for gap in (0.005, 0.001):
        table.two(f"strip over plate, gap {gap:g}", (plain, moved(strip, 0, 0, gap)), gap)
    flat = shapes.box(1.0, 1.0, 0.1)
    rough = block((5, 5, 1), (1.0, 1.0, 0.1), JITTER)
    for gap in (0.1, 0.01, 0.001):
        name = f"boxes, gap {gap:g}"
        table.two(name, (flat, moved(flat, 0, 0, 0.1 + gap)), gap)
        rough_pair = (rough, moved(turned_about_z(rough, 90.0), 0, 0, 0.1 + gap))
        table.two(f"{name}, irregular", rough_pair, gap, name)
    speck = shapes.box(1e-4, 1e-4, 1e-4, (0.0, 0.0, 0.501))
    table.two("cube and a speck 1e-4 of its size", (shapes.box(1.0, 1.0, 1.0), speck), 1e-3)


def _nearly_touching() -> Case:
    """Two unit sheets 1e-5 apart: the ideal value and a rim as that of discs (Kirchhoff 1877)."""
    gap, alone = 1e-5, 0.366788
    rim = 4.0 / (8.0 * math.pi**2) * (math.log(16.0 * math.pi * math.sqrt(1.0 / math.pi) / gap) - 1)
    mutual, outward = 1.0 / (4.0 * math.pi * gap) + rim, 0.5 * alone
    own = mutual + outward
    truth = np.array([[own, -mutual, outward], [-mutual, own, outward]])
    slack = np.array([[0.05, 0.05, 1e-4], [0.05, 0.05, 1e-4]])
    plain = shapes.plate(1.0, 1.0)
    parts = (Part("lower", plain), Part("upper", moved(plain, 0, 0, gap)))
    return Case("two unit plates, gap 1e-05", parts, Truth(truth, slack, True), None, gap, True)


def table_cases() -> list[Case]:
    """Flat cases that a solver meets in practice; the truth of most is a tight run."""
    table = _Table()
    _single_bodies(table)
    for gap in (0.1, 0.01, 0.001):
        _facing_sheets(table, gap)
    _strips_and_boxes(table)
    return [*table.cases, _nearly_touching()]


def all_cases() -> list[Case]:
    """All matrices, each name once."""
    plain = published_cases() + plates_over_a_plane() + mirrored_cases() + table_cases()
    return plain + dielectric_cases()
