"""What is described in a scene but cannot be solved: refused with one line."""

from __future__ import annotations

from bem.errors import InputError
from bem.geometry.wording import listed
from bem.scene.scene import Scene


def check_support(scene: Scene) -> None:
    """Refuse what no solver knows.

    Raises:
        InputError: the scene has flat layers, or dielectrics and mirror planes.
    """
    kind = "half_space" if scene.half_space else "flat_layers"
    if scene.stack is not None:
        raise InputError(f"{kind}: only scenes without half-space and layers are solved")
    if scene.dielectrics and scene.planes.mirrors:
        names = listed(d.name for d in scene.dielectrics[:4])
        raise InputError(f"mirror_plane: found with the dielectrics {names}; drop it")
