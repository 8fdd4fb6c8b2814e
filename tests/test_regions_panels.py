"""Panels on parts of curved bodies: no rims where other parts go on, volumes to first order."""

from __future__ import annotations

import numpy as np
import pytest
from test_regions_turned import CASES, TOLERANCE, Case, moved

from bem.geometry.planes import Plane
from bem.geometry.regions.measures import measures
from bem.geometry.regions.plane_cut import cut_at_plane
from bem.geometry.regions.turned import turned
from bem.geometry.shapes import bowl, sphere
from bem.panels.curved import CurvedFamily
from bem.panels.mesh import Mesh

NAMES = ["rod cast in", "ball half in a cylinder", "torus halfway in", "balls that overlap"]


def flux_of(corners: np.ndarray) -> np.ndarray:
    """(n,) a third of the flux of the position vector through planar panels."""
    normal = 0.5 * np.cross(corners[:, 2] - corners[:, 0], corners[:, 3] - corners[:, 1])
    return np.einsum("ni,ni->n", corners[:, 0], normal) / 3.0


def area_of(corners: np.ndarray) -> np.ndarray:
    normal = 0.5 * np.cross(corners[:, 2] - corners[:, 0], corners[:, 3] - corners[:, 1])
    return np.linalg.norm(normal, axis=1)


def refined(mesh: Mesh, seed: int) -> Mesh:
    rng = np.random.default_rng(seed)
    count = len(mesh.corners)
    return mesh.refine(rng.random(count) < 0.3, rng.integers(0, 2, count))[0]


def offsets(mesh: Mesh) -> np.ndarray:
    """(n,) mean distance of the true surface from each panel."""
    families = [family for family in mesh.families if isinstance(family, CurvedFamily)]
    assert len(families) == len(mesh.families)
    return np.concatenate([family.offset for family in families])


@pytest.mark.parametrize("case", [CASES[name] for name in NAMES], ids=NAMES)
@pytest.mark.parametrize("seed", [0, 5])
def test_panels_close_their_regions_and_know_what_they_miss(case: Case, seed: int) -> None:
    bodies = moved(case.bodies, seed, 1.0) if seed else case.bodies
    mesh = Mesh.start(turned(bodies, TOLERANCE).parts)
    volume = flux_of(mesh.corners) + area_of(mesh.corners) * offsets(mesh)
    area = np.cross(
        mesh.corners[:, 2] - mesh.corners[:, 0], mesh.corners[:, 3] - mesh.corners[:, 1]
    )
    for region, expected in case.volumes.items():
        sign = (mesh.regions == region) @ [1.0, -1.0]
        assert sign @ volume == pytest.approx(expected, rel=2e-3)
        np.testing.assert_allclose(sign @ area, 0.0, atol=1e-9)


@pytest.mark.parametrize("case", [CASES[name] for name in NAMES], ids=NAMES)
def test_refined_panels_keep_their_sides_and_have_no_rims(case: Case) -> None:
    parts = turned(case.bodies, TOLERANCE).parts
    mesh = refined(refined(Mesh.start(parts), 1), 2)
    faceting = mesh.faceting()
    assert not faceting.rim_offset.any() and not faceting.rim_width.any()
    sides = np.array([(part.back, part.front) for part in parts])
    assert (mesh.regions == sides[mesh.owner]).all()
    expected = [measures(part.surface.curve).area for part in parts]
    found = np.bincount(mesh.owner, area_of(mesh.corners))
    np.testing.assert_allclose(found, expected, rtol=0.06)


def test_only_genuine_rims_are_free() -> None:
    low, *rest = cut_at_plane(bowl(1.0), Plane(2, -0.5))
    assert not CurvedFamily.start(low.curve).rim_width.any()
    assert CurvedFamily.start(rest[0].curve).rim_width.any()
    for half in cut_at_plane(sphere(1.0), Plane(2, 0.3)):
        assert not CurvedFamily.start(half.curve).rim_width.any()


def test_a_part_reversed_keeps_its_ends() -> None:
    low, _ = cut_at_plane(sphere(1.0), Plane(2, 0.3))
    assert low.curve.joined == (False, True)
    assert low.curve.reversed().joined == (True, False)
    assert low.curve.reversed().free_rims == (False, False)
