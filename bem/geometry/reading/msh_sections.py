"""Sections of a Gmsh MSH file, and what it says of groups.

Only the sections of format, nodes and elements go on to the general reader. Groups are
read here, because an entity may be in several of them or in none, and a surface and a
volume may share one name.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

import numpy as np

from bem.errors import InputError

_START = re.compile(rb"^\$(\w+)[ \t]*\r?\n", re.MULTILINE)
_NAME = re.compile(rb'^\s*(\d+)\s+(-?\d+)\s+"(.*)"\s*$', re.MULTILINE)

SURFACE, VOLUME = 2, 3
"""Dimensions among Gmsh's entities and groups."""

VERSIONS = ("2", "2.0", "2.1", "2.2", "4", "4.0", "4.1")


@dataclass(frozen=True)
class MshFormat:
    """First lines of the file: version, whether binary, size of an integer in bytes."""

    version: str
    binary: bool
    integer: int


def split_sections(data: bytes) -> dict[str, bytes]:
    """Contents of each section, without its first and last line.

    Raises:
        InputError: not an MSH file, or a section without its end.
    """
    if data.lstrip()[:4] == b"$NOD":
        raise InputError("is MSH version 1; save it as version 2.2 or 4.1")
    sections: dict[str, bytes] = {}
    place = 0
    while (start := _START.search(data, place)) is not None:
        name = start.group(1).decode()
        end = data.find(b"$End" + start.group(1), start.end())
        if end < 0:
            raise InputError(f"is cut short: section ${name} has no end; export it again")
        sections[name] = data[start.end() : end]
        place = end + len(name) + len("$End")
    if "MeshFormat" not in sections:
        raise InputError("is not a Gmsh MSH file: no $MeshFormat section")
    return sections


def file_format(section: bytes) -> MshFormat:
    """Read the section $MeshFormat.

    Raises:
        InputError: the version is not one of ``VERSIONS``.
    """
    words = section.split(b"\n", 1)[0].split()
    version = words[0].decode("ascii", "replace") if words else ""
    if version not in VERSIONS or len(words) < 3 or words[2] not in (b"4", b"8"):
        raise InputError(f"is MSH version {version or '?'}; save it as version 2.2 or 4.1")
    return MshFormat(version, words[1] == b"1", int(words[2]))


def group_names(section: bytes, dimension: int) -> dict[int, str]:
    """Names of the groups of a dimension by number, from the section $PhysicalNames."""
    return {
        int(number): name.decode("utf-8", "replace")
        for of, number, name in _NAME.findall(section)
        if int(of) == dimension
    }


class _Numbers:
    """Numbers of a section, one after the other, text or binary."""

    def __init__(self, section: bytes, form: MshFormat) -> None:
        self._bytes = section
        self._words = None if form.binary else np.array(section.split(), dtype="S")
        self._size = f"<u{form.integer}"
        self._place = 0

    def _take(self, count: int, kind: str) -> np.ndarray:
        step = count * (np.dtype(kind).itemsize if self._words is None else 1)
        start, self._place = self._place, self._place + step
        if self._place > len(self._bytes if self._words is None else self._words):
            raise InputError("is cut short: section $Entities ends early; export it again")
        if self._words is None:
            return np.frombuffer(self._bytes[start : self._place], kind)
        return self._words[start : self._place].astype(kind)

    def ints(self, count: int) -> list[int]:
        return self._take(count, "<i4").tolist()

    def size(self) -> int:
        return int(self._take(1, self._size)[0])

    def skip_reals(self, count: int) -> None:
        self._take(count, "<f8")


def groups_of_entities(section: bytes, form: MshFormat, dimension: int) -> dict[int, list[int]]:
    """Group numbers of each entity of a dimension, from the section $Entities of version 4.

    Raises:
        InputError: the section ends early or holds words where numbers belong.
    """
    if not section:
        return {}
    numbers = _Numbers(section, form)
    try:
        counts = [numbers.size() for _ in range(4)]
        groups = {}
        for lower in range(dimension + 1):
            reals = 3 if lower == 0 and form.version == "4.1" else 6
            found = [_entity(numbers, lower, reals) for _ in range(counts[lower])]
            groups = dict(found)
    except (ValueError, OverflowError):
        raise InputError("has a damaged section $Entities; export it again") from None
    return groups


def _entity(numbers: _Numbers, dimension: int, reals: int) -> tuple[int, list[int]]:
    """Read number and groups of the next entity (a group's sign tells orientation only)."""
    (tag,) = numbers.ints(1)
    numbers.skip_reals(reals)
    groups = [abs(group) for group in numbers.ints(numbers.size())]
    if dimension > 0:
        numbers.ints(numbers.size())
    return tag, groups
