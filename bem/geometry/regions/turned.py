"""Curved bodies in the partition of space: they keep their true surfaces where circles cut them.

Bodies of revolution with one axis, planes across the axis of one, a sphere and anything: there
the half-plane (r, z) shows the partition. Profiles are cut into stretches, and points beside each
stretch tell the regions on both sides. Where faces coincide, the earlier body's are kept. Flat
ends that others cut in other shapes, and bodies that are cut across in other ways, are left to
the partition of flat faces, with facets for the curve.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from typing import TYPE_CHECKING, NamedTuple

import numpy as np

from bem.geometry.parts import INTERFACE, METAL, SURROUNDINGS, Part
from bem.geometry.regions.axes import with_suited_axis
from bem.geometry.regions.chains import Stretch, chains, stretches
from bem.geometry.regions.coaxial import aligned, scale_of
from bem.geometry.regions.inside import inside
from bem.geometry.regions.marks import Mark, boxes_meet, mark_of
from bem.geometry.regions.measures import measures
from bem.geometry.regions.notes import names_of
from bem.geometry.regions.stand_ins import stand_in
from bem.geometry.revolved import Revolution
from bem.geometry.shapes.round import faceted
from bem.geometry.shapes.steps import AROUND
from bem.geometry.surface import Surface
from bem.geometry.topology import edges_of

if TYPE_CHECKING:
    from bem.geometry.regions.partition import Solid

BESIDE = 1.5
"""Points beside a surface lie this many tolerances off it."""
SPOILT = Mark(spoilt=True)
SPOILT_LINE = (
    "{name} is cut otherwise than in circles about its axis: facets stand for its curved surface, "
    "and the bars hold them"
)
_U = np.array([0.137, 0.451, 0.802])
_T = np.array([0.29, 0.5, 0.77])


class Turned(NamedTuple):
    """What becomes of curved bodies.

    Args:
        parts: parts of curved bodies that follow the true surface.
        stand_ins: per curved body the facets by which it cuts the faces of others.
        covered: per curved body, which of these facets (f,) ``parts`` stands for already.
        apart: pairs of bodies, the lower first, that do not cut each other, whatever facets say.
        notes: one line for each body that loses its curve, and on contacts and overlaps of
            curved bodies that are apart.
    """

    parts: list[Part]
    stand_ins: dict[int, Surface]
    covered: dict[int, np.ndarray]
    apart: set[tuple[int, int]]
    notes: list[str]


@dataclass(frozen=True, eq=False)
class _Scene:
    """All bodies, and what they do to the curved ones."""

    bodies: Sequence[Solid]
    tolerance: float

    @cached_property
    def curved(self) -> list[int]:
        """Bodies that have a curve."""
        return [k for k, body in enumerate(self.bodies) if body.surface.curve is not None]

    def partners(self, k: int) -> list[int]:
        """Bodies that may touch or cut body k; conductors do not meet each other."""
        metal = self.bodies[k].kind != "dielectric"
        return [
            j
            for j, other in enumerate(self.bodies)
            if j != k
            and not (metal and other.kind != "dielectric")
            and boxes_meet(self.bodies[k].surface, other.surface, self.tolerance)
        ]

    @cached_property
    def curves(self) -> dict[int, Revolution | None]:
        """Curves with suitable axes; None where there are none."""
        found = {}
        for k in self.curved:
            curve = self.bodies[k].surface.curve
            assert curve is not None
            surfaces = [self.bodies[j].surface for j in self.partners(k)]
            found[k] = with_suited_axis(curve, surfaces, self.tolerance)
        return found

    @cached_property
    def marks(self) -> dict[tuple[int, int], Mark]:
        """What the second of two bodies does to the first, as far as it does anything."""
        found = {}
        for k in self.curved:
            for j in self.partners(k):
                mark = self._mark(k, j)
                if mark.some:
                    found[k, j] = mark
        return found

    def _mark(self, k: int, j: int) -> Mark:
        curve, partner = self.curves[k], self._now(j)
        if curve is None:
            drawn = self.bodies[k].surface.curve
            assert drawn is not None
            curve = with_suited_axis(drawn, [partner], self.tolerance)
        return SPOILT if curve is None else mark_of(curve, partner, self.tolerance)

    def _now(self, k: int) -> Surface:
        curve = self.curves.get(k)
        surface = self.bodies[k].surface
        return surface if curve is None else replace(surface, curve=curve)

    @cached_property
    def spoilt(self) -> set[int]:
        """Curved bodies that must do with facets, with all curved ones that they cut or touch."""
        found = {k for (k, _), mark in self.marks.items() if mark.spoilt}
        found |= {k for k, curve in self.curves.items() if curve is None}
        while True:
            more = {k for pair in self.marks for k in pair if found & {*pair}} & {*self.curved}
            if more <= found:
                return found
            found |= more

    @cached_property
    def numbers(self) -> np.ndarray:
        """Region (b,) inside each body; METAL for conductors."""
        dielectric = np.array([body.kind == "dielectric" for body in self.bodies])
        return np.where(dielectric, np.cumsum(dielectric), METAL)

    @cached_property
    def holding(self) -> list[int]:
        """Bodies with an inside."""
        return [k for k, body in enumerate(self.bodies) if _holds(body)]


def _holds(body: Solid) -> bool:
    if body.kind == "skin":
        return False
    curve = body.surface.curve
    if curve is not None:
        return not any(curve.free_rims)
    return not (edges_of(body.surface.triangles).uses % 2).any()


@dataclass(frozen=True, eq=False)
class _Round:
    """One curved body that keeps its curve."""

    scene: _Scene
    index: int
    curve: Revolution

    @cached_property
    def marks(self) -> dict[int, Mark]:
        """What each other body does to it."""
        return {j: mark for (k, j), mark in self.scene.marks.items() if k == self.index}

    @cached_property
    def line(self) -> list[Stretch]:
        """Its profile, cut."""
        cuts = [mark.cuts for mark in self.marks.values()]
        cuts += [mark.touching.ravel() for mark in self.marks.values()]
        local = self.scene.tolerance / scale_of(self.curve)
        return stretches(self.curve, np.concatenate([np.zeros(0), *cuts]), local)

    @cached_property
    def open(self) -> np.ndarray:
        """(n,) stretches that are left to the partition of flat faces."""
        pieces = {piece for mark in self.marks.values() for piece in mark.open}
        pieces |= {
            p for (_, k), mark in self.scene.marks.items() if k == self.index for p in mark.opens
        }
        return np.array([stretch.piece in pieces for stretch in self.line])

    @cached_property
    def sides(self) -> np.ndarray:
        """(n, 2, b) which bodies hold the space behind and in front of each stretch."""
        points = self._beside()
        held = np.zeros((*points.shape[:2], len(self.scene.bodies)), dtype=bool)
        for k in self.scene.holding:
            found = inside(self.scene.bodies[k].surface, points.reshape(-1, 3))
            held[..., k] = 2 * found.reshape(points.shape[:3]).sum(axis=2) > points.shape[2]
        return held

    def _beside(self) -> np.ndarray:
        """(n, 2, p, 3) points behind and in front of each stretch."""
        low, high = np.array([stretch[1:] for stretch in self.line]).T
        s = (low[:, None] + (high - low)[:, None] * _T)[:, None, :]
        points, normals = (f(_U[:, None], s) for f in (self.curve.point, self.curve.normal))
        off = BESIDE * self.scene.tolerance * normals
        return np.stack([points - off, points + off], axis=1).reshape(len(low), 2, -1, 3)

    @cached_property
    def regions(self) -> np.ndarray:
        """(n, 2) region behind and in front of each stretch."""
        highest = np.where(self.sides, self.scene.numbers, SURROUNDINGS).max(axis=2)
        metal = (self.sides & (self.scene.numbers == METAL)).any(axis=2)
        return np.where(metal, METAL, np.maximum(highest, SURROUNDINGS))

    @cached_property
    def kept(self) -> np.ndarray:
        """(n,) stretches that bound regions, are this body's to give, and follow its curve."""
        back, front = self.regions.T
        if self.scene.numbers[self.index] == METAL:
            return (front != METAL) & ~self.open
        others = [mark.touching for j, mark in self.marks.items() if j < self.index]
        given = [
            any(_within(span, stretch) for spans in others for span in spans)
            for stretch in self.line
        ]
        return (back != front) & (self.regions != METAL).all(axis=1) & ~np.array(given) & ~self.open

    def parts(self) -> list[Part]:
        """Parts with its true surface."""
        labels = [
            (int(back), int(front)) if kept else None
            for (back, front), kept in zip(self.regions, self.kept, strict=True)
        ]
        return [self._part(curve, sides) for sides, curve in chains(self.curve, self.line, labels)]

    def _part(self, curve: Revolution, regions: tuple[int, int]) -> Part:
        body = self.scene.bodies[self.index]
        conductor = INTERFACE if body.kind == "dielectric" else body.conductor
        if curve.profile == self.curve.profile:
            return Part(body.surface, conductor, *regions, self.index)
        surface = replace(faceted(aligned(curve), AROUND), rounding=body.surface.rounding)
        return Part(surface, conductor, *regions, self.index)

    def contact_area(self, j: int) -> float:
        """Area over which it touches another body."""
        if j not in self.marks:
            return 0.0
        spans = self.marks[j].touching
        touch = [any(_within(span, stretch) for span in spans) for stretch in self.line]
        labels = [(0, 0) if here else None for here in touch]
        return sum(measures(curve).area for _, curve in chains(self.curve, self.line, labels))

    def overlaps(self, j: int) -> bool:
        """Whether it is cut by another body, and lies partly inside."""
        if j not in self.marks:
            return False
        both = self.sides[:, :, j].all(axis=1)
        return bool(both.any() and not both.all())


def _within(span: np.ndarray, stretch: Stretch) -> bool:
    return bool(span[0] <= stretch.middle <= span[1])


def turned(bodies: Sequence[Solid], tolerance: float) -> Turned:
    """Find the regions beside curved bodies, and where they keep their true surfaces.

    Args:
        bodies: conductors first, then dielectrics; dielectric m of them, from 0, is region m + 1.
        tolerance: surfaces closer than this coincide, in the unit of the coordinates.
    """
    scene = _Scene(bodies, tolerance)
    rounds = {
        k: _Round(scene, k, c) for k, c in scene.curves.items() if c and k not in scene.spoilt
    }
    facets = {k: stand_in(r.curve, r.line) for k, r in rounds.items()}
    stand_ins = {k: surface for k, (surface, _) in facets.items()}
    covered = {k: ~rounds[k].open[stretch] for k, (_, stretch) in facets.items()}
    for k in sorted(scene.spoilt):
        stand_ins[k] = replace(bodies[k].surface, curve=None)
        covered[k] = np.zeros(len(stand_ins[k].faces), dtype=bool)
    parts = [part for r in rounds.values() for part in r.parts()]
    apart = _apart(scene, rounds)
    return Turned(parts, stand_ins, covered, apart, _notes(scene, rounds, apart))


def _apart(scene: _Scene, rounds: dict[int, _Round]) -> set[tuple[int, int]]:
    """Pairs with a curved body that leave each other alone, or are done with."""
    meet = {tuple(sorted(pair)) for pair in scene.marks}
    done = {k for k, r in rounds.items() if not r.open.any()}
    return {
        (i, j)
        for j in range(len(scene.bodies))
        for i in range(j)
        if {i, j} & {*scene.curved} and ((i, j) not in meet or {i, j} <= done)
    }


def _notes(scene: _Scene, rounds: dict[int, _Round], apart: set[tuple[int, int]]) -> list[str]:
    """One line for each body that loses its curve; on contacts and overlaps among the others."""
    names = names_of(list(scene.bodies))
    lines = [SPOILT_LINE.format(name=names[k]) for k in sorted(scene.spoilt)]
    for i, j in sorted(pair for pair in apart if {*pair} <= {*rounds}):
        area = rounds[i].contact_area(j)
        if area > 0.0:
            lines.append(f"{names[i]} touches {names[j]} over {area:.4g} m^2")
        if rounds[i].overlaps(j) or rounds[j].overlaps(i):
            first, second = _by_rank(scene, i, j)
            lines.append(f"{names[second]} overlaps {names[first]}: there {names[first]} counts")
    return lines


def _by_rank(scene: _Scene, i: int, j: int) -> tuple[int, int]:
    """The body that counts where two are, the lower given first, and the other."""
    return (i, j) if scene.numbers[i] == METAL else (j, i)
