"""Dielectrics beside mirror and grounded planes, against the whole device drawn out."""

from __future__ import annotations

import numpy as np
import pytest
from scenes import in_lengths

import bem
from bem.geometry import shapes
from bem.geometry.surface import Surface

CUBE, COAT = shapes.box(1.0, 1.0, 1.0), shapes.box(1.5, 1.5, 1.5)
BALLS = shapes.sphere(0.5), shapes.sphere(0.75)
STUB, TIP = (
    shapes.box(0.5, 0.5, 0.5, (-0.25, 0.0, 0.0)),
    shapes.box(0.3, 0.3, 0.3, (0.65, 0.0, 0.0)),
)
ROD = shapes.box(1.0, 0.5, 0.5)
FAR_TIP = shapes.box(0.3, 0.3, 0.3, (-0.65, 0.0, 0.0))


def solved(conductor: Surface, *dielectrics: Surface, mirrors: str = "") -> tuple[float, float]:
    """Value and bar in units of 4 pi eps0 m of one conductor, permittivity 4 around it."""
    scene = bem.Scene(unit="m")
    for axis in mirrors:
        scene.add_mirror_plane(**{axis: 0.0})
    scene.add_conductor("c", conductor)
    for k, body in enumerate(dielectrics):
        scene.add_dielectric(f"d{k}", body, relative_permittivity=4.0)
    result = bem.extract(scene, 3e-3)
    assert result.converged
    return float(in_lengths(result.capacitance)[0, 0]), float(in_lengths(result.error)[0, 0])


@pytest.mark.parametrize("mirrors", ["x", "yz", "xyz"])
def test_mirror_planes_cut_a_conductor_and_its_coat(mirrors: str) -> None:
    """The value of the whole cube is from the same program; see the table of known values."""
    (whole, bar), (folded, its_bar) = solved(CUBE, COAT), solved(CUBE, COAT, mirrors=mirrors)
    assert folded == pytest.approx(whole, rel=0.0, abs=bar + its_bar)


@pytest.mark.parametrize("mirrors", ["z", "xz"])
def test_mirror_planes_cut_curved_bodies(mirrors: str) -> None:
    """A ball in a coat, exact: two capacitors in series (any textbook)."""
    exact = 1.0 / ((1.0 / 0.5 - 1.0 / 0.75) / 4.0 + 1.0 / 0.75)
    value, bar = solved(*BALLS, mirrors=mirrors)
    assert value == pytest.approx(exact, rel=0.0, abs=bar)


def test_bodies_on_the_far_side_are_reflected_before_space_is_divided() -> None:
    """A stub drawn on one side of the plane, the block that touches its image on the other."""
    whole, bar = solved(ROD, TIP, FAR_TIP)
    folded, its_bar = solved(STUB, TIP, mirrors="x")
    assert folded == pytest.approx(whole, rel=0.0, abs=bar + its_bar)


def test_a_dielectric_that_the_mirror_does_not_map_onto_itself_is_refused() -> None:
    aside = shapes.box(1.5, 1.5, 1.5, (0.2, 0.0, 0.0))
    with pytest.raises(bem.BemError, match="not its own mirror image"):
        solved(CUBE, aside, mirrors="x")


def test_a_block_on_the_ground_holds_up_a_conductor() -> None:
    """Sum of charge as the block comes down: continuous, and largest where it stands."""
    values = []
    for gap in (0.0, 1e-4):
        scene = bem.Scene(unit="m")
        scene.set_ground_plane(z=-gap)
        scene.add_conductor("c", shapes.box(0.5, 0.5, 0.5, (0.0, 0.0, 0.75)))
        scene.add_dielectric(
            "d", shapes.box(1.0, 1.0, 0.5, (0.0, 0.0, 0.25)), relative_permittivity=4.0
        )
        scene.add_mirror_plane(x=0.0)
        scene.add_mirror_plane(y=0.0)
        values.append(in_lengths(bem.extract(scene, 5e-3).capacitance)[0, 0])
    assert values[1] == pytest.approx(values[0], rel=3e-3)
    alone = bem.Scene(unit="m").set_ground_plane(z=0.0)
    alone.add_conductor("c", shapes.box(0.5, 0.5, 0.5, (0.0, 0.0, 0.75)))
    assert np.min(values) > 1.2 * in_lengths(bem.extract(alone, 5e-3).capacitance)[0, 0]
