"""Boxes and sheets on a lattice of unit cells, where every region can be counted cell by cell."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from made_bodies import CUBE_TRIANGLES, faces_of

from bem.geometry.parts import METAL
from bem.geometry.regions.partition import Solid
from bem.geometry.surface import Surface


def box(low, high) -> Surface:
    """Closed box between two corners, outward."""
    unit = np.array([[k & 1, k >> 1 & 1, k >> 2] for k in range(8)], dtype=float)
    low, high = np.array(low, dtype=float), np.array(high, dtype=float)
    return Surface(low + unit * (high - low), faces_of(CUBE_TRIANGLES))


def sheet(axis: int, at: float, low, high) -> Surface:
    """Rectangle normal to an axis, between two corners in the other two coordinates."""
    corners = np.array([[low[0], low[1]], [high[0], low[1]], [high[0], high[1]], [low[0], high[1]]])
    return Surface(np.insert(corners.astype(float), axis, at, axis=1), np.array([[0, 1, 2, 3]]))


@dataclass(frozen=True)
class Lattice:
    """Bodies with whole-numbered corners, in the order of their precedence.

    Args:
        solids: conductors, then dielectrics.
        cells: (n, n, n) region of each unit cell.
        sheets: (3, n + 1, n + 1, n + 1) whether a sheet covers the lower side of a cell, by axis.
    """

    solids: list[Solid]
    cells: np.ndarray
    sheets: np.ndarray

    @property
    def volumes(self) -> dict[int, float]:
        """Number of cells of each dielectric region."""
        regions, count = np.unique(self.cells[self.cells > 0], return_counts=True)
        return dict(zip(regions.tolist(), count.astype(float).tolist(), strict=True))

    @property
    def areas(self) -> dict[tuple[int, int], float]:
        """Number of sides of cells between each two neighbours, both sides of a sheet."""
        areas: dict[tuple[int, int], float] = {}
        for axis in range(3):
            cells = np.pad(np.moveaxis(self.cells, axis, 0), 1)
            below, above = cells[:-1, 1:, 1:], cells[1:, 1:, 1:]
            covered = np.moveaxis(self.sheets[axis], axis, 0)
            for b, a, c in zip(below.ravel(), above.ravel(), covered.ravel(), strict=True):
                pairs = [(METAL, b), (METAL, a)] if c else [(min(a, b), max(a, b))]
                for one, two in pairs:
                    if one != two:
                        areas[int(one), int(two)] = areas.get((int(one), int(two)), 0.0) + 1.0
        return areas


def random_lattice(seed: int, size: int = 4, dielectrics: int = 4, conductors: int = 3) -> Lattice:
    """Boxes at random: conductors that do not touch one another, sheets among them."""
    random = np.random.default_rng(seed)
    cells = np.zeros((size,) * 3, dtype=int)
    sheets = np.zeros((3, size + 1, size + 1, size + 1), dtype=bool)
    taken = np.zeros((size + 1,) * 3, dtype=bool)
    blocks = []
    for number in range(1, dielectrics + 1):
        low, high = _corners(random, size)
        cells[_block(low, high)] = number
        blocks.append(Solid(box(low, high), "dielectric"))
    metals: list[Solid] = []
    for _ in range(conductors):
        low, high = _corners(random, size)
        flat = int(random.integers(6))
        if flat < 3:
            high[flat] = low[flat]
        closure = tuple(slice(a, b + 1) for a, b in zip(low, high, strict=True))
        if taken[closure].any():
            continue
        taken[closure] = True
        if flat < 3:
            others = [k for k in range(3) if k != flat]
            sheets[flat][_block(low, np.maximum(high, low + 1))] = True
            surface = sheet(flat, low[flat], low[others], high[others])
        else:
            cells[_block(low, high)] = METAL
            surface = box(low, high)
        metals.append(Solid(surface, "skin" if flat < 3 else "metal", len(metals)))
    return Lattice([*metals, *blocks], cells, sheets)


def _corners(random: np.random.Generator, size: int) -> tuple[np.ndarray, np.ndarray]:
    ends = [np.sort(random.choice(size + 1, 2, replace=False)) for _ in range(3)]
    return np.array([e[0] for e in ends]), np.array([e[1] for e in ends])


def _block(low: np.ndarray, high: np.ndarray) -> tuple[slice, ...]:
    return tuple(slice(a, b) for a, b in zip(low, high, strict=True))
