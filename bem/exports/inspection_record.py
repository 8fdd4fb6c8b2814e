"""An inspection as one record of plain values, for scripts; lengths are in metres.

Entries: ``bodies`` (conductors, then dielectrics), ``pairs``, ``regions`` with their neighbours,
``notes``, ``fatal`` (reasons not to solve), ``planes``, ``coincidence_m``.
"""

from __future__ import annotations

import json
from os import PathLike
from typing import Any

from bem.exports.atomic import write_file
from bem.exports.plain import plain
from bem.scene.body_report import BodyReport
from bem.scene.inspect import Inspection
from bem.scene.pairs import PairReport
from bem.scene.plane_checks import planes_record
from bem.scene.regions import RegionReport
from bem.scene.scene import Scene
from bem.scene.stack import flat_record

FORMAT = "bem inspection"
SCHEMA_VERSION = 1


def save_inspection(scene: Scene, found: Inspection, path: str | PathLike[str]) -> None:
    """Save what an inspection found.

    Raises:
        InputError: the file cannot be written.
    """
    text = json.dumps(inspection_record(scene, found), ensure_ascii=False, indent=1)
    write_file(path, (text + "\n").encode("utf-8", "backslashreplace"))


def inspection_record(scene: Scene, found: Inspection) -> dict[str, Any]:
    """Everything that was found, as JSON values."""
    regions = found.regions.reports if found.regions else ()
    flat = scene.half_space or scene.flat_layers
    record: dict[str, Any] = plain(
        {
            "format": FORMAT,
            "schema_version": SCHEMA_VERSION,
            "unit": scene.unit,
            "coincidence": scene.coincidence,
            "coincidence_m": found.coincidence,
            "surroundings": scene.surroundings.record(),
            "planes": {**planes_record(scene.planes), **flat_record(flat)},
            "bodies": [_body(body) for body in (*found.bodies, *found.dielectrics)],
            "pairs": [_pair(pair) for pair in found.pairs],
            "regions": [_region(region) for region in regions],
            "notes": found.notes,
            "fatal": found.fatal,
            "can_be_solved": not found.fatal,
        }
    )
    return record


def _body(body: BodyReport) -> dict[str, Any]:
    material = {} if body.material is None else body.material.record()
    return {
        "name": body.name,
        "kind": body.body,
        **material,
        "triangles": body.triangles,
        "quadrilaterals": body.quads,
        "vertices": body.vertices,
        "bounds_m": body.bounds,
        "area_m2": body.area,
        "volume_m3": body.volume,
        "closed": body.closed,
        "open_edges": body.open_edges,
        "pieces": body.pieces,
        "worst_aspect": body.worst_aspect,
        "curved": body.curved,
        "changes": body.changes,
    }


def _pair(pair: PairReport) -> dict[str, Any]:
    return {
        "conductors": (pair.first, pair.second),
        "gap_m": pair.gap,
        "relation": pair.relation,
        "place_m": pair.place,
        "inner": pair.inner,
    }


def _region(region: RegionReport) -> dict[str, Any]:
    return {
        "number": region.number,
        "name": region.name,
        **region.material.record(),
        "volume_m3": region.volume,
        "borders_m2": region.borders,
    }
