"""bem inspect: what is in the files, before anything is solved."""

from __future__ import annotations

import argparse
from collections.abc import Callable
from functools import partial
from typing import TYPE_CHECKING, Any

from bem.cli.outputs import check_outputs, tried
from bem.cli.scene_input import add_files, check_files, load
from bem.cli.terminal import put, tell
from bem.errors import EXIT_DONE, GeometryError, InputError, UsageError
from bem.units import metres_per

if TYPE_CHECKING:
    from bem.scene.inspect import Inspection
    from bem.scene.scene import Scene

_EPILOG = """\
The files of --faces and --section show what will be solved: which region lies
on each side of every face, and where each region is.

examples:
  bem inspect probe.toml
  bem inspect pad.toml --section pad.png --plane z=1.5 --faces pad.vtu
  bem inspect rod.stl wall.msh --unit mm

exit codes:
  0    the scene can be solved
  2    the command is not understood, or an output file cannot be written
  3    an input cannot be used: a file is damaged, or conductors touch, cross
       or lie in solid metal; all findings are printed; or writing failed
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
    group = parser.add_argument_group("output")
    group.add_argument("--json", metavar="FILE", help="save all findings, in metres")
    group.add_argument(
        "--faces", metavar="FILE.vtu", help="save all faces with the regions on their sides"
    )
    group.add_argument(
        "--section", metavar="FILE.png", help="save a picture of a cross-section, by region"
    )
    group.add_argument(
        "--plane",
        metavar="AXIS=NUMBER",
        help="where the cross-section is, such as z=0.5 in the scene's unit (default: half-way "
        "across y)",
    )


def run(args: argparse.Namespace) -> int:
    """Inspect, print all findings, and tell by the exit code whether the scene can be solved."""
    check_files(args.files, args.unit, args.split)
    check_outputs(args, args.files)
    if args.plane is not None and args.section is None:
        raise UsageError("--plane: says where the cross-section is; give --section FILE.png too")
    if args.section is not None:
        from bem.exports.section_png import check_drawing

        check_drawing()
    scene = load(args.files, args.unit, args.split)
    return _inspect(scene, args)


def _inspect(scene: Scene, args: argparse.Namespace) -> int:
    from bem.scene.inspect import inspect
    from bem.scene.report import report

    section = _section(scene, args)
    inspection = inspect(scene)
    steps = [*_writers(scene, inspection, args), lambda: put(report(scene, inspection))]
    if section is not None:
        steps.insert(0, section)
    trouble = tried(steps)
    for line in trouble:
        tell(f"bem: {line}")
    return GeometryError.exit_code if inspection.fatal or trouble else EXIT_DONE


def _section(scene: Scene, args: argparse.Namespace) -> Callable[[], None] | None:
    """The call that writes the picture, if one was asked for."""
    if args.section is None:
        return None
    from bem.exports.section_png import save_section
    from bem.scene.section import Section, plane_of

    plane = None if args.plane is None else plane_of(args.plane, metres_per(scene.unit))
    return partial(save_section, Section.of(scene, plane), args.section)


def _writers(
    scene: Scene, inspection: Inspection, args: argparse.Namespace
) -> list[Callable[[], None]]:
    """One call per file of findings that was asked for."""
    steps: list[Callable[[], None]] = []
    if args.json is not None:
        from bem.exports.inspection_record import save_inspection

        steps.append(partial(save_inspection, scene, inspection, args.json))
    if args.faces is not None:
        steps.append(partial(_save_faces, scene, inspection, args.faces))
    return steps


def _save_faces(scene: Scene, inspection: Inspection, path: str) -> None:
    from bem.exports.faces_file import save_faces
    from bem.scene.regions import regions_of

    if inspection.fatal:
        raise InputError(f"--faces: {path} not written: the scene cannot be solved as it is")
    regions = inspection.regions or regions_of(scene)
    save_faces(scene, regions.partition.parts, path)
