"""Scenes from TOML files, and from mesh files alone.

A scene file::

    unit = "mm"                    # required: m, cm, mm, um, nm, in, mil
    [surroundings]
    relative_permittivity = 1.0    # optional
    [ground_plane]                 # optional: infinite, at potential zero
    z = 0.0                        # or x, or y
    [[mirror_plane]]               # optional, up to three: images belong to their conductors
    x = 0.0
    [half_space]                   # optional: another medium on one side of a plane
    below_z = 0.0                  # or above_z, below_x, ...
    relative_permittivity = 4.0
    [flat_layers]                  # optional, instead of half_space: a stack of infinite layers
    from_z = 0.0                   # the lowest plane; or from_x, from_y
    grounded_below = true          # optional: the lowest plane is at potential zero
    grounded_above = false         # optional: the highest plane
    thickness = [0.2, 1.2]         # the lowest layer first
    relative_permittivity = [3.6, 4.4]
    [[conductor]]
    name = "probe rod"
    mesh = "probe_rod.stl"         # relative to this file; or a shape, see bem.scene.shape_entry
    part = "rod"                   # optional: a named portion of the file
    split = true                   # optional: each body in it is a conductor, "probe rod 1", ...
    unit = "mm"                    # optional: of the mesh file, if not the scene's
    body = "solid"                 # optional: or "shell", hollow
    state = "grounded"             # optional: or "floating", "terminal"
    node = "shield"                # optional: conductors with one node are tied
    smooth = true                  # optional: refine onto a smooth surface fitted to the facets
    crease_degrees = 40            # optional: edges that turn by more stay sharp
    place = { shift = [0, 0, 12.5], turn = { axis = [0, 0, 1], degrees = 90 }, scale = 1.0 }
    [[dielectric]]                 # mesh, shape, part, split, unit, smooth, place as above
    name = "cover"
    mesh = "cover.stl"             # closed
    relative_permittivity = 7.0
    loss_tangent = 0.01            # optional; or conductivity, in S/m

Surroundings, half-space and layers may state their loss as dielectrics do. Before all tables,
``coincidence = 1e-6`` may say which part of the scene's size still counts as contact.
"""

from __future__ import annotations

import contextlib
import re
import tomllib
from collections.abc import Iterator, Sequence
from pathlib import Path
from typing import Any

from bem.errors import BemError, InputError, UsageError
from bem.geometry.planes import AXES
from bem.geometry.wording import counted, listed
from bem.scene import checks
from bem.scene.drawing import entry_name
from bem.scene.material import MATERIAL_KEYS, Material, material_of
from bem.scene.placing import place_of
from bem.scene.scene import Scene, coincidence_of
from bem.scene.stack import SIDES, STARTS
from bem.scene.states import check_terminals
from bem.units import METRES_PER

_TOP = (
    *("unit", "coincidence", "surroundings", "ground_plane", "mirror_plane"),
    *("half_space", "flat_layers", "conductor", "dielectric"),
)
_CONDUCTOR = (
    *("name", "mesh", "shape", "part", "unit", "body", "smooth", "crease_degrees"),
    *("place", "state", "node", "split"),
)
_DIELECTRIC = (
    *("name", "mesh", "shape", "part", "unit", "smooth", "crease_degrees", "place", "split"),
    *MATERIAL_KEYS,
)
_FLAT_LAYERS = (*STARTS, "grounded_below", "grounded_above", "thickness", *MATERIAL_KEYS)
_POSITION = re.compile(r"\(at (line \d+, column \d+|end of document)\)")


def load_scene(path: str | Path) -> Scene:
    """Scene of a TOML file; mesh files are read relative to it.

    Raises:
        InputError: the file or a mesh file is missing or damaged, or an entry does not fit.
    """
    with _about(path):
        entries = checks.table("", _parsed(Path(path)), _TOP)
        if "unit" not in entries:
            raise InputError(f"unit: missing; allowed are {', '.join(METRES_PER)}")
        around = _surroundings(entries)
        scene = Scene(entries["unit"], **vars(around), folder=Path(path).parent)
        if "coincidence" in entries:
            scene.coincidence = coincidence_of(entries["coincidence"])
        _add_planes(scene, entries)
        _add_layers(scene, entries)
        conductors = _tables(entries, "conductor")
        if not conductors:
            raise InputError("no [[conductor]] found; a scene needs at least one")
        for number, entry in enumerate(conductors, 1):
            scene.add_conductor(**_keys("conductor", number, entry, _CONDUCTOR))
        for number, entry in enumerate(_tables(entries, "dielectric"), 1):
            scene.add_dielectric(**_keys("dielectric", number, entry, _DIELECTRIC))
        check_terminals(scene.conductors)
    return scene


def scene_from_files(
    paths: Sequence[str | Path],
    unit: str,
    relative_permittivity: float = 1.0,
    split: bool = False,
) -> Scene:
    """Scene of mesh files alone.

    A file that names bodies gives one conductor for each of them; any other file, such as
    STL, is one conductor named after the file, or one for each of its bodies if ``split``.

    Raises:
        UsageError: no files, or the unit is unknown.
        InputError: a file cannot be used, or two conductors would have one name.
    """
    if not paths:
        raise UsageError("no mesh files given; name at least one mesh file")
    scene = Scene(unit, relative_permittivity)
    origin: dict[str, Path] = {}
    for path in map(Path, paths):
        for name, part in _bodies_of(path):
            if name in origin:
                raise InputError(
                    f"two conductors would be called {listed([name])} (from {origin[name]} and "
                    f'{path}); name them in a scene file: [[conductor]] name = "...", mesh = "..."'
                )
            origin[name] = path
            scene.add_conductor(name, mesh=path, part=part, split=split and part is None)
    return scene


def _bodies_of(path: Path) -> list[tuple[str, str | None]]:
    """Name and part of each conductor that a mesh file gives."""
    from bem.geometry.reading.files import bodies_in

    bodies = bodies_in(path)
    if not bodies.names:
        return [(path.stem, None)]
    if bodies.outside:
        raise InputError(
            f"{path}: {counted(bodies.outside, 'face')} in none of the groups "
            f"{listed(bodies.names)}; name a group for them, or pick parts in a scene file"
        )
    return [(name, name) for name in bodies.names]


@contextlib.contextmanager
def _about(path: str | Path) -> Iterator[None]:
    """Put the file's name before messages about it."""
    try:
        yield
    except BemError as problem:
        raise InputError(f"{path}: {problem}") from None


def _parsed(path: Path) -> dict[str, Any]:
    try:
        text = path.read_bytes().decode()
        return tomllib.loads(text)
    except tomllib.TOMLDecodeError as problem:
        raise InputError(_syntax(str(problem), text)) from None
    except UnicodeDecodeError as problem:
        raise InputError(f"is not UTF-8 text (byte {problem.start}); save it as UTF-8") from None
    except FileNotFoundError:
        raise InputError("no such file") from None
    except OSError as problem:
        raise InputError(f"cannot be opened ({problem.strerror})") from None


def _syntax(problem: str, text: str) -> str:
    """Message of the TOML reader with its place in front."""
    place = _POSITION.search(problem)
    where = place.group(1) if place else "end of document"
    if where == "end of document":
        where = f"line {text.count(chr(10)) + 1}"
    return f"{where}: not TOML: {_POSITION.sub('', problem).strip().rstrip(':')}"


def _surroundings(entries: dict[str, Any]) -> Material:
    around = checks.table("surroundings", entries.get("surroundings", {}), MATERIAL_KEYS)
    numbers = (around.get(key) for key in MATERIAL_KEYS[1:])
    return material_of("surroundings.", around.get(MATERIAL_KEYS[0], 1.0), *numbers)


def _add_planes(scene: Scene, entries: dict[str, Any]) -> None:
    """Add what [ground_plane] and [[mirror_plane]] say."""
    if "ground_plane" in entries:
        scene.set_ground_plane(**_coordinate("ground_plane", entries["ground_plane"]))
    mirrors = _tables(entries, "mirror_plane")
    for number, mirror in enumerate(mirrors, 1):
        scene.add_mirror_plane(**_coordinate(f"mirror_plane {number}", mirror))


def _coordinate(where: str, value: Any) -> dict[str, float]:
    """A plane's coordinate by the name of its axis."""
    found = checks.table(where, value, tuple(AXES))
    return {key: checks.number(f"{where}: {key}", at) for key, at in found.items()}


def _add_layers(scene: Scene, entries: dict[str, Any]) -> None:
    """Add what [half_space] and [flat_layers] say."""
    if "half_space" in entries:
        keys = (*SIDES, *MATERIAL_KEYS)
        scene.set_half_space(
            **_complete("half_space", entries["half_space"], keys, ("relative_permittivity",))
        )
    if "flat_layers" in entries:
        needed = ("thickness", "relative_permittivity")
        scene.set_flat_layers(
            **_complete("flat_layers", entries["flat_layers"], _FLAT_LAYERS, needed)
        )


def _complete(
    where: str, value: Any, known: tuple[str, ...], needed: tuple[str, ...]
) -> dict[str, Any]:
    """A table of known keys that holds those that are needed."""
    found = checks.table(where, value, known)
    for key in needed:
        if key not in found:
            raise InputError(f"{where}: {key}: missing")
    return found


def _tables(entries: dict[str, Any], kind: str) -> list[Any]:
    found = entries.get(kind, [])
    if not isinstance(found, list):
        raise InputError(f"{kind}: found a single value or [{kind}]; write [[{kind}]]")
    return found


def _keys(kind: str, number: int, entry: Any, known: tuple[str, ...]) -> dict[str, Any]:
    """Arguments that one [[conductor]] or [[dielectric]] table stands for."""
    name = entry.get("name") if isinstance(entry, dict) else None
    where = entry_name(number, name, kind)
    needed = ("name", *(key for key in MATERIAL_KEYS[:1] if key in known))
    keys = dict(_complete(where, entry, known, needed))
    if "shape" in keys:
        from bem.scene.shape_entry import shape_of

        keys["shape"] = shape_of(f"{where}: shape", keys["shape"])
    if "place" in keys:
        keys["place"] = place_of(f"{where}: place", keys["place"])
    return keys
