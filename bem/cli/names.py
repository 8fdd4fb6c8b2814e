"""Names of conductors in options, told apart once the conductors are known."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from itertools import islice

from bem.errors import UsageError
from bem.geometry.wording import unknown_name


def match_names(option: str, text: str, known: Sequence[str]) -> tuple[str, ...]:
    """Names in ``text``, with commas between them; a name may itself hold commas.

    Raises:
        UsageError: a name is unknown, or the text can be read in several ways.
    """
    parts = text.split(",")
    ways = list(islice(_readings(parts, set(known)), 2))
    if not ways:
        stray = next((p.strip() for p in parts if p.strip() not in known), text)
        raise UsageError(f"{option}: {unknown_name(stray, known)}")
    if len(ways) > 1:
        raise UsageError(
            f"{option}: {text!r} can be read in several ways; give one name at a time, "
            "or rename a conductor so that its name has no comma"
        )
    return ways[0]


def _readings(parts: list[str], known: set[str]) -> Iterator[tuple[str, ...]]:
    """Every way to join neighbouring parts so that all are known."""
    if not parts:
        yield ()
    for count in range(1, len(parts) + 1):
        name = ",".join(parts[:count]).strip()
        if name in known:
            for rest in _readings(parts[count:], known):
                yield (name, *rest)
