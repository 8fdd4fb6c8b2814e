"""bem show: the table of a saved result."""

from __future__ import annotations

import argparse
from typing import Any

from bem.cli.outputs import check_outputs, deliver
from bem.errors import EXIT_DONE, InputError

_EPILOG = """\
example:
  bem show probe.json --csv probe.csv

exit codes:
  0    done
  2    the command is not understood, or an output file cannot be written
  3    the file is no saved result, or writing failed
"""


def add_parser(subparsers: Any) -> None:
    """Describe the command."""
    parser = subparsers.add_parser(
        "show",
        help="print the table of a saved result",
        description="Print the table of a result that bem extract --json saved.",
        epilog=_EPILOG,
    )
    parser.add_argument("result", metavar="RESULT.json", help="file that --json wrote")
    parser.add_argument(
        "--all",
        action="store_true",
        help="every conductor, also those that are grounded, floating or tied",
    )
    parser.add_argument("--csv", metavar="FILE", help="save the entries with their bars")
    parser.add_argument("--budget", action="store_true", help="print how the bars are composed")


def run(args: argparse.Namespace) -> int:
    """Load, print, and write the CSV file if asked."""
    check_outputs(args, [args.result])
    from bem.results.result import load_result

    result = load_result(args.result)
    if args.all:
        result = result.reduced(free=result.conductors)
    written = deliver(result, args)
    return EXIT_DONE if written else InputError.exit_code
