"""Scenes of conductors among dielectrics that the tests are made of, in metres."""

from __future__ import annotations

from collections.abc import Callable, Iterable

import numpy as np
from dielectric_values import DielectricReference
from scenes import meshed_box, shape_of

import bem
from bem.geometry.surface import Surface
from bem.scene.placing import rotation

Filling = tuple[Surface, float]
"""A dielectric body and its permittivity."""


def with_dielectrics(
    conductors: Iterable[Surface], fillings: Iterable[Filling], shells: tuple[int, ...] = ()
) -> bem.Scene:
    """Scene with conductors c0, c1, ... and dielectrics d0, d1, ..."""
    scene = bem.Scene(unit="m")
    for k, surface in enumerate(conductors):
        scene.add_conductor(f"c{k}", surface, body="shell" if k in shells else "solid")
    for k, (surface, permittivity) in enumerate(fillings):
        scene.add_dielectric(f"d{k}", surface, relative_permittivity=permittivity)
    return scene


def scene_of_record(
    record: DielectricReference, place: Callable[[Surface], Surface] = lambda surface: surface
) -> bem.Scene:
    """Scene of a record, every body moved by ``place``."""
    conductors = [place(shape_of(b)) for b in record.conductors]
    fillings = [(place(shape_of(m.body)), m.permittivity) for m in record.materials]
    return with_dielectrics(conductors, fillings)


def turned_by(seed: int) -> Callable[[Surface], Surface]:
    """Return a rigid motion that ``seed`` chooses."""
    random = np.random.default_rng(seed)
    axis = tuple(random.normal(size=3).tolist())
    matrix, shift = rotation(axis, random.uniform(20.0, 340.0)), random.uniform(-1.0, 1.0, 3)
    return lambda surface: surface.placed(matrix, shift)


def rough_box(
    sides: tuple[float, float, float], centre: tuple[float, float, float], n: int, seed: int = 0
) -> Surface:
    """Box of 12 n^2 irregular triangles, meshed unlike any neighbour."""
    return meshed_box(n, jitter=0.3, seed=seed).placed(np.diag(sides), np.array(centre))


def solve(scene: bem.Scene, tolerance: float = 1e-3) -> bem.CapacitanceResult:
    """Extract on one thread."""
    return bem.extract(scene, tolerance=tolerance, threads=1)


def bars_meet(first: bem.CapacitanceResult, second: bem.CapacitanceResult) -> None:
    """Require two results to agree within both bars, in every entry and row sum."""
    assert first.converged and second.converged
    apart = np.abs(first.capacitance - second.capacitance)
    assert np.all(apart <= first.error + second.error), apart / (first.error + second.error)
    rows = np.abs(first.row_sum - second.row_sum)
    assert np.all(rows <= first.row_sum_error + second.row_sum_error)
