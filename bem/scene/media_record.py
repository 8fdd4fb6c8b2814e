"""Media of a scene as plain values, for the settings of a result."""

from __future__ import annotations

from dataclasses import asdict
from typing import Any

from bem.scene.scene import Scene
from bem.scene.stack import flat_record


def media_record(scene: Scene) -> dict[str, Any]:
    """Loss of the surroundings, dielectrics and flat layers; empty without any of them."""
    around = scene.surroundings.record()
    del around["relative_permittivity"]  # has an entry of its own since there were no dielectrics
    record: dict[str, Any] = {f"surroundings_{key}": value for key, value in around.items()}
    if scene.dielectrics:
        record["coincidence"] = scene.coincidence
        record["dielectrics"] = [
            {"name": body.name, **body.material.record(), **asdict(body.source)}
            for body in scene.dielectrics
        ]
    return record | flat_record(scene.half_space or scene.flat_layers)
