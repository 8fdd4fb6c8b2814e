"""What is described in a scene but cannot be solved: refused with one line."""

from __future__ import annotations

from bem.errors import InputError
from bem.geometry.wording import listed
from bem.scene.scene import Scene


def check_support(scene: Scene) -> None:
    """Refuse what no solver knows.

    Raises:
        InputError: the scene has dielectrics and flat layers.
    """
    if not scene.dielectrics:
        return
    names = listed(d.name for d in scene.dielectrics[:4])
    if scene.stack is not None:
        kind = "half_space" if scene.half_space else "flat_layers"
        raise InputError(f"{kind}: found with the dielectrics {names}; drop it, or draw the layers")
