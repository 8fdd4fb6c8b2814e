"""bem reduce: ground, float and tie conductors of a saved result, without a new solve."""

from __future__ import annotations

import argparse
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from bem.cli.names import match_names
from bem.cli.outputs import check_outputs, deliver
from bem.errors import EXIT_DONE, InputError, UsageError

if TYPE_CHECKING:
    from bem.results.result import CapacitanceResult

_EPILOG = """\
NAME is a conductor, or a node of the scene; several with commas between them,
or the option again. What the scene says holds unless it is changed here.

examples:
  bem reduce board.json --ground shield --float pad3 --tie a,b
  bem reduce board.json --tie left=a,b --tie right=c,d --csv pairs.csv
  bem reduce board.json --free shield     the shield is a terminal again

exit codes:
  0    done
  2    the command is not understood, a name is unknown, no terminal is left,
       or an output file cannot be written
  3    the file is no saved result, the potential of a floating conductor is
       not known within the bars, or writing failed
"""


def add_parser(subparsers: Any) -> None:
    """Describe the command."""
    parser = subparsers.add_parser(
        "reduce",
        help="ground, float or tie conductors of a saved result",
        description="Ground, float and tie conductors of a saved result, without a new solve.",
        epilog=_EPILOG,
    )
    parser.add_argument("result", metavar="RESULT.json", help="file that --json wrote")
    _add_changes(parser)
    parser.add_argument("--json", metavar="FILE", help="save the reduced result")
    parser.add_argument("--csv", metavar="FILE", help="save the entries with their bars")
    parser.add_argument("--budget", action="store_true", help="print how the bars are composed")


def _add_changes(parser: argparse.ArgumentParser) -> None:
    group = parser.add_argument_group("changes")
    kinds = {
        "ground": ("NAME", "hold these at 0 V"),
        "float": ("NAME", "leave these without net charge"),
        "tie": ("[NODE=]A,B", "connect these to one terminal, named NODE or A+B"),
        "free": ("NAME", "make these terminals of their own again"),
    }
    for option, (metavar, text) in kinds.items():
        group.add_argument(f"--{option}", metavar=metavar, action="append", default=[], help=text)


def run(args: argparse.Namespace) -> int:
    """Load, reduce, print, and write the files that were asked for."""
    check_outputs(args, [args.result])
    from bem.results.result import load_result

    written = deliver(_reduced(load_result(args.result), args), args)
    return EXIT_DONE if written else InputError.exit_code


def _reduced(result: CapacitanceResult, args: argparse.Namespace) -> CapacitanceResult:
    known = list(dict.fromkeys([*result.conductors, *filter(None, result.nodes)]))
    free = _names("--free", args.free, known)
    ties = _ties(args.tie, known)
    known += ties
    return result.reduced(
        _names("--ground", args.ground, known), _names("--float", args.float, known), ties, free
    )


def _names(option: str, texts: Sequence[str], known: Sequence[str]) -> tuple[str, ...]:
    return tuple(name for text in texts for name in match_names(option, text, known))


def _ties(texts: Sequence[str], known: Sequence[str]) -> dict[str, tuple[str, ...]]:
    """{name of the new node: names}; a tie may name the nodes of those before it."""
    ties: dict[str, tuple[str, ...]] = {}
    for text in texts:
        label, names = _tie(text, [*known, *ties])
        if label in ties:
            raise UsageError(f"--tie: node {label!r} is given twice; choose another name for one")
        ties[label] = names
    return ties


def _tie(text: str, known: Sequence[str]) -> tuple[str, tuple[str, ...]]:
    label, equals, rest = text.partition("=")
    if equals and label.strip() and not _all_known(text, known):
        return label.strip(), match_names("--tie", rest, known)
    names = match_names("--tie", text, known)
    return "+".join(names), names


def _all_known(text: str, known: Sequence[str]) -> bool:
    """Whether the text as a whole, with its equals sign, is made of known names."""
    try:
        return bool(match_names("--tie", text, known))
    except UsageError:
        return False
