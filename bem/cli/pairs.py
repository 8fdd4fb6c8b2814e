"""The option --pair A,B=1%: one coupling that has to be known to a relative accuracy."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from bem.cli.values import fraction
from bem.errors import UsageError
from bem.geometry.wording import unknown_name


@dataclass(frozen=True)
class PairOption:
    """One --pair as typed: the two names with a comma between them, not yet told apart."""

    names: str
    accuracy: float


def read_pair(text: str) -> PairOption:
    """Split off the accuracy; the names wait until the conductors are known.

    Raises:
        UsageError: there is no accuracy, or no comma between two names.
    """
    names, equals, accuracy = text.rpartition("=")
    if not equals or "," not in names:
        raise UsageError(
            f"--pair: found {text!r}; give two names and an accuracy, such as 'rod,wall=1%'"
        )
    return PairOption(names, fraction(f"--pair {names}")(accuracy))


def match_pairs(
    options: Sequence[PairOption], conductors: Sequence[str]
) -> dict[tuple[str, str], float]:
    """{(name, name): relative accuracy} for the conductors of a scene.

    Raises:
        UsageError: a name is unknown, a pair is one conductor, or is given twice.
    """
    pairs: dict[tuple[str, str], float] = {}
    for option in options:
        pair = _match(option, conductors)
        if pair in pairs or pair[::-1] in pairs:
            raise UsageError(f"--pair: {option.names!r} is given twice; keep one of them")
        pairs[pair] = option.accuracy
    return pairs


def _match(option: PairOption, conductors: Sequence[str]) -> tuple[str, str]:
    """Find the two conductors; a name may hold commas, so every comma is tried."""
    splits = _splits(option.names)
    fits = [pair for pair in splits if pair[0] in conductors and pair[1] in conductors]
    if not fits:
        raise UsageError(_unknown(splits, conductors))
    if len(fits) > 1:
        raise UsageError(
            f"--pair: {option.names!r} can be read in {len(fits)} ways; "
            "rename a conductor so that its name has no comma"
        )
    if fits[0][0] == fits[0][1]:
        raise UsageError(
            f"--pair: {option.names!r} names one conductor twice; name two different ones"
        )
    return fits[0]


def _splits(names: str) -> list[tuple[str, str]]:
    parts = names.split(",")
    return [
        (",".join(parts[:k]).strip(), ",".join(parts[k:]).strip()) for k in range(1, len(parts))
    ]


def _unknown(splits: list[tuple[str, str]], conductors: Sequence[str]) -> str:
    # the split that has a known name on one side is the one that was meant
    first, second = max(splits, key=lambda pair: sum(name in conductors for name in pair))
    name = second if first in conductors else first
    return f"--pair: {unknown_name(name, conductors)}"
