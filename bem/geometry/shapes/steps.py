"""Lines and arcs in a plane, given step by step: profiles of revolution, outlines of plates."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from bem.errors import UsageError
from bem.geometry.revolved import Piece, Position, Segment, arc_through
from bem.geometry.shapes import values as need

AROUND = 48
"""Facets around a full circle in the faceting of a round shape."""
SNAP = 1e-12
"""Points this near to each other count as one; relative to the largest coordinate."""


class ArcTo(NamedTuple):
    """A step of a profile or outline: along a circle by way of ``via`` to ``to``.

    Both are (r, z) in a profile and (x, y) in an outline.
    """

    via: Position
    to: Position


Step = Position | ArcTo


class Wording(NamedTuple):
    """What messages call the steps and their coordinates."""

    what: str
    axes: tuple[str, str]


class Stops(NamedTuple):
    """Where steps lead: the name of each, the point it goes by if it is an arc, its end."""

    names: list[str]
    vias: list[Position | None]
    ends: list[Position]

    @property
    def tolerance(self) -> float:
        """Length below which points count as one."""
        return SNAP * max(abs(x) for end in self.ends for x in end)


def read_steps(steps: Sequence[Step], say: Wording) -> Stops:
    """Points of steps, as floats.

    Raises:
        UsageError: fewer than two steps, an arc first, or numbers that are none.
    """
    steps = list(steps) if hasattr(steps, "__iter__") else []
    if len(steps) < 2:
        raise UsageError(f"{say.what}: found {len(steps)} points; give at least two")
    if isinstance(steps[0], ArcTo):
        at = ", ".join(say.axes)
        raise UsageError(f"{say.what}: the first step is an ArcTo; start with a point ({at})")
    names = [f"{say.what} point {k}" for k in range(1, len(steps) + 1)]
    vias = [_via(name, step, say) for name, step in zip(names, steps, strict=True)]
    ends = [_end(name, step, say) for name, step in zip(names, steps, strict=True)]
    return Stops(names, vias, ends)


def _end(name: str, step: Step, say: Wording) -> Position:
    return _position(name, step.to if isinstance(step, ArcTo) else step, say)


def _via(name: str, step: Step, say: Wording) -> Position | None:
    return _position(name, step.via, say) if isinstance(step, ArcTo) else None


def _position(name: str, value: Position, say: Wording) -> Position:
    found = need.numbers(name, value)
    if len(found) != 2:
        at = ", ".join(say.axes)
        raise UsageError(f"{name}: found {value!r}; give two numbers ({at}) or an ArcTo")
    return found[0], found[1]


def pieces_between(stops: Stops) -> tuple[Piece, ...]:
    """Pieces from each stop to the next, in the order given.

    Raises:
        UsageError: a stop twice in a row, or three points of an arc in line.
    """
    return tuple(map(_piece, stops.names[1:], stops.ends[:-1], stops.vias[1:], stops.ends[1:]))


def _piece(name: str, here: Position, via: Position | None, there: Position) -> Piece:
    if there == here:
        raise UsageError(
            f"{name}: found {there!r} twice in a row; leave one out, or give a full circle as "
            f"two arcs"
        )
    if via is None:
        return Segment(here, there)
    arc = arc_through(here, via, there)
    if arc is None:
        raise UsageError(
            f"{name}: found an arc from {here!r} by {via!r} to {there!r}, which are in line; "
            f"give a straight step"
        )
    return arc


def corners_of(piece: Piece, around: int) -> np.ndarray:
    """(m, 2): the ends of a piece, and for an arc points between as dense as ``around``."""
    count = max(1, math.ceil(around * piece.bend / (2.0 * math.pi) - 1e-9))
    return piece.at(np.arange(count + 1) / count)


def polygon(pieces: tuple[Piece, ...], around: int = AROUND) -> np.ndarray:
    """(n, 2): corners along all pieces, first and last point included."""
    return np.vstack([*(corners_of(piece, around)[:-1] for piece in pieces), pieces[-1].end])


def check_crossing(line: np.ndarray, say: Wording) -> None:
    """Refuse a polygon (n, 2) that touches itself other than where its ends meet.

    Raises:
        UsageError: it does; the message names the place.
    """
    a, b = line[:-1], line[1:]
    count = len(a)
    apart = np.subtract.outer(np.arange(count), np.arange(count)) > 1
    closed = np.array_equal(line[0], line[-1])
    apart[-1, 0] &= not closed
    touching = _meeting(a, b, a, b) & apart
    touching[range(1, count), range(count - 1)] = _turns_back(b - a)
    touching[0, 0] |= closed and bool(_turns_back((b - a)[[-1, 0]])[0])
    if touching.any():
        x, y = a[np.argwhere(touching)[0, 0]]
        raise UsageError(
            f"{say.what}: found touching or crossing itself near {say.axes[0]} = {x:.4g}, "
            f"{say.axes[1]} = {y:.4g}; give an outline that does not"
        )


def meeting_place(line: np.ndarray, other: np.ndarray) -> np.ndarray | None:
    """Start (2,) of a side of the polygon ``line`` that touches ``other``; None if none does."""
    touching = _meeting(line[:-1], line[1:], other[:-1], other[1:]).any(axis=1)
    return line[np.argmax(touching)] if touching.any() else None


def _meeting(a: np.ndarray, b: np.ndarray, c: np.ndarray, d: np.ndarray) -> np.ndarray:
    """(n, m): whether the segments from ``a`` to ``b`` touch those from ``c`` to ``d``."""
    across = _side(a[:, None], b[:, None], c) * _side(a[:, None], b[:, None], d) <= 0.0
    along = _side(c[:, None], d[:, None], a) * _side(c[:, None], d[:, None], b) <= 0.0
    return across & along.T & _boxes_meet(a, b, c, d)


def _side(a: np.ndarray, b: np.ndarray, p: np.ndarray) -> np.ndarray:
    """Twice the signed area of a, b, p."""
    ab, ap = b - a, p - a
    return ab[..., 0] * ap[..., 1] - ab[..., 1] * ap[..., 0]


def _boxes_meet(a: np.ndarray, b: np.ndarray, c: np.ndarray, d: np.ndarray) -> np.ndarray:
    low, high = np.minimum(a, b)[:, None], np.maximum(a, b)[:, None]
    return np.all((low <= np.maximum(c, d)) & (np.minimum(c, d) <= high), axis=-1)


def _turns_back(steps: np.ndarray) -> np.ndarray:
    """Whether each step after the first retraces the one before."""
    before, after = steps[:-1], steps[1:]
    onward = np.sum(before * after, axis=1)
    aside = before[:, 0] * after[:, 1] - before[:, 1] * after[:, 0]
    return (onward < 0.0) & (np.abs(aside) <= 1e-9 * np.abs(onward))
