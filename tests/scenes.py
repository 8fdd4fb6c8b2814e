"""Scenes that the tests of the numerics are made of, in metres."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
from made_bodies import faces_of
from reference_values import Body, Reference

import bem
from bem.geometry import shapes
from bem.geometry.shapes import ArcTo
from bem.geometry.surface import Surface
from bem.scene.placing import rotation
from bem.units import EPS0

FARAD = 4.0 * np.pi * EPS0
"""Capacitance in farad of L = 1 m."""

AXIS = (0.3, -1.1, 0.7)
SHIFT = (0.31, -0.17, 0.53)


def tidy(points: np.ndarray, triangles: np.ndarray) -> Surface:
    """Surface of triangles (t, 3)."""
    return Surface(np.asarray(points, dtype=float), faces_of(np.asarray(triangles)))


def _touching_spheres(radius: float) -> Surface:
    """Two equal balls with a tiny neck where they would touch."""
    neck = 1e-3 * radius
    half = float(np.sqrt(radius**2 - neck**2))
    low = ArcTo((radius, -half), (neck, 0.0))
    high = ArcTo((radius, half), (0.0, half + radius))
    return shapes.revolve([(0.0, -half - radius), low, high])


SHAPES = {
    "sphere": shapes.sphere,
    "spherical shell": shapes.sphere,
    "spheroid": lambda radius, half_axis: shapes.spheroid(radius, half_axis),
    "ellipsoid": shapes.ellipsoid,
    "torus": shapes.torus,
    "bowl": lambda radius, polar_angle: shapes.bowl(radius),
    "half ball": shapes.hemisphere,
    "touching spheres": _touching_spheres,
    "box": lambda x, y, z: shapes.box(x, y, z),
    "plate": lambda x, y: shapes.plate(x, y),
    "disc": shapes.disc,
    "annulus": shapes.annulus,
    "tube": shapes.tube,
    "cylinder": shapes.cylinder,
}
"""Maker of each kind of body of the reference table; every bowl there is a half sphere."""


def shape_of(body: Body) -> Surface:
    """Surface of a body of the reference table, at its place."""
    surface = SHAPES[body.kind](**body.sizes)
    return surface.placed(np.eye(3), np.array(body.centre))


def scene_of(surfaces: Iterable[Surface], shells: tuple[int, ...] = ()) -> bem.Scene:
    """Scene in metres with conductors c0, c1, ...; those numbered in ``shells`` are hollow."""
    scene = bem.Scene(unit="m")
    for k, surface in enumerate(surfaces):
        scene.add_conductor(f"c{k}", surface, body="shell" if k in shells else "solid")
    return scene


def scene_of_reference(record: Reference) -> bem.Scene:
    """Scene of a record, its bodies in order."""
    hollow = tuple(k for k, b in enumerate(record.bodies) if "shell" in b.kind)
    return scene_of([shape_of(b) for b in record.bodies], hollow)


def in_lengths(farads: np.ndarray) -> np.ndarray:
    """L = C / (4 pi eps0) in metres."""
    return np.asarray(farads) / FARAD


def moved(surface: Surface, degrees: float = 37.0, shift: tuple = SHIFT) -> Surface:
    """Turn a surface about ``AXIS`` and shift it."""
    return surface.placed(rotation(AXIS, degrees), np.array(shift))
