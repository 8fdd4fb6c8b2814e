"""Where compiled code is kept: one folder per state of the sources, in a place that can be used."""

from __future__ import annotations

import os
import subprocess
import sys
import tempfile
from pathlib import Path

import numba
import pytest

from bem import compiled


@pytest.fixture
def package(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """A package with one file of kernels, and no cache folder asked for."""
    (tmp_path / "package" / "kernels").mkdir(parents=True)
    (tmp_path / "package" / "kernels" / "a.py").write_text("x = 1\n")
    monkeypatch.setattr(compiled, "PACKAGE", tmp_path / "package")
    monkeypatch.setenv("HOME", str(tmp_path / "home"))
    monkeypatch.delenv("NUMBA_CACHE_DIR", raising=False)
    monkeypatch.setattr(tempfile, "tempdir", str(tmp_path / "temporary"))
    (tmp_path / "temporary").mkdir()
    return tmp_path / "package"


def forbid(monkeypatch: pytest.MonkeyPatch, *places: Path) -> None:
    """Nothing below these places can be written."""
    usable = compiled._usable

    def limited(folder: Path) -> bool:
        return not any(folder.is_relative_to(place) for place in places) and usable(folder)

    monkeypatch.setattr(compiled, "_usable", limited)


def test_beside_the_package_first(package: Path) -> None:
    assert compiled.cache_folder().is_relative_to(package)


def test_any_change_of_a_kernel_gives_another_folder(package: Path) -> None:
    """Also of one that is only called by others: their files need not change."""
    before = compiled.cache_folder()
    assert compiled.cache_folder() == before
    (package / "kernels" / "a.py").write_text("x = 2\n")
    assert compiled.cache_folder() != before


def test_then_the_home_then_temporary_files(package: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    home = package.parent / "home"
    forbid(monkeypatch, package)
    assert compiled.cache_folder().is_relative_to(home)
    forbid(monkeypatch, package, home)
    folder = compiled.cache_folder()
    assert folder.is_relative_to(package.parent / "temporary")
    assert folder.stat().st_mode & 0o077 == 0


def test_a_folder_of_somebody_else_is_not_trusted(
    package: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    forbid(monkeypatch, package, package.parent / "home")
    shared = compiled.cache_folder()
    monkeypatch.setattr(os, "getuid", lambda: os.stat(package).st_uid + 1, raising=False)
    assert compiled.cache_folder() != shared


def test_the_folder_that_was_asked_for_comes_first(
    package: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    asked = package.parent / "asked"
    monkeypatch.setenv("NUMBA_CACHE_DIR", str(asked))
    assert compiled.cache_folder().is_relative_to(asked)


def test_the_setting_of_others_is_left_as_it_was() -> None:
    before = numba.config.CACHE_DIR
    doubled = compiled.njit(cache=True)(lambda x: 2 * x)
    assert doubled(4) == 8
    assert numba.config.CACHE_DIR == before
    assert Path(doubled.stats.cache_path).is_relative_to(compiled.FOLDER)


def test_importing_compiles_nothing() -> None:
    """No kernel has a signature before it is called."""
    code = (
        "import bem.extraction.extract, bem.kernels.pairs as p, bem.kernels.potential as q;"
        "assert not any(f.signatures for f in (p.fill_block, p.near_pair, q.potential))"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr
