"""The compiler, with a cache that belongs to exactly this code.

The compiler's own cache looks only at the file of each function, so a kernel would be kept
although one that it calls, in another file, has changed. Here compiled code lies in a folder
named after a digest of all files that kernels are compiled from: beside the package or, where that
cannot be written, in the user's cache folder or among the temporary files.
"""

from __future__ import annotations

import getpass
import hashlib
import os
import tempfile
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numba

PACKAGE = Path(__file__).parent


def _sources() -> list[bytes]:
    """Names and contents of all kernel files, and of others with compiled functions."""
    kernels = sorted((PACKAGE / "kernels").glob("*.py"))
    geometry = sorted((PACKAGE / "geometry").rglob("*.py"))
    texts = [file.name.encode() + file.read_bytes() for file in geometry]
    compiled = [text for text in texts if b"bem.compiled import" in text]
    return [file.name.encode() + file.read_bytes() for file in kernels] + compiled


def _digest() -> str:
    digest = hashlib.sha256(numba.__version__.encode())
    for source in _sources():
        digest.update(source)
    return digest.hexdigest()[:16]


def _usable(folder: Path) -> bool:
    """Whether the folder exists or can be made, belongs to this user alone, and can be written."""
    try:
        folder.mkdir(mode=0o700, parents=True, exist_ok=True)
        with tempfile.TemporaryFile(dir=folder):
            return True
    except OSError:
        return False


def _owned(folder: Path) -> bool:
    """Whether nobody else can have put code there."""
    return not hasattr(os, "getuid") or folder.stat().st_uid == os.getuid()


def _user() -> str:
    try:
        return getpass.getuser()
    except (KeyError, OSError):
        return "user"


def cache_folder() -> Path:
    """Folder for compiled code that is usable now; made if it must be."""
    name = f"bem-compiled-{_digest()}"
    asked = os.environ.get("NUMBA_CACHE_DIR")
    places = [Path(asked)] if asked else []
    places += [PACKAGE / "__pycache__", Path(os.path.expanduser("~")) / ".cache" / "bem"]
    for place in places:
        if _usable(place / name):
            return place / name
    shared = Path(tempfile.gettempdir()) / f"bem-{_user()}" / name
    if _usable(shared) and _owned(shared.parent) and _owned(shared):
        return shared
    return Path(tempfile.mkdtemp(prefix="bem-compiled-"))


FOLDER = cache_folder()
config: Any = numba.config


def njit(*functions: Callable[..., Any], **options: Any) -> Any:
    """``numba.njit`` with the cache in ``FOLDER``; with options it gives a decorator."""

    def decorate(function: Callable[..., Any]) -> Any:
        before = config.CACHE_DIR
        config.CACHE_DIR = str(FOLDER)
        try:
            return numba.njit(**options)(function)
        finally:
            config.CACHE_DIR = before

    return decorate(functions[0]) if functions else decorate
