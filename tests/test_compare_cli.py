"""The command compare on small scenes: what it prints, writes and returns."""

from __future__ import annotations

import json
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import pytest
from made_bodies import soup, stl_binary
from test_compare_results import sample_comparison

import bem
from bem.cli.main import main
from bem.errors import ChangeExceeded, ToleranceNotReached
from bem.geometry import shapes

SCENE = """unit = "mm"
[[conductor]]
name = "low"
mesh = "plate.stl"
[[conductor]]
name = "{name}"
mesh = "plate.stl"
place = {{ shift = [0.0, 0.0, {z}] }}
"""


@dataclass
class Run:
    """What a run of the command left behind."""

    code: int
    out: str
    err: str


@pytest.fixture
def run(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> Callable[..., Run]:
    """Run the command in a folder with three scenes."""
    monkeypatch.chdir(tmp_path)
    Path("plate.stl").write_bytes(stl_binary(soup(shapes.plate(10.0, 10.0))))
    for file, name, z in (("a", "high", 1.0), ("b", "high", 1.001), ("c", "other", 1.0)):
        Path(f"{file}.toml").write_text(SCENE.format(name=name, z=z), "utf-8")

    def call(*arguments: str) -> Run:
        code = main(["compare", *arguments])
        return Run(code, *capsys.readouterr())

    return call


def test_it_prints_and_saves_the_change(run: Callable[..., Run]) -> None:
    done = run("a.toml", "b.toml", "--json", "c.json", "--csv", "c.csv")
    assert done.code == 0
    assert "low, high" in done.out
    assert "same panels in both scenes" in done.out
    assert "round 1" in done.err
    record = json.loads(Path("c.json").read_text("utf-8"))
    assert record["correlated"]
    assert record["conductors"] == ["low", "high"]
    change, bar = record["change_F"][0][1], record["change_error_F"][0][1]
    assert 0.0 < bar < 0.02 * change
    assert Path("c.csv").read_text("utf-8").count("\n") == 7


def test_a_limit_that_is_kept(run: Callable[..., Run]) -> None:
    done = run("a.toml", "b.toml", "--limit", "0.2%", "--quiet")
    assert (done.code, done.err) == (0, "")


def test_a_limit_that_is_exceeded_names_the_entries(run: Callable[..., Run]) -> None:
    done = run("a.toml", "b.toml", "--limit", "0.05%", "--quiet")
    assert done.code == ChangeExceeded.exit_code == 6
    assert "the change of C(low, high)" in done.err
    assert "is above the limit of 0.05 %" in done.err
    assert done.out.startswith("Change of the Maxwell")


def test_a_saved_result_against_a_scene(run: Callable[..., Run]) -> None:
    """Bars of about a thousandth add up, so a change below them cannot be ruled out."""
    bem.extract(bem.load_scene("a.toml"), threads=1).to_json("a.json")
    done = run("a.json", "b.toml", "--limit", "0.1%", "--quiet")
    assert done.code == 6
    assert "the first side is saved" in done.out
    assert "cannot be ruled out" in done.err
    same = run("a.json", "a.json", "--limit", "0.0001%")
    assert same.code == 0
    assert "nothing changed" in same.out


def test_the_accuracy_is_not_reached(run: Callable[..., Run]) -> None:
    done = run("a.toml", "b.toml", "--max-panels", "100", "--quiet")
    assert done.code == ToleranceNotReached.exit_code
    assert "NOT REACHED" in done.out
    assert "raise max-panels" in done.err
    decided = run("a.toml", "b.toml", "--max-panels", "100", "--limit", "5%", "--quiet")
    assert decided.code == 0


@pytest.mark.parametrize(
    ("arguments", "code", "words"),
    [
        (["a.toml", "c.toml"], 2, 'only in the first: "high"; only in the second: "other"'),
        (["a.toml", "plate.stl"], 2, "give a scene file (.toml)"),
        (["a.toml"], 2, "required: B"),
        (["a.toml", "none.toml"], 3, "no such file"),
        (["a.toml", "none.json"], 3, "cannot read none.json"),
        (["a.toml", "b.toml", "--limit", "2"], 2, "--limit: found '2'"),
        (["a.toml", "b.toml", "--change-accuracy", "0"], 2, "--change-accuracy: found '0'"),
        (["a.toml", "b.toml", "--json", "a.toml"], 2, "is also the input a.toml"),
        (["a.toml", "b.toml", "--csv", "none/x.csv"], 2, "there is no folder"),
        (["a.toml", "b.toml", "--memory", "1kB"], 5, "--memory"),
    ],
)
def test_faults_are_one_line_and_a_code(
    run: Callable[..., Run], arguments: list[str], code: int, words: str
) -> None:
    done = run(*arguments, *(["--quiet"] if len(arguments) > 1 else []))
    assert done.code == code
    assert words in done.err
    assert done.err.count("\n") == 1
    assert done.out == ""


def test_an_interrupted_comparison_is_still_written(
    run: Callable[..., Run], monkeypatch: pytest.MonkeyPatch
) -> None:
    stopped = sample_comparison(converged=False, stopped_by="interrupt")
    monkeypatch.setattr("bem.extraction.compare.compare", lambda *_, **__: stopped)
    done = run("a.toml", "b.toml", "--csv", "c.csv")
    assert done.code == 130
    assert Path("c.csv").exists()
    assert "best comparison so far" in done.err


def test_a_file_that_cannot_be_written_does_not_take_the_report_with_it(
    run: Callable[..., Run], monkeypatch: pytest.MonkeyPatch
) -> None:
    def fail(*_: object) -> None:
        raise bem.InputError("cannot write c.json: disk full")

    monkeypatch.setattr("bem.extraction.compare.compare", lambda *_, **__: sample_comparison())
    monkeypatch.setattr("bem.exports.comparison_files.save_json", fail)
    done = run("a.toml", "b.toml", "--json", "c.json")
    assert done.code == 3
    assert "probe rod" in done.out
    assert "disk full" in done.err
