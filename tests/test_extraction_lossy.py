"""Capacitance and conductance of media with losses, against closed forms in complex numbers."""

from __future__ import annotations

import numpy as np
import pytest
from dielectric_formulas import layered_spheres
from scenes import FARAD

import bem
from bem.results.lossy import Lossy
from bem.units import EPS0

RADIUS, COAT = 1.0, 1.5


def complex_lengths(entry: Lossy) -> np.ndarray:
    """(C - j G / (2 pi f)) / (4 pi eps0), in metres."""
    return (entry.capacitance - 1j * entry.conductance / (2.0 * np.pi * entry.frequency)) / FARAD


def assert_within(entry: Lossy, exact: np.ndarray, tolerance: float) -> None:
    """Both parts inside bars that keep the tolerance."""
    omega = 2.0 * np.pi * entry.frequency
    off = complex_lengths(entry) - exact
    assert entry.converged
    assert np.all(np.abs(off.real) <= entry.error / FARAD)
    assert np.all(np.abs(off.imag) <= entry.conductance_error / (omega * FARAD))
    size = np.sqrt(np.abs(np.diagonal(exact)))
    assert np.all(entry.error <= 1.01 * tolerance * FARAD * np.outer(size, size))


def at(conductivity: float, frequency: float, real: float = 1.0) -> complex:
    """Complex relative permittivity under exp(j 2 pi f t) (any textbook)."""
    return real - 1j * conductivity / (2.0 * np.pi * frequency * EPS0)


def test_a_sphere_in_a_conducting_coat() -> None:
    """At 50 Hz the coat is nearly metal, at 5 MHz a dielectric, in between it is both."""
    scene = bem.Scene(unit="m").add_conductor("ball", bem.sphere(RADIUS))
    scene.add_dielectric("coat", bem.sphere(COAT), relative_permittivity=4.0, conductivity=3e-7)
    found = bem.extract(scene, 1e-2, frequencies=[50.0, 2e3, 5e6]).lossy
    for entry in found:
        coat = at(3e-7, entry.frequency, 4.0)
        exact = 1.0 / ((1.0 / RADIUS - 1.0 / COAT) / coat + 1.0 / COAT)
        assert_within(entry, np.array([[exact]]), 1e-2)
        assert entry.conductance[0, 0] > 0.0
        assert entry.row_conductance == pytest.approx(entry.conductance[0], rel=1e-9, abs=0.0)
        bar = entry.conductance_error[0]
        assert entry.row_conductance_error == pytest.approx(bar, rel=0.5, abs=0.0)
    assert [entry.frequency for entry in found] == [50.0, 2e3, 5e6]


def test_two_lossy_layers_between_spheres() -> None:
    """Series of both layers (Maxwell 1873, from memory), with more of the field in each by turns.

    The outer sphere is hollow; its outside adds its own radius.
    """
    scene = bem.Scene(unit="m")
    scene.add_conductor("ball", bem.sphere(1.0))
    scene.add_conductor("shell", bem.sphere(2.0), body="shell")
    scene.add_dielectric("outer", bem.sphere(2.0), relative_permittivity=2.0, loss_tangent=0.5)
    scene.add_dielectric("inner", bem.sphere(1.5), relative_permittivity=6.0, conductivity=2e-7)
    (entry,) = bem.extract(scene, 1e-2, frequencies=[300.0]).lossy
    media = at(2e-7, 300.0, 6.0), 2.0 - 1.0j
    inverse = (1.0 / 1.0 - 1.0 / 1.5) / media[0] + (1.0 / 1.5 - 1.0 / 2.0) / media[1]
    mutual = 1.0 / inverse
    assert abs(mutual.imag) > 0.3 * mutual.real
    assert_within(entry, np.array([[mutual, -mutual], [-mutual, mutual + 2.0]]), 1e-2)
    assert layered_spheres((1.0, 1.5, 2.0), (6.0, 2.0)) == pytest.approx(
        1.0 / ((1.0 - 1.0 / 1.5) / 6.0 + (1.0 / 1.5 - 0.5) / 2.0), rel=1e-14
    )


@pytest.mark.parametrize(
    ("loss", "factor"),
    [({"conductivity": 5e-9}, 5e-9 / (2.5 * EPS0)), ({"loss_tangent": 0.02}, 2e3 * np.pi * 0.02)],
)
def test_one_lossy_medium_everywhere(loss: dict[str, float], factor: float) -> None:
    """G = C sigma / eps, or C 2 pi f tan: bars and row sums alike (textbook)."""
    scene = bem.Scene(unit="m", relative_permittivity=2.5, **loss)
    for x in (-1.0, 1.0):
        scene.add_conductor(f"cube {x}", bem.box(1.0, 1.0, 1.0, (x, 0.0, 0.0)))
    result = bem.extract(scene, 1e-2, frequencies=[1e3])
    (entry,) = result.lossy
    close = {"rel": 1e-12, "abs": 0.0}
    assert entry.capacitance == pytest.approx(result.capacitance, **close)
    assert entry.conductance == pytest.approx(factor * result.capacitance, **close)
    assert entry.row_conductance == pytest.approx(factor * result.row_sum, **close)
    modulus = np.hypot(1.0, factor / (2e3 * np.pi))
    assert entry.error == pytest.approx(modulus * result.error, **close)
    assert entry.conductance_error == pytest.approx(2e3 * np.pi * entry.error, **close)
    assert (entry.converged, entry.panels) == (True, result.panels)


def test_equal_loss_tangents_turn_the_real_matrix() -> None:
    """All permittivities times 1 - j tan: so is C, whatever lies where."""
    scene = bem.Scene(unit="m", relative_permittivity=1.5, loss_tangent=0.4)
    scene.add_conductor("post", bem.box(0.5, 0.5, 0.5, (0.0, 0.0, 0.25)))
    scene.add_dielectric(
        "block", bem.box(1.0, 1.0, 0.5, (0.0, 0.0, -0.25)),
        relative_permittivity=6.0, loss_tangent=0.4,
    )  # fmt: skip
    result = bem.extract(scene, 2e-2, frequencies=[1e3])
    (entry,) = result.lossy
    assert np.all(np.abs(entry.capacitance - result.capacitance) <= result.error)
    turned = 2e3 * np.pi * 0.4 * entry.capacitance
    assert entry.conductance == pytest.approx(turned, rel=1e-6, abs=0.0)
    assert entry.row_conductance == pytest.approx(turned.sum(axis=1), rel=1e-6, abs=0.0)


def test_two_slabs_side_by_side_add() -> None:
    """Plates close together: eps0 A e / d of each half, the lossy half alone conducting."""
    gap, flow = 0.05, 1e-8
    scene = bem.Scene(unit="m")
    for k, z in enumerate((-0.5 * (gap + 0.1), 0.5 * (gap + 0.1))):
        scene.add_conductor(f"plate {k}", bem.box(1.0, 1.0, 0.1, (0.0, 0.0, z)))
    half = [bem.box(0.5, 1.0, gap, (x, 0.0, 0.0)) for x in (-0.25, 0.25)]
    scene.add_dielectric("dry", half[0], relative_permittivity=2.0)
    scene.add_dielectric("wet", half[1], relative_permittivity=8.0, conductivity=flow)
    (entry,) = bem.extract(scene, 2e-2, frequencies=[1e3]).lossy
    assert -entry.capacitance[0, 1] == pytest.approx(EPS0 * 5.0 / gap, rel=0.08, abs=0.0)
    assert -entry.conductance[0, 1] == pytest.approx(flow * 0.5 / gap, rel=0.02, abs=0.0)
    assert np.abs(entry.row_conductance).max() < 0.02 * entry.conductance[0, 0]


def test_frequencies_need_something_that_is_lost() -> None:
    scene = bem.Scene(unit="m").add_conductor("ball", bem.sphere(1.0))
    with pytest.raises(bem.BemError, match="found some, but no medium has losses"):
        bem.extract(scene, 3e-2, frequencies=[50.0])
    for wrong in (0.0, -50.0, float("inf")):
        with pytest.raises(bem.BemError, match="frequencies: found .*, needs positive numbers"):
            bem.extract(scene, 3e-2, frequencies=[wrong])
    scene.set_half_space(below_z=-2.0, relative_permittivity=4.0, loss_tangent=0.1)
    with pytest.raises(bem.BemError, match="found some with flat layers"):
        bem.extract(scene, 3e-2, frequencies=[50.0])
