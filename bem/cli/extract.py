"""bem extract: the capacitance matrix of a scene file or of mesh files."""

from __future__ import annotations

import argparse
from typing import TYPE_CHECKING, Any

from bem.cli import values
from bem.cli.effort import add_effort
from bem.cli.live import live_or_none
from bem.cli.outputs import check_outputs, deliver
from bem.cli.pairs import match_pairs, read_pair
from bem.cli.scene_input import add_files, check_files, load
from bem.cli.terminal import tell
from bem.errors import EXIT_DONE, EXIT_INTERRUPTED, InputError, ToleranceNotReached
from bem.results.outcome import remedy

if TYPE_CHECKING:
    from bem.results.result import CapacitanceResult
    from bem.scene.scene import Scene

_EPILOG = """\
examples:
  bem extract probe.toml --tolerance 0.1% --json probe.json
  bem extract rod.stl wall.msh --unit mm --pair rod,wall=1%

exit codes:
  0    done, everything that was asked was reached
  1    a fault in bem; please report it
  2    the command is not understood, or an output file cannot be written
  3    an input cannot be used, or writing the result failed
  4    the tolerance was not reached; the result is still written, and marked
  5    refused: more memory would be needed than is allowed
  130  interrupted; the best result so far is written, if there is one
"""


def add_parser(subparsers: Any) -> None:
    """Describe the command."""
    parser = subparsers.add_parser(
        "extract",
        help="compute the capacitance matrix of a scene or of meshes",
        description="Compute the Maxwell capacitance matrix with an error bar on every entry.",
        epilog=_EPILOG,
    )
    add_files(parser)
    _add_scene_options(parser)
    _add_accuracy_options(parser)
    add_effort(parser)
    _add_output_options(parser)


def _add_scene_options(parser: argparse.ArgumentParser) -> None:
    group = parser.add_argument_group("the scene")
    group.add_argument(
        "--surroundings-permittivity",
        metavar="NUMBER",
        type=values.positive("--surroundings-permittivity"),
        help="relative permittivity of the medium (default: the scene's, or 1)",
    )
    _add_frequency(group)


def _add_frequency(group: argparse._ArgumentGroup) -> None:
    group.add_argument(
        "--frequency",
        metavar="FREQUENCY",
        type=values.frequency("--frequency"),
        action="append",
        default=[],
        help="also C and G with the losses of all media at this frequency, such as 50Hz or 1MHz; "
        "may be repeated",
    )


def _add_accuracy_options(parser: argparse.ArgumentParser) -> None:
    group = parser.add_argument_group("accuracy")
    group.add_argument(
        "--tolerance",
        metavar="FRACTION",
        type=values.fraction("--tolerance"),
        default=1e-3,
        help="every bar at most this times sqrt(C_ii C_jj) (default 0.001)",
    )
    group.add_argument(
        "--pair",
        metavar="A,B=ACCURACY",
        type=read_pair,
        action="append",
        default=[],
        help="relative accuracy of one coupling, such as 'rod,wall=1%%'; may be repeated",
    )


def _add_output_options(parser: argparse.ArgumentParser) -> None:
    group = parser.add_argument_group("output")
    group.add_argument("--json", metavar="FILE", help="save everything, to be read by bem show")
    group.add_argument("--csv", metavar="FILE", help="save the entries with their bars")
    group.add_argument("--budget", action="store_true", help="print how the bars are composed")
    group.add_argument("--quiet", action="store_true", help="no progress on standard error")


def run(args: argparse.Namespace) -> int:
    """Extract, deliver, and tell how it went by the exit code."""
    check_outputs(args, args.files)
    check_files(args.files, args.unit, args.split)
    scene = _load(args)
    pairs = match_pairs(args.pair, [conductor.name for conductor in scene.conductors])
    result = _extract(scene, pairs, args)
    if not deliver(result, args):
        return InputError.exit_code
    return _exit_code(result)


def _load(args: argparse.Namespace) -> Scene:
    scene = load(args.files, args.unit, args.split)
    if args.surroundings_permittivity is not None:
        scene.relative_permittivity = args.surroundings_permittivity
    return scene


def _extract(
    scene: Scene, pairs: dict[tuple[str, str], float], args: argparse.Namespace
) -> CapacitanceResult:
    from bem.extraction.extract import extract

    live = live_or_none(args.quiet, args.tolerance)
    try:
        return extract(
            scene,
            args.tolerance,
            pairs=pairs,
            max_panels=args.max_panels,
            memory=args.memory,
            threads=args.threads,
            progress=live,
            frequencies=args.frequency,
        )
    finally:
        if live is not None:
            live.close()


def _exit_code(result: CapacitanceResult) -> int:
    reason = remedy(result.stopped_by, result.converged)
    if result.stopped_by == "interrupt":
        tell(f"bem: {reason}")
        return EXIT_INTERRUPTED
    if not result.converged:
        tell(f"bem: tolerance {result.tolerance:g} not reached: {reason}")
        return ToleranceNotReached.exit_code
    return EXIT_DONE
