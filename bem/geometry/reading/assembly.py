"""Files of placed, named meshes put together: each mesh is a body, each group of them a part."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from bem.errors import InputError
from bem.geometry.reading.mesh_data import MeshData
from bem.geometry.surface import NO_CORNER
from bem.geometry.wording import counted, listed


class Leaf(NamedTuple):
    """One mesh where it stands.

    Args:
        names: of the groups that hold it, the outermost first, and its own name last.
        vertices: (v, 3) float64, placed.
        faces: (f, 4) int64; a triangle has -1 last.
    """

    names: tuple[str, ...]
    vertices: np.ndarray
    faces: np.ndarray


def assembled(leaves: Sequence[Leaf], unit: str, changes: Sequence[str] = ()) -> MeshData:
    """One mesh of all leaves.

    Meshes of one name are numbered, "bolt 1", "bolt 2"; "bolt" is then all of them together.
    A mesh without triangles is left out.

    Raises:
        InputError: a mesh uses a corner that it does not list.
    """
    leaves = [leaf for leaf in leaves if len(leaf.faces)]
    names, lines = _own_names([leaf.names[-1] for leaf in leaves])
    owner = np.repeat(np.arange(len(leaves)), [len(leaf.faces) for leaf in leaves])
    parts = {name: np.flatnonzero(owner == k) for k, name in enumerate(names)}
    for group in dict.fromkeys(name for leaf in leaves for name in leaf.names):
        if group and group not in parts:
            members = [k for k, leaf in enumerate(leaves) if group in leaf.names]
            parts[group] = np.flatnonzero(np.isin(owner, members))
    vertices = np.concatenate([np.empty((0, 3)), *(leaf.vertices for leaf in leaves)])
    return MeshData(vertices, _faces(leaves), parts, tuple(names), (*changes, *lines), unit=unit)


def _own_names(given: list[str]) -> tuple[list[str], list[str]]:
    """Names that differ, and a line about those that had to be numbered."""
    uses, taken = Counter(given), set(given)
    repeated = [name for name in uses if uses[name] > 1]
    numbers = dict.fromkeys(repeated, 0)
    names = []
    for name in given:
        chosen = name
        while chosen in taken and name in numbers:
            numbers[name] += 1
            chosen = f"{name} {numbers[name]}"
        taken.add(chosen)
        names.append(chosen)
    lines = [f'{counted(uses[n], "body", "bodies")} called "{n}" numbered' for n in repeated]
    return names, lines


def _faces(leaves: Sequence[Leaf]) -> np.ndarray:
    """Faces (f, 4) of all leaves, with their corners counted through."""
    faces, first = [np.empty((0, 4), dtype=np.int64)], 0
    for leaf in leaves:
        if leaf.faces[:, :3].min() < 0 or leaf.faces.max() >= len(leaf.vertices):
            raise InputError(
                f"mesh {listed(leaf.names[-1:])} uses a corner beyond the "
                f"{len(leaf.vertices):,} listed; mesh it again"
            )
        faces.append(np.where(leaf.faces == NO_CORNER, NO_CORNER, leaf.faces + first))
        first += len(leaf.vertices)
    return np.concatenate(faces)
