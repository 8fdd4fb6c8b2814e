"""The regions that bodies part space into, as an inspection reports them."""

from __future__ import annotations

from collections import defaultdict
from dataclasses import dataclass
from typing import TYPE_CHECKING

from bem.geometry.parts import INTERFACE, METAL, SURROUNDINGS
from bem.scene.material import Material
from bem.scene.plane_checks import on_kept_side
from bem.scene.scene import Scene

if TYPE_CHECKING:
    from bem.geometry.regions.partition import Partition, Solid

OUTSIDE = "surroundings"
"""Name of the region around all bodies."""


@dataclass(frozen=True)
class RegionReport:
    """One region and what it borders on.

    Args:
        number: 0 for the surroundings, else that of the dielectric from 1.
        name: of the dielectric, or ``OUTSIDE``.
        material: that fills it.
        volume: m^3, what other bodies leave of it; None for the surroundings.
        borders: {name of a neighbour: shared area, m^2}; both sides of a sheet count.
    """

    number: int
    name: str
    material: Material
    volume: float | None
    borders: dict[str, float]


@dataclass(frozen=True)
class Regions:
    """Space as the solver will see it.

    Args:
        partition: faces with the regions on their sides, metres.
        reports: one for each region, the surroundings first.
    """

    partition: Partition
    reports: tuple[RegionReport, ...]


def regions_of(scene: Scene) -> Regions:
    """Part space by the bodies of a scene, those behind mirror planes reflected.

    Raises:
        GeometryError: a body cannot be cut along the others.
    """
    from bem.geometry.regions.parted import parted

    partition = parted(solids_of(scene), scene.coincidence * scene.size)
    borders = _borders(scene, partition)
    media = [scene.surroundings, *(dielectric.material for dielectric in scene.dielectrics)]
    reports = [
        RegionReport(
            number,
            name,
            medium,
            None if number == SURROUNDINGS else partition.volumes.get(number, 0.0),
            borders[number],
        )
        for number, (name, medium) in enumerate(zip(region_names(scene), media, strict=True))
    ]
    return Regions(partition, tuple(reports))


def region_names(scene: Scene) -> list[str]:
    """Names of all regions, by their numbers."""
    return [OUTSIDE, *(dielectric.name for dielectric in scene.dielectrics)]


def solids_of(scene: Scene) -> list[Solid]:
    """All bodies as the partition takes them: conductors, then dielectrics."""
    from bem.geometry.regions.partition import Solid

    planes = scene.planes
    conductors = [
        Solid(on_kept_side(c, planes).surface, "metal" if c.body == "solid" else "skin", k, c.name)
        for k, c in enumerate(scene.conductors)
    ]
    return conductors + [
        Solid(on_kept_side(d, planes).surface, "dielectric", INTERFACE, d.name)
        for d in scene.dielectrics
    ]


def _borders(scene: Scene, partition: Partition) -> dict[int, dict[str, float]]:
    """Area that each region shares with each of its neighbours, the largest first."""
    from bem.geometry.regions.partition import area_of

    names = region_names(scene)
    found: dict[int, dict[str, float]] = defaultdict(lambda: defaultdict(float))
    for part in partition.parts:
        area = area_of(part.surface)
        for side, other in ((part.back, part.front), (part.front, part.back)):
            if side == METAL:
                continue
            metal = part.conductor != INTERFACE
            neighbour = scene.conductors[part.conductor].name if metal else names[other]
            found[side][neighbour] += area
    ordered: dict[int, dict[str, float]] = {number: {} for number in range(len(names))}
    for number, areas in found.items():
        ordered[number] = dict(sorted(areas.items(), key=lambda item: -item[1]))
    return ordered
