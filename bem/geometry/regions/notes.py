"""Lines on what the partition found: bodies that touch, and bodies that overlap."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from bem.geometry.gap import smallest_gap
from bem.geometry.regions.assemble import Cut
from bem.geometry.regions.facets import Facets
from bem.geometry.regions.partition import Solid
from bem.geometry.tree import build_tree
from bem.geometry.wording import metre_text

MOST_PROBES = 16
"""Points looked at for the depth of an overlap."""


class Relations(NamedTuple):
    """How the faces of each body (row) lie to each other body (column), (b, b) each.

    Args:
        contact: area that lies on the other's surface.
        within: whether any of it lies inside the other.
        outside: whether any of it lies outside.
        alike: whether any lies on it with both insides on one side.
    """

    contact: np.ndarray
    within: np.ndarray
    outside: np.ndarray
    alike: np.ndarray


def names_of(solids: list[Solid]) -> list[str]:
    """Names of all bodies, made up where they have none."""
    counts = {"conductor": 0, "dielectric": 0}
    names = []
    for solid in solids:
        word = "dielectric" if solid.kind == "dielectric" else "conductor"
        counts[word] += 1
        names.append(f'{word} "{solid.name}"' if solid.name else f"{word} {counts[word]}")
    return names


def notes_of(cuts: list[Cut]) -> list[str]:
    """One line for each contact and each overlap of two bodies."""
    rows = [_row(index, cut) for index, cut in enumerate(cuts)]
    relations = Relations(*(np.array(one) for one in zip(*rows, strict=True)))
    names = names_of([cut.solid for cut in cuts])
    lines = [
        f"{names[one]} touches {names[two]} over {relations.contact[one, two]:.4g} m^2"
        for one, two in np.argwhere(np.triu(relations.contact > 0.0, 1))
    ]
    for one, two in np.argwhere(np.triu(_overlapping(relations), 1)):
        first, second = _by_rank(cuts, int(one), int(two))
        if relations.outside[first, second] and cuts[first].solid.kind != "skin":
            depth = _depth_text(cuts[one], cuts[two], (int(one), int(two)))
            lines.append(
                f"{names[second]} overlaps {names[first]}{depth}: there {names[first]} counts"
            )
    return lines


def buried(solids: list[Solid], regions: set[int]) -> list[str]:
    """One line for each dielectric whose region is not among the given ones."""
    names = [n for n, s in zip(names_of(solids), solids, strict=True) if s.kind == "dielectric"]
    gone = [name for region, name in enumerate(names, start=1) if region not in regions]
    return [f"nothing is left of {name}: bodies that count before it fill it" for name in gone]


def _row(index: int, cut: Cut) -> tuple[np.ndarray, ...]:
    """One row of each of the relations."""
    sides = cut.sides
    other = np.arange(sides.lies_on.shape[1]) != index
    area = np.array([scrap.area for scrap in cut.scraps])
    within = sides.behind & sides.before & ~sides.lies_on & other
    alike = (sides.behind & sides.behind[:, [index]]) | (sides.before & sides.before[:, [index]])
    alike &= sides.lies_on & other
    outside = ~within & ~alike & other
    contact = area @ (sides.lies_on & other)
    return contact, within.any(axis=0), outside.any(axis=0), alike.any(axis=0)


def _overlapping(relations: Relations) -> np.ndarray:
    """Which pairs share space; one wholly within the other counts as well."""
    meet = relations.within | relations.alike
    return meet | meet.T


def _by_rank(cuts: list[Cut], one: int, two: int) -> tuple[int, int]:
    """The body that counts where both are, and the other."""
    conductor = cuts[one].solid.kind != "dielectric"
    return (one, two) if conductor else (two, one)


def _depth_text(one: Cut, two: Cut, index: tuple[int, int]) -> str:
    depth = max(_depth(one, index[1], two.facets), _depth(two, index[0], one.facets))
    return f", about {metre_text(depth)} deep" if depth > 0.0 else ""


def _depth(cut: Cut, other: int, facets: Facets) -> float:
    """How deep pieces of one body lie in another, at some of their points."""
    sides = cut.sides
    deep = sides.behind[:, other] & sides.before[:, other] & ~sides.lies_on[:, other]
    points = [_points(cut, k) for k in np.flatnonzero(deep).tolist()]
    if not points:
        return 0.0
    probes = np.concatenate(points)
    probes = probes[:: max(len(probes) // MOST_PROBES, 1)]
    trees = (build_tree(np.repeat(point[None, None], 3, axis=1)) for point in probes)
    return max(smallest_gap(tree, facets.tree).distance for tree in trees)


def _points(cut: Cut, index: int) -> np.ndarray:
    """Corners and one inner point (n, 3) of a scrap."""
    scrap = cut.scraps[index]
    rows = cut.facets.vertices[np.unique(cut.facets.rows[scrap.rows])]
    return np.concatenate([scrap.point[None], scrap.corners.reshape(-1, 3), rows.reshape(-1, 3)])
