"""How well the error bars hold, over all cases whose value is known.

    python benchmarks/bench_bars.py --out bars.json

Every case runs at three tolerances, as it is and turned (flat ones read back from
single-precision STL files). An entry is inside if its true error is at most its bar plus what
is not known of the truth; entries whose truth is known to no better than a fifth of the bar
say nothing and are left out, as are those whose case has no result.
"""

from __future__ import annotations

import argparse
import json
import os
import tempfile
import time
from dataclasses import asdict, dataclass, field
from pathlib import Path

for _variable in ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS"):
    os.environ.setdefault(_variable, "1")

import numpy as np  # noqa: E402
from bar_report import Entry, Outcome, print_report  # noqa: E402
from cases import FARAD, LEFT_OUT, Case, Slope, Truth, all_cases, columns, slopes  # noqa: E402
from turned import rounding, scene_of_files, turned  # noqa: E402

import bem  # noqa: E402

TOLERANCES = (1e-2, 1e-3, 1e-4)
TIGHT = 1e-5
MAX_PANELS = {1e-2: 3000, 1e-3: 3000, 1e-4: 4000, TIGHT: 6000}
KNOWN = 0.2
"""A truth must be known to this part of the bar, or the entry says nothing of the bar."""


@dataclass
class Survey:
    """Results so far.

    Args:
        truths: by case name.
        outcomes: one per case and tolerance.
        entries: one per entry of each result.
        left_out: reason by name.
    """

    truths: dict[str, Truth] = field(default_factory=dict)
    outcomes: list[Outcome] = field(default_factory=list)
    entries: list[Entry] = field(default_factory=list)
    left_out: dict[str, str] = field(default_factory=lambda: dict(LEFT_OUT))


@dataclass(frozen=True)
class Solved:
    """A result as columns, the last one the row sums, in L."""

    value: np.ndarray
    bar: np.ndarray
    outcome: Outcome


def solve(name: str, scene: bem.Scene, tolerance: float) -> Solved:
    """Extract on one thread and time it.

    Raises:
        BemError: there is no result.
    """
    start = time.perf_counter()
    result = bem.extract(scene, tolerance, threads=1, max_panels=MAX_PANELS[tolerance])
    seconds = time.perf_counter() - start
    return Solved(
        columns(result.capacitance, result.row_sum) / FARAD,
        columns(result.error, result.row_sum_error) / FARAD,
        Outcome(name, tolerance, result.panels, len(result.rounds), result.stopped_by, seconds),
    )


def tight_truth(case: Case) -> Truth:
    """Find the truth of a case by a run whose bars are far below the others'."""
    found = solve(case.name, case.scene(), TIGHT)
    return Truth(found.value, found.bar, False)


def know(survey: Survey, case: Case) -> Truth | None:
    """Look up or make the truth of a case, or note why there is none."""
    key = case.like or case.name
    if key not in survey.truths:
        if case.truth is not None:
            survey.truths[key] = case.truth
        elif case.like is None:
            _make_truth(survey, case)
    return survey.truths.get(key)


def _make_truth(survey: Survey, case: Case) -> None:
    try:
        survey.truths[case.name] = tight_truth(case)
    except bem.BemError as problem:
        survey.left_out[case.name] = f"the tight run has no result: {problem}"


def compare(survey: Survey, solved: Solved, truth: Truth, extra: float) -> None:
    """Note every entry of a result once; ``extra`` is relative slack of each."""
    n = len(solved.value)
    slack = truth.slack + extra * np.abs(truth.columns)
    root = np.sqrt(np.diagonal(truth.columns))
    size = columns(np.outer(root, root), root**2)
    for i in range(n):
        for j in range(i, n + (n > 1)):
            kind = "diagonal" if i == j else "row sum" if j == n else "off-diagonal"
            entry = Entry(
                solved.outcome.case, solved.outcome.tolerance, kind, truth.published, i, j,
                float(solved.value[i, j]), float(solved.bar[i, j]),
                float(truth.columns[i, j]), float(slack[i, j]), float(size[i, j]),
            )  # fmt: skip
            _note(survey, entry)


def _note(survey: Survey, entry: Entry) -> None:
    if entry.slack <= KNOWN * entry.bar:
        survey.entries.append(entry)
        return
    name = f"{entry.case}, {entry.kind} {entry.row},{entry.column}, t = {entry.tolerance:g}"
    survey.left_out[name] = f"truth known to {entry.slack:.1e}, the bar is {entry.bar:.1e}"


def run_case(survey: Survey, case: Case, tolerance: float, folder: Path | None) -> None:
    """Run one case; from files where ``folder`` is given and the case is flat."""
    truth = know(survey, case)
    if truth is None:
        return
    through_files = folder is not None and case.flat
    try:
        scene = scene_of_files(case, folder) if through_files else case.scene()
        solved = solve(case.name, scene, tolerance)
    except bem.BemError as problem:
        kept = f"refused, as it may: {problem}" if case.may_refuse else f"no result: {problem}"
        survey.left_out[f"{case.name}, t = {tolerance:g}"] = kept
        survey.outcomes.append(Outcome(case.name, tolerance, 0, 0, kept, 0.0, case.may_refuse))
        return
    survey.outcomes.append(solved.outcome)
    compare(survey, solved, truth, rounding(case) if through_files else 0.0)


def run_slope(survey: Survey, slope: Slope, tolerance: float) -> None:
    """Run both lengths and note their difference over that of the lengths."""
    try:
        two = [solve(slope.name, case.scene(), tolerance) for case in (slope.short, slope.long)]
    except bem.BemError as problem:
        survey.left_out[f"{slope.name}, t = {tolerance:g}"] = f"no result: {problem}"
        survey.outcomes.append(Outcome(slope.name, tolerance, 0, 0, str(problem), 0.0))
        return
    step = slope.lengths[1] - slope.lengths[0]
    value = float(two[1].value[0, 0] - two[0].value[0, 0]) / step
    bar = float(two[1].bar[0, 0] + two[0].bar[0, 0]) / step
    survey.outcomes.extend(solved.outcome for solved in two)
    _note(
        survey,
        Entry(
            slope.name, tolerance, "slope", True, 0, 0, value, bar, slope.exact, 1e-6, slope.exact
        ),
    )


def run_all(survey: Survey, tolerances: list[float], only: str) -> None:
    """Run cases whose name holds ``only``, printing a line for each."""
    cases = all_cases()
    by_name = {case.name: case for case in cases}
    for case in [c for c in cases if only in c.name]:
        if case.like:
            know(survey, by_name[case.like])
        for tolerance in tolerances:
            run_case(survey, case, tolerance, None)
            with tempfile.TemporaryDirectory() as folder:
                run_case(survey, turned(case), tolerance, Path(folder))
            print(".", end="", flush=True)
    for slope in [s for s in slopes() if only in s.name]:
        for tolerance in tolerances:
            run_slope(survey, slope, tolerance)
    print()


def save(survey: Survey, path: Path) -> None:
    """Write the raw numbers."""
    record = {
        "unit": "L = C / (4 pi eps0), metres",
        "entries": [asdict(entry) for entry in survey.entries],
        "outcomes": [asdict(outcome) for outcome in survey.outcomes],
        "left_out": survey.left_out,
    }
    path.write_text(json.dumps(record, indent=1) + "\n")


def main() -> None:
    """Run, report and save."""
    parser = argparse.ArgumentParser(description="How well the error bars hold.")
    parser.add_argument("--out", type=Path, help="JSON file for the raw numbers")
    parser.add_argument("--only", default="", help="cases whose name holds this")
    parser.add_argument("--tolerance", type=float, action="append", choices=TOLERANCES)
    options = parser.parse_args()
    survey = Survey()
    run_all(survey, options.tolerance or list(TOLERANCES), options.only)
    if options.out:
        save(survey, options.out)
    print_report(survey.entries, survey.outcomes, survey.left_out)


if __name__ == "__main__":
    main()
