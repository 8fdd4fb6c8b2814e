"""A cross-section of a scene as a picture: regions in colours, metal dark, a legend."""

from __future__ import annotations

import io
from os import PathLike
from typing import Any

import numpy as np

from bem.errors import UsageError
from bem.exports.atomic import write_file
from bem.exports.names import shown
from bem.geometry.planes import AXES
from bem.scene.plane_checks import plane_text
from bem.scene.section import METAL_HERE, Section
from bem.units import metres_per

METAL_COLOUR = "#3a3a3a"
MOST_LEGEND = 16
"""Most regions in the legend."""
MOST_NAMES = 12
"""With more conductors in the section their names are left out."""
WIDEST = 28
"""Longest name in the legend, columns."""
DOTS = 150
"""Dots per inch of the picture."""


def check_drawing() -> None:
    """Find out whether pictures can be made.

    Raises:
        UsageError: the library is missing; the message says how to install it.
    """
    from importlib.util import find_spec

    if find_spec("matplotlib") is None:
        raise UsageError(
            "--section: matplotlib is not installed; install it with pip install "
            "'bem-capacitance[plot]', or leave the option out"
        )


def save_section(section: Section, path: str | PathLike[str]) -> None:
    """Draw a section and save it; lengths are in the scene's unit.

    Raises:
        UsageError: matplotlib is missing.
        InputError: the file cannot be written.
    """
    check_drawing()
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    figure = Figure(figsize=(8.0, 6.0), layout="constrained")
    FigureCanvasAgg(figure)
    axes = figure.add_subplot()
    _draw(axes, section)
    data = io.BytesIO()
    figure.savefig(data, format="png", dpi=DOTS)
    write_file(path, data.getvalue())


def _draw(axes: Any, section: Section) -> None:
    from matplotlib.colors import ListedColormap

    scene, metres = section.scene, metres_per(section.scene.unit)
    (left, bottom), (right, top) = section.frame / metres
    colours = _colours(len(section.media) - 1)
    axes.imshow(
        section.regions - METAL_HERE,
        cmap=ListedColormap([METAL_COLOUR, *colours]),
        vmin=-0.5,
        vmax=len(colours) + 0.5,
        origin="lower",
        extent=(left, right, bottom, top),
        interpolation="nearest",
    )
    _draw_outlines(axes, section, metres)
    _draw_planes(axes, section, metres)
    _draw_names(axes, section, metres)
    axes.set_xlim(left, right)
    axes.set_ylim(bottom, top)
    across, up = (AXES[axis] for axis in section.along)
    axes.set_xlabel(f"{across} / {scene.unit}")
    axes.set_ylabel(f"{up} / {scene.unit}")
    axes.set_title(f"section at {plane_text(section.plane, scene.unit)}")
    axes.legend(handles=_legend(section, colours), loc="upper left", bbox_to_anchor=(1.02, 1.0))


def _colours(number: int) -> list[Any]:
    """White for the surroundings, and one colour for each other medium."""
    from matplotlib import colormaps

    pastel = colormaps["Set3"].colors  # type: ignore[attr-defined]
    return ["white", *(pastel[k % len(pastel)] for k in range(number))]


def _draw_outlines(axes: Any, section: Section, metres: float) -> None:
    """Sheets and the skins of metal are thick lines, dielectrics thin ones."""
    from matplotlib.collections import LineCollection

    count = len(section.scene.conductors)
    for number, segments in enumerate(section.segments):
        metal = number < count
        lines = LineCollection(
            list(segments / metres),
            colors=METAL_COLOUR if metal else "0.4",
            linewidths=2.0 if metal else 0.6,
        )
        axes.add_collection(lines)


def _draw_names(axes: Any, section: Section, metres: float) -> None:
    """Names of the conductors that are cut, unless there are many."""
    cut = zip(section.scene.conductors, section.segments, strict=False)
    seen = [(conductor.name, segments) for conductor, segments in cut if len(segments)]
    for name, segments in seen if len(seen) <= MOST_NAMES else ():
        x, y = segments.reshape(-1, 2).mean(axis=0) / metres
        box = {"boxstyle": "round,pad=0.15", "facecolor": "white", "edgecolor": "none"}
        axes.annotate(
            _plain(shown(name, WIDEST)),
            (x, y),
            xytext=(4.0, 4.0),
            textcoords="offset points",
            fontsize=7,
            bbox=box,
        )


def _draw_planes(axes: Any, section: Section, metres: float) -> None:
    """Grounded planes, mirror planes, and those between layers, where they are seen edge on."""
    scene, stack = section.scene, section.scene.stack
    found = [(mirror, "--", "0.5") for mirror in scene.planes.mirrors]
    found += [(scene.planes.ground, "-", METAL_COLOUR)] if scene.planes.ground else []
    lines = [(plane.axis, plane.at, style, colour) for plane, style, colour in found]
    if stack is not None:
        grounded = [(stack.axis, at, "-", METAL_COLOUR) for at in stack.grounded]
        lines += [(stack.axis, at, ":", "0.3") for at in stack.planes] + grounded
    for axis, at, style, colour in lines:
        if axis != section.plane.axis:
            draw = axes.axvline if axis == section.along[0] else axes.axhline
            draw(at / metres, linestyle=style, color=colour, linewidth=1.5)


def _legend(section: Section, colours: list[Any]) -> list[Any]:
    """Patches with names and permittivities of what is seen."""
    from matplotlib.patches import Patch

    patches = [Patch(facecolor=METAL_COLOUR, label="conductors")]
    for number in np.unique(section.regions[section.regions != METAL_HERE])[:MOST_LEGEND]:
        name, medium = section.media[number]
        label = f"{_plain(shown(name, WIDEST))} ({medium.relative_permittivity:g})"
        patches.append(Patch(facecolor=colours[number], edgecolor="0.4", label=label))
    return patches


def _plain(text: str) -> str:
    """Text without the sign that starts formulas."""
    return text.replace("$", r"\$")
