"""What an inspection says of facets that seem to stand for a smooth surface."""

from __future__ import annotations

from bem.geometry.wording import counted, listed, metre_text
from bem.scene.scene import Conductor, Dielectric

MOST_FACETS = 100_000
"""Bodies beyond this number of faces in all are not looked at."""


def facet_notes(bodies: list[Conductor | Dielectric]) -> list[str]:
    """One line for each body with facets off the smooth surface that they seem to follow."""
    lines: list[str] = []
    seen = 0
    for number, body in enumerate(bodies):
        seen += len(body.surface.faces)
        if seen > MOST_FACETS:
            left = counted(len(bodies) - number, "body", "bodies")
            return [*lines, f"facets of the last {left} not compared with smooth surfaces"]
        lines += _notes(body)
    return lines


def _notes(body: Conductor | Dielectric) -> list[str]:
    from bem.geometry.fit.fit import fit_of
    from bem.geometry.flat_faces import FlatFaces

    surface = body.surface
    if surface.curve is not None or surface.smooth is False:
        return []
    fit = fit_of(surface, FlatFaces.of(surface))
    if fit is None:
        return []
    off = f"facets of {listed([body.name])} are up to {metre_text(fit.farthest)} off the"
    if surface.smooth:
        return [f"{off} smooth surface fitted to them"]
    return [
        f"{off} curve that they seem to follow; give smooth = true to refine onto it, "
        "or smooth = false if the facets are the shape"
    ]
