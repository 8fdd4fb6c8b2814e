"""What is done with each conductor: a terminal of the matrix, grounded, floating; and tied.

Conductors of one node are tied: one potential, one state, one row and column of the matrix
that is reported. The matrix that is solved always holds all conductors.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, Protocol

from bem.errors import InputError, UsageError
from bem.geometry.wording import listed, shown
from bem.scene import checks

TERMINAL, GROUNDED, FLOATING = "terminal", "grounded", "floating"
STATES = (TERMINAL, GROUNDED, FLOATING)
"""A row and column of the matrix; held at 0 V; left alone with no net charge."""


class Wired(Protocol):
    """A conductor as far as its connections go."""

    @property
    def name(self) -> str:
        """Its name."""

    @property
    def state(self) -> str:
        """One of ``STATES``."""

    @property
    def node(self) -> str | None:
        """Name of the node that it is tied to, or None."""


def check_wiring(entry: str, found: tuple[str, Any, Any], others: Sequence[Wired]) -> None:
    """Refuse a state or a node that does not fit the conductors before it.

    Args:
        entry: how messages name the conductor.
        found: its name, state and node.
        others: the conductors that the scene has already.

    Raises:
        InputError: the message names the entry, and the other conductor if there is one.
    """
    name, state, node = found
    checks.one_of(f"{entry}: state", state, STATES)
    if node is not None:
        checks.text(f"{entry}: node", node)
    for other in others:
        _check_node(entry, (state, node), other)
        _check_names(entry, (name, node), other)


def _check_node(entry: str, found: tuple[str, str | None], other: Wired) -> None:
    state, node = found
    if node is not None and node == other.node and state != other.state:
        raise InputError(
            f"{entry}: node {shown(node)}: its state is {state}, but {shown(other.name)} of the "
            f"same node is {other.state}; give all conductors of a node the same state"
        )


def _check_names(entry: str, found: tuple[str, str | None], other: Wired) -> None:
    """Refuse a node called like a conductor that is not in it."""
    name, node = found
    if node == other.node or (node != other.name and other.node != name):
        return
    shared, outside = (node, other.name) if node == other.name else (name, name)
    raise InputError(
        f"{entry}: {shown(shared)} names a node and conductor {shown(outside)}, which is not in "
        "it; rename one, or put the conductor in that node"
    )


def check_terminals(conductors: Sequence[Wired]) -> None:
    """Refuse conductors of which none is a terminal.

    Raises:
        UsageError: the matrix would be empty.
    """
    if conductors and all(c.state != TERMINAL for c in conductors):
        raise UsageError(
            f"state: {listed(c.name for c in conductors[:4])}{' ...' * (len(conductors) > 4)}: "
            "every conductor is grounded or floating; leave at least one a terminal"
        )


def wiring_of(
    conductors: Sequence[Wired],
) -> tuple[tuple[str, ...], tuple[str | None, ...]]:
    """Return states and nodes of all conductors, or two empty tuples if all are as usual."""
    states = tuple(c.state for c in conductors)
    nodes = tuple(c.node for c in conductors)
    usual = set(states) <= {TERMINAL} and set(nodes) <= {None}
    return ((), ()) if usual else (states, nodes)
