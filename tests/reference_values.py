"""Capacitances of conductors in one medium known from outside the package, as plain data.

Values are lengths L = C / (4 pi eps0) in the unit of the sizes: a sphere of radius 1 has L = 1.
Maxwell signs. Bodies are described by numbers only; whoever uses a record maps its kinds to
shapes. Marks say how sure a value is:

    T  closed form or theorem
    P  published number, read in its source or abstract
    M  formula or citation from memory, digits confirmed by a second method
    N  computed by an independent high-order program, no published number known
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np

ROUNDING = 1e-12
"""Relative uncertainty of a value that all printed digits of a closed form give."""


@dataclass(frozen=True)
class Body:
    """One conductor as plain numbers.

    Kinds and their sizes; the axis of every body of revolution is z, and ``centre`` is the centre
    of the body's bounding box, or of the full sphere for a bowl, a half ball or touching spheres:

        sphere            radius
        spherical shell   radius                    thin, other bodies may lie inside
        spheroid          radius, half_axis
        ellipsoid         a, b, c                   semi-axes along x, y, z
        torus             major, minor
        bowl              radius, polar_angle       thin part of a sphere about the +z pole
        half ball         radius                    the half with z > 0, with its flat face
        touching spheres  radius                    two equal ones, centres at z = +radius, -radius
        box               x, y, z
        plate             x, y                      thin rectangle at one z
        disc              radius                    thin
        annulus           inner, outer              thin
        tube              radius, length            thin, open at both ends
        cylinder          radius, length            solid
    """

    kind: str
    sizes: Mapping[str, float]
    centre: tuple[float, float, float] = (0.0, 0.0, 0.0)


@dataclass(frozen=True)
class Reference:
    """A set of bodies and its known Maxwell matrix.

    Args:
        name: unique.
        bodies: in the order of rows and columns.
        exact: (n, n) in L.
        uncertainty: half width, in L, of what the printed digits and their source leave open.
        mark: T, P, M or N.
        source: author, title or method.
        grounded: whether the plane z = 0 is at potential zero.
    """

    name: str
    bodies: tuple[Body, ...]
    exact: tuple[tuple[float, ...], ...]
    uncertainty: float
    mark: str
    source: str
    grounded: bool = False

    @property
    def matrix(self) -> np.ndarray:
        """(n, n) in L."""
        return np.array(self.exact)

    @property
    def scale(self) -> np.ndarray:
        """(n, n) in L: sqrt(C_ii C_jj), what a tolerance is relative to."""
        root = np.sqrt(np.diag(self.matrix))
        return np.outer(root, root)


@dataclass(frozen=True)
class PerLength:
    """A cross-section and its known capacitance per length, C' / eps0.

    To be compared with the slope of capacitance against length of long bodies.
    """

    name: str
    sizes: Mapping[str, float]
    exact: float
    mark: str
    source: str


@dataclass(frozen=True)
class LeftOut:
    """A known value that is not in the tables, and why."""

    name: str
    reason: str


def body(kind: str, centre: tuple[float, float, float] = (0.0, 0.0, 0.0), **sizes: float) -> Body:
    """Return a body of ``kind`` with its sizes by name."""
    return Body(kind, sizes, centre)


def at_height(kind: str, z: float, **sizes: float) -> Body:
    """Return a body of ``kind`` centred on the z axis at ``z``."""
    return body(kind, (0.0, 0.0, z), **sizes)


@dataclass(frozen=True)
class _Shelf:
    """Collects records that share a mark."""

    mark: str
    records: list[Reference] = field(default_factory=list)

    def one(self, name: str, what: Body, value: float, source: str, loose: float = 0.0) -> None:
        """Add a single body."""
        self.many(name, (what,), ((value,),), source, loose)

    def pair(
        self,
        name: str,
        two: tuple[Body, Body],
        values: tuple[float, ...],
        source: str,
        loose: float,
    ) -> None:
        """Add two bodies by C11, C12 and, if it differs from C11, C22."""
        own, mutual, other = values if len(values) == 3 else (*values, values[0])
        self.many(name, two, ((own, mutual), (mutual, other)), source, loose)

    def many(
        self,
        name: str,
        bodies: tuple[Body, ...],
        exact: tuple[tuple[float, ...], ...],
        source: str,
        loose: float = 0.0,
    ) -> None:
        """Add a matrix; ``loose`` is the absolute uncertainty, 0 for that of rounding."""
        slack = loose or ROUNDING * exact[0][0]
        self.records.append(Reference(name, bodies, exact, slack, self.mark, source))


def _theorems() -> list[Reference]:
    shelf = _Shelf("T")
    shelf.one("sphere", body("sphere", radius=1.0), 1.0, "any textbook")
    shelf.one("disc", body("disc", radius=1.0), 0.636619772367581, "2 a / pi, any textbook")
    nested = (body("sphere", radius=1.0), body("spherical shell", radius=2.0))
    shelf.pair("concentric spheres", nested, (2.0, -2.0, 4.0), "k = a b / (b - a), k + b", 0.0)
    return shelf.records


def _published() -> list[Reference]:
    shelf = _Shelf("P")
    long_body = body("ellipsoid", a=3.0, b=2.0, c=1.0)
    shelf.one("ellipsoid 3, 2, 1", long_body, 1.96600920070939, "1 / R_F, DLMF 19.33.6")
    touching = body("touching spheres", radius=1.0)
    shelf.one("two spheres in contact", touching, 1.38629436111989, "2 ln 2")
    cube = body("box", x=1.0, y=1.0, z=1.0)
    cited = "Hwang & Mascagni, J. Appl. Phys. 95, 3798 (2004)"
    shelf.one("unit cube, published", cube, 0.6606782, cited, 1e-7)
    return shelf.records


def _remembered() -> list[Reference]:
    shelf = _Shelf("M")
    one, memory = shelf.one, "from memory"
    spheroid = "e / acosh(a/b), from memory"
    one("prolate 2 : 1", body("spheroid", radius=1.0, half_axis=2.0), 1.31519072220405, spheroid)
    one("prolate 10 : 1", body("spheroid", radius=1.0, half_axis=10.0), 3.32413417996680, spheroid)
    flat = body("spheroid", radius=1.0, half_axis=0.5)
    one("oblate 1 : 0.5", flat, 0.826993343132688, "e / acos(c/a), from memory")
    ring = body("torus", major=2.0, minor=1.0)
    one("torus 2, 1", ring, 2.43167041245346, "ring functions, DLMF 14.19, from memory")
    hollow = body("bowl", radius=1.0, polar_angle=np.pi / 2)
    one("open hemisphere", hollow, 0.818309886183791, "Kelvin (1869), from memory")
    one("solid hemisphere", body("half ball", radius=1.0), 0.845299461620748, memory)
    cited = "Helsing & Perfekt, Appl. Comput. Harmon. Anal. 34, 445 (2013), from memory"
    one("unit cube", body("box", x=1.0, y=1.0, z=1.0), 0.66067815409957, cited, 1e-8)
    return shelf.records + _spheres() + _discs() + _over_a_plane()


def _spheres() -> list[Reference]:
    shelf, source = _Shelf("M"), "Maxwell, Treatise, series of images, from memory"
    for name, radius, distance, values in (
        ("two spheres, distance 3", 1.0, 3.0, (1.1462874419411, -0.38908306689512)),
        ("two spheres, distance 2.1", 1.0, 2.1, (1.5839593035774, -0.88352360988321)),
        (
            "spheres 1 and 0.5, distance 2",
            0.5,
            2.0,
            (1.1639380634334, -0.30598373372695, 0.60258163882531),
        ),
    ):
        two = (body("sphere", radius=1.0), at_height("sphere", distance, radius=radius))
        shelf.pair(name, two, values, source, 1e-12)
    return shelf.records


def _over_a_plane() -> list[Reference]:
    """C of one body is C11 - C12 of it and its mirror image."""
    source = "C11 - C12 of two spheres (Maxwell, Treatise, from memory)"
    return [
        Reference(
            f"sphere over a plane, height {height:g}",
            (at_height("sphere", height, radius=1.0),),
            ((exact,),),
            1e-12,
            "M",
            source,
            grounded=True,
        )
        for height, exact in ((1.1, 2.1550861170132), (2.0, 1.3410598130784))
    ]


def _discs() -> list[Reference]:
    shelf, source = _Shelf("M"), "integral equation of Love (1949), from memory"
    for gap, values in (
        (0.1, (3.109557518879, -2.768404078070)),
        (1.0, (0.799591902860, -0.359555818441)),
    ):
        two = (body("disc", radius=1.0), at_height("disc", gap, radius=1.0))
        shelf.pair(f"two discs, gap {gap:g}", two, values, source, 2e-12)
    return shelf.records


def _single_computed() -> list[Reference]:
    shelf = _Shelf("N")
    graded, spectral = "graded Galerkin, exact integrals", "axisymmetric spectral method"
    shelf.one("unit square", body("plate", x=1.0, y=1.0), 0.3667880, graded, 2e-7)
    shelf.one("rectangle 1 x 2", body("plate", x=1.0, y=2.0), 0.531918, graded, 1e-6)
    for half, value in ((0.25, 0.8281366675), (1.0, 1.1914985209), (4.0, 2.2166489742)):
        rod = body("cylinder", radius=1.0, length=2.0 * half)
        shelf.one(f"solid cylinder, half length {half:g}", rod, value, spectral, 1e-9)
    tube = body("tube", radius=1.0, length=2.0)
    shelf.one("open tube, half length 1", tube, 1.1503824626, spectral, 1e-9)
    flat = body("annulus", inner=0.5, outer=1.0)
    shelf.one("annulus 0.5, 1", flat, 0.6245353902, spectral, 1e-9)
    return shelf.records


def _several_computed() -> list[Reference]:
    shelf, graded = _Shelf("N"), "graded Galerkin, exact integrals"
    for gap, values, loose in (
        (0.01, (8.393505, -8.206743), 3e-6),
        (0.1, (1.14121, -0.93688), 7e-6),
        (1.0, (0.406037, -0.126015), 1e-6),
    ):
        two = (body("plate", x=1.0, y=1.0), at_height("plate", gap, x=1.0, y=1.0))
        shelf.pair(f"two unit plates, gap {gap:g}", two, values, graded, loose)
    thick = {"radius": 1.0, "length": 0.2}
    two = (at_height("cylinder", 0.35, **thick), at_height("cylinder", -0.35, **thick))
    spectral = "axisymmetric spectral method"
    shelf.pair("two thick discs", two, (1.2091502476, -0.7486440581), spectral, 1e-9)
    shelf.many(
        "guard ring",
        (
            at_height("disc", 0.5, radius=1.0),
            at_height("annulus", 0.5, inner=1.1, outer=2.0),
            at_height("disc", 0.0, radius=2.0),
        ),
        (
            (1.4889468833, -0.8291798008, -0.5721820418),
            (-0.8291798008, 3.2985860925, -1.8288243487),
            (-0.5721820418, -1.8288243487, 3.1308069413),
        ),
        spectral,
        1e-9,
    )
    return shelf.records


REFERENCES: tuple[Reference, ...] = tuple(
    _theorems() + _published() + _remembered() + _single_computed() + _several_computed()
)
"""All records, each with a name of its own."""

BY_NAME: dict[str, Reference] = {record.name: record for record in REFERENCES}

PER_LENGTH: tuple[PerLength, ...] = (
    PerLength(
        "two wires",
        {"radius": 1.0, "distance": 4.0},
        2.38549209578045,
        "M",
        "2 pi / acosh((d^2 - 2) / 2)",
    ),
    PerLength("coaxial line", {"inner": 1.0, "outer": 2.0}, 9.06472028365439, "T", "2 pi / ln 2"),
    PerLength(
        "wire over a plane", {"radius": 1.0, "height": 2.0}, 4.7709841915609, "M", "2 pi / acosh 2"
    ),
    PerLength(
        "strip over a plane, in air",
        {"width": 1.0, "height": 1.0},
        2.9798986509,
        "N",
        "graded Galerkin",
    ),
    PerLength(
        "cross-capacitance of quarter shells",
        {"radius": 1.0},
        0.220635600152652,
        "M",
        "Thompson & Lampard, Nature 177, 888 (1956): ln 2 / pi",
    ),
)
"""Cross-sections of long bodies."""

LEFT_OUT: tuple[LeftOut, ...] = (
    LeftOut("stripline", "needs two planes without end"),
    LeftOut("microstrip on a substrate", "needs a dielectric"),
    LeftOut("coats, cube in a coat, layered plates", "with dielectrics: in dielectric_values"),
    LeftOut("forces on spheres and discs", "a derivative of the matrix, not an entry of it"),
    LeftOut("Kirchhoff's discs and Smythe's fit", "approximations: checked against the records"),
)
"""Values of the same list that no record holds."""
