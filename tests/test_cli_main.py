"""The program as a process: help, version, show, pipes and odd screens."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest
from test_results import sample_result

from bem import __version__
from bem.cli.main import COMMANDS, main

PROGRAM = [sys.executable, "-c", "import sys; from bem.cli.main import main; sys.exit(main())"]
MODULES = (
    "import sys\n"
    "from bem.cli.main import main\n"
    "try:\n    main(sys.argv[1:])\nexcept SystemExit:\n    pass\n"
    "print('\\n'.join(sys.modules), file=sys.stderr)"
)
HEAVY = {"numpy", "scipy", "numba", "trimesh", "meshio", "llvmlite", "jsonschema", "asyncio"}


@pytest.fixture
def saved(tmp_path: Path) -> Path:
    path = tmp_path / "r.json"
    sample_result().to_json(path)
    return path


def bem(*arguments: str | Path, **options: Any) -> subprocess.CompletedProcess[bytes]:
    """Run the program in a process of its own."""
    return subprocess.run(
        [*PROGRAM, *map(str, arguments)],
        **{"stdout": subprocess.PIPE, "stderr": subprocess.PIPE, "timeout": 30, **options},
    )


@pytest.mark.parametrize(
    "arguments",
    [
        ["--help"],
        ["--version"],
        ["extract", "--help"],
        ["inspect", "--help"],
        ["show", "--help"],
        ["reduce", "--help"],
        [],
    ],
)
def test_help_imports_nothing_heavy(arguments: list[str]) -> None:
    done = subprocess.run(
        [sys.executable, "-c", MODULES, *arguments], capture_output=True, text=True, timeout=30
    )
    loaded = {name.partition(".")[0] for name in done.stderr.split()}
    assert "bem" in loaded and not loaded & HEAVY


def help_of(capsys: pytest.CaptureFixture[str], *arguments: str) -> str:
    with pytest.raises(SystemExit) as caught:
        main([*arguments, "--help"])
    assert caught.value.code == 0
    return capsys.readouterr().out


def test_help_has_an_example_per_command_and_all_exit_codes(
    capsys: pytest.CaptureFixture[str],
) -> None:
    text = help_of(capsys)
    for command in COMMANDS:
        assert f"\n  bem {command} " in text
    codes = text.partition("exit codes:")[2]
    for code in ("0", "1", "2", "3", "4", "5", "130"):
        assert f" {code} " in codes


def test_help_of_extract_has_every_option_and_exit_code(
    capsys: pytest.CaptureFixture[str],
) -> None:
    text = help_of(capsys, "extract")
    options = "tolerance pair json csv surroundings-permittivity threads max-panels memory budget"
    for option in [*options.split(), "quiet", "unit"]:
        assert f"  --{option} " in text or f"  --{option}\n" in text
    codes = text.partition("exit codes:")[2]
    assert [line.split()[0] for line in codes.strip().splitlines()] == "0 1 2 3 4 5 130".split()


def test_help_fits_80_columns(
    capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("COLUMNS", "80")
    for arguments in ([], *([command] for command in COMMANDS)):
        assert max(map(len, help_of(capsys, *arguments).splitlines())) <= 80


def test_version(capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit):
        main(["--version"])
    assert capsys.readouterr().out == f"bem {__version__}\n"


def test_no_command_prints_the_help(capsys: pytest.CaptureFixture[str]) -> None:
    assert main([]) == 2
    out, err = capsys.readouterr()
    assert out == "" and err.startswith("usage: bem ")


@pytest.mark.parametrize(
    ("arguments", "expected"),
    [
        (
            ["extrakt", "a.toml"],
            "command: found 'extrakt' (did you mean 'extract'?); "
            f"allowed are {', '.join(COMMANDS)}",
        ),
        (["show"], "the following arguments are required: RESULT.json; see bem show --help"),
        (["--json"], "the following arguments are required: COMMAND; see bem --help"),
    ],
)
def test_usage_errors(
    arguments: list[str], expected: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(arguments) == 2
    assert capsys.readouterr().err == f"bem: {expected}\n"


def test_show_prints_and_writes_csv(saved: Path, capsys: pytest.CaptureFixture[str]) -> None:
    csv = saved.with_suffix(".csv")
    assert main(["show", str(saved), "--csv", str(csv), "--budget"]) == 0
    out, err = capsys.readouterr()
    assert out.startswith(str(sample_result())) and "Parts of the bars" in out and err == ""
    assert csv.read_text().startswith('"quantity"')


def test_show_refuses_other_files(saved: Path, capsys: pytest.CaptureFixture[str]) -> None:
    saved.write_text("{}")
    assert main(["show", str(saved)]) == 3
    assert "not a saved result" in capsys.readouterr().err
    assert main(["show", str(saved), "--csv", str(saved)]) == 2
    assert "is also the input" in capsys.readouterr().err


@pytest.mark.parametrize("unbuffered", ["", "1"])
def test_a_reader_that_leaves_early_is_no_fault(saved: Path, unbuffered: str) -> None:
    read, write = os.pipe()
    os.close(read)
    done = bem("show", saved, stdout=write, env={**os.environ, "PYTHONUNBUFFERED": unbuffered})
    os.close(write)
    assert (done.returncode, done.stderr) == (0, b"")


def test_help_into_a_closed_pipe_is_quiet() -> None:
    read, write = os.pipe()
    os.close(read)
    done = bem("--help", stdout=write, env={**os.environ, "PYTHONUNBUFFERED": ""})
    os.close(write)
    assert (done.returncode, done.stderr) == (141, b"")


def test_no_standard_output_at_all(saved: Path) -> None:
    csv = saved.with_suffix(".csv")
    done = bem("show", saved, "--csv", csv, stdout=None, preexec_fn=lambda: os.close(1))
    assert (done.returncode, done.stderr) == (0, b"") and csv.exists()


def test_a_full_disk_under_standard_output_is_told(saved: Path) -> None:
    with open("/dev/full", "wb") as full:
        done = bem("show", saved, stdout=full)
    assert done.returncode == 3
    assert done.stderr == b"bem: cannot write to standard output: No space left on device\n"


@pytest.mark.parametrize(
    ("encoding", "expected"),
    [
        ("ascii", b"12.3457 +- 0.0012"),
        ("latin-1", b"12.3457 \xb1 0.0012"),
        ("utf-8", b"12.3457 \xc2\xb1 0.0012"),
    ],
)
def test_screens_without_the_sign(tmp_path: Path, encoding: str, expected: bytes) -> None:
    sample_result(names=("液位", "wall")).to_json(tmp_path / "r.json")
    done = bem("show", tmp_path / "r.json", env={**os.environ, "PYTHONIOENCODING": encoding})
    assert (done.returncode, done.stderr) == (0, b"") and expected in done.stdout
    name = "液位".encode() if encoding == "utf-8" else b"\\u6db2\\u4f4d"
    assert name in done.stdout
