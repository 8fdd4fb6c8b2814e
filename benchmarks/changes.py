"""Pairs of scenes that differ a little, with the change where it is known from outside."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from cases import FARAD  # puts the tests' folder on the path

import bem
from bem.geometry import shapes
from bem.geometry.surface import Surface
from bem.scene.placing import rotation

from reference_formulas import (  # isort: skip
    concentric_spheres,
    prolate_spheroid,
    torus,
    two_discs,
    two_spheres,
)
from reference_revolved import Generator, revolved_capacitance  # isort: skip
from reference_values import BY_NAME  # isort: skip

__all__ = ["FARAD", "PAIRS", "Pair"]

Bodies = list[Surface]


@dataclass(frozen=True)
class Pair:
    """Two scenes in metres.

    Args:
        name: unique.
        scenes: before and after.
        exact: (n, n) change in L if known from outside, otherwise None.
    """

    name: str
    scenes: tuple[bem.Scene, bem.Scene]
    exact: np.ndarray | None = None


def at(body: Surface, *shift: float) -> Surface:
    """Shift a body."""
    return body.placed(np.eye(3), np.array(shift))


def scene(bodies: Bodies, shells: tuple[int, ...] = ()) -> bem.Scene:
    """Scene of bodies c0, c1, ...; those numbered in ``shells`` are hollow."""
    out = bem.Scene(unit="m")
    for k, body in enumerate(bodies):
        out.add_conductor(f"c{k}", body, body="shell" if k in shells else "solid")
    return out


def known(
    name: str,
    make: Callable[..., Bodies],
    exact: Callable[..., np.ndarray],
    *at_: tuple[float, ...],
) -> Pair:
    """Bodies and their exact matrix as functions of the same numbers, before and after."""
    before, after = at_
    return Pair(
        name,
        (scene(make(*before)), scene(make(*after))),
        np.atleast_2d(exact(*after)) - np.atleast_2d(exact(*before)),
    )


def unknown(name: str, make: Callable[..., Bodies], before: float, after: float) -> Pair:
    """Bodies as a function of one number; the truth is a tight run."""
    return Pair(name, (scene(make(before)), scene(make(after))))


def spheres(a: float, b: float, distance: float) -> Bodies:
    """Two balls."""
    return [shapes.sphere(a), at(shapes.sphere(b), 0, 0, distance)]


def discs(gap: float) -> Bodies:
    """Two discs of radius 1."""
    return [shapes.disc(1.0), at(shapes.disc(1.0), 0, 0, gap)]


def discs_exact(gap: float) -> np.ndarray:
    """Love's equation with enough nodes for gaps of 0.1."""
    return two_discs(gap, 1000)


def plates(gap: float) -> Bodies:
    """Two unit squares."""
    return [shapes.plate(1, 1), shapes.plate(1, 1, (0, 0, gap))]


def slipped(shift: float) -> Bodies:
    """Two unit squares at 0.1, one slipped."""
    return [shapes.plate(1, 1), shapes.plate(1, 1, (shift, 0, 0.1))]


def widened(width: float) -> Bodies:
    """Two squares at 0.1, one of another width."""
    return [shapes.plate(1, 1), shapes.plate(1, width, (0, 0, 0.1))]


def slabs(gap: float) -> Bodies:
    """Two thick plates."""
    return [shapes.box(1, 1, 0.1), shapes.box(1, 1, 0.1, (0, 0, 0.1 + gap))]


def trace(y: float) -> Bodies:
    """A narrow trace over a plate, near its rim."""
    return [shapes.plate(1, 1), shapes.box(0.02, 0.5, 0.005, (0.45 + y, 0, 0.05))]


def three(x: float) -> Bodies:
    """Two boxes and a plate that moves."""
    return [
        shapes.box(1, 1, 0.2),
        shapes.box(0.5, 0.5, 0.5, (1.2, 0, 0)),
        shapes.plate(0.6, 0.6, (x, 0, 0.6)),
    ]


def turned_box(gap: float) -> Bodies:
    """A cube and a turned box over it."""
    turn = rotation((0.3, -1.1, 0.7), 37.0)
    return [shapes.box(1, 1, 1), shapes.box(0.4, 0.5, 0.3).placed(turn, np.array([0, 0, gap]))]


def leaking(z: float) -> Bodies:
    """A ball in a box without lid, and one outside; the outer one moves."""
    walls = shapes.box(1, 1, 1)
    cup = Surface(walls.vertices, np.delete(walls.faces, 1, axis=0))
    return [cup, at(shapes.sphere(0.2), 0, 0, -0.2), at(shapes.sphere(0.3), 0, 0, z)]


def bracket(arm: float) -> Bodies:
    """An L-shaped body with one arm of a given length: faces go triangle by triangle."""
    outline = [(0, 0), (2, 0), (2, 1), (1, 1), (1, arm), (0, arm)]
    points = np.array([(x, y, z) for z in (0.0, 0.2) for x, y in outline])
    sides = [[k, (k + 1) % 6, (k + 1) % 6 + 6, k + 6] for k in range(6)]
    ends = [[k + s for k in cut] for cut in ([0, 1, 2, 3], [0, 3, 4, 5]) for s in (0, 6)]
    return [Surface(points, np.array(sides + ends)), shapes.box(1, 1, 0.2, (1.8, 1.8, 0.1))]


def cylinder(radius: float, length: float) -> Generator:
    """Solid cylinder for the independent solver."""
    z = 0.5 * length
    pin = 1e-3 * radius
    return Generator(((pin, -z), (radius, -z), (radius, z), (pin, z)))


def one_cylinder(length: float) -> np.ndarray:
    """Solid cylinder of radius 1 by the spectral method."""
    return revolved_capacitance([cylinder(1.0, length)])


def rod_in_tube(radius: float) -> np.ndarray:
    """Rod in an open tube by the spectral method."""
    return revolved_capacitance([cylinder(radius, 1.0), Generator(((0.5, -0.6), (0.5, 0.6)))])


def over_ground(height: float) -> bem.Scene:
    """Ball of radius 1 over a grounded plane."""
    out = scene([at(shapes.sphere(1.0), 0, 0, height)])
    out.set_ground_plane(z=0.0)
    return out


def ball_over_ground(height: float) -> float:
    """Ball and image at opposite potentials (Maxwell)."""
    pair = two_spheres(1, 1, 2 * height)
    return float(pair[0, 0] - pair[0, 1])


def shelled(radius: float) -> bem.Scene:
    """A ball in a spherical shell."""
    return scene([shapes.sphere(radius), shapes.sphere(2.0)], shells=(1,))


CUBE = BY_NAME["unit cube"].matrix

PAIRS = [
    known("spheres, gap 1", spheres, two_spheres, (1, 1, 3), (1, 1, 3.003)),
    known("spheres, gap 0.1", spheres, two_spheres, (1, 1, 2.1), (1, 1, 2.1001)),
    known("spheres 1 and 0.5", spheres, two_spheres, (1, 0.5, 2), (1, 0.5, 2.002)),
    known("sphere grows", spheres, two_spheres, (1, 0.5, 2), (1, 0.505, 2)),
    known("spheres, far move", spheres, two_spheres, (1, 1, 3), (1, 1, 2.5)),
    known("discs, gap 0.1", discs, discs_exact, (0.1,), (0.1001,)),
    known("discs, gap 1", discs, discs_exact, (1.0,), (1.001,)),
    known("discs, far move", discs, discs_exact, (1.0,), (0.5,)),
    known("cube", lambda a: [shapes.box(a, a, a)], lambda a: a * CUBE, (1.0,), (1.001,)),
    known("cylinder", lambda h: [shapes.cylinder(1, h)], one_cylinder, (2.0,), (2.002,)),
    known("torus", lambda r: [shapes.torus(r, 1)], lambda r: torus(r, 1), (2.0,), (2.002,)),
    known(
        "spheroid",
        lambda c: [shapes.spheroid(1, c)],
        lambda c: prolate_spheroid(c, 1),
        (2.0,),
        (2.002,),
    ),
    known(
        "rod in tube",
        lambda r: [shapes.cylinder(r, 1.0), shapes.tube(0.5, 1.2)],
        rod_in_tube,
        (0.2,),
        (0.2002,),
    ),
    Pair(
        "ball in shell",
        (shelled(1.0), shelled(1.001)),
        concentric_spheres(1.001, 2.0) - concentric_spheres(1.0, 2.0),
    ),
    Pair(
        "ball over ground",
        (over_ground(1.2), over_ground(1.2002)),
        np.array([[ball_over_ground(1.2002) - ball_over_ground(1.2)]]),
    ),
    unknown("plates, gap 1", plates, 1.0, 1.001),
    unknown("plates, gap 0.1", plates, 0.1, 0.1001),
    unknown("plates, gap 0.01", plates, 0.01, 0.01001),
    unknown("plate slips", slipped, 0.5, 0.501),
    unknown("plate wider", widened, 1.0, 1.001),
    unknown("slabs, gap 0.1", slabs, 0.1, 0.1001),
    unknown("slabs, gap 0.01", slabs, 0.01, 0.01001),
    unknown("trace near a rim", trace, 0.0, 0.001),
    unknown("one of three", three, 0.0, 0.001),
    unknown("one of three, far", three, 0.0, 0.1),
    unknown("turned box", turned_box, 0.9, 0.9005),
    unknown("box longer", lambda c: [shapes.box(1, 1, c)], 1.0, 1.001),
    unknown("past a shield", leaking, 1.2, 1.2012),
    unknown("arm longer", bracket, 2.0, 2.002),
]
