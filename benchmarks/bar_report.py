"""Tables of how error bars compare with true errors."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass

import numpy as np


@dataclass(frozen=True)
class Entry:
    """One entry of one result, in L (metres).

    Args:
        case: name of the case.
        tolerance: asked.
        kind: "diagonal", "off-diagonal", "row sum" or "slope".
        published: whether the truth comes from outside the solver.
        row: of the matrix.
        column: of the matrix; the number of conductors for a row sum.
        value: reported.
        bar: its error bar.
        truth: what it should be.
        slack: what is not known of the truth.
        size: what the tolerance is relative to: sqrt(L_ii L_jj), L_ii for a row sum.
    """

    case: str
    tolerance: float
    kind: str
    published: bool
    row: int
    column: int
    value: float
    bar: float
    truth: float
    slack: float
    size: float

    @property
    def error(self) -> float:
        """True error."""
        return abs(self.value - self.truth)

    @property
    def inside(self) -> bool:
        """Whether the bar holds."""
        return self.error <= self.bar + self.slack

    @property
    def ratio(self) -> float:
        """Bar over true error."""
        return self.bar / max(self.error, 1e-300)


@dataclass(frozen=True)
class Outcome:
    """How one extraction went."""

    case: str
    tolerance: float
    panels: int
    rounds: int
    stopped_by: str
    seconds: float
    acceptable: bool = False


@dataclass(frozen=True)
class _Row:
    outcome: Outcome
    worst: Entry

    @property
    def text(self) -> str:
        o, e = self.outcome, self.worst
        mark = "inside" if e.inside else "OUTSIDE"
        share = f"{e.error / e.size:9.1e} {e.bar / e.size:9.1e}"
        stop = "" if o.stopped_by == "tolerance" else o.stopped_by
        return (
            f"{o.tolerance:6.0e} {o.panels:6d} {o.seconds:6.2f} s {share} {e.ratio:9.2f} "
            f"{mark:8} {e.case}: {e.kind} {e.row},{e.column} {stop}"
        )


def _rows(entries: list[Entry], outcomes: list[Outcome]) -> list[_Row]:
    """Pick the entry with the smallest ratio of each extraction, smallest first."""
    worst: dict[tuple[str, float], Entry] = {}
    for e in entries:
        key = (e.case, e.tolerance)
        if key not in worst or e.ratio < worst[key].ratio:
            worst[key] = e
    run = {(o.case, o.tolerance): o for o in outcomes}
    return sorted((_Row(run[k], e) for k, e in worst.items()), key=lambda row: row.worst.ratio)


def _line(label: str, entries: list[Entry]) -> str:
    if not entries:
        return f"{label:28} no entries"
    inside = np.mean([e.inside for e in entries])
    low, middle, high = np.percentile([min(e.ratio, 1e9) for e in entries], [5, 50, 95])
    return (
        f"{label:28} {len(entries):5d} entries  inside {100 * inside:5.1f} %  "
        f"bar/error: median {middle:6.2f}  (5 %: {low:.2f}, 95 %: {high:.0f})"
    )


def _groups(entries: list[Entry]) -> Iterable[tuple[str, list[Entry]]]:
    def where(test: Callable[[Entry], bool]) -> list[Entry]:
        return [e for e in entries if test(e)]

    yield "all", entries
    for kind in ("diagonal", "off-diagonal", "row sum", "slope"):
        yield kind, where(lambda e, kind=kind: e.kind == kind)  # type: ignore[misc]
    for t in sorted({e.tolerance for e in entries}, reverse=True):
        yield f"t = {t:g}", where(lambda e, t=t: e.tolerance == t)  # type: ignore[misc]
    yield "value published", where(lambda e: e.published)
    yield "truth by tight run", where(lambda e: not e.published)
    yield "with dielectrics", where(lambda e: ", er " in e.case)
    yield "as it is", where(lambda e: not e.case.endswith(", turned"))
    yield "turned", where(lambda e: e.case.endswith(", turned"))


def print_report(entries: list[Entry], outcomes: list[Outcome], left_out: dict[str, str]) -> None:
    """Print extractions from the worst bar to the best, what is left out, and the totals."""
    print("per extraction, its entry with the smallest bar over error; error and bar over what")
    print("the tolerance is relative to")
    print("     t panels  seconds     error       bar bar/error")
    for row in _rows(entries, outcomes):
        print(row.text)
    failed = [o for o in outcomes if o.panels == 0 and not o.acceptable]
    print(f"\nextractions without a result: {len(failed)}")
    for o in failed:
        print(f"  {o.case}, t = {o.tolerance:g}: {o.stopped_by}")
    print(f"\nleft out: {len(left_out)}")
    for name, reason in left_out.items():
        print(f"  {name}: {reason}")
    print("\ntotals")
    for label, group in _groups(entries):
        print(_line(label, group))
