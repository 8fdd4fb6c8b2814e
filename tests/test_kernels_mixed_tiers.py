"""Filling of the mixed matrices in tiers: against exact layers only, with images, and reuse."""

from __future__ import annotations

import numpy as np
import pytest
from panel_shapes import SKEW, SQUARE, TRIANGLE, turned

from bem.kernels import parallel
from bem.kernels.mixed import fill_mixed
from bem.kernels.mixed_arrays import (
    Images,
    MixedMatrices,
    MixedPanels,
    empty_matrices,
    mixed_panels,
)

TIERS, EXACT = np.array([1.5, 2.5]), np.array([1.5, np.inf])


def cloud(count: int, seed: int) -> np.ndarray:
    """Panels of three shapes and several sizes, (count, 4, 3), above the plane z = 0."""
    random = np.random.default_rng(seed)
    cells = random.permutation(6**3)[:count]
    places = 1.5 * np.stack(np.unravel_index(cells, (6, 6, 6)), axis=1) + (0.0, 0.0, 1.2)
    sizes = 10.0 ** random.uniform(-1.0, -0.3, count)
    kinds = [SQUARE, SKEW, TRIANGLE]
    return np.array([turned(sizes[k] * kinds[k % 3], k) + places[k] for k in range(count)])


def over_ground(corners: np.ndarray, conductors: int) -> MixedPanels:
    """Panels and their images in z = 0, of the opposite sign."""
    mirrored = corners * (1.0, 1.0, -1.0)
    layer = np.zeros(len(corners), dtype=np.int64)
    images = Images(np.array([[[1.0, -1.0]]]), np.array([1.0, -1.0]), layer)
    return mixed_panels(np.stack([corners, mirrored]), conductors, images)


def matrices(setup: MixedPanels, reach: np.ndarray, known: tuple | None = None) -> MixedMatrices:
    """Filled matrices; ``known`` are older ones and the origin of each panel in them."""
    new = empty_matrices(int(setup.counts[0]), int(setup.counts[1]))
    old, origin = known or (empty_matrices(0, 0), np.full(int(setup.counts.sum()), -1))
    fill_mixed(setup, reach, origin, old, new)
    return new


def sizes(setup: MixedPanels) -> tuple[np.ndarray, np.ndarray]:
    """What V and K of f0 come to at most, (n, n) each."""
    n = len(setup.points)
    center, area = setup.panels.center[:n], setup.panels.area[:n]
    apart = np.linalg.norm(center[:, None] - center, axis=2)
    apart = np.where(np.eye(n, dtype=bool), np.sqrt(area), apart)
    return np.outer(area, area) / apart, np.outer(area, area) / apart**2


def spread(size: np.ndarray, metal: int, rows: tuple[int, int], columns: tuple[int, int]):
    """Repeat sizes of panels for so many rows and columns of conductors and interfaces."""
    kinds = np.arange(len(size)) < metal
    repeat_rows, repeat_columns = (np.where(kinds, *each) for each in (rows, columns))
    return np.repeat(np.repeat(size, repeat_rows, axis=0), repeat_columns, axis=1)


def test_tiers_agree_with_exact_layers() -> None:
    """Every part of the matrices, relative to what the pair of constants gives."""
    setup = over_ground(cloud(50, 1), 20)
    tiers, exact = matrices(setup, TIERS), matrices(setup, EXACT)
    v, k = sizes(setup)
    scale = {
        "single": spread(v, 20, (1, 3), (1, 0)),
        "double": spread(k, 20, (1, 3), (1, 3)),
        "single_tests": spread(v, 20, (4, 3), (1, 0)),
        "double_tests": spread(k, 20, (4, 3), (1, 3)),
        "linear": spread(v, 20, (4, 0), (0, 3)),
        "quadratic": spread(k, 20, (1, 3), (0, 3)),
    }
    for name, size in scale.items():
        error = np.abs(getattr(tiers, name) - getattr(exact, name)) / size
        assert 0.0 < error.max() < 5e-4 and np.sqrt(np.mean(error**2)) < 1e-5


def test_all_tiers_take_part() -> None:
    """Counted are the pairs that need exact layers: fewer for a nearer ``far``, never none."""
    setup = over_ground(cloud(30, 2), 10)
    n, counts = 30, []
    for far in (2.5, 5.0, np.inf):
        new = empty_matrices(10, 20)
        origin = np.full(n, -1)
        reach = np.array([1.5, far])
        counts.append(fill_mixed(setup, reach, origin, empty_matrices(0, 0), new))
    assert n <= counts[0] < counts[1] < counts[2] == 2 * n**2


@pytest.mark.parametrize("threads", [1, 3])
def test_reuse_gives_the_very_entries_of_a_fresh_fill(threads: int) -> None:
    """Panels taken out, put in and renumbered, in all tiers."""
    before, after = cloud(60, 3), cloud(60, 4)
    kept = np.arange(60) % 3 > 0
    mixture = np.where(kept[:, None, None], before, after)
    origin = np.where(kept, np.arange(60), -1)
    with parallel.working_with(threads):
        old = matrices(over_ground(before, 25), TIERS)
        setup = over_ground(mixture, 25)
        reused, fresh = matrices(setup, TIERS, (old, origin)), matrices(setup, TIERS)
    for part, true in zip(reused, fresh, strict=True):
        assert np.array_equal(part, true)
