"""The argument parser: faults become UsageError, unknown options get the nearest known one."""

from __future__ import annotations

import argparse
import difflib
from collections.abc import Sequence
from typing import Any, NoReturn

from bem.errors import UsageError


class Parser(argparse.ArgumentParser):
    """Like its base, but plain about what is wrong and strict about option names."""

    def __init__(self, **kwargs: Any) -> None:
        kwargs.setdefault("formatter_class", argparse.RawDescriptionHelpFormatter)
        super().__init__(allow_abbrev=False, **kwargs)

    def error(self, message: str) -> NoReturn:
        """Raise what the base class would print."""
        raise UsageError(f"{message}; see {self.prog} --help")

    def parse_known_args(self, args: Any = None, namespace: Any = None) -> Any:
        """Parse, and refuse options that no command knows."""
        found, extras = super().parse_known_args(args, namespace)
        if extras:
            self.error(f"unknown argument {extras[0]!r}{self._hint(extras[0])}")
        return found, extras

    def _hint(self, given: str) -> str:
        return nearest(given.partition("=")[0], list(self._option_string_actions))


def nearest(given: str, known: Sequence[str]) -> str:
    """Return a hint that names the known word nearest to ``given``, or nothing."""
    near = difflib.get_close_matches(given, known, n=1, cutoff=0.5)
    return f" (did you mean {near[0]!r}?)" if near else ""
