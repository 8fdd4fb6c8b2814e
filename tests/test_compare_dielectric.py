"""Comparisons of scenes with dielectrics, and what a result says of panels on these."""

from __future__ import annotations

import numpy as np
from scenes import in_lengths

import bem
from bem.extraction.compare import WITH_DIELECTRICS
from bem.geometry import shapes
from bem.geometry.parts import INTERFACE
from bem.results.comparison import in_order


def coated(permittivity: float) -> bem.Scene:
    """A ball in a coat, and one beside it, by a mirror plane half of each."""
    scene = bem.Scene(unit="m").add_mirror_plane(z=0.0)
    scene.add_conductor("ball", shapes.sphere(0.5))
    scene.add_conductor("bead", shapes.sphere(0.25).placed(np.eye(3), np.array([2.0, 0.0, 0.0])))
    return scene.add_dielectric("coat", shapes.sphere(0.75), relative_permittivity=permittivity)


def test_scenes_with_dielectrics_are_solved_apart_and_their_bars_add() -> None:
    """A coat of another permittivity; the same change from the two results by themselves."""
    found = bem.compare(coated(4.0), coated(5.0), tolerance=1e-2)
    assert not found.correlated and WITH_DIELECTRICS in found.notes
    sides = [bem.extract(coated(e), 1e-2) for e in (4.0, 5.0)]
    change = sides[1].capacitance - sides[0].capacitance
    np.testing.assert_allclose(found.change, change, rtol=1e-9, atol=0.0)
    np.testing.assert_allclose(found.change_error, sides[0].error + sides[1].error, rtol=1e-9)
    assert in_lengths(found.change)[0, 0] > 0.0


def test_a_coat_that_comes_or_goes_is_a_change_too() -> None:
    """One side without dielectrics."""
    bare = bem.Scene(unit="m").add_mirror_plane(z=0.0)
    bare.add_conductor("bead", shapes.sphere(0.25).placed(np.eye(3), np.array([2.0, 0.0, 0.0])))
    bare.add_conductor("ball", shapes.sphere(0.5))
    found = bem.compare(bare, coated(4.0), tolerance=1e-2)
    assert not found.correlated and found.before.conductors == ("bead", "ball")
    assert found.change[1, 1] > found.change_error[1, 1] > 0.0


def test_panels_on_dielectrics_belong_to_no_conductor() -> None:
    """Their charge is none of a conductor's; a reduction and another order leave them alone."""
    result = bem.extract(coated(4.0), 1e-2)
    owner = np.asarray(result.panel_conductor)
    assert sorted(set(owner.tolist())) == [INTERFACE, 0, 1]
    corners = np.asarray(result.panel_corners)
    area = 0.5 * np.linalg.norm(
        np.cross(corners[:, 2] - corners[:, 0], corners[:, 3] - corners[:, 1]), axis=1
    )
    charge = np.array([area[owner == k] @ np.asarray(result.density)[owner == k] for k in (0, 1)])
    np.testing.assert_allclose(2.0 * charge, result.capacitance, rtol=0.06, atol=0.0)
    assert not np.asarray(result.density)[owner == INTERFACE].any()
    small = result.reduced(ground=["ball"])
    np.testing.assert_array_equal(small.panel_conductor, np.where(owner == 1, 0, -1))
    other = in_order(result, ["bead", "ball"])
    np.testing.assert_array_equal(other.panel_conductor, np.where(owner < 0, owner, 1 - owner))
