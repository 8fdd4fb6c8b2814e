"""Matrices of the mixed formulation against quadrature that knows nothing of tiers."""

from __future__ import annotations

import numpy as np
import pytest
from panel_shapes import SKEW, SQUARE, TRIANGLE, in_plane, rectangle, turned, upright
from test_kernels_fill import cloud

from bem.geometry import shapes
from bem.kernels import pairs, parallel
from bem.kernels.arrays import PanelArrays, bilinear
from bem.kernels.basis import values
from bem.kernels.mixed import fill_mixed
from bem.kernels.mixed_arrays import (
    Images,
    MixedMatrices,
    MixedPanels,
    empty_matrices,
    mixed_bytes,
    mixed_panels,
    no_images,
)
from bem.kernels.moments import ROWS, moments
from bem.kernels.pairs import clustered_rule
from bem.kernels.targets import make_targets
from bem.panels.mesh import Mesh

REACH = np.array([1.5, np.inf])
SINGLE = 1e-6
"""Tests are kept in single precision."""
STRETCHES = 40
"""Of the reference, in each direction: its error is far below that of any rule tested."""


def matrices_of(setup: MixedPanels, reach: np.ndarray = REACH) -> MixedMatrices:
    """All matrices, nothing taken over."""
    new = empty_matrices(int(setup.counts[0]), int(setup.counts[1]))
    origin = np.full(int(setup.counts.sum()), -1)
    fill_mixed(setup, reach, origin, empty_matrices(0, 0), new)
    return new


def filled(corners: np.ndarray, conductors: int) -> tuple[MixedPanels, MixedMatrices]:
    setup = mixed_panels(corners[None], conductors, no_images(len(corners)))
    return setup, matrices_of(setup)


def fine_rule(stretches: int) -> tuple[np.ndarray, np.ndarray]:
    """Nodes and weights on (-1, 1): eight on each of many stretches, clustered at their ends."""
    x, w = clustered_rule(8, False)
    cuts = np.linspace(-1.0, 1.0, stretches + 1)
    half = 0.5 * np.diff(cuts)[:, None]
    return (cuts[:-1, None] + half * (1.0 + x)).ravel(), (half * w).ravel()


def fine_samples(setup: MixedPanels, i: int) -> tuple[np.ndarray, np.ndarray]:
    """Points (m, 3) and weights times test functions (6, m) of target i."""
    t, w = fine_rule(STRETCHES)
    xi, eta = np.repeat(t, len(t)), np.tile(t, len(t))
    own = PanelArrays(*(part[i : i + 1] for part in setup.panels))
    at, jacobian = bilinear(own.corners, xi, eta)
    weight = np.outer(w, w).ravel() * jacobian[0]
    if i < setup.counts[0]:
        raw = np.array([xi, eta, 1.5 * xi**2 - 0.5, 1.5 * eta**2 - 0.5])
        mean = (raw @ weight) / weight.sum()
        test = np.concatenate([np.ones((1, len(xi))), raw - mean[:, None], 0.0 * raw[:1]])
    else:
        test = values(setup.basis[i : i + 1], at)[0]
    return own.center[0] + at[0] @ own.axes[0, :2], weight * test


def reference_pair(setup: MixedPanels, i: int, j: int) -> tuple[np.ndarray, np.ndarray]:
    """Tests of i against V of f0, f1, f2 (6, 3) and K of f0 to f5 (6, 6) of j or an image."""
    points, weighted = fine_samples(setup, i)
    work = np.empty((ROWS, len(points)))
    moments(j, setup.basis, setup.panels, np.ascontiguousarray(points.T)[None], 0, work)
    return weighted @ work[[3, 10, 11]].T, weighted @ work[4:10].T


def stored_pair(setup: MixedPanels, found: MixedMatrices, i: int, j: int) -> dict[str, np.ndarray]:
    """What the matrices keep of the pair, by name, with tests in rows."""
    metal = int(setup.counts[0])

    def numbers(p: int, first: int, each: int) -> slice:
        start = first * p if p < metal else first * metal + each * (p - metal)
        return slice(start, start + (first if p < metal else each))

    rows, tests, columns = numbers(i, 1, 3), numbers(i, 4, 3), numbers(j, 1, 3)
    parts = {
        "double": found.double[rows, columns],
        "double_tests": found.double_tests[tests, columns],
    }
    place = slice(3 * (j - metal), 3 * (j - metal) + 3)
    if j < metal:
        parts["single"] = found.single[rows, j : j + 1]
        parts["single_tests"] = found.single_tests[tests, j : j + 1]
    else:
        parts["quadratic"] = found.quadratic[rows, place]
        if i < metal:
            parts["linear"] = found.linear[tests, place]
    return parts


def expected_pair(setup: MixedPanels, i: int, j: int, image: int = 0) -> dict[str, np.ndarray]:
    """The same from the reference, of one image of panel j."""
    single, double = reference_pair(setup, i, j + image * len(setup.basis))
    metal = setup.counts[0]
    own, tests = (slice(0, 1), slice(1, 5)) if i < metal else (slice(0, 3), slice(3, 6))
    width = 1 if j < metal else 3
    parts = {"double": double[own, :width], "double_tests": double[tests, :width]}
    if j < metal:
        parts |= {"single": single[own, :1], "single_tests": single[tests, :1]}
    else:
        parts["quadratic"] = double[own, 3:]
        if i < metal:
            parts["linear"] = single[tests]
    return parts


def worst(setup: MixedPanels, found: MixedMatrices, i: int, j: int) -> dict[str, float]:
    """Largest error of each part, over what V and K of f0 give with the constant test."""
    stored, expected = stored_pair(setup, found, i, j), expected_pair(setup, i, j)
    area = setup.panels.area
    apart = np.linalg.norm(setup.panels.center[i] - setup.panels.center[j])
    far = max(float(apart), 0.5 * float(np.sqrt(area[j])))
    sizes = {"single": area[i] * area[j] / far, "linear": area[i] * area[j] / far}
    sizes["single_tests"] = sizes["single"]
    size = area[i] * min(float(area[j]) / far**2, 2.0 * np.pi)
    return {
        name: float(np.abs(part - expected[name]).max()) / float(sizes.get(name, size))
        for name, part in stored.items()
    }


def scattered() -> np.ndarray:
    """Two conductors and two interfaces that touch nothing, at moderate distances."""
    kinds = [SQUARE, SKEW, TRIANGLE, 0.7 * SQUARE]
    return np.array([turned(k, n) + (3.5 * n, 0.4 * n, 0.0) for n, k in enumerate(kinds)])


def test_pairs_of_every_kind_at_a_distance() -> None:
    """Conductor or interface as target or source: what is kept is the plain integral."""
    setup, found = filled(scattered(), 2)
    for i in range(4):
        for j in range(4):
            if i != j:
                assert max(worst(setup, found, i, j).values()) < 2e-5, (i, j)


def equation_and_test_errors(corners: np.ndarray, conductors: int) -> tuple[float, float]:
    """Worst error of both orders of two panels, in the rows of equations and in tests."""
    setup, found = filled(corners, conductors)
    errors = [worst(setup, found, i, j) for i, j in ((0, 1), (1, 0))]
    equations = [e[name] for e in errors for name in ("single", "double") if name in e]
    return max(equations), max(max(e.values()) for e in errors)


HINGED = {
    "upright on an edge": upright((0.0, 1.0), (0.0, 1.0)),
    "upright beside": upright((0.2, 1.2), (0.0, 0.6), -0.2),
    "upright half way": upright((0.3, 1.3), (0.1, 0.9), 0.4),
    "narrow strip on an edge": upright((0.0, 1.0), (0.0, 0.05)),
    "narrow strip across the middle": upright((0.0, 1.0), (0.0, 0.05), 0.5),
}


@pytest.mark.parametrize("name", HINGED)
@pytest.mark.parametrize("conductors", [0, 1])
def test_near_pairs_at_an_angle(name: str, conductors: int) -> None:
    """On, beside and across each other, a conductor and an interface or two interfaces."""
    equations, tests = equation_and_test_errors(np.array([SQUARE, HINGED[name]]), conductors)
    assert equations < 2e-3 and tests < 6e-3


FACING = {
    "matched": SQUARE,
    "a quarter": rectangle((0.0, 0.5), (0.0, 0.5)),
    "shifted": SQUARE + (0.3, 0.4, 0.0),
    "turned": in_plane(SQUARE, 20.0) + (0.3, 0.1, 0.0),
    "leaning": SQUARE @ np.array([[1.0, 0.0, 0.02], [0.0, 1.0, 0.01], [0.0, 0.0, 1.0]]),
}


@pytest.mark.parametrize("gap", [0.3, 0.05])
@pytest.mark.parametrize("name", FACING)
def test_panels_that_face_each_other_closely(name: str, gap: float) -> None:
    """The shadow of a rim is a step, a gap wide, wherever it falls."""
    corners = np.array([SQUARE, FACING[name] + (0.0, 0.0, gap)])
    for conductors in (0, 1):
        equations, tests = equation_and_test_errors(corners, conductors)
        assert equations < 2e-3 and tests < 4e-3


def test_potentials_of_conductors_are_those_of_the_conductors_alone() -> None:
    """V between conductors, near or not, with and without interfaces: the very same numbers."""
    corners = Mesh.start([shapes.box(1.0, 0.6, 0.4)]).corners
    setup, found = filled(np.concatenate([corners, scattered()]), len(corners))
    panels = PanelArrays(*(part[: len(corners)] for part in setup.panels))
    alone = pairs.Matrices(
        np.empty((len(corners),) * 2), np.empty((4, len(corners), len(corners)), dtype=np.float32)
    )
    origin = np.full(len(corners), -1)
    empty = pairs.Matrices(np.empty((0, 0)), np.empty((4, 0, 0), dtype=np.float32))
    sources = pairs.Sources(panels, no_images(len(corners)), 0.0)
    pairs.fill(sources, make_targets(panels), REACH, origin, empty, alone)
    metal = len(corners)
    assert found.single[:metal] == pytest.approx(alone.single, rel=1e-12)
    rows = found.single_tests[: 4 * metal].reshape(metal, 4, metal).swapaxes(0, 1)
    size = np.abs(alone.single).max()
    assert np.abs(rows - alone.tests).max() < SINGLE * size


@pytest.mark.parametrize("conductors", [0, 30, 1000])
def test_layers_of_a_closed_surface_add_up(conductors: int) -> None:
    """Seen from the surface itself the angle is 2 pi, from behind, with nothing against tests."""
    corners = Mesh.start([shapes.box(1.0, 0.6, 0.4)]).corners
    metal = min(conductors, len(corners))
    setup, found = filled(corners, metal)
    area = setup.panels.area
    constant = np.concatenate([np.arange(metal), np.arange(metal, found.double.shape[1], 3)])
    sums = found.double[:, constant].sum(axis=1)
    exact = np.zeros_like(sums)
    exact[constant] = -2.0 * np.pi * area
    assert np.abs(sums - exact).max() < 1e-5 * area.max()
    beyond = found.double_tests[:, constant].astype(float).sum(axis=1)
    assert np.abs(beyond).max() < 1e-4 * area.max()


def test_panels_of_one_plane_have_no_double_layer() -> None:
    """Turned in space too, sharing a side or apart; their potentials stay."""
    corners = np.array([turned(p, 4) for p in (SQUARE, SQUARE + (1.0, 0.3, 0.0), SKEW + (0, 3, 0))])
    for metal in (0, 1, 3):
        found = filled(corners, metal)[1]
        assert np.abs(found.double).max() < 1e-12 and np.abs(found.quadratic).max(initial=0) < 1e-6
        assert metal == 0 or np.all(found.single[:metal] > 0.0)


def mirrored(corners: np.ndarray) -> np.ndarray:
    return corners * [1.0, 1.0, -1.0]


def test_images_are_panels_with_weights() -> None:
    """Sums over a reflected image equal those of panels that lie there, turned inside out."""
    corners = scattered()[:3] + (0.0, 0.0, 1.2)
    weight = np.array([[[1.0, -0.6], [0.7, 0.0]], [[0.3, 0.4], [0.9, -0.2]]])
    images = Images(weight, np.array([1.0, -1.0]), np.array([0, 1, 1]))
    setup = mixed_panels(np.array([corners, mirrored(corners)]), 1, images)
    found = matrices_of(setup)
    for i in range(3):
        for j in range(3):
            if i == j:
                continue
            total = expected_pair(setup, i, j)
            image = expected_pair(setup, i, j, 1)
            one, two = weight[images.layer[i], images.layer[j]]
            for name, part in stored_pair(setup, found, i, j).items():
                layer = images.layer[j]
                single = name in ("single", "single_tests", "linear")
                turn, home = (1.0, 1.0) if single else (-1.0, weight[layer, layer, 0])
                exact = (one * total[name] + turn * two * image[name]) / home
                assert np.abs(part - exact).max() < 1e-4 * np.abs(total["double"]).max() + 1e-5


def test_reflected_image_is_the_same_function_seen_from_below() -> None:
    """V of an image is V at the mirrored point; K of it, with its parity, as well."""
    corners = scattered()[:2] + (0.0, 0.0, 1.2)
    images = Images(np.array([[[1.0, 1.0]]]), np.array([1.0, -1.0]), np.zeros(2, dtype=np.int64))
    with_image = matrices_of(mixed_panels(np.array([corners, mirrored(corners)]), 1, images))
    direct = filled(corners, 1)[1]
    both = np.array([corners[0], mirrored(corners[1])])
    plain = filled(both, 1)[1]
    double = with_image.double[0, 1:] - direct.double[0, 1:]
    linear = with_image.linear[:, :3] - direct.linear[:, :3]
    assert double == pytest.approx(-plain.double[0, 1:], rel=1e-9, abs=1e-12)
    assert linear == pytest.approx(plain.linear[:, :3], rel=1e-5, abs=1e-6)


def some_panels(count: int) -> np.ndarray:
    return cloud(count, 3, spread=4.0)


def test_reuse_gives_the_very_entries_of_a_fresh_fill() -> None:
    """Panels kept, dropped, added and in another order; every entry bit for bit."""
    corners = some_panels(40)
    kept = np.array([3, 5, 6, 11, 14, -1, -1, 25, 21, 30, -1, 39, 38, -1])
    fresh = some_panels(60)[40:]
    mixed = np.array([corners[k] if k >= 0 else fresh[n] for n, k in enumerate(kept)])
    old = filled(corners, 20)[1]
    setup = mixed_panels(mixed[None], 7, no_images(len(mixed)))
    new = empty_matrices(7, len(mixed) - 7)
    sampled = fill_mixed(setup, REACH, kept, old, new)
    whole = matrices_of(setup)
    for found, expected in zip(new, whole, strict=True):
        assert np.array_equal(found, expected)
    known = int((kept >= 0).sum())
    assert sampled == len(kept) ** 2 - known**2


def test_threads_do_not_change_a_bit() -> None:
    setup = mixed_panels(some_panels(40)[None], 15, no_images(40))
    one = matrices_of(setup)
    with parallel.working_with(3):
        more = matrices_of(setup)
    assert all(np.array_equal(a, b) for a, b in zip(one, more, strict=True))


@pytest.mark.parametrize(("conductors", "interfaces"), [(0, 5), (7, 0), (7, 5), (1, 1)])
def test_bytes_are_those_of_the_arrays(conductors: int, interfaces: int) -> None:
    new = empty_matrices(conductors, interfaces)
    assert mixed_bytes(conductors, interfaces) == sum(part.nbytes for part in new)


@pytest.mark.parametrize(("conductors", "interfaces"), [(1, 0), (0, 1), (8, 0), (0, 8), (50, 50)])
def test_any_number_of_panels_of_either_kind(conductors: int, interfaces: int) -> None:
    found = filled(some_panels(conductors + interfaces), conductors)[1]
    assert all(np.isfinite(part).all() for part in found)
