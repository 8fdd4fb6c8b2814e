"""Which region lies on each side: metal before dielectrics, a later dielectric before earlier."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from bem.geometry.parts import INTERFACE, METAL, SURROUNDINGS
from bem.geometry.regions.facets import Facets
from bem.geometry.regions.partition import Solid
from bem.geometry.regions.scraps import BEFORE, BEHIND, LIES_ON, Scrap, is_covered


class Sides(NamedTuple):
    """What lies on both sides of n scraps of one body, among b bodies.

    Args:
        back: (n,) region behind each.
        front: (n,) region before each.
        kept: (n,) whether the scrap is part of a boundary, and this body's to give.
        behind: (n, b) which bodies' insides are behind it.
        before: (n, b) which are before it.
        lies_on: (n, b) whose surfaces it lies on.
    """

    back: np.ndarray
    front: np.ndarray
    kept: np.ndarray
    behind: np.ndarray
    before: np.ndarray
    lies_on: np.ndarray


def numbered(solids: list[Solid]) -> np.ndarray:
    """Region (b,) inside each body; METAL for conductors."""
    dielectric = np.array([solid.kind == "dielectric" for solid in solids])
    return np.where(dielectric, np.cumsum(dielectric), METAL)


def region_of(inside: np.ndarray, numbers: np.ndarray) -> np.ndarray:
    """Region (n,) of points inside the bodies flagged (n, b), by precedence."""
    metal = (inside & (numbers == METAL)).any(axis=1)
    highest = np.where(inside, numbers, SURROUNDINGS).max(axis=1, initial=SURROUNDINGS)
    return np.where(metal, METAL, highest)


def sides_of_scraps(
    index: int, scraps: list[Scrap], bodies: list[Facets], numbers: np.ndarray
) -> Sides:
    """Regions on both sides of all scraps of a body."""
    flags = np.array([scrap.meets for scrap in scraps])
    flags[:, index] = [LIES_ON | (BEHIND if scrap.solid else 0) for scrap in scraps]
    points = np.array([scrap.point for scrap in scraps])
    within = _within(points, flags, bodies)
    behind, before = within | (flags & BEHIND > 0), within | (flags & BEFORE > 0)
    back, front = region_of(behind, numbers), region_of(before, numbers)
    lies_on = flags & LIES_ON > 0
    kept = (lies_on.argmax(axis=1) == index) & _bounds(back, front, numbers[index])
    kept &= ~np.array([is_covered(scrap, bodies[index]) for scrap in scraps])
    return Sides(back, front, kept, behind, before, lies_on)


def _bounds(back: np.ndarray, front: np.ndarray, number: int) -> np.ndarray:
    """Where faces of a body part regions: a conductor's unless all is metal, or different ones."""
    if number == METAL:
        return np.maximum(back, front) != METAL
    return (back != front) & (np.minimum(back, front) != METAL)


def _within(points: np.ndarray, flags: np.ndarray, bodies: list[Facets]) -> np.ndarray:
    """Which points (n, 3) lie inside which bodies, on whose surfaces they do not lie, (n, b)."""
    within = np.zeros(flags.shape, dtype=bool)
    for k, body in enumerate(bodies):
        off = flags[:, k] & LIES_ON == 0
        within[off, k] = body.inside(points[off])
    return within


def conductor_of(solid: Solid) -> int:
    """Conductor that the faces of a body belong to."""
    return INTERFACE if solid.kind == "dielectric" else solid.conductor
