"""Smooth surfaces fitted to facets: close to what the facets sample, flat and sharp where it is."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from faceted_bodies import (
    bent_wire,
    bowl,
    circle,
    cylinder,
    disc,
    flat_sheet,
    hull,
    icosphere,
    rounded_box,
    stretched,
    tidy,
    torus,
    uneven_sphere,
    uv_sphere,
)
from made_bodies import cube, turned

import bem
from bem.geometry import shapes
from bem.geometry.fit import normals as fit_normals
from bem.geometry.fit.edges import crease_tangents
from bem.geometry.fit.facets import Facets
from bem.geometry.fit.fit import Fit, fit_of
from bem.geometry.fit.patches import (
    Piece,
    area_beyond,
    basis,
    control_net,
    slopes,
    swept_volume,
)
from bem.geometry.flat_faces import FlatFaces
from bem.geometry.surface import Surface
from bem.scene.placing import rotation

CREASE = np.radians(40.0)
GRID = np.array([(i, j, 5 - i - j) for i in range(6) for j in range(6 - i)]) / 5.0
AXES = np.array([3.0, 2.0, 1.0])


def fitted(surface: Surface, crease: float = CREASE) -> Fit:
    return Fit.of(FlatFaces.of(surface), crease)


def points(fit: Fit, at: np.ndarray = GRID) -> np.ndarray:
    """(t, g, 3) on all patches."""
    return basis(at) @ fit.net


def off_sphere(x: np.ndarray) -> np.ndarray:
    return np.linalg.norm(x, axis=-1) - 1.0


def off_torus(x: np.ndarray) -> np.ndarray:
    return np.hypot(np.hypot(x[..., 0], x[..., 1]) - 2.0, x[..., 2]) - 1.0


def off_cylinder(x: np.ndarray) -> np.ndarray:
    """Of the wall or, for points within it, of the flat ends."""
    wall, ends = np.hypot(x[..., 0], x[..., 1]) - 1.0, np.abs(x[..., 2]) - 1.0
    return np.where(np.abs(ends) < 1e-12, 0.0, wall)


def off_ellipsoid(x: np.ndarray) -> np.ndarray:
    level = ((x / AXES) ** 2).sum(axis=-1) - 1.0
    return level / np.linalg.norm(2.0 * x / AXES**2, axis=-1)


FAMILIES = {
    "sphere": (icosphere, (1, 2, 3), off_sphere, 13.0),
    "sphere of rings": (uv_sphere, (12, 24, 48), off_sphere, 13.0),
    "torus": (lambda n: torus(2 * n, n), (12, 24, 48), off_torus, 8.0),
    "cylinder": (cylinder, (12, 24, 48), off_cylinder, 13.0),
    "open half sphere": (bowl, (12, 24, 48), off_sphere, 13.0),
    "uneven sphere": (uneven_sphere, (160, 640, 2560), off_sphere, 8.0),
}


@pytest.mark.parametrize("name", FAMILIES)
def test_distance_to_what_the_facets_sample(name: str) -> None:
    """It falls by about 2**4 where facets halve; that of the facets themselves by 2**2."""
    make, sizes, off, least = FAMILIES[name]
    worst = [np.abs(off(points(fitted(make(n))))).max() for n in sizes]
    assert worst[0] > least * worst[1] > least**2 * worst[2]


def test_uneven_facets_of_an_ellipsoid() -> None:
    """Local averages of normals stay at first order; the sweeps gain most of another one."""
    finest = fitted(stretched(uneven_sphere(2560), *AXES))
    off = off_ellipsoid(points(finest))
    facets = off_ellipsoid(GRID @ finest.facets.points[finest.facets.corners])
    assert abs(off.mean()) < 3e-3 * abs(facets.mean())
    assert np.abs(off).max() < 0.15 * np.abs(facets).max()


def test_sweeps_help(monkeypatch: pytest.MonkeyPatch) -> None:
    body = stretched(uneven_sphere(1000), *AXES)
    swept = np.abs(off_ellipsoid(points(fitted(body)))).mean()
    monkeypatch.setattr(fit_normals, "SWEEPS", 0)
    assert np.abs(off_ellipsoid(points(fitted(body)))).mean() > 1.3 * swept


def plain_normals(surface: Surface) -> np.ndarray:
    """(v, 3) after Max (1999), vertex by vertex, for outward triangles."""
    total = np.zeros_like(surface.vertices)
    for corners in surface.triangles:
        for k in range(3):
            here, after, before = (corners[(k + i) % 3] for i in range(3))
            a = surface.vertices[after] - surface.vertices[here]
            b = surface.vertices[before] - surface.vertices[here]
            normal = np.cross(a, b)
            outward = np.sign(normal @ surface.vertices[here])
            total[here] += outward * normal / (a @ a) / (b @ b)
    return total / np.linalg.norm(total, axis=1, keepdims=True)


def test_normals_are_those_of_a_plain_loop(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(fit_normals, "SWEEPS", 0)
    body = stretched(uneven_sphere(120), 1.0, 1.2, 0.9)
    facets = Facets.of(FlatFaces.of(body), np.pi / 2)
    found = fit_normals.normals_of(facets, np.pi / 2, np.zeros_like(facets.points))
    expected = plain_normals(body)[facets.corners]
    np.testing.assert_allclose(found.normal[found.fan], expected, atol=1e-12)


@pytest.mark.parametrize("surface", [uneven_sphere(200), bowl(24), uv_sphere(16)])
def test_normals_of_a_sphere_are_exact(surface: Surface) -> None:
    """Also at a free rim, where local averages are not."""
    facets = Facets.of(FlatFaces.of(surface), CREASE)
    found = fit_normals.normals_of(facets, CREASE, crease_tangents(facets, CREASE))
    out = facets.points[facets.corners]
    assert np.abs(np.abs((found.normal[found.fan] * out).sum(axis=-1)) - 1.0).max() < 1e-6


def test_a_body_without_soft_edges_has_no_fit() -> None:
    box = cube()
    assert fit_of(box, FlatFaces.of(box)) is None
    fine = cylinder(24)
    assert fit_of(fine, FlatFaces.of(fine)) is not None
    for sharp in (replace(fine, crease=np.radians(10.0)), replace(fine, smooth=False)):
        assert fit_of(sharp, FlatFaces.of(sharp)) is None


def test_facets_run_outward_whichever_way_they_were_written() -> None:
    body = uv_sphere(12)
    mixed = body.faces.copy()
    mixed[::2, :3] = mixed[::2, [0, 2, 1]]
    facets = Facets.of(FlatFaces.of(Surface(body.vertices, mixed)), CREASE)
    middle = facets.points[facets.corners].mean(axis=1)
    corners = facets.points[facets.corners]
    normal = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    assert np.all(np.einsum("ti,ti->t", normal, middle) > 0.0)


@pytest.mark.parametrize("steps", [3, 5])
def test_flat_faces_between_fillets_stay_flat(steps: int) -> None:
    """And fillets are round to their very ends."""
    fit = fitted(rounded_box(steps, 0.2))
    x = points(fit)
    facing = np.abs(fit.facets.normal).max(axis=1) > 1.0 - 1e-9
    axis = np.abs(fit.facets.normal).argmax(axis=1)
    rows = np.arange(len(axis))
    height = np.abs(x[rows, :, axis])[facing]
    np.testing.assert_allclose(height, 0.5, atol=1e-12)
    beyond = np.maximum(np.abs(x[~facing]) - 0.3, 0.0)
    off = np.linalg.norm(beyond, axis=-1) - 0.2
    flat = 0.2 * (1.0 - np.cos(0.25 * np.pi / steps))
    assert np.abs(off).max() < 0.2 * flat


def test_ends_of_a_cylinder_stay_flat_and_its_rim_is_round() -> None:
    fit = fitted(cylinder(24))
    end = np.abs(fit.facets.normal[:, 2]) > 0.5
    np.testing.assert_allclose(np.abs(fit.net[end][:, :, 2]), 1.0, atol=1e-12)
    assert fit.sagitta[np.unique(fit.facets.flat[end])] == pytest.approx(0.0, abs=0.0)
    middle = points(fit, np.array([[0.5, 0.5, 0.0], [0.0, 0.5, 0.5], [0.5, 0.0, 0.5]]))
    rim = ~fit.facets.soft[fit.facets.edge]
    assert np.abs(np.hypot(*middle[rim][:, :2].T) - 1.0).max() < 1e-6


def test_the_tip_of_a_cone_stays_sharp() -> None:
    ring = np.column_stack([circle(24, 1.0), np.zeros(24)])
    fit = fitted(hull(np.concatenate([ring, [[0.0, 0.0, 2.0]]])))
    wall = np.abs(fit.facets.normal[:, 2]) < 0.9
    x = points(fit)[wall]
    off = np.hypot(x[..., 0], x[..., 1]) - (1.0 - 0.5 * x[..., 2])
    assert np.abs(off).max() < 0.3 * (1.0 - np.cos(np.pi / 24))


def stadium() -> Surface:
    """Sheet with two straight sides of length 2 and half circles of radius 1."""
    half = circle(24, 1.0)
    half = half[half[:, 0] > 0.0]
    half = np.concatenate([[[0.0, -1.0]], half[np.argsort(half[:, 1])], [[0.0, 1.0]]])
    right, left = half + [1.0, 0.0], -half - [1.0, 0.0]
    return flat_sheet([right, left], lambda x: x[:, 0] < 9.0)


def test_straight_stretches_of_a_rim_stay_straight() -> None:
    fit = fitted(stadium())
    ends = fit.facets.points[fit.facets.corners]
    for k in range(3):
        side = ends[:, [k, (k + 1) % 3]]
        on_rim = fit.facets.rim[fit.facets.edge[:, k]]
        straight = on_rim & (np.ptp(side[:, :, 0], axis=1) > 1.9)
        assert np.all(fit.rim_sagitta[straight, k] == 0.0)
        assert np.all(fit.rim_sagitta[on_rim & ~straight, k] > 0.0)
    assert np.abs(fit.sagitta).max() == 0.0


def test_sagitta_of_a_rim_is_that_of_the_circle() -> None:
    """Area of the segment over its chord."""
    count = 32
    fit = fitted(disc(count))
    angle = 2.0 * np.pi / count
    segment = 0.5 * (angle - np.sin(angle)) / (2.0 * np.sin(0.5 * angle))
    found = fit.rim_sagitta[fit.rim_sagitta != 0.0]
    assert len(found) == count
    assert found == pytest.approx(segment, rel=1e-4)
    assert fit.farthest == pytest.approx(1.0 - np.cos(0.5 * angle), rel=1e-6)


@pytest.mark.parametrize("body", [icosphere(2), torus(24, 12), cylinder(24), bent_wire(16, 8)])
def test_sagitta_is_the_mean_distance(body: Surface) -> None:
    """Volume between facets and patches over their area, to within the turn of the facets."""
    fit = fitted(turned(body, 4))
    every = np.arange(len(fit.net))
    volume = swept_volume(fit.pieces(every)).sum()
    facets = fit.facets
    assert (fit.sagitta[facets.flat] * facets.area).sum() == pytest.approx(volume, rel=0.08)


@pytest.mark.parametrize("name", FAMILIES)
def test_doubt_holds_the_mean_distance(name: str) -> None:
    make, sizes, off, _ = FAMILIES[name]
    fit = fitted(make(sizes[1]))
    mean = off(points(fit)).mean(axis=1)
    area = fit.facets.area
    assert abs((mean * area).sum()) < (fit.doubt * area).sum()


def test_patches_that_the_facets_do_not_explain_are_doubted() -> None:
    """Where bodies cut each other askew, what the patches add or take is in the doubt."""
    turn = rotation((1.0, 0.2, 0.0), 63.0)
    stub = shapes.cylinder(0.3, 2.0).placed(turn, np.array([0.1, 0.4, 0.1]))
    bodies = [shapes.cylinder(0.5, 3.0), shapes.torus(0.5, 0.2), stub]
    fit = fitted(shapes.union(bodies, around=32), np.radians(17.0))
    corners = fit.facets.points[fit.facets.corners]
    rise = (fit.net.mean(axis=1) - corners.mean(axis=1)) * fit.facets.normal
    taken = np.minimum(rise.sum(axis=1), 0.0) @ fit.facets.area
    assert taken < -1e-2
    assert fit.doubt @ fit.facets.area > abs(taken)


def test_an_ellipsoid_from_a_shape_is_fitted_too() -> None:
    """Facets of planar quadrilaterals, as the shapes of the package have them."""
    shape = shapes.ellipsoid(*AXES)
    fit = fitted(Surface(shape.vertices, shape.faces))
    facets = off_ellipsoid(GRID @ fit.facets.points[fit.facets.corners])
    assert np.abs(off_ellipsoid(points(fit))).max() < 0.2 * np.abs(facets).max()


def random_net(seed: int) -> np.ndarray:
    return np.random.default_rng(seed).normal(size=(4, 10, 3))


def test_patches_take_weights_that_sum_to_one() -> None:
    at = np.random.default_rng(1).dirichlet([1, 1, 1], 20)
    assert basis(at).sum(axis=-1) == pytest.approx(1.0)
    step = 1e-6
    for k in range(3):
        ahead, back = at.copy(), at.copy()
        ahead[:, k] += step
        back[:, k] -= step
        change = (basis(ahead) - basis(back)) / (2.0 * step)
        np.testing.assert_allclose(slopes(at)[:, k], change, atol=1e-8)


def test_quadratic_patches_are_reproduced() -> None:
    random = np.random.default_rng(5)
    corners, middle = random.normal(size=(2, 1, 3, 3))

    def quadratic(at: np.ndarray) -> np.ndarray:
        a, b, c = np.moveaxis(at, -1, 0)
        weights = np.stack([a * a, b * b, c * c, 2 * a * b, 2 * b * c, 2 * c * a], axis=-1)
        return weights @ np.concatenate([corners[0], middle[0]])

    ahead = np.roll(corners, -1, axis=1)
    along = np.stack([corners + 2.0 * middle, 2.0 * middle + ahead], axis=2) / 3.0
    net = control_net(corners, along)
    np.testing.assert_allclose(basis(GRID) @ net[0], quadratic(GRID), atol=1e-12)


def test_swept_volume_is_that_of_many_small_prisms() -> None:
    """Twin: thin prisms between fine grids on both, each the mean of two cuts in tetrahedra."""
    corners = np.array([[[0.0, 0.0, 0.0], [1.0, 0.1, 0.0], [0.2, 0.9, 0.1]]])
    flat = control_net(corners, thirds(corners))
    net = flat + 0.1 * random_net(3)[:1] * (np.arange(10) > 2)[:, None]
    piece = Piece(net, np.eye(3)[None], corners)
    n = 60
    grid = np.array([(i, j, n - i - j) for i in range(n + 1) for j in range(n + 1 - i)]) / n
    number = {tuple(np.round(row * n).astype(int)): k for k, row in enumerate(grid)}
    low, high = grid @ corners[0], basis(grid) @ net[0]
    total = 0.0
    for (i, j, k), here in number.items():
        for steps in (((-1, 1, 0), (-1, 0, 1)), ((-1, 0, 1), (-1, 0, 1))):
            if i == 0 or steps[0] == steps[1]:
                continue
            first, second = (number[(i + a, j + b, k + c)] for a, b, c in steps)
            total += prism(low, high, (here, first, second))
            corner = number.get((i - 2, j + 1, k + 1))
            if corner is not None:
                total += prism(low, high, (first, corner, second))
    assert swept_volume(piece)[0] == pytest.approx(total, rel=2e-3)


def thirds(corners: np.ndarray) -> np.ndarray:
    ahead = np.roll(corners, -1, axis=1)
    return np.stack([(2.0 * corners + ahead) / 3.0, (corners + 2.0 * ahead) / 3.0], axis=2)


def prism(low: np.ndarray, high: np.ndarray, at: tuple[int, int, int]) -> float:
    a, b, c = (low[k] for k in at)
    d, e, f = (high[k] for k in at)
    one = ((a, b, c, f), (a, b, f, e), (a, e, f, d))
    other = ((c, b, a, d), (c, b, d, e), (c, e, d, f))
    six = [float(np.linalg.det([q - p, r - p, s - p])) / 6.0 for p, q, r, s in (*one, *other)]
    return 0.5 * (sum(six[:3]) - sum(six[3:]))


def test_area_beyond_a_side() -> None:
    """A chord of the unit circle, followed within the plane of the triangle."""
    half = 0.4
    ends = np.array([[np.cos(half), -np.sin(half), 0.0], [np.cos(half), np.sin(half), 0.0]])
    corners = np.array([[*ends, [0.0, 0.0, 0.0]]])
    along = thirds(corners)
    reach = 4.0 / 3.0 * np.tan(0.5 * half)
    along[0, 0, 0] = ends[0] + reach * np.array([np.sin(half), np.cos(half), 0.0])
    along[0, 0, 1] = ends[1] - reach * np.array([-np.sin(half), np.cos(half), 0.0])
    piece = Piece(control_net(corners, along), np.eye(3)[None], corners)
    assert area_beyond(piece, 0)[0] == pytest.approx(half - 0.5 * np.sin(2.0 * half), rel=1e-4)
    assert area_beyond(piece, 1)[0] == pytest.approx(0.0, abs=1e-15)


def test_folded_and_lone_facets_do_no_harm() -> None:
    """A strip of three triangles on one edge, and one triangle alone."""
    fins = np.array([[0, 0, 0], [1, 0, 0], [0.5, 1, 0], [0.5, -1, 0], [0.5, 0, 1.0]])
    assert not fitted(tidy(fins, [[0, 1, 2], [0, 1, 3], [0, 1, 4]])).bends
    assert not fitted(tidy(fins[:3], [[0, 1, 2]])).bends


def test_the_scene_keeps_what_a_shape_says() -> None:
    ball = replace(icosphere(1), smooth=True, crease=1.0)
    scene = bem.Scene(unit="mm").add_conductor("ball", ball, place=bem.Place(scale=2.0))
    kept = scene.conductors[0].surface
    assert kept.smooth is True and kept.crease == 1.0
