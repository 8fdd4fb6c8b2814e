"""The audit passes sound solutions and catches doctored ones."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from types import SimpleNamespace
from typing import Any

import numpy as np
import pytest
from scenes import scene_of

import bem
from bem.extraction import rounds
from bem.extraction.audit import WILD, WRONG_SIGN, audit
from bem.extraction.estimate import Estimate
from bem.extraction.extract import Limits, MemoryPlan
from bem.extraction.loop import Run
from bem.extraction.marking import Goal
from bem.extraction.solution import Solution
from bem.geometry import shapes
from bem.panels.mesh import Mesh

BODIES = [shapes.box(1.0, 1.0, 1.0), shapes.plate(1.0, 1.0, (0.0, 0.0, 0.8))]


@pytest.fixture(scope="module")
def solved() -> SimpleNamespace:
    """Last round of a sound run of two bodies."""
    run = Run(2, Goal(1e-2), Limits(10**4, MemoryPlan.of(None)), lambda step: None)
    run.go(Mesh.start(BODIES))
    return SimpleNamespace(solution=run.rounds[-1].solution, found=run.rounds[-1].found)


CHECKS = (
    "mean_residual",
    "rms_residual",
    "asymmetry_before_averaging",
    "positive_coupling",
    "negative_row_sum",
)


def test_a_sound_solution_passes(solved: SimpleNamespace) -> None:
    found = audit(solved.solution, solved.found)
    assert not found.wild
    assert set(CHECKS) == set(found.findings)
    assert all(f["ok"] and f["value"] <= f["limit"] for f in found.findings.values())
    assert not found.signs.any()
    assert found.extra < 1e-2


def doctored(solution: Solution, change: Callable[[np.ndarray], np.ndarray]) -> Solution:
    return replace(solution, density=change(solution.density.copy()))


def swap_columns(density: np.ndarray) -> np.ndarray:
    return density[:, ::-1]


def flip_every_other(density: np.ndarray) -> np.ndarray:
    density[::2] *= -1.0
    return density


def flatten(density: np.ndarray) -> np.ndarray:
    """One density for all panels of a body: the right charge in the wrong places."""
    return np.full_like(density, density.mean())


def shuffle(density: np.ndarray) -> np.ndarray:
    return np.random.default_rng(0).permutation(density)


DOCTORED = {
    "ten per cent too much": lambda d: 1.1 * d,
    "ten per cent too little": lambda d: 0.9 * d,
    "4 pi forgotten": lambda d: d / (4.0 * np.pi),
    "all signs flipped": lambda d: -d,
    "every other sign flipped": flip_every_other,
    "columns exchanged": swap_columns,
    "panels shuffled": shuffle,
    "one density for all": flatten,
}


@pytest.mark.parametrize("name", DOCTORED)
def test_a_doctored_density_is_caught(solved: SimpleNamespace, name: str) -> None:
    """The potential that it makes, recomputed off the sample points, is not that asked for."""
    found = audit(doctored(solved.solution, DOCTORED[name]), solved.found)
    assert found.wild
    assert not (found.findings["mean_residual"]["ok"] and found.findings["rms_residual"]["ok"])


def test_a_small_error_of_the_energy_enters_the_bar(solved: SimpleNamespace) -> None:
    """Four per cent too much is no wild result, but no bar may hide it."""
    found = audit(doctored(solved.solution, lambda d: 1.04 * d), solved.found)
    assert not found.wild
    assert 0.01 < found.extra < WILD


def with_entry(found: Estimate, place: tuple[int, int], value: float) -> Estimate:
    changed = found.value.copy()
    changed[place] = value
    return replace(found, value=changed)


@pytest.mark.parametrize(
    ("place", "sign", "check"), [((0, 1), 1.0, CHECKS[3]), ((1, 2), -1.0, CHECKS[4])]
)
def test_signs_that_no_maxwell_matrix_has(
    solved: SimpleNamespace, place: tuple[int, int], sign: float, check: str
) -> None:
    """A little beyond the bar widens it until it reaches zero; far beyond is an error."""
    largest, bar = np.diagonal(solved.found.value).max(), solved.found.bar[place]
    near = with_entry(solved.found, place, sign * (bar + 0.5 * WRONG_SIGN * largest))
    mild = audit(solved.solution, near)
    assert not mild.wild
    assert mild.signs[place] == pytest.approx(0.5 * WRONG_SIGN * largest)
    assert np.count_nonzero(mild.signs) == 1
    far = with_entry(solved.found, place, sign * (bar + 2.0 * WRONG_SIGN * largest))
    assert any(check.replace("_", " ") in line for line in audit(solved.solution, far).wild)


def test_a_lopsided_operator_is_caught(solved: SimpleNamespace) -> None:
    """Reciprocity is judged on the two rows of each pair, before they are made one."""
    operator = solved.solution.operator

    class Lopsided:
        size = operator.size

        @staticmethod
        def near_rows(rows: np.ndarray) -> np.ndarray:
            values = operator.near_rows(rows)
            return values * (1.0 + 0.02 * np.sign(np.arange(operator.size) - rows[:, None]))

    found = audit(replace(solved.solution, operator=Lopsided()), solved.found)
    assert not found.findings["asymmetry_before_averaging"]["ok"]
    assert any("asymmetry" in line for line in found.wild)


def doctor_the_solver(monkeypatch: pytest.MonkeyPatch, factor: float) -> None:
    plain = rounds.solve_round

    def solve(*arguments: Any) -> Solution:
        return doctored(plain(*arguments), lambda d: factor * d)

    monkeypatch.setattr(rounds, "solve_round", solve)


@pytest.mark.filterwarnings("ignore:invalid value encountered in sqrt")
@pytest.mark.parametrize("factor", [-1.0, 0.8, 1.2, 4.0 * np.pi])
def test_an_extraction_with_a_wrong_solver_ends_in_words(
    monkeypatch: pytest.MonkeyPatch, factor: float
) -> None:
    doctor_the_solver(monkeypatch, factor)
    with pytest.raises(bem.SolutionError) as failure:
        bem.extract(scene_of(BODIES), tolerance=1e-2, threads=1)
    message = str(failure.value)
    assert "the limit is" in message or "not positive definite" in message
    assert "bem inspect" in message


def test_an_extraction_slightly_off_says_so(monkeypatch: pytest.MonkeyPatch) -> None:
    """Bars are widened to what the energy check found, and the result is marked."""
    true = bem.extract(scene_of(BODIES), tolerance=1e-2, threads=1)
    doctor_the_solver(monkeypatch, 1.04)
    result = bem.extract(scene_of(BODIES), tolerance=1e-2, threads=1)
    assert not result.converged
    assert any("energy check adds" in line for line in result.warnings)
    assert np.all(result.error > 1.5 * true.error)


def test_findings_travel_with_the_result() -> None:
    result = bem.extract(scene_of(BODIES), tolerance=1e-2, threads=1)
    assert set(CHECKS) == set(result.audit)
    assert all(set(f) == {"value", "limit", "ok"} for f in result.audit.values())
    assert all(f["ok"] for f in result.audit.values())
