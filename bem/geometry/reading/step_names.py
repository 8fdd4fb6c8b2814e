"""Names that a STEP file gives and the CAD kernel drops.

It names a body by its product, but not the bodies of a product with several, nor a surface
of several faces. Where the file leaves one way only to do it, they get their names here.
"""

from __future__ import annotations

import re
from collections.abc import Sequence

_PRODUCT = re.compile(rb"=\s*PRODUCT\s*\(\s*'((?:[^']|'')*)'", re.IGNORECASE)
_SOLID = re.compile(
    rb"#(\d+)\s*=\s*(?:MANIFOLD_SOLID_BREP|BREP_WITH_VOIDS)\s*\(\s*'((?:[^']|'')*)'", re.IGNORECASE
)
_SHAPE = re.compile(rb"_SHAPE_REPRESENTATION\s*\(\s*'(?:[^']|'')*'\s*,\s*\(([#\d\s,]*)\)", re.I)
_WIDE = re.compile(r"\\X2\\((?:[0-9A-Fa-f]{4})+)\\X0\\")


def completed(names: Sequence[str], data: bytes) -> list[str]:
    """Names of bodies with those left blank filled in, as far as the file leaves no doubt.

    Args:
        names: of all bodies with those of their assemblies, parted by strokes; "" is none.
        data: the file.
    """
    blank = [place for place, name in enumerate(names) if not name]
    used = {level for name in names for level in name.split("/")}
    free = [name for name in _products(data) if name not in used]
    above = free[0] if len(free) == 1 else ""
    solids = _solids_of_one_product(data)
    found = list(names)
    if len(solids) == len(blank):
        for place, name in zip(blank, solids, strict=True):
            found[place] = "/".join(level for level in (above, name) if level)
    elif len(blank) == 1:
        found[blank[0]] = above
    return found


def _products(data: bytes) -> list[str]:
    return [_text(name) for name in _PRODUCT.findall(data)]


def _solids_of_one_product(data: bytes) -> list[str]:
    """Names of the solids of the only product that has several, in order; else none."""
    solids = {number: _text(name) for number, name in _SOLID.findall(data)}
    shapes = [re.findall(rb"\d+", items) for items in _SHAPE.findall(data)]
    inside = [[solids[n] for n in numbers if n in solids] for numbers in shapes]
    several = [names for names in inside if len(names) > 1]
    return several[0] if len(several) == 1 else []


def _text(name: bytes) -> str:
    """Text of a STEP string, with doubled quotes and characters given by their numbers."""
    plain = name.decode("utf-8", "replace").replace("''", "'")
    return _WIDE.sub(lambda m: bytes.fromhex(m[1]).decode("utf-16-be", "replace"), plain).strip()
