"""Compiled integrals over panels, exact and tiered.

Compiled code is cached beside the package or, where that cannot be written, in the user's
cache folder; where neither can be, in the folder for temporary files.
"""

from __future__ import annotations

import getpass
import os
import tempfile
from pathlib import Path


def _writable(folder: Path) -> bool:
    while not folder.exists() and folder != folder.parent:
        folder = folder.parent
    return os.access(folder, os.W_OK | os.X_OK)


def _private_folder() -> str:
    """A folder of this user's among the temporary files, closed to others."""
    try:
        user = getpass.getuser()
    except (KeyError, OSError):
        user = str(os.getuid()) if hasattr(os, "getuid") else "user"
    folder = Path(tempfile.gettempdir()) / f"bem-kernels-{user}"
    try:
        folder.mkdir(mode=0o700, exist_ok=True)
        if not hasattr(os, "getuid") or folder.stat().st_uid == os.getuid():
            return str(folder)
    except OSError:
        pass
    return tempfile.mkdtemp(prefix="bem-kernels-")


def _choose_cache() -> None:
    if "NUMBA_CACHE_DIR" in os.environ:
        return
    home = Path(os.path.expanduser("~")) / ".cache"
    if not _writable(Path(__file__).parent / "__pycache__") and not _writable(home):
        os.environ["NUMBA_CACHE_DIR"] = _private_folder()


_choose_cache()
