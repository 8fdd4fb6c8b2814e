"""Which conductors are tied, grounded or floating, and how that is changed by name."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

from bem.errors import UsageError
from bem.geometry.wording import listed, shown, unknown_name
from bem.scene.states import FLOATING, GROUNDED, TERMINAL


@dataclass(frozen=True)
class Wiring:
    """Nodes of all conductors and what is done with them; changes give a new one.

    Args:
        conductors: names.
        labels: name of each conductor's node: its own name if it is tied to no other.
        states: "terminal", "grounded" or "floating"; the same throughout a node.
    """

    conductors: tuple[str, ...]
    labels: tuple[str, ...]
    states: tuple[str, ...]

    @classmethod
    def of(
        cls, conductors: Sequence[str], states: Sequence[str], nodes: Sequence[str | None]
    ) -> Wiring:
        """Wiring of a scene; without states or nodes all are terminals of their own."""
        names = tuple(conductors)
        labels = [node or name for name, node in zip(names, nodes or names, strict=True)]
        return cls(names, tuple(labels), tuple(states) or (TERMINAL,) * len(names))

    @property
    def plain(self) -> bool:
        """Whether every conductor is a terminal by its own name."""
        return self.labels == self.conductors and set(self.states) == {TERMINAL}

    @property
    def names(self) -> tuple[str, ...]:
        """All that can be named: conductors, then nodes."""
        return tuple(dict.fromkeys((*self.conductors, *self.labels)))

    def nodes_in(self, state: str) -> dict[str, tuple[int, ...]]:
        """{label: indices of its conductors} of the nodes in one state, in order."""
        nodes: dict[str, tuple[int, ...]] = {}
        for k, (label, found) in enumerate(zip(self.labels, self.states, strict=True)):
            if found == state:
                nodes[label] = (*nodes.get(label, ()), k)
        return nodes

    def changed(
        self,
        ground: Iterable[str],
        floating: Iterable[str],
        tie: Iterable[Iterable[str]],
        free: Iterable[str],
    ) -> Wiring:
        """Free, then tie, then ground and float what is named.

        Raises:
            UsageError: a name is unknown, is told two things, or no terminal is left.
        """
        ground, floating, free = (names_of(names) for names in (ground, floating, free))
        _check_apart({"ground": ground, "float": floating, "free": free})
        wiring = self
        for name in free:
            wiring = wiring.freed(name)
        for label, group in _groups(tie):
            wiring = wiring.tied(group, label)
        return wiring._with(ground, floating)._with_a_terminal()

    def freed(self, name: str) -> Wiring:
        """Make a node a terminal, or one conductor of it a terminal by itself.

        Raises:
            UsageError: the name is unknown.
        """
        if name in self.labels:
            return self._put(self._members("free", name), name, TERMINAL)
        return self._put((self._index("free", name),), name, TERMINAL)

    def tied(self, group: Sequence[str], label: str) -> Wiring:
        """Connect nodes; what is connected with ground is grounded, a terminal stays one.

        Args:
            group: names of conductors or nodes.
            label: of the new node.

        Raises:
            UsageError: a name is unknown, all is one node already, or the label is taken.
        """
        found = [self._members("tie", name) for name in group]
        members = tuple(sorted({k for part in found for k in part}))
        if len({self.labels[k] for k in members}) < 2:
            raise UsageError(
                f"tie: found {listed(group) or 'no name'}; give two or more that are not tied yet"
            )
        self._check_label(label, members)
        states = {self.states[k] for k in members}
        state = next(s for s in (GROUNDED, TERMINAL, FLOATING) if s in states)
        return self._put(members, label, state)

    def _with(self, ground: Sequence[str], floating: Sequence[str]) -> Wiring:
        grounded = {k for name in ground for k in self._members("ground", name)}
        afloat = {k for name in floating for k in self._members("floating", name)}
        both = sorted(grounded & afloat)
        if both:
            label = shown(self.labels[both[0]])
            raise UsageError(f"node {label} is both to be grounded and to float; choose one")
        states = dict.fromkeys(grounded, GROUNDED) | dict.fromkeys(afloat, FLOATING)
        kept = [states.get(k, found) for k, found in enumerate(self.states)]
        return replace(self, states=tuple(kept))

    def _with_a_terminal(self) -> Wiring:
        if TERMINAL not in self.states:
            raise UsageError(
                "every conductor is grounded or floating; leave at least one a terminal, "
                "or make one so again (free)"
            )
        return self

    def _put(self, members: Sequence[int], label: str, state: str) -> Wiring:
        labels, states = list(self.labels), list(self.states)
        for k in members:
            labels[k], states[k] = label, state
        return replace(self, labels=tuple(labels), states=tuple(states))

    def _members(self, task: str, name: str) -> tuple[int, ...]:
        """Conductors of the node that has this name or this conductor."""
        label = name if name in self.labels else self.labels[self._index(task, name)]
        return tuple(k for k, found in enumerate(self.labels) if found == label)

    def _index(self, task: str, name: str) -> int:
        if name not in self.conductors:
            raise UsageError(f"{task}: {unknown_name(name, self.names)}")
        return self.conductors.index(name)

    def _check_label(self, label: str, members: Sequence[int]) -> None:
        others = [k for k in range(len(self.labels)) if k not in members]
        if any(label in (self.labels[k], self.conductors[k]) for k in others):
            raise UsageError(
                f"tie: the name {shown(label)} is taken by another conductor; choose another"
            )


def names_of(names: str | Iterable[str]) -> tuple[str, ...]:
    """Names as a tuple; a single text is one name.

    Raises:
        UsageError: something else was given.
    """
    found = (names,) if isinstance(names, str) else tuple(names)
    for name in found:
        if not isinstance(name, str):
            raise UsageError(f"found {shown(name)}; needs names of conductors")
    return found


def _groups(tie: Iterable[Iterable[str]]) -> list[tuple[str, tuple[str, ...]]]:
    """(name of the node, names) of each group; a flat list of names is one group."""
    if isinstance(tie, Mapping):
        return [(names_of(label)[0], names_of(group)) for label, group in tie.items()]
    groups: list[Any] = [tie] if isinstance(tie, str) else list(tie)
    if groups and all(isinstance(group, str) for group in groups):
        groups = [groups]
    named = [names_of(group) for group in groups]
    return [("+".join(group), group) for group in named]


def _check_apart(told: dict[str, tuple[str, ...]]) -> None:
    first: dict[str, str] = {}
    for task, names in told.items():
        for name in names:
            if first.setdefault(name, task) != task:
                raise UsageError(f"{shown(name)} is told both to {first[name]} and to {task}")
