"""bem inspect: what is in the files, before anything is solved."""

from __future__ import annotations

import argparse
from typing import TYPE_CHECKING, Any

from bem.cli.scene_input import add_files, check_files, load
from bem.cli.terminal import put
from bem.errors import EXIT_DONE, GeometryError

if TYPE_CHECKING:
    from bem.scene.scene import Scene

_EPILOG = """\
examples:
  bem inspect probe.toml
  bem inspect rod.stl wall.msh --unit mm

exit codes:
  0    the scene can be solved
  2    the command is not understood
  3    an input cannot be used: a file is damaged, or bodies touch, cross or
       lie in solid metal; all findings are printed
"""


def add_parser(subparsers: Any) -> None:
    """Describe the command."""
    parser = subparsers.add_parser(
        "inspect",
        help="look at the bodies of a scene before solving",
        description="Print units, boxes, facets, gaps, and what would forbid a solution.",
        epilog=_EPILOG,
    )
    add_files(parser)


def run(args: argparse.Namespace) -> int:
    """Inspect, print all findings, and tell by the exit code whether the scene can be solved."""
    check_files(args.files, args.unit, args.split)
    scene = load(args.files, args.unit, args.split)
    return _inspect(scene)


def _inspect(scene: Scene) -> int:
    from bem.scene.inspect import inspect
    from bem.scene.report import report

    inspection = inspect(scene)
    put(report(scene, inspection))
    return GeometryError.exit_code if inspection.fatal else EXIT_DONE
