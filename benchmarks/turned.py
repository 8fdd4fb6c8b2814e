"""The same cases turned by a random angle and shifted, as a user's mesh files would have them."""

from __future__ import annotations

import zlib
from dataclasses import replace
from pathlib import Path

import numpy as np
from cases import Case
from stl_out import binary_stl

import bem
from bem.scene.placing import rotation

HALF_STEP = 2.0**-24
"""Largest relative rounding of a single-precision number."""


def turned(case: Case) -> Case:
    """Turn and shift a case at random, by its name; coordinates stay near one size."""
    random = np.random.default_rng(zlib.crc32(case.name.encode()))
    matrix = rotation(tuple(random.normal(size=3).tolist()), random.uniform(0.0, 360.0))
    size = max(body.surface.extent for body in case.bodies)
    shift = random.uniform(-0.5, 0.5, 3) * size

    def placed(bodies: tuple) -> tuple:
        return tuple(replace(b, surface=b.surface.placed(matrix, shift)) for b in bodies)

    parts, fillings = placed(case.parts), placed(case.fillings)
    like = case.like or case.name
    return replace(case, name=f"{case.name}, turned", parts=parts, fillings=fillings, like=like)


def rounding(case: Case) -> float:
    """Relative change of C that rounded coordinates of the turned case may cause.

    Twice their step over the gap, or a tenth of that over the thinnest side (a thin body's
    capacitance goes with the logarithm of its thickness); sides are those before turning.
    """
    sides = np.array([np.ptp(body.surface.bounds, axis=0) for body in case.bodies])
    reach = max(body.surface.extent for body in case.bodies)
    return 2.0 * HALF_STEP * reach / min(case.gap, 10.0 * float(sides[sides > 0.0].min()))


def scene_of_files(case: Case, folder: Path) -> bem.Scene:
    """Read the case back from binary STL files in ``folder``, one per body."""
    scene = bem.Scene(unit="m")
    paths = {body.name: folder / f"{number}.stl" for number, body in enumerate(case.bodies, 1)}
    for body in case.bodies:
        paths[body.name].write_bytes(binary_stl(body.surface, body.name))
    for part in case.parts:
        scene.add_conductor(part.name, mesh=paths[part.name], body=part.body)
    for filling in case.fillings:
        scene.add_dielectric(
            filling.name, mesh=paths[filling.name], relative_permittivity=filling.permittivity
        )
    return scene
