"""The process that turns a STEP file into facets, in millimetres; see ``step.py``.

Run as a script with the file, the folder for the results, the angle and the chord. It uses
nothing else of bem, so that it starts fast and from wherever bem is installed.
"""

from __future__ import annotations

import json
import sys
from collections.abc import Sequence
from pathlib import Path
from typing import Any

import numpy as np

NO_LIBRARY = 3
"""Exit code if Gmsh cannot be loaded; the reason is on standard error."""


def main(path: str, folder: str, angle: str, chord: str) -> None:
    """Write names and facets of all bodies of a file into a folder."""
    try:
        import gmsh
    except (ImportError, OSError) as problem:
        print(problem, file=sys.stderr)
        sys.exit(NO_LIBRARY)
    gmsh.initialize(interruptible=False, readConfigFiles=False)
    gmsh.option.setNumber("General.Terminal", 0)
    gmsh.option.setNumber("Geometry.OCCImportLabels", 1)
    gmsh.option.setString("Geometry.OCCTargetUnit", "MM")
    gmsh.option.setNumber("Mesh.StlLinearDeflectionRelative", 1)
    gmsh.option.setNumber("Mesh.StlLinearDeflection", float(chord))
    gmsh.option.setNumber("Mesh.StlAngularDeflection", 2.0 * float(angle))
    gmsh.model.occ.importShapes(path, highestDimOnly=False)
    gmsh.model.occ.synchronize()
    gmsh.model.mesh.importStl()
    _write(gmsh.model, Path(folder))
    gmsh.finalize()


def _write(model: Any, folder: Path) -> None:
    solids = [([solid], _faces(model, solid)) for solid in model.getEntities(3)]
    inner = {face for _, faces in solids for face in faces}
    sheets = _shells(model, [tag for _, tag in model.getEntities(2) if tag not in inner])
    bodies = [*solids, *(([(2, tag) for tag in faces], faces) for faces in sheets)]
    tags, places, _ = model.mesh.getNodes()
    arrays: dict[str, Any] = {
        f"body{k}": _triangles(model, faces) for k, (_, faces) in enumerate(bodies)
    }
    with (folder / "arrays.npz").open("wb") as file:
        np.savez(file, tags=tags, places=places.reshape(-1, 3), **arrays)
    names = [_name(model, entities) for entities, _ in bodies]
    (folder / "names.json").write_text(json.dumps(names))


def _faces(model: Any, solid: tuple[int, int]) -> list[int]:
    return [tag for _, tag in model.getBoundary([solid], combined=False, oriented=False)]


def _shells(model: Any, faces: Sequence[int]) -> list[list[int]]:
    """Faces that belong to no solid, those that share an edge together."""
    shells: list[tuple[set[int], list[int]]] = []
    for face in faces:
        edges = set(model.getAdjacencies(2, face)[1].tolist())
        joined = [shell for shell in shells if shell[0] & edges]
        shells = [shell for shell in shells if not shell[0] & edges]
        shells.append((edges.union(*(s[0] for s in joined)), sum((s[1] for s in joined), [face])))
    return [sorted(faces) for _, faces in shells]


def _triangles(model: Any, faces: Sequence[int]) -> np.ndarray:
    """Node tags (t, 3) of the facets of some faces."""
    found = [model.mesh.getElementsByType(2, face)[1].reshape(-1, 3) for face in faces]
    return np.concatenate([np.empty((0, 3), dtype=np.uint64), *found])


def _name(model: Any, entities: Sequence[tuple[int, int]]) -> str:
    """Name of the first entity that has one, with those of its assemblies before it."""
    names = (model.getEntityName(*entity) for entity in entities)
    return next((name for name in names if name), "")


if __name__ == "__main__":
    main(*sys.argv[1:])
