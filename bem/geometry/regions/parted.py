"""The partition of space by bodies that may touch, overlap, or lie in one another.

Each flat face that comes near other bodies is cut along the lines where their faces cross it, and
along the outlines of those that lie in its plane. A point inside each piece then tells which
bodies are on either side: behind a face that coincides with it, or around it by rays.
"""

from __future__ import annotations

from dataclasses import replace

from bem.errors import GeometryError
from bem.geometry.regions.assemble import Cut, parts_of, settled
from bem.geometry.regions.cutting import scraps_of
from bem.geometry.regions.facets import Facets
from bem.geometry.regions.notes import buried, names_of, notes_of
from bem.geometry.regions.partition import Partition, Solid
from bem.geometry.regions.sides import numbered, sides_of_scraps
from bem.geometry.regions.turned import Turned, turned
from bem.geometry.wording import counted, point_text


def parted(bodies: list[Solid], tolerance: float) -> Partition:
    """Cut the faces of bodies so that each has one region on each side.

    Where bodies overlap, metal counts before dielectrics, and a later dielectric before an
    earlier one.

    Args:
        bodies: conductors first, then dielectrics; dielectric m of them, from 0, is region m + 1.
        tolerance: faces closer than this coincide, in the unit of the coordinates.

    Raises:
        GeometryError: a dielectric is not closed.
    """
    round_ones = turned(bodies, tolerance)
    facets = [_facets(k, body, round_ones) for k, body in enumerate(bodies)]
    _refuse_open(bodies, facets)
    numbers = numbered(bodies)
    cuts = []
    for k, body in enumerate(bodies):
        scraps = scraps_of(k, facets, tolerance, round_ones.apart)
        solid = replace(body, surface=round_ones.stand_ins.get(k, body.surface))
        cuts.append(Cut(solid, facets[k], scraps, sides_of_scraps(k, scraps, facets, numbers)))
    cuts = settled(cuts, tolerance)
    parts = round_ones.parts + [part for k, cut in enumerate(cuts) for part in parts_of(k, cut)]
    left = {region for part in parts for region in (part.back, part.front)}
    parts.sort(key=lambda part: part.body)
    return Partition(parts, round_ones.notes + notes_of(cuts) + buried(bodies, left))


def _facets(index: int, body: Solid, round_ones: Turned) -> Facets:
    """Facets of a body, or those that stand for it if it is curved."""
    hollow = body.kind == "skin"
    if index not in round_ones.stand_ins:
        return Facets.of(body.surface, hollow)
    facets = Facets.of(round_ones.stand_ins[index], hollow)
    covered = round_ones.covered[index]
    if not covered.any():
        return facets
    return replace(facets, covered=covered, curve=body.surface.curve)


def _refuse_open(bodies: list[Solid], facets: list[Facets]) -> None:
    for body, facet, name in zip(bodies, facets, names_of(bodies), strict=True):
        if body.kind == "dielectric" and len(facet.open_ends):
            place = point_text(facet.open_ends[0].mean(axis=0), "m")
            raise GeometryError(
                f"{name} is not closed: {counted(len(facet.open_ends), 'edge')} without a "
                f"neighbour, one near {place}; close its surface and mesh it again"
            )
