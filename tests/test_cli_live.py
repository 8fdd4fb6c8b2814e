"""Signs of life: one line rewritten in a terminal, a line per round elsewhere."""

from __future__ import annotations

import io
import math
from typing import Any

import pytest

from bem.cli.live import Live, line_of, live_or_none
from bem.extraction.progress import Progress

COMPILING = "compiling kernels, first run only"
EVENTS = [
    Progress("starting mesh", 0, 0, math.nan, 0.01),
    Progress(COMPILING, 1, 96, math.nan, 0.02),
    Progress("assembling", 1, 96, math.nan, 9.1),
    Progress("solving", 1, 96, math.nan, 9.2),
    Progress("assembling", 2, 308, 2.4, 9.3),
    Progress("solving", 2, 308, 2.4, 9.4),
    Progress("refining", 2, 308, 0.8, 9.5),
]


class Screen(io.StringIO):
    """A stream that says it is a terminal."""

    def isatty(self) -> bool:
        """Say so."""
        return True


def played(stream: io.StringIO) -> str:
    live = Live(1e-3, stream)
    for event in EVENTS:
        live(event)
    live.close()
    return stream.getvalue()


def test_a_line_says_all_that_was_asked_for() -> None:
    assert line_of(EVENTS[-1], 1e-3) == (
        "9.5 s: round 2, 308 panels, largest bar 0.8 x target 0.001, refining"
    )
    assert "largest bar unknown, target 0.001" in line_of(EVENTS[2], 1e-3)


def test_a_file_gets_a_line_per_round_and_one_for_the_compiler() -> None:
    lines = played(io.StringIO()).splitlines()
    assert [line.partition(": ")[2].split(",")[0] for line in lines] == [
        "starting mesh",
        "round 1",
        "round 1",
        "round 2",
    ]
    assert lines[1].endswith(COMPILING)


def test_a_terminal_gets_one_line_that_is_wiped_at_the_end(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    monkeypatch.setenv("COLUMNS", "60")
    text = played(Screen())
    assert "\n" not in text
    assert all(len(part.rstrip()) < 60 for part in text.split("\r"))
    assert text.count("\r") == len(EVENTS) + 2
    assert text.endswith("\r" + " " * 59 + "\r")


def test_a_shorter_line_covers_the_longer_one_before(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("COLUMNS", "200")
    stream = Screen()
    live = Live(1e-3, stream)
    live(EVENTS[-1])
    live(EVENTS[0])
    long, short = stream.getvalue().split("\r")[1:]
    assert len(short) == len(long) and short.startswith("0.0 s: starting mesh ")


def test_a_reader_that_left_does_not_stop_the_computation() -> None:
    class Gone(Screen):
        def write(self, _: str) -> int:
            raise BrokenPipeError

    assert played(Gone()) == ""


def test_quiet_and_no_stream_mean_no_progress(monkeypatch: pytest.MonkeyPatch) -> None:
    assert live_or_none(True, 1e-3) is None
    assert live_or_none(False, 1e-3) is not None
    nothing: Any = None
    monkeypatch.setattr("sys.stderr", nothing)
    assert live_or_none(False, 1e-3) is None
