"""Filling of the matrices: far and middle tiers, mirroring, reuse, threads."""

from __future__ import annotations

from concurrent.futures import ThreadPoolExecutor

import numpy as np
import pytest
from panel_shapes import SKEW, SQUARE, TRIANGLE, turned
from reference_integrals import pair_integral, potential

import bem
from bem.geometry import shapes
from bem.geometry.surface import Surface
from bem.kernels import pairs, parallel
from bem.kernels.arrays import panel_arrays
from bem.kernels.images import plain_sources
from bem.kernels.targets import make_targets
from bem.operators import dense
from bem.operators.dense import DenseOperator, Reuse, far_reach
from bem.panels.mesh import Mesh

SINGLE = 2e-6
"""Tests are kept in single precision."""


FAR = far_reach(1e-3)


def operator_of(corners: np.ndarray, far: float = FAR) -> DenseOperator:
    panels = panel_arrays(corners)
    return DenseOperator(plain_sources(panels), make_targets(panels), far)


@pytest.fixture
def no_near(monkeypatch: pytest.MonkeyPatch) -> None:
    """No pair of different panels is near: what is not expanded is sampled."""
    monkeypatch.setattr(dense, "NEAR", -1.0)


def cloud(count: int, seed: int, spread: float = 6.0) -> np.ndarray:
    """Panels (count, 4, 3) of three shapes and several sizes, scattered without touching."""
    random = np.random.default_rng(seed)
    cells = random.permutation(5**3)[:count]
    places = spread * np.stack(np.unravel_index(cells, (5, 5, 5)), axis=1) / 5.0
    kinds = [SQUARE, SKEW, TRIANGLE]
    sizes = 10.0 ** random.uniform(-1.0, -0.3, count)
    return np.array([turned(sizes[k] * kinds[k % 3], k) + places[k] for k in range(count)])


def distant_pair(distance: float, seed: int) -> np.ndarray:
    """Two general panels, their centres at ``distance`` in units of the sum of both radii."""
    pair = np.array([turned(SKEW, seed), turned(0.7 * TRIANGLE, seed + 1)])
    panels = panel_arrays(pair)
    direction = np.random.default_rng(seed).normal(size=3)
    reach = distance * panels.radius.sum() * direction / np.linalg.norm(direction)
    return pair - panels.center[:, None] + np.array([[[0.0] * 3], [reach]])


def far_error(distance: float, seed: int) -> float:
    """Relative error of the expansion."""
    pair = distant_pair(distance, seed)
    found = operator_of(pair, 0.0).matrices.single
    return float(np.abs(found[[0, 1], [1, 0]] / pair_integral(*pair) - 1.0).max())


@pytest.mark.parametrize("seed", range(6))
def test_far_expansion_falls_at_least_with_the_fourth_power(no_near: None, seed: int) -> None:
    """Per doubling of the distance the error falls sixteenfold, or (odd terms) eightfold once."""
    errors = np.array([far_error(d, seed) for d in (2.0, 4.0, 8.0)])
    assert np.all(errors[1:] < errors[:-1] / 7.0)
    assert errors[2] < errors[0] / 200.0


@pytest.mark.parametrize("tolerance", [1e-2, 1e-3, 1e-4])
def test_expansions_begin_where_they_serve_the_tolerance(no_near: None, tolerance: float) -> None:
    """At the switch distance a single pair is wrong by less than the tolerance over five."""
    worst = max(far_error(far_reach(tolerance), seed) for seed in range(8))
    assert worst < 0.2 * tolerance


def test_expansions_begin_farther_out_where_charges_cancel() -> None:
    """Never nearer for a tighter tolerance or for more cancellation, nor for less than none."""
    reach = [[far_reach(t, c) for c in (-1.0, 1.0, 1e3, 1e6)] for t in (1e-2, 1e-4, 1e-6)]
    assert np.all(np.diff(reach, axis=0) >= 0.0) and np.all(np.diff(reach, axis=1) >= 0.0)
    assert reach[2][3] > reach[0][0] == reach[0][1] >= 2.0


def test_middle_pairs_are_the_samples_against_the_exact_potential(no_near: None) -> None:
    """Both rows of every pair, and the tests, from a plain loop with a plain potential."""
    corners = cloud(12, 1)
    targets = make_targets(panel_arrays(corners))
    found = operator_of(corners, np.inf).matrices
    for j, panel in enumerate(corners):
        for i in range(len(corners)):
            if i == j:
                continue
            u = potential(panel, targets.points[i].T)
            assert found.single[i, j] == pytest.approx(targets.weights[i] @ u, rel=1e-10)
            size = np.abs(targets.tests[i]).sum(axis=1) * u.max()
            assert np.all(np.abs(found.tests[:, i, j] - targets.tests[i] @ u) < SINGLE * size)


def test_tests_of_far_pairs_agree_with_samples(no_near: None) -> None:
    """Expanded and sampled tests differ by little of what the pair contributes."""
    pair = np.concatenate([distant_pair(4.0, 3), distant_pair(4.0, 5) + 40.0])
    expanded = operator_of(pair, 0.0).matrices.tests.astype(float)
    sampled = operator_of(pair, np.inf).matrices
    size = np.abs(sampled.single)
    off = ~np.eye(4, dtype=bool)
    assert np.all(np.abs(expanded - sampled.tests)[:, off] < 3e-4 * size[off])
    assert np.abs(sampled.tests[:, 0, 1]).max() > 3e-3 * size[0, 1]


def test_near_pairs_are_the_near_rule_on_both_sides_of_the_diagonal() -> None:
    corners = Mesh.start([shapes.box(1.0, 1.0, 1.0)]).corners
    panels = panel_arrays(corners)
    found = operator_of(corners).matrices.single
    for i, j in ((0, 0), (0, 1), (1, 5), (3, 17), (10, 11)):
        gap = np.linalg.norm(panels.center[i] - panels.center[j])
        if gap < dense.NEAR * (panels.radius[i] + panels.radius[j]):
            assert found[i, j] == pairs.near_pair(i, j, panels)
            assert found[j, i] == found[i, j]
    assert np.isfinite(found).all()


def test_every_entry_is_right_whatever_its_tier() -> None:
    """Near, middle and far pairs of a cloud against the quadrature."""
    corners = cloud(10, 7, spread=3.0)
    found = operator_of(corners, far_reach(1e-4)).matrix()
    exact = np.array([[pair_integral(a, b) for b in corners] for a in corners])
    assert found == pytest.approx(exact, rel=1e-4)


def test_mirror_fills_what_is_missing_below_the_diagonal() -> None:
    random = np.random.default_rng(3)
    n = 2 * pairs.TILE + 13
    full = random.normal(size=(n, n))
    missing = np.tril(random.random((n, n)) < 0.5, -1)
    holed = np.where(missing, np.nan, full)
    pairs.mirror(holed)
    assert np.array_equal(holed, np.where(missing, full.T, full))


def test_each_pair_comes_from_the_row_of_the_smaller_panel() -> None:
    """Against plain numpy; on a tie the upper triangle decides."""
    random = np.random.default_rng(4)
    n = 2 * pairs.TILE + 7
    single, radius = random.normal(size=(n, n)), random.integers(1, 6, n).astype(float)
    out = np.empty((n, n))
    pairs.symmetric(single, radius, out)
    smaller = radius[:, None] < radius
    tie = (radius[:, None] == radius) & np.triu(np.ones((n, n), dtype=bool))
    assert np.array_equal(out, np.where(smaller | tie, single, single.T))


def test_asymmetry_is_the_energy_of_half_the_difference() -> None:
    random = np.random.default_rng(5)
    n = pairs.TILE + 30
    single, radius = random.normal(size=(n, n)), random.uniform(1, 2, n)
    x = random.normal(size=(n, 3))
    chosen = np.empty((n, n))
    pairs.symmetric(single, radius, chosen)
    plain = x.T @ (chosen - 0.5 * (single + single.T)) @ x
    assert pairs.asymmetry(single, radius, x) == pytest.approx(plain, rel=1e-11, abs=1e-11)


def test_operator_applies_its_matrix_and_gives_its_rows() -> None:
    operator = operator_of(cloud(9, 2))
    density = np.random.default_rng(6).normal(size=(9, 2))
    assert operator.size == 9
    assert operator.apply(density) == pytest.approx(operator.matrix() @ density)
    assert np.array_equal(operator.matrix(), operator.matrix().T)
    assert np.array_equal(operator.near_rows(np.array([4])), operator.matrices.single[[4]])
    each = np.einsum("tij,jk->tik", operator.matrices.tests.astype(float), density)
    assert operator.tests(density) == pytest.approx(each, rel=1e-4, abs=1e-5)


@pytest.mark.parametrize("surface", [shapes.box(1.0, 0.5, 0.25), shapes.sphere(1.0)])
def test_reuse_gives_the_very_entries_of_a_fresh_fill(surface: Surface) -> None:
    """Two refinements on: every entry bit for bit, and fewer pairs computed."""
    mesh = Mesh.start([surface])
    panels = panel_arrays(mesh.corners)
    operator = DenseOperator(plain_sources(panels), make_targets(panels), FAR)
    for seed in range(2):
        random = np.random.default_rng(seed)
        count = len(mesh.conductor)
        mesh, origin = mesh.refine(random.random(count) < 0.3, random.integers(0, 2, count))
        sources = plain_sources(panel_arrays(mesh.corners))
        targets = make_targets(sources.panels)
        fresh = DenseOperator(sources, targets, FAR)
        operator = DenseOperator(sources, targets, FAR, Reuse(operator, origin))
        assert np.array_equal(operator.matrices.single, fresh.matrices.single)
        assert np.array_equal(operator.matrices.tests, fresh.matrices.tests)
        assert operator.sampled_pairs < fresh.sampled_pairs


def test_threads_do_not_change_a_bit() -> None:
    corners = cloud(60, 8)
    one = operator_of(corners).matrices
    for count in (2, 5):
        with parallel.working_with(count):
            more = operator_of(corners).matrices
        assert np.array_equal(one.single, more.single)
        assert np.array_equal(one.tests, more.tests)


@pytest.mark.parametrize("count", [1, 2, 3, 7])
@pytest.mark.parametrize("rows", [1, 2, 31, 500])
def test_blocks_cover_every_row_once(rows: int, count: int) -> None:
    seen: list[int] = []

    def work(first: int, last: int) -> int:
        seen.extend(range(first, last))
        return last - first

    with parallel.working_with(count):
        assert parallel.sum_over_rows(rows, work) == rows
    assert sorted(seen) == list(range(rows))
    assert parallel.workers() == 1


def test_a_failure_in_a_block_comes_out() -> None:
    def work(first: int, last: int) -> int:
        raise KeyboardInterrupt if first else ValueError

    with parallel.working_with(2), pytest.raises((KeyboardInterrupt, ValueError)):
        parallel.sum_over_rows(40, work)


def test_extractions_in_threads_of_one_program() -> None:
    """Each with its own number of threads; all get the same matrix."""
    scene = bem.Scene(unit="m")
    scene.add_conductor("box", shapes.box(1.0, 2.0, 0.5))
    with ThreadPoolExecutor(3) as pool:
        found = list(pool.map(lambda n: bem.extract(scene, 1e-2, threads=1 + n % 2), range(3)))
    assert all(np.array_equal(r.capacitance, found[0].capacitance) for r in found)


@pytest.mark.parametrize("count", [1, 2, 8, 100])
def test_any_number_of_panels(count: int) -> None:
    """Positive definite, as the exact matrix is."""
    matrix = operator_of(cloud(count, 9)).matrix()
    assert matrix.shape == (count, count)
    assert np.linalg.eigvalsh(matrix)[0] > 0.0
