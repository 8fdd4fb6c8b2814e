"""Options that bound the work: panels, memory, threads."""

from __future__ import annotations

import argparse

from bem.cli import values


def add_effort(parser: argparse.ArgumentParser, extent: str = "") -> None:
    """Add the options to a command; ``extent`` says what the memory is for."""
    scope = f" {extent}" if extent else ""
    group = parser.add_argument_group("effort")
    group.add_argument(
        "--max-panels",
        metavar="N",
        type=values.count("--max-panels"),
        default=10000,
        help="stop before more panels than this (default 10000)",
    )
    group.add_argument(
        "--memory",
        metavar="AMOUNT",
        type=values.memory("--memory"),
        help=f"use no more memory than this{scope}, such as 8GB (default: what is free)",
    )
    group.add_argument(
        "--threads",
        metavar="N",
        type=values.count("--threads"),
        help="number of threads (default: one per processor)",
    )
