"""The command bem: finds the command, runs it, and turns every failure into one line."""

from __future__ import annotations

import os
import sys
from collections.abc import Sequence
from types import ModuleType

from bem import __version__
from bem.cli import compare, extract, inspect, reduce, show
from bem.cli.parser import Parser, nearest
from bem.cli.terminal import silence_stdout, tell
from bem.errors import EXIT_INTERRUPTED, BemError, MemoryRefused, UsageError

COMMANDS: dict[str, ModuleType] = {
    "compare": compare,
    "extract": extract,
    "inspect": inspect,
    "reduce": reduce,
    "show": show,
}
EXIT_UNEXPECTED = 1
EXIT_BROKEN_PIPE = 141

_DESCRIPTION = """\
Capacitance matrices of 3D conductors from mesh files,
with an error bar on every entry.
"""

_EPILOG = """\
examples:
  bem inspect probe.toml                    look at the bodies before solving
  bem extract probe.toml --json probe.json  compute, print and save
  bem extract rod.stl wall.msh --unit mm    the same from mesh files
  bem reduce probe.json --ground wall       ground, float or tie after the solve
  bem show probe.json --csv probe.csv       print a saved result
  bem compare probe.toml longer.toml        compute what a change does

exit codes:
  0 done; 1 a fault in bem; 2 usage; 3 bad input, or writing the result failed;
  4 tolerance not reached, the result is still written, and marked;
  5 refused for lack of memory; 6 a change above its limit; 130 interrupted;
  141 nobody read the output

bem COMMAND --help describes each command.
"""


def main(argv: Sequence[str] | None = None) -> int:
    """Run ``bem`` with ``argv`` (default: the process's own); returns the exit code."""
    arguments = list(sys.argv[1:] if argv is None else argv)
    try:
        return _run(arguments)
    except BemError as error:
        tell(f"bem: {_one_line(error)}")
        return error.exit_code
    except KeyboardInterrupt:
        tell("bem: interrupted before there was a result; nothing was written")
        return EXIT_INTERRUPTED
    except BrokenPipeError:
        silence_stdout()
        return EXIT_BROKEN_PIPE
    except MemoryError:
        tell("bem: memory ran out; lower --max-panels, raise --tolerance, or free some memory")
        return MemoryRefused.exit_code
    except Exception as error:
        return _unexpected(error)


def _run(arguments: list[str]) -> int:
    parser = build_parser()
    if not arguments:
        parser.print_help(sys.stderr)
        return UsageError.exit_code
    _check_command(arguments[0])
    try:
        args = parser.parse_args(arguments)
        code: int = COMMANDS[args.command].run(args)
        return code
    finally:
        if sys.stdout is not None:
            sys.stdout.flush()


def build_parser() -> Parser:
    """Make the parser with every command."""
    parser = Parser(prog="bem", description=_DESCRIPTION, epilog=_EPILOG)
    parser.add_argument("--version", action="version", version=f"bem {__version__}")
    subparsers = parser.add_subparsers(dest="command", metavar="COMMAND", required=True)
    for command in COMMANDS.values():
        command.add_parser(subparsers)
    return parser


def _check_command(word: str) -> None:
    if not word.startswith("-") and word not in COMMANDS:
        raise UsageError(
            f"command: found {word!r}{nearest(word, list(COMMANDS))}; "
            f"allowed are {', '.join(COMMANDS)}"
        )


def _one_line(error: BaseException) -> str:
    return " ".join(str(error).split())


def _unexpected(error: Exception) -> int:
    if os.environ.get("BEM_DEBUG") == "1":
        import traceback

        traceback.print_exc()
    tell(
        f"bem: unexpected {type(error).__name__}: {_one_line(error)}; this is a fault in bem, "
        "please report it with the command and its files (BEM_DEBUG=1 shows where it happened)"
    )
    return EXIT_UNEXPECTED


if __name__ == "__main__":
    sys.exit(main())
