"""The result on its way out: files first, then the table, then what went wrong."""

from __future__ import annotations

import argparse
import os
import sys
from collections.abc import Callable
from functools import partial
from typing import TYPE_CHECKING

from bem.cli.terminal import can_show, put, tell
from bem.errors import InputError, UsageError
from bem.geometry.wording import counted

if TYPE_CHECKING:
    from bem.results.result import CapacitanceResult


def check_outputs(args: argparse.Namespace, inputs: list[str]) -> None:
    """Refuse output files that cannot work, before anything is computed.

    Raises:
        UsageError: a folder is missing or read-only, or two files are the same.
    """
    from bem.exports.atomic import check_target

    taken = {os.path.realpath(name): f"the input {name}" for name in inputs}
    for option in ("json", "csv", "faces", "section"):
        path = getattr(args, option, None)
        if path is None:
            continue
        check_target(path)
        real = os.path.realpath(path)
        if real in taken and (os.path.isfile(real) or not os.path.exists(real)):
            raise UsageError(f"--{option}: {path} is also {taken[real]}; choose another file")
        taken[real] = f"the file of --{option}"


def deliver(result: CapacitanceResult, args: argparse.Namespace) -> bool:
    """Write the files that were asked for and print the report.

    The JSON file holds every conductor, the CSV file and the report the terminals.

    Returns:
        Whether all of it arrived; if not, a line has said so.
    """
    from bem.results.reduction import presented

    small = presented(result)
    text = partial(_text, small, args.budget)
    trouble = tried([*_writers((result, small), args), lambda: put(text() + _note(result))])
    for line in trouble:
        tell(f"bem: {line}")
    return not trouble


def _note(result: CapacitanceResult) -> str:
    """Say where the full matrix is, if the report was not it."""
    if not result.states:
        return ""
    return (
        f"\nthe full matrix of {counted(len(result.conductors), 'conductor')} is in the JSON file "
        "(--json);\n  'bem show --all' prints it"
    )


def _writers(
    results: tuple[CapacitanceResult, CapacitanceResult], args: argparse.Namespace
) -> list[Callable[[], None]]:
    """Return one call per file that was asked for; ``results`` are the full and the small one."""
    full, small = results
    writers = [("json", full.to_json), ("csv", small.to_csv)]
    paths = [(getattr(args, option, None), write) for option, write in writers]
    return [partial(write, path) for path, write in paths if path is not None]


def tried(steps: list[Callable[[], None]]) -> list[str]:
    """Take every step, whatever became of the others; returns the complaints."""
    trouble = []
    for step in steps:
        try:
            step()
        except InputError as error:
            trouble.append(str(error))
    return trouble


def _text(result: CapacitanceResult, budget: bool) -> str:
    from bem.exports.budget import budget_text
    from bem.exports.text import PLUS_MINUS, PLUS_MINUS_ASCII, report

    sign = PLUS_MINUS if can_show(PLUS_MINUS, sys.stdout) else PLUS_MINUS_ASCII
    parts = [report(result, sign), *([budget_text(result, sign)] if budget else [])]
    return "\n\n".join(parts)
