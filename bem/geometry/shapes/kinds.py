"""Names of all shapes, and the module that makes each; nothing is loaded for a look at them."""

from __future__ import annotations

_ROUND_AND_FLAT = """
    box plate disc annulus tube bowl sphere spheroid ellipsoid cylinder hemisphere torus ring cone
    revolve
"""

SHAPES: dict[str, str] = {
    **dict.fromkeys(_ROUND_AND_FLAT.split(), "bem.geometry.shapes.round"),
    **dict.fromkeys(("sheet", "extrude"), "bem.geometry.shapes.extrusions"),
    **dict.fromkeys(("union", "difference", "intersection"), "bem.geometry.shapes.solids"),
    "wire": "bem.geometry.shapes.wires",
}
"""Name of each shape and the module where the function of that name is."""
