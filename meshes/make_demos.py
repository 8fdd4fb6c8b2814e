"""Write the mesh files of the demo scenes; the same bytes every time.

    python meshes/make_demos.py [FOLDER]

All lengths are millimetres. Planar faces are as coarse as they can be: the solver cuts them as it
needs. The scene files and drawings beside the meshes are kept by hand.
"""

from __future__ import annotations

import struct
import sys
from dataclasses import dataclass
from pathlib import Path

import numpy as np

HERE = Path(__file__).parent
ELEMENT_TYPE = {3: 2, 4: 3}
"""Element type in MSH files by number of corners."""
GRAIN = {"low": 100.0, "half": 170.0, "full": 260.0}
"""Levels of the grain in the hopper, mm."""


@dataclass(frozen=True)
class Faces:
    """Planar faces: points (v, 3) in mm, and per face its corners as indices into them."""

    points: np.ndarray
    corners: list[list[int]]

    def triangles(self) -> np.ndarray:
        """(t, 3, 3): faces cut into fans of triangles."""
        fans = [(c[0], c[i], c[i + 1]) for c in self.corners for i in range(1, len(c) - 1)]
        return self.points[np.array(fans)]


def joined(*pieces: Faces) -> Faces:
    """Faces of several pieces; coinciding points become one."""
    points = np.concatenate([piece.points for piece in pieces])
    starts = np.cumsum([0] + [len(piece.points) for piece in pieces])
    kept, place = np.unique(points.round(9), axis=0, return_inverse=True)
    place = place.reshape(-1)
    corners = [
        [int(place[start + i]) for i in face]
        for start, piece in zip(starts, pieces, strict=False)
        for face in piece.corners
    ]
    return Faces(kept + 0.0, corners)


def quadrilateral(*points: tuple[float, float, float]) -> Faces:
    """One face."""
    return Faces(np.array(points, dtype=float), [[0, 1, 2, 3]])


def facing(faces: Faces, way: tuple[float, float, float]) -> Faces:
    """Return one face, turned over if it looks against ``way``."""
    a, b, c = faces.points[faces.corners[0][:3]]
    if np.cross(b - a, c - a) @ np.array(way) > 0:
        return faces
    return Faces(faces.points, [faces.corners[0][::-1]])


def rectangle(x: float, y: float) -> Faces:
    """Sheet centred at the origin in the plane z = 0."""
    a, b = x / 2, y / 2
    return quadrilateral((-a, -b, 0), (a, -b, 0), (a, b, 0), (-a, b, 0))


def box(low: tuple[float, float, float], high: tuple[float, float, float]) -> Faces:
    """Six rectangles, outward."""
    corner = np.array([(i & 1, i >> 1 & 1, i >> 2) for i in range(8)])
    sides = [[0, 2, 3, 1], [4, 5, 7, 6], [0, 1, 5, 4], [2, 6, 7, 3], [0, 4, 6, 2], [1, 3, 7, 5]]
    return Faces(np.where(corner, high, low).astype(float), sides)


def ring(half_width: float, z: float, sides: int) -> np.ndarray:
    """Corners of a regular polygon whose sides are ``half_width`` from the z axis."""
    angle = 2 * np.pi * (np.arange(sides) + 0.5) / sides
    radius = half_width / np.cos(np.pi / sides)
    return np.column_stack([radius * np.cos(angle), radius * np.sin(angle), np.full(sides, z)])


def wall(rings: list[np.ndarray]) -> Faces:
    """Faces between successive rings of corners."""
    sides = len(rings[0])
    corners = [
        [level + i, level + (i + 1) % sides, level + sides + (i + 1) % sides, level + sides + i]
        for level in range(0, sides * (len(rings) - 1), sides)
        for i in range(sides)
    ]
    return Faces(np.concatenate(rings), corners)


def rod(half_width: float, bottom: float, top: float, sides: int) -> Faces:
    """Solid prism with a regular cross-section, as triangles where it ends."""
    rings = [ring(half_width, z, sides) for z in (bottom, top)]
    fans = [[0, i + 1, i] for i in range(1, sides - 1)]
    lids = [Faces(rings[0], fans), Faces(rings[1], [face[::-1] for face in fans])]
    return joined(wall(rings), *lids)


def filled(rings: list[np.ndarray]) -> Faces:
    """Solid between successive rings of four corners, with its two ends."""
    ends = [Faces(rings[0], [[0, 3, 2, 1]]), Faces(rings[-1], [[0, 1, 2, 3]])]
    return joined(wall(rings), *ends)


@dataclass(frozen=True)
class Comb:
    """Heat sink: a base from z = 0 to ``base`` and equal fins on it up to ``top``, along y."""

    width: float
    length: float
    base: float
    top: float
    fins: int
    fin_width: float

    def columns(self) -> list[tuple[float, float, float]]:
        """Left, right and height of the columns of the cross-section."""
        left = -self.width / 2 + (self.width - self.fin_width) / (self.fins - 1) * np.arange(
            self.fins
        )
        edges = np.column_stack([left, left + self.fin_width]).ravel()
        return [
            (float(a), float(b), self.base if i % 2 else self.top)
            for i, (a, b) in enumerate(zip(edges, edges[1:], strict=False))
        ]

    def faces(self) -> Faces:
        """Build the closed surface, looking outward, without a face between base and fins."""
        columns = self.columns()
        pieces = [
            self._upright(columns[0][0], (0.0, self.base), -1.0),
            self._upright(columns[-1][1], (0.0, self.base), 1.0),
        ]
        for left, right, height in columns:
            pieces += [self._level(left, right, 0.0, -1.0), self._level(left, right, height, 1.0)]
            pieces += self._ends(left, right, (0.0, self.base))
            if height > self.base:
                pieces += self._ends(left, right, (self.base, height))
                pieces.append(self._upright(left, (self.base, height), -1.0))
                pieces.append(self._upright(right, (self.base, height), 1.0))
        return joined(*pieces)

    def _level(self, left: float, right: float, z: float, way: float) -> Faces:
        y = self.length / 2
        face = quadrilateral((left, -y, z), (right, -y, z), (right, y, z), (left, y, z))
        return facing(face, (0.0, 0.0, way))

    def _upright(self, x: float, span: tuple[float, float], way: float) -> Faces:
        y, (low, high) = self.length / 2, span
        face = quadrilateral((x, -y, low), (x, y, low), (x, y, high), (x, -y, high))
        return facing(face, (way, 0.0, 0.0))

    def _ends(self, left: float, right: float, span: tuple[float, float]) -> list[Faces]:
        y, (low, high) = self.length / 2, span
        face = quadrilateral((left, y, low), (right, y, low), (right, y, high), (left, y, high))
        other = Faces(face.points * (1.0, -1.0, 1.0), face.corners)
        return [facing(face, (0.0, 1.0, 0.0)), facing(other, (0.0, -1.0, 0.0))]


def write_stl(path: Path, faces: Faces) -> None:
    """Write a binary STL file with an empty header."""
    triangles = faces.triangles()
    normal = np.cross(triangles[:, 1] - triangles[:, 0], triangles[:, 2] - triangles[:, 0])
    normal /= np.linalg.norm(normal, axis=1)[:, None]
    record = np.zeros(len(triangles), dtype=[("numbers", "<f4", (4, 3)), ("spare", "<u2")])
    record["numbers"][:, 0] = normal + 0.0
    record["numbers"][:, 1:] = triangles
    path.write_bytes(bytes(80) + struct.pack("<I", len(triangles)) + record.tobytes())


def write_msh(path: Path, groups: dict[str, Faces]) -> None:
    """Write an MSH 4.1 text file with one named group of faces per entry."""
    lines = ["$MeshFormat", "4.1 0 8", "$EndMeshFormat"]
    lines += ["$PhysicalNames", str(len(groups))]
    lines += [f'2 {tag} "{name}"' for tag, name in enumerate(groups, 1)]
    lines += ["$EndPhysicalNames", *_entities(groups), *_nodes(groups), *_elements(groups)]
    path.write_text("\n".join(lines) + "\n", encoding="ascii", newline="\n")


def _entities(groups: dict[str, Faces]) -> list[str]:
    rows = []
    for tag, faces in enumerate(groups.values(), 1):
        bounds = (*faces.points.min(axis=0), *faces.points.max(axis=0))
        rows.append(f"{tag} {' '.join(f'{x:.12g}' for x in bounds)} 1 {tag} 0")
    return ["$Entities", f"0 0 {len(groups)} 0", *rows, "$EndEntities"]


def _nodes(groups: dict[str, Faces]) -> list[str]:
    total = sum(len(faces.points) for faces in groups.values())
    rows, first = [f"{len(groups)} {total} 1 {total}"], 1
    for tag, faces in enumerate(groups.values(), 1):
        rows.append(f"2 {tag} 0 {len(faces.points)}")
        rows += [str(first + i) for i in range(len(faces.points))]
        rows += [" ".join(f"{x:.12g}" for x in point) for point in faces.points]
        first += len(faces.points)
    return ["$Nodes", *rows, "$EndNodes"]


def _elements(groups: dict[str, Faces]) -> list[str]:
    rows, blocks, number, first = [], 0, 0, 1
    for tag, faces in enumerate(groups.values(), 1):
        for count, kind in ELEMENT_TYPE.items():
            chosen = [face for face in faces.corners if len(face) == count]
            blocks += bool(chosen)
            rows += [f"2 {tag} {kind} {len(chosen)}"] if chosen else []
            for face in chosen:
                number += 1
                rows.append(" ".join(map(str, (number, *(first + i for i in face)))))
        first += len(faces.points)
    return ["$Elements", f"{blocks} {number} 1 {number}", *rows, "$EndElements"]


def grain_hopper(folder: Path) -> None:
    """Square hopper that tapers to its outlet; a level probe with a guard sleeve; grain."""
    levels = [(30.0, 0.0), (120.0, 150.0), (120.0, 300.0)]
    write_stl(folder / "hopper.stl", wall([ring(half, z, 4) for half, z in levels]))
    for name, top in GRAIN.items():
        below = [(half, z) for half, z in levels if z < top]
        half = min(30.0 + 0.6 * top, 120.0)
        rings = [ring(half, z, 4) for half, z in [*below, (half, top)]]
        write_stl(folder / f"grain_{name}.stl", filled(rings))
    sleeve = wall([ring(10.0, z, 12) for z in (-70.0, -10.0)])
    write_msh(folder / "probe.msh", {"rod": rod(5.0, -210.0, 0.0, 12), "guard sleeve": sleeve})


def touch_pad(folder: Path) -> None:
    """One strip, placed six times by the scene, the plate behind them, and a glass cover."""
    write_stl(folder / "strip.stl", rectangle(22.0, 3.0))
    write_stl(folder / "back_plate.stl", rectangle(26.0, 26.0))
    write_stl(folder / "cover.stl", box((-13.0, -13.0, 0.0), (13.0, 13.0, 1.8)))


def busbars(folder: Path) -> None:
    """Two bars, and the heat sink under them."""
    sink = Comb(width=90.0, length=80.0, base=8.0, top=33.0, fins=5, fin_width=4.0)
    write_stl(folder / "heat_sink.stl", sink.faces())
    bars = {
        "positive": box((-30.0, -60.0, 35.0), (-10.0, 60.0, 40.0)),
        "negative": box((10.0, -60.0, 35.0), (30.0, 60.0, 40.0)),
    }
    write_msh(folder / "bars.msh", bars)


def board_pair(folder: Path) -> None:
    """A board, and two strips that stand on it with their own mesh."""
    write_stl(folder / "board.stl", box((-10.0, -20.0, 0.0), (10.0, 20.0, 1.6)))
    strips = {
        "left": box((-2.4, -15.0, 1.6), (-0.4, 15.0, 1.67)),
        "right": box((0.4, -15.0, 1.6), (2.4, 15.0, 1.67)),
    }
    write_msh(folder / "strips.msh", strips)


DEMOS = {
    "grain_hopper": grain_hopper,
    "touch_pad": touch_pad,
    "busbars": busbars,
    "board_pair": board_pair,
}


def make_all(folder: Path) -> None:
    """Write all mesh files below ``folder``."""
    for name, make in DEMOS.items():
        (folder / name).mkdir(parents=True, exist_ok=True)
        make(folder / name)


if __name__ == "__main__":
    make_all(Path(sys.argv[1]) if len(sys.argv) > 1 else HERE)
