"""A profile cut into stretches, and chains of stretches that belong together."""

from __future__ import annotations

import itertools
from collections.abc import Sequence
from dataclasses import replace
from typing import NamedTuple

import numpy as np

from bem.geometry.regions.meridian import cut_up, length
from bem.geometry.revolved import Piece, Revolution

Label = tuple[int, int]
"""Regions behind and in front."""


class Stretch(NamedTuple):
    """Part of a piece of a profile, from s = ``low`` to ``high``."""

    piece: int
    low: float
    high: float

    @property
    def middle(self) -> float:
        """Parameter s amid it."""
        return 0.5 * (self.low + self.high)


def stretches(curve: Revolution, cuts: np.ndarray, tolerance: float) -> list[Stretch]:
    """A profile cut at parameters s; cuts that almost coincide count once.

    Args:
        curve: the surface.
        cuts: in any order.
        tolerance: cuts closer together than twice this are one, in local lengths.
    """
    found = []
    for k, piece in enumerate(curve.profile):
        inner = np.sort(cuts[(cuts > k) & (cuts < k + 1)])
        stops = [float(k)]
        shortest = 2.0 * tolerance / length(piece)
        for s in inner.tolist():
            if s - stops[-1] > shortest and k + 1 - s > shortest:
                stops.append(s)
        stops.append(k + 1.0)
        found += [Stretch(k, low, high) for low, high in itertools.pairwise(stops)]
    return found


def chains(
    curve: Revolution, line: Sequence[Stretch], labels: Sequence[Label | None]
) -> list[tuple[Label, Revolution]]:
    """Surfaces along neighbouring stretches with one label each, in the order of the profile.

    Args:
        curve: the whole surface.
        line: its stretches.
        labels: of each; stretches with the label None are left out.
    """
    order = _order(curve, labels)
    found = []
    for label, group in itertools.groupby(order, key=lambda k: labels[k]):
        if label is not None:
            found.append((label, _chain(curve, [line[k] for k in group])))
    return found


def _order(curve: Revolution, labels: Sequence[Label | None]) -> list[int]:
    """Numbers of the stretches, begun where the label changes if the profile loops."""
    order = list(range(len(labels)))
    if not curve.loops:
        return order
    changes = [k for k in order if labels[k] != labels[k - 1]]
    first = changes[0] if changes else 0
    return order[first:] + order[:first]


def _chain(curve: Revolution, line: Sequence[Stretch]) -> Revolution:
    profile = tuple(_pieces(curve, line))
    first, last = profile[0].start, profile[-1].end
    starts, ends = line[0].low == 0.0, line[-1].high == curve.pieces
    whole = first == last and len(profile) > 1
    if curve.loops and not whole:
        starts = ends = False
    joined = (curve.joined[0] if starts else True, curve.joined[1] if ends else True)
    return replace(curve, profile=profile, joined=(False, False) if whole else joined)


def _pieces(curve: Revolution, line: Sequence[Stretch]) -> list[Piece]:
    """Pieces along neighbouring stretches; those that a cut parted for nothing are one again."""
    merged: list[Stretch] = []
    for stretch in line:
        if merged and merged[-1].piece == stretch.piece and merged[-1].high == stretch.low:
            stretch = Stretch(stretch.piece, merged.pop().low, stretch.high)
        merged.append(stretch)
    pieces = []
    for k, low, high in merged:
        stops = sorted({0.0, low - k, high - k, 1.0})
        pieces.append(cut_up(curve.profile[k], stops)[stops.index(low - k)])
    return pieces
