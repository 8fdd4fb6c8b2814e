"""The scene that a command works on: one scene file, or mesh files with their unit."""

from __future__ import annotations

import argparse
from collections.abc import Sequence
from typing import TYPE_CHECKING

from bem.errors import UsageError
from bem.units import METRES_PER, metres_per

if TYPE_CHECKING:
    from bem.scene.scene import Scene


def add_files(parser: argparse.ArgumentParser) -> None:
    """Add the files and their unit to a command."""
    parser.add_argument(
        "files", nargs="+", metavar="FILE", help="one scene file (.toml), or mesh files"
    )
    parser.add_argument(
        "--unit", metavar="UNIT", help=f"unit of mesh coordinates: {', '.join(METRES_PER)}"
    )
    parser.add_argument(
        "--split",
        action="store_true",
        help="each body in a mesh file that names none is a conductor of its own",
    )


def is_scene(name: str) -> bool:
    """Tell whether a file is a scene file, by its name."""
    return name.lower().endswith(".toml")


def check_files(files: Sequence[str], unit: str | None, split: bool = False) -> None:
    """Refuse files and a unit that do not go together.

    Raises:
        UsageError: meshes without a unit, a scene with one, or a scene among other files.
    """
    scenes = [name for name in files if is_scene(name)]
    if not scenes and unit is None:
        raise UsageError(
            "--unit is missing: mesh files do not say their unit; "
            f"allowed are {', '.join(METRES_PER)}"
        )
    if scenes and len(files) > 1:
        raise UsageError(
            f"found the scene {scenes[0]} among {len(files)} files; "
            "give one scene file, or mesh files alone"
        )
    if scenes and unit is not None:
        raise UsageError(
            f"--unit {unit}: a scene file states its own unit; "
            f"drop the option or change the unit in {scenes[0]}"
        )
    if scenes and split:
        raise UsageError(f"--split: goes with mesh files; write split = true in {scenes[0]}")
    if unit is not None:
        metres_per(unit)


def load(files: Sequence[str], unit: str | None, split: bool = False) -> Scene:
    """Load the scene of files that ``check_files`` let pass.

    Raises:
        InputError: a file cannot be used.
    """
    from bem.scene.scene_file import load_scene, scene_from_files

    if unit is None:
        return load_scene(files[0])
    return scene_from_files(files, unit, split=split)
