"""The command reduce, and how the other commands show what is grounded, floating or tied."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from made_bodies import write_cube
from test_reduce import network, result_of, wired
from test_results import assert_same

from bem.cli.main import main
from bem.cli.names import match_names
from bem.errors import UsageError
from bem.results.result import load_result

Run = Callable[..., tuple[int, str, str]]


@pytest.fixture
def run(tmp_path: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch) -> Run:
    """Run a command in a folder with saved results: wired.json, plain.json, commas.json."""
    monkeypatch.chdir(tmp_path)
    wired().to_json("wired.json")
    result_of(network(4, 3)).to_json("plain.json")
    names = ("a", "b", "a,b", "x=y", "left,top")
    result_of(network(5, 3), names=names).to_json("commas.json")

    def call(*arguments: str) -> tuple[int, str, str]:
        code = main(arguments)
        return code, *capsys.readouterr()

    return call


def test_it_prints_saves_and_leaves_the_input_alone(run: Run) -> None:
    before = Path("plain.json").read_bytes()
    code, out, err = run(
        *("reduce", "plain.json", "--ground", "c1", "--float", "c3"),
        *("--tie", "pair=c0,c2", "--json", "r.json", "--csv", "r.csv", "--budget"),
    )
    expected = load_result("plain.json").reduced(["c1"], ["c3"], {"pair": ("c0", "c2")})
    assert (code, err) == (0, "")
    assert out.startswith(str(expected)) and "floating, second order" in out
    assert_same(load_result("r.json"), expected)
    assert Path("r.csv").read_text().splitlines()[1].startswith('"maxwell","pair","pair",')
    assert Path("plain.json").read_bytes() == before


@pytest.mark.parametrize(
    ("options", "terminals"),
    [
        ([], "c0 pad"),
        (["--free", "c1,c4"], "c0 c1 pad c4"),
        (["--free", "c1", "--free", "c2"], "c0 c1 c2 pad"),
        (["--ground", "pad"], "c0"),
        (["--float=c0"], "pad"),
        (["--tie", "c0,c4"], "c0+c4 pad"),
        (["--tie", "c0,pad"], "c0+pad"),
        (["--tie", "n=c0,c4", "--tie", "m=n,pad"], "m"),
        (["--tie", "n=c1,c4", "--free", "c1", "--ground", "n"], "c0 pad"),
    ],
)
def test_what_the_scene_says_is_changed(run: Run, options: list[str], terminals: str) -> None:
    assert run("reduce", "wired.json", *options, "--json", "r.json")[0] == 0
    assert load_result("r.json").conductors == tuple(terminals.split())


@pytest.mark.parametrize(
    ("options", "code", "message"),
    [
        (["--ground", "c9x"], 2, "--ground: no conductor is named 'c9x'"),
        (["--float", "c0,pda"], 2, "--float: no conductor is named 'pda' (did you mean 'pad'?)"),
        (["--tie", "c0"], 2, 'tie: found "c0"; give two or more that are not tied yet'),
        (["--tie", "n=c0,zz"], 2, "--tie: no conductor is named 'zz'"),
        (["--tie", "n=c0,c4", "--tie", "n=c2,c4"], 2, "--tie: node 'n' is given twice"),
        (["--tie", "c1=c0,c4"], 2, 'tie: the name "c1" is taken by another conductor'),
        (["--ground", "c0", "--float", "c0"], 2, '"c0" is told both to ground and to float'),
        (["--ground", "c0,pad"], 2, "every conductor is grounded or floating; leave at least"),
        (["--json", "wired.json"], 2, "--json: wired.json is also the input wired.json"),
        (["--grund", "c0"], 2, "unknown argument '--grund' (did you mean '--ground'?)"),
    ],
)
def test_refused_in_one_line(run: Run, options: list[str], code: int, message: str) -> None:
    found, out, err = run("reduce", "wired.json", *options)
    assert (found, out) == (code, "")
    assert err.startswith(f"bem: {message}") and err.count("\n") == 1


def test_what_is_no_saved_result_and_a_lost_floating_node_are_3(run: Run) -> None:
    Path("other.json").write_text("{}")
    assert run("reduce", "other.json")[0] == 3
    result_of(np.diag([1.0, 1e-5]), 1e-4).to_json("weak.json")
    code, out, err = run("reduce", "weak.json", "--float", "c1")
    assert (code, out) == (3, "") and err.startswith("bem: floating: the potential of")


def test_names_with_commas_and_equals_signs(run: Run) -> None:
    run("reduce", "commas.json", "--tie", "x=y,left,top", "--json", "r.json")
    assert load_result("r.json").conductors == ("a", "b", "a,b", "x=y+left,top")
    run("reduce", "commas.json", "--ground", "left,top,x=y", "--json", "r.json")
    assert load_result("r.json").conductors == ("a", "b", "a,b")
    code, _, err = run("reduce", "commas.json", "--ground", "a,b")
    assert code == 2 and "'a,b' can be read in several ways" in err


def test_matching_of_names() -> None:
    known = ["rod", "left,top", "rod,left"]
    assert match_names("--x", " rod , left,top", ["rod", "left,top"]) == ("rod", "left,top")
    assert match_names("--x", "left,top", known) == ("left,top",)
    with pytest.raises(UsageError, match="--x: no conductor is named 'tip'"):
        match_names("--x", "rod,tip", known)


def test_show_prints_the_terminals_and_on_request_all(run: Run) -> None:
    code, out, _ = run("show", "wired.json", "--csv", "small.csv")
    assert code == 0 and out.startswith(str(wired().terminals))
    note = (
        "the full matrix of 5 conductors is in the JSON file (--json); 'bem show --all' prints it"
    )
    assert note in " ".join(out.split())
    assert len(Path("small.csv").read_text().splitlines()) == 1 + 4 + 2
    code, out, _ = run("show", "wired.json", "--all", "--csv", "all.csv")
    assert code == 0 and "full matrix" not in out and "reduced" not in out
    assert out.startswith(str(wired(states=(), nodes=())))
    assert len(Path("all.csv").read_text().splitlines()) == 1 + 25 + 5


def test_a_plain_result_shows_as_ever(run: Run) -> None:
    shown = run("show", "plain.json")
    assert shown == run("show", "plain.json", "--all") == run("reduce", "plain.json")
    assert "full matrix" not in shown[1]


def test_a_scene_from_file_to_reduced_table(run: Run) -> None:
    """Three cubes in a row, the outer one grounded in the scene, then freed."""
    write_cube(Path("cube.stl"))
    entries = [
        f'[[conductor]]\nname = "{name}"\nmesh = "cube.stl"\nplace = {{ shift = [{x}, 0, 0] }}\n'
        for name, x in (("a", 0), ("b", 3), ("shield", 6))
    ]
    Path("s.toml").write_text('unit = "mm"\n' + "".join(entries) + 'state = "grounded"\n')
    code, out, _ = run(
        "extract", "s.toml", "--tolerance", "2%", "--json", "s.json", "--csv", "s.csv", "--quiet"
    )
    text = " ".join(out.split())
    assert code == 0 and "conductors reduced: grounded shield" in text
    assert "the full matrix of 3 conductors is in the JSON file" in text
    full = load_result("s.json")
    assert full.conductors == ("a", "b", "shield") and full.reduction is None
    assert json.loads(Path("s.json").read_text())["states"] == ["terminal"] * 2 + ["grounded"]
    assert len(Path("s.csv").read_text().splitlines()) == 1 + 4 + 2
    code, out, _ = run("reduce", "s.json", "--free", "shield", "--ground", "a")
    assert code == 0 and "shield" in out and "grounded a" in out


def test_an_extraction_whose_floating_node_is_lost_still_arrives(run: Run) -> None:
    states = ("terminal", "floating")
    result_of(np.diag([1.0, 1e-5]), 1e-4, states=states, nodes=(None, None)).to_json("weak.json")
    code, out, err = run("show", "weak.json", "--csv", "weak.csv")
    assert (code, err) == (0, "")
    assert "warning: this is the full matrix; floating: the potential" in " ".join(out.split())
    assert len(Path("weak.csv").read_text().splitlines()) == 1 + 4 + 2
