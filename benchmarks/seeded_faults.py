"""Whether tests and audit catch deliberate faults.

    python benchmarks/seeded_faults.py             # all
    python benchmarks/seeded_faults.py --only bar  # those with "bar" in their words

Each fault goes into a copy of the package; its tests run there and, if they pass, a few
extractions that may fail, be marked by their audit, or not reach their tolerance. Exit code 1 if
a fault survives, 2 if its text is not found any more or the package is not sound without it;
tests that fail without any fault are named and catch none.
"""

from __future__ import annotations

import argparse
import os
import re
import shutil
import subprocess
import sys
import tempfile
import time
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from faults import FAULTS, Fault

ROOT = Path(__file__).resolve().parent.parent
COPIED = ("bem", "tests", "meshes", "benchmarks", ".ci")
FAILED = re.compile(r"^(?:FAILED|ERROR) (?:tests/)?(.+?)(?: - .*)?$", re.MULTILINE)
AUDIT = """
import bem

caught = []
lower, upper = bem.plate(1.0, 1.0), bem.plate(1.0, 1.0, (0.3, 0.2, 0.2))
for bodies in ([bem.box(1.0, 1.0, 1.0)], [lower, upper], [bem.sphere(1.0)]):
    scene = bem.Scene(unit="m")
    for number, body in enumerate(bodies):
        scene.add_conductor(f"body {number}", body)
    try:
        result = bem.extract(scene, 1e-3, threads=1, max_panels=1500)
        caught += [name for name, finding in result.audit.items() if not finding["ok"]]
        caught += [line for line in result.warnings if "energy check" in line]
        caught += [] if result.converged else [f"stopped by {result.stopped_by}, as marked"]
    except bem.SolutionError as problem:
        caught.append(str(problem))
print("; ".join(caught))
"""


@dataclass(frozen=True)
class Verdict:
    """What became of a fault: who caught it, or None, or that it could not be tried."""

    fault: Fault
    caught_by: str | None
    trouble: str = ""
    seconds: float = 0.0


class Copy:
    """A copy of the checkout in which one file at a time is changed.

    Args:
        folder: empty; the copy goes there.

    Attributes:
        broken: names of tests that fail without any fault.
    """

    def __init__(self, folder: Path) -> None:
        self._folder = folder
        self.broken: list[str] = []
        for name in COPIED:
            ignored = shutil.ignore_patterns("__pycache__")
            shutil.copytree(ROOT / name, folder / name, ignore=ignored)
        for path in filter(Path.is_file, ROOT.iterdir()):
            shutil.copy(path, folder)

    def tests(self, patterns: Sequence[str]) -> list[str]:
        """Test files that exist, by patterns of their names; "file::test" names a single test."""
        found = []
        for pattern in patterns:
            file, colons, test = pattern.partition("::")
            for path in sorted((self._folder / "tests").glob(file)):
                found.append(f"{path.relative_to(self._folder)}{colons}{test}")
        return list(dict.fromkeys(found))

    def change(self, fault: Fault) -> Path | None:
        """Put a fault in; returns the file below bem/, or None if its text is not there once."""
        found = []
        for path in sorted((ROOT / "bem").glob(fault.file)):
            text = path.read_text(encoding="utf-8")
            found += [(path.relative_to(ROOT / "bem"), text)] * text.count(fault.old)
        if len(found) != 1:
            return None
        file, text = found[0]
        changed = text.replace(fault.old, fault.new)
        (self._folder / "bem" / file).write_text(changed, encoding="utf-8")
        return file

    def restore(self, file: Path) -> None:
        """Take a fault out again, with the old date, so that older compiled code is valid."""
        shutil.copy2(ROOT / "bem" / file, self._folder / "bem" / file)

    def run(self, words: Sequence[str], cache: str) -> subprocess.CompletedProcess[str]:
        """Run Python in the copy, with compiled code in its folder ``cache``."""
        places = {"PYTHONPATH": str(self._folder), "NUMBA_CACHE_DIR": str(self._folder / cache)}
        environment = {**os.environ, **places, "PYTHONDONTWRITEBYTECODE": "1"}
        words = [sys.executable, *words]
        return subprocess.run(
            words, cwd=self._folder, env=environment, capture_output=True, text=True, check=False
        )

    def pytest(self, words: Sequence[str], cache: str) -> subprocess.CompletedProcess[str]:
        """Run tests, other than those that fail without any fault."""
        passed_over = [f"--deselect=tests/{name}" for name in self.broken]
        return self.run(
            ["-m", "pytest", "-q", "-p", "no:cacheprovider", *passed_over, *words], cache
        )


def caught_by_tests(copy: Copy, files: list[str], cache: str) -> tuple[str | None, str]:
    """Name the test that failed, if one did, and what went wrong if pytest itself did."""
    done = copy.pytest(["-x", *files], cache)
    if done.returncode == 0:
        return None, ""
    names = FAILED.findall(done.stdout)
    if done.returncode == 1 and names:
        return names[0], ""
    return None, f"pytest ended with {done.returncode}: {(done.stdout + done.stderr)[-300:]}"


def caught_by_audit(copy: Copy, cache: str) -> str | None:
    """Tell what the audit says of extractions with the fault, if it says anything."""
    done = copy.run(["-c", AUDIT], cache)
    if done.returncode != 0:
        return f"the extraction itself: {done.stderr.strip().splitlines()[-1]}"
    return f"audit: {done.stdout.strip()[:120]}" if done.stdout.strip() else None


def judge(copy: Copy, fault: Fault, number: int) -> Verdict:
    """Try one fault."""
    start = time.perf_counter()
    file = copy.change(fault)
    if file is None:
        return Verdict(fault, None, f"text not found exactly once in {fault.file}: {fault.old}")
    cache = f"cache_{number}" if fault.compiled else "cache"
    files = copy.tests(fault.tests)
    by, trouble = caught_by_tests(copy, files, cache) if files else (None, "")
    if by is None and not trouble:
        by = caught_by_audit(copy, cache)
    copy.restore(file)
    return Verdict(fault, by, trouble, time.perf_counter() - start)


def try_without(copy: Copy, faults: Sequence[Fault]) -> bool:
    """Note which tests fail as long as nothing is changed; returns whether the audit is silent."""
    files = copy.tests([pattern for fault in faults for pattern in fault.tests])
    done = copy.pytest(files, "cache")
    copy.broken = FAILED.findall(done.stdout)
    for name in copy.broken:
        print(f"fails without any fault, so it catches none: {name}", flush=True)
    by = caught_by_audit(copy, "cache")
    if by or done.returncode not in (0, 1):
        print(f"without any fault: {by or done.stdout[-300:]}")
        return False
    return True


def report(verdict: Verdict) -> None:
    """Print one line."""
    if verdict.trouble:
        outcome = f"NOT TRIED: {verdict.trouble}"
    else:
        outcome = verdict.caught_by or "SURVIVED"
    print(f"{verdict.seconds:6.1f} s  {verdict.fault.what}: {outcome}", flush=True)


def main() -> int:
    """Try the faults one after another."""
    parser = argparse.ArgumentParser(description="Whether deliberate faults are caught.")
    parser.add_argument("--only", default="", help="faults whose words hold this")
    only = parser.parse_args().only
    chosen = [fault for fault in FAULTS if only in fault.what]
    with tempfile.TemporaryDirectory() as folder:
        copy = Copy(Path(folder))
        if not try_without(copy, chosen):
            return 2
        verdicts = []
        for number, fault in enumerate(chosen):
            verdicts.append(judge(copy, fault, number))
            report(verdicts[-1])
    untried = sum(bool(v.trouble) for v in verdicts)
    survived = sum(not v.trouble and v.caught_by is None for v in verdicts)
    print(f"{len(verdicts)} faults: {survived} survived, {untried} not tried")
    return 2 if untried else 1 if survived else 0


if __name__ == "__main__":
    sys.exit(main())
