"""The command extract, around an extraction that is played."""

from __future__ import annotations

import errno
import os
import sys
from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path
from types import ModuleType, SimpleNamespace
from typing import Any

import pytest
from test_results import assert_same, sample_result

from bem.cli.main import main
from bem.errors import GeometryError, InputError, MemoryRefused, SolutionError, UsageError
from bem.extraction.progress import Progress
from bem.results.result import load_result


@dataclass
class Stage:
    """What the played modules were called with, and what they do."""

    outcome: Callable[[], Any] = sample_result
    calls: dict[str, Any] = field(default_factory=dict)

    def load_scene(self, path: str) -> Any:
        """Play the reader of scene files."""
        self.calls["load"] = path
        return self._scene(7.0)

    def scene_from_files(self, paths: list[str], unit: str, split: bool = False) -> Any:
        """Play the reader of mesh files."""
        self.calls["load"] = (paths, unit, "split") if split else (paths, unit)
        return self._scene(1.0)

    def extract(self, scene: Any, tolerance: float, **options: Any) -> Any:
        """Play the extraction: one sign of life, then the outcome."""
        self.calls.update(options, tolerance=tolerance, scene=scene)
        if options["progress"] is not None:
            options["progress"](Progress("solving", 1, 96, 2.4, 0.1))
        return self.outcome()

    @staticmethod
    def _scene(permittivity: float) -> Any:
        conductors = [SimpleNamespace(name=name) for name in ("probe rod", "wall")]
        return SimpleNamespace(conductors=conductors, relative_permittivity=permittivity)


@pytest.fixture
def stage(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> Stage:
    played = Stage()
    scene_file, extraction = ModuleType("scene_file"), ModuleType("extract")
    vars(scene_file).update(load_scene=played.load_scene, scene_from_files=played.scene_from_files)
    vars(extraction).update(extract=played.extract)
    monkeypatch.setitem(sys.modules, "bem.scene.scene_file", scene_file)
    monkeypatch.setitem(sys.modules, "bem.extraction.extract", extraction)
    monkeypatch.chdir(tmp_path)
    return played


@dataclass
class Run:
    """What a run of the command left behind."""

    code: int
    out: str
    err: str


@pytest.fixture
def run(stage: Stage, capsys: pytest.CaptureFixture[str]) -> Callable[..., Run]:
    def call(*arguments: str) -> Run:
        code = main(["extract", *arguments])
        return Run(code, *capsys.readouterr())

    return call


def raising(error: BaseException) -> Callable[[], Any]:
    def play() -> Any:
        raise error

    return play


def test_done_prints_the_table_and_progress_and_writes_both_files(run: Any, stage: Stage) -> None:
    done = run("probe.toml", "--json", "r.json", "--csv", "r.csv")
    assert done.code == 0
    assert "12.3457 ± 0.0012" in done.out
    assert done.err == "0.1 s: round 1, 96 panels, largest bar 2.4 x target 0.001, solving\n"
    assert_same(load_result("r.json"), sample_result())
    assert Path("r.csv").read_text().count("\n") == 7


def test_defaults_and_options_reach_the_extraction(run: Any, stage: Stage) -> None:
    run("probe.toml")
    assert stage.calls["load"] == "probe.toml"
    assert stage.calls["scene"].relative_permittivity == 7.0
    chosen = ("tolerance", "pairs", "max_panels", "memory", "threads")
    assert [stage.calls[key] for key in chosen] == [1e-3, {}, 10000, None, None]
    run(
        *("a.stl", "b.msh", "--unit", "mm", "--tolerance", "0.01%", "--threads", "3"),
        *("--pair", "wall,probe rod=2%", "--max-panels", "500", "--memory", "2GiB"),
        *("--surroundings-permittivity", "2.1"),
    )
    assert stage.calls["load"] == (["a.stl", "b.msh"], "mm")
    assert stage.calls["scene"].relative_permittivity == 2.1
    pairs = {("wall", "probe rod"): pytest.approx(0.02)}
    expected = [pytest.approx(1e-4), pairs, 500, 2 * 2**30, 3]
    assert [stage.calls[key] for key in chosen] == expected


def test_the_permittivity_option_goes_before_the_scene_file(run: Any, stage: Stage) -> None:
    run("probe.toml", "--surroundings-permittivity", "2.1")
    assert stage.calls["scene"].relative_permittivity == 2.1


def test_quiet_leaves_standard_error_empty(run: Any, stage: Stage) -> None:
    done = run("probe.toml", "--quiet")
    assert (done.code, done.err) == (0, "") and stage.calls["progress"] is None


def test_budget_is_printed_on_request(run: Any) -> None:
    assert "quadrature" not in run("probe.toml").out
    done = run("probe.toml", "--budget")
    assert "Parts of the bars in pF" in done.out and "quadrature" in done.out


@pytest.mark.parametrize("stopped_by", ["max-panels", "memory", "rounds"])
def test_tolerance_not_reached_is_4_and_the_result_is_written(
    run: Any, stage: Stage, stopped_by: str
) -> None:
    stage.outcome = lambda: sample_result(converged=False, stopped_by=stopped_by)
    done = run("probe.toml", "--json", "r.json")
    assert done.code == 4
    assert "TOLERANCE 0.001 NOT REACHED" in done.out
    assert "bem: tolerance 0.001 not reached: " in done.err
    assert load_result("r.json").converged is False


def test_interrupted_with_a_result_is_130_and_written(run: Any, stage: Stage) -> None:
    stage.outcome = lambda: sample_result(converged=False, stopped_by="interrupt")
    done = run("probe.toml", "--json", "r.json")
    assert done.code == 130 and "best result so far" in done.err
    assert load_result("r.json").stopped_by == "interrupt"


def test_interrupted_without_a_result_is_130_and_nothing_is_written(run: Any, stage: Stage) -> None:
    stage.outcome = raising(KeyboardInterrupt())
    done = run("probe.toml", "--quiet", "--json", "r.json")
    assert (done.code, done.out) == (130, "") and not Path("r.json").exists()
    assert done.err == "bem: interrupted before there was a result; nothing was written\n"


@pytest.mark.parametrize(
    ("error", "code"),
    [
        (UsageError("threads: found 900; this machine has 2"), 2),
        (InputError("probe.toml: empty"), 3),
        (GeometryError("rod and wall touch"), 3),
        (SolutionError("reciprocity 0.4 over 0.001"), 3),
        (MemoryRefused("needs 90 GB, allowed are 8 GB"), 5),
    ],
)
def test_errors_are_one_line_with_their_code(
    run: Any, stage: Stage, error: Exception, code: int
) -> None:
    stage.outcome = raising(error)
    done = run("probe.toml", "--quiet")
    assert (done.code, done.out, done.err) == (code, "", f"bem: {error}\n")


def test_running_out_of_memory_is_5(run: Any, stage: Stage) -> None:
    stage.outcome = raising(MemoryError())
    done = run("probe.toml", "--quiet")
    assert done.code == 5 and "memory ran out; lower --max-panels" in done.err


def test_a_fault_is_one_line_that_asks_for_a_report(
    run: Any, stage: Stage, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.delenv("BEM_DEBUG", raising=False)
    stage.outcome = raising(ZeroDivisionError("division\nby zero"))
    done = run("probe.toml", "--quiet")
    assert done.code == 1 and done.err.count("\n") == 1
    assert "unexpected ZeroDivisionError: division by zero; this is a fault in bem" in done.err
    monkeypatch.setenv("BEM_DEBUG", "1")
    assert "Traceback" in run("probe.toml", "--quiet").err


@pytest.mark.parametrize(
    ("arguments", "expected"),
    [
        (["a.stl"], "--unit is missing: mesh files do not say their unit; allowed are m, cm"),
        (["a.stl", "--unit", "mmm"], "unit: found 'mmm' (did you mean 'mm'?); allowed are"),
        (["p.toml", "--unit", "mm"], "--unit mm: a scene file states its own unit; drop"),
        (["p.toml", "b.stl"], "found the scene p.toml among 2 files; give one scene file"),
        (["p.toml", "--pair", "rod,wall=1%"], "named 'rod' (did you mean 'probe rod'?)"),
        (["p.toml", "--tolerence", "1e-4"], "'--tolerence' (did you mean '--tolerance'?)"),
        (["p.toml", "--tol", "1e-4"], "unknown argument '--tol'"),
        (["p.toml", "--threads", "none"], "--threads: found 'none'"),
        (["p.toml", "--memory"], "--memory: expected one argument; see bem extract --help"),
        ([], "required: FILE; see bem extract --help"),
        (["p.toml", "--json", "gone/r.json"], "cannot write gone/r.json: there is no folder"),
        (["p.toml", "--csv", "."], "cannot write .: it is a folder"),
        (["p.toml", "--json", "p.toml"], "--json: p.toml is also the input p.toml"),
        (["p.toml", "--json", "x", "--csv", "./x"], "./x is also the file of --json"),
    ],
)
def test_usage_is_2_and_nothing_is_computed(
    run: Any, stage: Stage, arguments: list[str], expected: str
) -> None:
    done = run(*arguments)
    assert (done.code, done.out) == (2, "")
    assert done.err.startswith("bem: ") and done.err.count("\n") == 1
    assert expected in done.err
    assert "tolerance" not in stage.calls and list(Path.cwd().iterdir()) == []


def test_a_read_only_folder_is_found_before_the_solve(
    run: Any, stage: Stage, monkeypatch: pytest.MonkeyPatch
) -> None:
    def read_only(*_: Any, **__: Any) -> int:
        raise OSError(errno.EROFS, os.strerror(errno.EROFS))

    with monkeypatch.context() as patch:
        patch.setattr(os, "open", read_only)
        done = run("probe.toml", "--json", "r.json")
    assert done.code == 2 and "Read-only file system; choose another file" in done.err
    assert stage.calls == {}


def test_a_disk_that_fills_up_later_costs_the_file_but_not_the_table(
    run: Any, monkeypatch: pytest.MonkeyPatch
) -> None:
    def full(*_: Any) -> None:
        raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))

    with monkeypatch.context() as patch:
        patch.setattr(os, "fsync", full)
        done = run("probe.toml", "--quiet", "--json", "r.json", "--csv", "r.csv")
    assert done.code == 3 and "12.3457 ± 0.0012" in done.out
    assert [line.partition(";")[0] for line in done.err.splitlines()] == [
        "bem: cannot write 'r.json': No space left on device",
        "bem: cannot write 'r.csv': No space left on device",
    ]
    assert list(Path.cwd().iterdir()) == []


def test_the_progress_line_is_closed_when_the_extraction_fails(
    run: Any, stage: Stage, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(sys.stderr, "isatty", lambda: True, raising=False)
    stage.outcome = raising(InputError("empty"))
    assert run("probe.toml").err.endswith("\rbem: empty\n")
