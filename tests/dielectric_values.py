"""Capacitances of conductors among dielectrics known from outside the package, as plain data.

Conventions and marks as in ``reference_values``: L = C / (4 pi eps0), Maxwell signs, permittivity
relative to the surroundings. Values computed by finite elements can be computed again with
``benchmarks/dielectric_elements.py``.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from reference_values import Body, at_height, body


@dataclass(frozen=True)
class Material:
    """A dielectric body; a later one displaces an earlier one, a conductor displaces both."""

    body: Body
    permittivity: float


@dataclass(frozen=True)
class DielectricReference:
    """Bodies, and their known Maxwell matrix.

    Args:
        name: unique.
        conductors: in the order of rows and columns.
        materials: dielectric bodies.
        exact: (n, n) in L.
        uncertainty: half width, in L, of what the printed digits and their source leave open.
        mark: T, P, M or N.
        source: author, title or method.
    """

    name: str
    conductors: tuple[Body, ...]
    materials: tuple[Material, ...]
    exact: tuple[tuple[float, ...], ...]
    uncertainty: float
    mark: str
    source: str

    @property
    def matrix(self) -> np.ndarray:
        """(n, n) in L."""
        return np.array(self.exact)

    @property
    def bodies(self) -> tuple[Body, ...]:
        """All bodies, conductors first."""
        return (*self.conductors, *(material.body for material in self.materials))


def box(x: float, y: float, z: float, at: tuple[float, float, float] = (0.0, 0.0, 0.0)) -> Body:
    """Return a box with its centre."""
    return body("box", at, x=x, y=y, z=z)


def cube(side: float, z: float = 0.0) -> Body:
    """Return a cube centred on the z axis."""
    return box(side, side, side, (0.0, 0.0, z))


def rod(radius: float, length: float, z: float = 0.0) -> Body:
    """Return a solid cylinder about the z axis."""
    return at_height("cylinder", z, radius=radius, length=length)


ELEMENTS = "hp finite elements, benchmarks/dielectric_elements.py"


@dataclass(frozen=True)
class _Family:
    """Scenes that differ in the permittivity of one body, computed by finite elements.

    Args:
        name: without the permittivity.
        conductors: as in a record.
        body: whose permittivity differs.
        below: what does not differ, given before it.
        accuracy: relative, of all values.
    """

    name: str
    conductors: tuple[Body, ...]
    body: Body
    accuracy: float
    below: tuple[Material, ...] = ()

    def at(self, permittivity: float, *values: float) -> DielectricReference:
        """Return the record of one permittivity."""
        exact = (values,) if len(values) == 1 else (values[:2], values[1:])
        materials = (*self.below, Material(self.body, permittivity))
        name = f"{self.name}, er {permittivity:g}"
        slack = self.accuracy * values[0]
        return DielectricReference(name, self.conductors, materials, exact, slack, "N", ELEMENTS)


def _round() -> list[DielectricReference]:
    disc = (at_height("disc", 0.0, radius=1.0),)
    accuracy = 5e-7
    standing = _Family(
        "cylinder standing on a wider one", (rod(1.0, 1.0, 0.5),), rod(1.5, 1.0, -0.5), accuracy
    )
    flush = _Family("disc on a cylinder of radius 1", disc, rod(1.0, 0.5, -0.25), accuracy)
    wider = _Family("disc on a cylinder of radius 1.5", disc, rod(1.5, 0.5, -0.25), accuracy)
    cast = _Family("rod cast into a cylinder", (rod(0.25, 2.0, 0.25),), rod(1.0, 1.5), accuracy)
    plates = rod(1.0, 0.2, 0.35), rod(1.0, 0.2, -0.35)
    between = _Family("cylinder between two discs", plates, rod(1.0, 0.5), accuracy)
    lower = (Material(rod(1.5, 0.5, -0.55), 4.0),)
    stacked = _Family(
        "disc on a cylinder on another of er 4", disc, rod(1.5, 0.3, -0.15), accuracy, lower
    )
    return [
        standing.at(4.0, 1.165012),
        standing.at(80.0, 1.4121051),
        standing.at(1000.0, 1.4342493),
        flush.at(10.0, 0.7865850),
        wider.at(10.0, 1.0019733),
        cast.at(4.0, 0.8125517),
        between.at(10.0, 5.7225427, -5.2547568, 5.7225427),
        stacked.at(20.0, 1.0906087),
    ]


def _boxes() -> list[DielectricReference]:
    coat = _Family("cube in a cubic coat of side 1.5", (cube(1.0),), cube(1.5), 1e-5)
    block = box(2.0, 2.0, 0.5, (0.0, 0.0, -0.25))
    standing = _Family(
        "box standing on a wider block", (box(1.0, 1.0, 0.5, (0.0, 0.0, 0.25)),), block, 1.5e-5
    )
    sunk = _Family(
        "cube half sunk in a block", (cube(1.0),), box(2.0, 2.0, 1.0, (0.0, 0.0, -0.5)), 1e-5
    )
    plates = tuple(box(1.0, 1.0, 0.1, (0.0, 0.0, z)) for z in (0.15, -0.15))
    between = _Family("slab flush between two plates", plates, box(1.0, 1.0, 0.2), 3e-6)
    sheet = _Family("square sheet on a block", (body("plate", x=1.0, y=1.0),), block, 1.5e-5)
    beside = _Family("block beside a cube", (cube(1.0, -0.75),), cube(1.0, 0.75), 1e-5)
    lower = (Material(box(1.5, 1.5, 0.25, (0.0, 0.0, -0.375)), 4.0),)
    stacked = _Family(
        "plate on a slab on another of er 4",
        (box(1.0, 1.0, 0.1, (0.0, 0.0, 0.05)),),
        box(2.0, 2.0, 0.25, (0.0, 0.0, -0.125)),
        2e-5,
        lower,
    )
    return [
        coat.at(4.0, 0.8626444),
        coat.at(80.0, 0.982490),
        coat.at(1000.0, 0.990317),
        coat.at(1e5, 0.991010),
        standing.at(10.0, 0.797909),
        standing.at(1000.0, 0.971968),
        sunk.at(4.0, 0.879864),
        sunk.at(80.0, 1.095448),
        between.at(10.0, 4.413940, -4.157581, 4.413940),
        between.at(1000.0, 398.323914, -398.066933, 398.323914),
        sheet.at(10.0, 0.718487),
        sheet.at(1000.0, 0.935608),
        beside.at(10.0, 0.677767),
        stacked.at(20.0, 0.755327),
    ]


def _noted() -> list[DielectricReference]:
    coat = cube(1.0), cube(1.5)
    source = "high-order finite elements of another program"
    return [
        DielectricReference(
            f"cube in a cubic coat, noted, er {er:g}",
            coat[:1],
            (Material(coat[1], er),),
            ((value,),),
            2e-5,
            "N",
            source,
        )
        for er, value in ((4.0, 0.862646), (1000.0, 0.990326))
    ]


BY_ELEMENTS: tuple[DielectricReference, ...] = tuple(_round() + _boxes())
"""Values that ``benchmarks/dielectric_elements.py`` computes again."""

PUBLISHED: tuple[DielectricReference, ...] = tuple(_noted())
"""Values that came with a demand on the number of unknowns."""

ALL: tuple[DielectricReference, ...] = BY_ELEMENTS + PUBLISHED
"""All records, each with a name of its own."""

BY_NAME: dict[str, DielectricReference] = {record.name: record for record in ALL}
