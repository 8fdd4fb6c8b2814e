"""bem compare: what changed from one scene to another."""

from __future__ import annotations

import argparse
import sys
from typing import TYPE_CHECKING, Any

from bem.cli import values
from bem.cli.effort import add_effort
from bem.cli.live import live_or_none
from bem.cli.outputs import check_outputs, tried
from bem.cli.scene_input import is_scene
from bem.cli.terminal import can_show, put, tell
from bem.errors import (
    EXIT_DONE,
    EXIT_INTERRUPTED,
    ChangeExceeded,
    InputError,
    ToleranceNotReached,
    UsageError,
)

if TYPE_CHECKING:
    from bem.extraction.compare import Side
    from bem.results.comparison import Comparison

_EPILOG = """\
A and B have the same names of conductors. Panels are made once and carried
over, so that errors which are the same on both sides cancel; with a saved
result, or where a body is drawn in another way, they do not, and the report
says so.

examples:
  bem compare probe.toml probe_longer.toml
  bem compare probe.json probe.toml --limit 0.5%

exit codes:
  0    done, everything that was asked was reached; with --limit: no change
       above it
  1    a fault in bem; please report it
  2    the command is not understood, or an output file cannot be written
  3    an input cannot be used, or writing the result failed
  4    the accuracy was not reached; the comparison is still written, and
       marked (with --limit, the limit alone decides between 0 and 6)
  5    refused: more memory would be needed than is allowed
  6    a change is, or cannot be ruled out to be, above --limit
  130  interrupted; the best comparison so far is written, if there is one
"""


def add_parser(subparsers: Any) -> None:
    """Describe the command."""
    parser = subparsers.add_parser(
        "compare",
        help="compute what changed from one scene to another",
        description="Compute the change of every capacitance from A to B, with a bar of its own.",
        epilog=_EPILOG,
    )
    for name, side in (("before", "A"), ("after", "B")):
        parser.add_argument(
            name, metavar=side, help="scene file (.toml), or result saved by --json"
        )
    _add_accuracy_options(parser)
    add_effort(parser, "for both")
    _add_output_options(parser)


def _add_accuracy_options(parser: argparse.ArgumentParser) -> None:
    group = parser.add_argument_group("accuracy")
    group.add_argument(
        "--limit",
        metavar="FRACTION",
        type=values.fraction("--limit"),
        help="fail with exit code 6 unless every |change| plus its bar is at most this times "
        "sqrt(C_ii C_jj), such as 1%%",
    )
    group.add_argument(
        "--change-accuracy",
        metavar="FRACTION",
        type=values.fraction("--change-accuracy"),
        default=0.02,
        help="every bar of a change at most this times the largest change (default 0.02)",
    )
    group.add_argument(
        "--tolerance",
        metavar="FRACTION",
        type=values.fraction("--tolerance"),
        default=1e-3,
        help="every bar of both matrices at most this times sqrt(C_ii C_jj) (default 0.001)",
    )


def _add_output_options(parser: argparse.ArgumentParser) -> None:
    group = parser.add_argument_group("output")
    group.add_argument("--json", metavar="FILE", help="save the comparison and both matrices")
    group.add_argument("--csv", metavar="FILE", help="save the entries before, after and changed")
    group.add_argument("--quiet", action="store_true", help="no progress on standard error")


def run(args: argparse.Namespace) -> int:
    """Compare, deliver, and tell how it went by the exit code."""
    names = [args.before, args.after]
    check_outputs(args, names)
    for name in names:
        _check_kind(name)
    found = _compare(_side(args.before), _side(args.after), args)
    if not _deliver(found, args):
        return InputError.exit_code
    if found.stopped_by == "interrupt":
        tell("bem: interrupted; this is the best comparison so far")
        return EXIT_INTERRUPTED
    return _verdict(found, args.limit)


def _check_kind(name: str) -> None:
    if not (is_scene(name) or _is_saved(name)):
        raise UsageError(
            f"found {name!r}; give a scene file (.toml) or a result that --json saved (.json)"
        )


def _is_saved(name: str) -> bool:
    return name.lower().endswith(".json")


def _side(name: str) -> Side:
    if _is_saved(name):
        from bem.results.result import load_result

        return load_result(name)
    from bem.scene.scene_file import load_scene

    return load_scene(name)


def _compare(before: Side, after: Side, args: argparse.Namespace) -> Comparison:
    from bem.extraction.compare import compare

    live = live_or_none(args.quiet, args.tolerance)
    try:
        return compare(
            before,
            after,
            args.tolerance,
            change_accuracy=args.change_accuracy,
            max_panels=args.max_panels,
            memory=args.memory,
            threads=args.threads,
            progress=live,
        )
    finally:
        if live is not None:
            live.close()


def _deliver(found: Comparison, args: argparse.Namespace) -> bool:
    """Write the files that were asked for and print the report; tells what did not arrive."""
    steps = [lambda: put(_text(found))]
    if args.csv is not None:
        steps.insert(0, lambda: found.to_csv(args.csv))
    if args.json is not None:
        steps.insert(0, lambda: found.to_json(args.json))
    trouble = tried(steps)
    for line in trouble:
        tell(f"bem: {line}")
    return not trouble


def _text(found: Comparison) -> str:
    from bem.exports.comparison_text import report
    from bem.exports.text import PLUS_MINUS, PLUS_MINUS_ASCII

    return report(found, PLUS_MINUS if can_show(PLUS_MINUS, sys.stdout) else PLUS_MINUS_ASCII)


def _verdict(found: Comparison, limit: float | None) -> int:
    from bem.exports.comparison_text import excess_lines, outcome

    if not found.converged:
        tell(f"bem: {outcome(found)}")
    if limit is None:
        return EXIT_DONE if found.converged else ToleranceNotReached.exit_code
    excesses = found.exceeding(limit)
    for line in excess_lines(excesses, limit):
        tell(f"bem: {line}")
    return ChangeExceeded.exit_code if excesses else EXIT_DONE
