"""Checks of a scene before solving: each body, each pair, and what forbids a solution."""

from __future__ import annotations

from dataclasses import dataclass

from bem.errors import GeometryError, InputError
from bem.geometry.planes import Planes
from bem.geometry.wording import counted, metre_text, point_text
from bem.scene.body import Body, body_of
from bem.scene.body_report import BodyReport, all_body_notes, junctions, report_of
from bem.scene.facet_notes import facet_notes
from bem.scene.material import below_vacuum
from bem.scene.pairs import ALL_PAIRS, CONTACT, PairReport, all_pairs
from bem.scene.plane_checks import ground_gap, on_kept_side, plane_findings
from bem.scene.regions import Regions, regions_of
from bem.scene.scene import Scene


@dataclass(frozen=True)
class Inspection:
    """Findings about a scene.

    Args:
        unit: of the scene.
        bodies: one report per conductor.
        pairs: sorted by gap; with many conductors those far apart are left out.
        fatal: reasons not to solve, one line each.
        warnings: what may be wrong with a body, one line each.
        notes: what is worth knowing, one line each, the warnings among it.
        ground_gaps: distance of each conductor from the grounded plane, metres; none without it.
        dielectrics: one report per dielectric.
        coincidence: faces closer than this coincide, metres.
        regions: what the bodies part space into; None without dielectrics, if the scene cannot be
            solved, or if it was not asked for.
    """

    unit: str
    bodies: tuple[BodyReport, ...]
    pairs: tuple[PairReport, ...]
    fatal: list[str]
    warnings: list[str]
    notes: list[str]
    ground_gaps: tuple[float, ...] = ()
    dielectrics: tuple[BodyReport, ...] = ()
    coincidence: float = 0.0
    regions: Regions | None = None


def inspect(scene: Scene, closely: bool = True) -> Inspection:
    """Look at every body and every pair of conductors.

    Args:
        scene: what to look at.
        closely: also compare facets with the smooth surfaces that they may stand for, and find
            the regions that dielectrics part space into.

    Raises:
        InputError: the scene has no conductors.
    """
    if not scene.conductors:
        raise InputError("the scene has no conductors; add at least one")
    planes = scene.planes
    bodies = [body_of(on_kept_side(body, planes)) for body in scene.bodies]
    reports = tuple(report_of(body) for body in bodies)
    number = len(scene.conductors)
    pairs = tuple(all_pairs(bodies[:number]))
    bad, reasons = _refused(scene, pairs)
    warnings = [*all_body_notes(reports, bodies, scene.unit), *_media_notes(scene)]
    regions, trouble = _regions(scene) if closely and not reasons else (None, [])
    return Inspection(
        unit=scene.unit,
        bodies=reports[:number],
        pairs=pairs,
        fatal=reasons + trouble,
        ground_gaps=_ground_gaps(bodies[:number], planes),
        warnings=warnings,
        notes=[
            *warnings,
            *(facet_notes(scene.bodies) if closely else ()),
            *junctions(bodies[:number], scene.unit),
            *_pair_notes([p for p in pairs if p not in bad], number),
            *(regions.partition.notes if regions else ()),
        ],
        dielectrics=reports[number:],
        coincidence=scene.coincidence * scene.size,
        regions=regions,
    )


def _refused(scene: Scene, pairs: tuple[PairReport, ...]) -> tuple[list[PairReport], list[str]]:
    """Pairs that forbid a solution, and all reasons that do, one line each."""
    solid = {c.name: c.body == "solid" for c in scene.conductors}
    bad = [pair for pair in pairs if _is_fatal(pair, solid)]
    hint = _image_hint(scene.planes)
    return bad, [*plane_findings(scene), *(_reason(pair, scene.unit) + hint for pair in bad)]


def _regions(scene: Scene) -> tuple[Regions | None, list[str]]:
    """Regions of a scene with dielectrics, or the reason why there are none."""
    if not scene.dielectrics:
        return None, []
    try:
        return regions_of(scene), []
    except GeometryError as problem:
        return None, [str(problem)]


def _ground_gaps(bodies: list[Body], planes: Planes) -> tuple[float, ...]:
    ground = planes.ground
    return () if ground is None else tuple(ground_gap(body, ground) for body in bodies)


def _media_notes(scene: Scene) -> list[str]:
    """Permittivities that are too low to be true; the surroundings have a line of their own."""
    media = [(f'"{body.name}"', body.material) for body in scene.dielectrics]
    if scene.half_space is not None:
        media.append(("half_space", scene.half_space.material))
    if scene.flat_layers is not None:
        layers = enumerate(scene.flat_layers.materials, 1)
        media += [(f"flat_layers: layer {number}", layer) for number, layer in layers]
    return [line for what, medium in media for line in below_vacuum(what, medium)]


def check_scene(scene: Scene) -> Inspection:
    """Inspect a scene that is about to be solved.

    Raises:
        GeometryError: conductors touch, cross, or lie in solid metal.
        InputError: the scene has no conductors.
    """
    inspection = inspect(scene, closely=False)
    if inspection.fatal:
        more = len(inspection.fatal) - 1
        rest = f" (and {counted(more, 'more finding')}: see bem inspect)" if more else ""
        raise GeometryError(inspection.fatal[0] + rest)
    return inspection


def _outer(pair: PairReport) -> str:
    return pair.second if pair.inner == pair.first else pair.first


def _is_fatal(pair: PairReport, solid: dict[str, bool]) -> bool:
    if pair.relation == "inside":
        return solid[_outer(pair)]
    return pair.relation in ("touch", "cross")


def _reason(pair: PairReport, unit: str) -> str:
    place = point_text(pair.place, unit)
    if pair.relation == "inside":
        return (
            f'"{pair.inner}" lies inside "{_outer(pair)}", which is solid metal; '
            f'if "{_outer(pair)}" is hollow, give it body = "shell"'
        )
    if pair.relation == "cross":
        return (
            f'"{pair.first}" and "{pair.second}" cross near {place}; '
            "move them apart, or make them one conductor"
        )
    return (
        f'"{pair.first}" and "{pair.second}" touch or overlap near {place}: '
        f"their gap of {metre_text(pair.gap)} is within {CONTACT:g} of the smaller body; "
        "move them apart, or make them one conductor"
    )


def _image_hint(planes: Planes) -> str:
    """What to think of where bodies were folded onto one side of mirror planes."""
    if not planes.mirrors:
        return ""
    return " (with the mirror planes a body stands for its images too: leave those out)"


def _pair_notes(pairs: list[PairReport], number: int) -> list[str]:
    notes = [
        f'"{pair.inner}" lies inside "{_outer(pair)}"'
        for pair in pairs
        if pair.relation == "inside"
    ]
    if number > ALL_PAIRS:
        every = counted(number * (number - 1) // 2, "pair")
        notes.append(
            f"gaps of {len(pairs):,} of {every} found, with each conductor's smallest among them; "
            "the other pairs are farther apart"
        )
    return notes
