"""What an extraction is asked for, how it stops, and what it tells."""

from __future__ import annotations

import math
import os
import tracemalloc
from typing import Any

import numpy as np
import pytest
from scenes import moved, scene_of

import bem
from bem.extraction import extract as module
from bem.extraction import rounds
from bem.extraction.memory import MemoryPlan, readable
from bem.extraction.progress import Progress
from bem.extraction.threads import use_threads
from bem.geometry import shapes
from bem.kernels.parallel import workers


def cube_scene() -> bem.Scene:
    return scene_of([shapes.box(1.0, 1.0, 1.0)])


def screened_pair() -> bem.Scene:
    """Two small boxes with a wide sheet between them: a weak coupling."""
    return scene_of(
        [
            shapes.box(0.3, 0.3, 0.3, (0.0, 0.0, -0.5)),
            shapes.box(0.3, 0.3, 0.3, (0.0, 0.0, 0.5)),
            shapes.plate(2.0, 2.0),
        ]
    )


WEAK = ("c0", "c1")


@pytest.mark.parametrize("tolerance", [0.1, 1e-2, 1e-3, 1e-4])
def test_bars_are_within_the_tolerance(tolerance: float) -> None:
    result = bem.extract(cube_scene(), tolerance=tolerance, threads=1)
    assert result.converged and result.stopped_by == "tolerance"
    assert np.all(result.error <= tolerance * result.capacitance)
    assert result.tolerance == tolerance
    assert result.rounds[-1].worst <= 1.0 < result.rounds[-2].worst


def test_a_tighter_tolerance_takes_more_panels_and_gives_smaller_bars() -> None:
    loose, tight = (bem.extract(cube_scene(), tolerance=t, threads=1) for t in (1e-2, 1e-4))
    assert tight.panels > loose.panels
    assert tight.error[0, 0] < 0.05 * loose.error[0, 0]


def test_a_pair_is_brought_to_its_own_accuracy() -> None:
    """The weak coupling is far below the tolerance of the matrix, unless it is asked for."""
    plain = bem.extract(screened_pair(), tolerance=1e-2, threads=1)
    asked = bem.extract(screened_pair(), tolerance=1e-2, pairs={WEAK: 0.02}, threads=1)
    relative = [r.error[0, 1] / abs(r.capacitance[0, 1]) for r in (plain, asked)]
    assert abs(plain.capacitance[0, 1]) < 0.05 * plain.capacitance[0, 0]
    assert relative[0] > 0.02 >= relative[1]
    assert asked.converged
    assert asked.pairs == {WEAK: 0.02}
    assert asked.used.max() <= 1.0
    apart = abs(asked.capacitance[0, 1] - plain.capacitance[0, 1])
    assert apart <= asked.error[0, 1] + plain.error[0, 1]


def test_a_pair_steers_refinement_to_its_bodies() -> None:
    """More panels go to the pair, fewer than a tight tolerance for all would take."""
    plain = bem.extract(screened_pair(), tolerance=1e-2, threads=1)
    asked = bem.extract(screened_pair(), tolerance=1e-2, pairs={WEAK: 0.01}, threads=1)
    accuracy = 0.01 * abs(asked.capacitance[0, 1]) / asked.capacitance[0, 0]
    tight = bem.extract(screened_pair(), tolerance=accuracy, threads=1)
    assert plain.panels < asked.panels < tight.panels


def test_a_start_beyond_max_panels_is_refused() -> None:
    """Before and after the flat faces are divided."""
    for most, need in ((1, 6), (10, 24)):
        with pytest.raises(
            bem.InputError, match=f"at least {need} panels .* limit is {most}: raise"
        ):
            bem.extract(cube_scene(), max_panels=most, threads=1)


def test_a_fine_mesh_may_do_at_once() -> None:
    """A sphere of 1280 facets needs no finer panels at 1e-2, and its bar says so."""
    import trimesh

    ball = trimesh.creation.icosphere(subdivisions=3)
    faces = np.hstack([ball.faces, np.full((len(ball.faces), 1), -1)])
    scene = bem.Scene(unit="m")
    scene.add_conductor("ball", bem.Surface(np.array(ball.vertices), faces, smooth=False))
    coarse, fine = (bem.extract(scene, tolerance=t, threads=1) for t in (1e-2, 1e-4))
    assert len(coarse.rounds) == 1 and coarse.converged
    difference = abs(coarse.capacitance[0, 0] - fine.capacitance[0, 0])
    assert difference <= coarse.error[0, 0] + fine.error[0, 0]


def test_names_of_a_pair_in_either_order() -> None:
    first = bem.extract(screened_pair(), tolerance=1e-2, pairs={WEAK: 0.05}, threads=1)
    second = bem.extract(screened_pair(), tolerance=1e-2, pairs={WEAK[::-1]: 0.05}, threads=1)
    assert np.array_equal(first.capacitance, second.capacitance)


@pytest.mark.parametrize("most", [24, 30, 100, 250])
def test_max_panels_stops_and_marks(most: int) -> None:
    """The result so far is returned, marked, and its bar is honest."""
    result = bem.extract(cube_scene(), tolerance=1e-5, max_panels=most, threads=1)
    assert not result.converged
    assert result.stopped_by == "max-panels"
    assert result.panels <= most
    assert result.used.max() > 1.0
    assert result.settings["max_panels"] == most
    assert abs(result.capacitance[0, 0] / bem.EPS0 / 4 / np.pi - 0.660678) <= (
        result.error[0, 0] / bem.EPS0 / 4 / np.pi
    )


def test_memory_refuses_before_anything_is_allocated(monkeypatch: pytest.MonkeyPatch) -> None:
    """No round is begun, and next to nothing has been allocated when it refuses."""

    def never(*arguments: Any) -> None:
        raise AssertionError("a round was begun")

    monkeypatch.setattr(rounds, "solve_round", never)
    scene = scene_of([moved(shapes.box(1, 1, 1)), moved(shapes.plate(1, 1), 0.0, (9, 9, 9))])
    tracemalloc.start()
    try:
        with pytest.raises(bem.MemoryRefused) as refusal:
            bem.extract(scene, memory=10_000, threads=1)
        peak = tracemalloc.get_traced_memory()[1]
    finally:
        tracemalloc.stop()
    assert peak < 20_000_000
    message = str(refusal.value)
    assert "the limit is 10 kB" in message and "--memory" in message and "panels" in message


def test_refusal_states_the_need_of_the_starting_mesh() -> None:
    plan = MemoryPlan.of(10_000_000)
    with pytest.raises(bem.MemoryRefused, match="20000 panels needs 12.8 GB, the limit is 10 MB"):
        plan.check_start(20_000)
    plan.check_start(500)


def test_memory_stops_a_run_that_would_outgrow_it() -> None:
    limit = 2_000_000
    result = bem.extract(cube_scene(), tolerance=1e-5, memory=limit, threads=1)
    assert result.stopped_by == "memory" and not result.converged
    assert MemoryPlan(limit).fits(result.panels)
    assert result.settings["memory_bytes"] == limit


def test_the_plan_covers_what_a_round_holds(monkeypatch: pytest.MonkeyPatch) -> None:
    """Matrices of all rounds, as allocated, never exceed the plan of the last one."""
    tracemalloc.start()
    try:
        result = bem.extract(cube_scene(), tolerance=1e-4, threads=1)
        peak = tracemalloc.get_traced_memory()[1]
    finally:
        tracemalloc.stop()
    last = [r.panels for r in result.rounds[-2:]]
    assert peak < 1.6 * MemoryPlan(0).need(last[1], last[0]) + 20_000_000


def test_default_memory_is_most_of_what_is_free() -> None:
    assert 10_000_000 < MemoryPlan.of(None).limit < 10**15
    assert readable(2.5e9) == "2.5 GB"
    assert readable(3e6) == "3 MB"


def test_progress_tells_every_round() -> None:
    """Phases in order, rounds counted from one, panels growing, time not going backwards."""
    told: list[Progress] = []
    result = bem.extract(cube_scene(), tolerance=1e-3, threads=1, progress=told.append)
    assert told[0].phase == "checking the geometry"
    assert told[0].round == told[0].panels == 0
    solving = [p for p in told if p.phase == "solving"]
    assert [p.round for p in solving] == list(range(1, len(result.rounds) + 1))
    assert [p.panels for p in solving] == [r.panels for r in result.rounds]
    assert math.isnan(solving[0].worst)
    assert [p.worst for p in solving[1:]] == [r.worst for r in result.rounds[:-1]]
    elapsed = [p.elapsed for p in told]
    assert elapsed == sorted(elapsed)


def test_records_of_rounds_lead_to_the_result() -> None:
    result = bem.extract(screened_pair(), tolerance=1e-2, threads=1)
    panels = [r.panels for r in result.rounds]
    assert panels == sorted(panels) and result.panels == panels[-1]
    assert len(result.rounds) >= 4
    last = result.rounds[-1]
    assert last.capacitance == pytest.approx(result.capacitance, rel=1e-9, abs=0.0)
    assert last.error == pytest.approx(result.error, rel=1e-9, abs=0.0)
    assert all(r.seconds <= result.seconds["total"] for r in result.rounds)
    assert all(np.all(np.diag(r.capacitance) > 0.0) for r in result.rounds)


def interrupted_at(number: int, monkeypatch: pytest.MonkeyPatch) -> None:
    """Have the solver interrupted in the round of that number, from one."""
    plain, begun = rounds.solve_round, []

    def solve(*arguments: Any) -> Any:
        begun.append(1)
        if len(begun) == number:
            raise KeyboardInterrupt
        return plain(*arguments)

    monkeypatch.setattr(rounds, "solve_round", solve)


def test_an_interrupt_returns_the_best_result_so_far(monkeypatch: pytest.MonkeyPatch) -> None:
    interrupted_at(4, monkeypatch)
    result = bem.extract(cube_scene(), tolerance=1e-4, threads=1)
    assert result.stopped_by == "interrupt" and not result.converged
    assert len(result.rounds) == 3
    assert len(result.density) == result.panels
    monkeypatch.undo()
    whole = bem.extract(cube_scene(), tolerance=1e-4, threads=1)
    assert result.capacitance == pytest.approx(whole.rounds[2].capacitance, rel=1e-9, abs=0.0)


def test_an_interrupt_before_any_result_is_passed_on(monkeypatch: pytest.MonkeyPatch) -> None:
    interrupted_at(1, monkeypatch)
    with pytest.raises(KeyboardInterrupt):
        bem.extract(cube_scene(), tolerance=1e-4, threads=1)


def test_an_interrupt_from_the_progress_call_counts_too() -> None:
    def stop(step: Progress) -> None:
        if step.round == 3:
            raise KeyboardInterrupt

    result = bem.extract(cube_scene(), tolerance=1e-4, threads=1, progress=stop)
    assert result.stopped_by == "interrupt"
    assert len(result.rounds) == 2


def broken_at(number: int, monkeypatch: pytest.MonkeyPatch) -> None:
    plain, begun = rounds.solve_round, []

    def solve(*arguments: Any) -> Any:
        begun.append(1)
        if len(begun) >= number:
            raise bem.SolutionError("not positive definite")
        return plain(*arguments)

    monkeypatch.setattr(rounds, "solve_round", solve)


def test_a_breakdown_late_keeps_the_result_and_early_does_not(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    """After enough rounds for a bar the last good one is returned, marked."""
    broken_at(5, monkeypatch)
    result = bem.extract(cube_scene(), tolerance=1e-5, threads=1)
    assert result.stopped_by == "breakdown" and not result.converged
    monkeypatch.undo()
    broken_at(2, monkeypatch)
    with pytest.raises(bem.SolutionError, match="not positive definite"):
        bem.extract(cube_scene(), tolerance=1e-5, threads=1)


def test_threads_are_set_while_it_runs_and_put_back() -> None:
    before = workers()
    during: list[int] = []
    result = bem.extract(
        cube_scene(), tolerance=0.1, threads=1, progress=lambda p: during.append(p.round)
    )
    assert result.settings["threads"] == 1
    assert workers() == before
    with use_threads(1) as used:
        assert used == workers() == 1
    assert workers() == before


def test_all_usable_cores_by_default() -> None:
    with use_threads(None) as used:
        assert used == workers() >= 1


def test_the_number_of_threads_changes_no_digit() -> None:
    most = min(2, os.cpu_count() or 1)
    one, more = (bem.extract(screened_pair(), 1e-2, threads=n) for n in (1, most))
    assert np.array_equal(one.capacitance, more.capacitance)
    assert np.array_equal(one.error, more.error)


WRONG = {
    "tolerance 0": ({"tolerance": 0.0}, "tolerance: found 0.0, allowed is 1e-06 to 0.5"),
    "tolerance 1": ({"tolerance": 1}, "tolerance: found 1, allowed is 1e-06 to 0.5"),
    "tolerance nan": ({"tolerance": math.nan}, "tolerance: found nan, allowed is"),
    "tolerance text": ({"tolerance": "1%"}, "tolerance: found '1%', allowed is"),
    "max_panels 0": ({"max_panels": 0}, "max_panels: found 0, needs a whole number of at least 1"),
    "max_panels text": ({"max_panels": "many"}, "max_panels: found 'many', needs"),
    "max_panels half": ({"max_panels": 10.5}, "max_panels: found 10.5, needs a whole number"),
    "memory 0": ({"memory": 0}, "memory: found 0 bytes, needs a number of at least 1"),
    "memory text": ({"memory": "2GB"}, "memory: found '2GB' bytes, needs a number"),
    "threads 0": ({"threads": 0}, "threads: found 0, allowed is 1 to "),
    "threads many": ({"threads": 10**6}, "threads: found 1000000, allowed is 1 to "),
    "threads text": ({"threads": "2"}, "threads: found '2', allowed is 1 to "),
    "unknown name": (
        {"pairs": {("c0", "rod"): 0.1}},
        "pair: no conductor is named 'rod'; there are c0, c1, c2",
    ),
    "same name": ({"pairs": {("c0", "c0"): 0.1}}, "pair: found 'c0' twice, needs two different"),
    "no pair": ({"pairs": {("c0",): 0.1}}, "pair: found ('c0',), needs a tuple of two names"),
    "accuracy 0": ({"pairs": {WEAK: 0.0}}, "pair: found accuracy 0.0, allowed is 1e-06 to 1"),
    "accuracy text": ({"pairs": {WEAK: "2%"}}, "pair: found accuracy '2%', allowed is"),
}


@pytest.mark.parametrize("name", WRONG)
def test_wrong_arguments_are_named_with_what_is_allowed(name: str) -> None:
    arguments, message = WRONG[name]
    with pytest.raises(bem.UsageError) as refusal:
        bem.extract(screened_pair(), **arguments)
    assert message in str(refusal.value)


def test_a_scene_without_conductors_is_refused() -> None:
    with pytest.raises(bem.UsageError, match="the scene has no conductors: add at least one"):
        bem.extract(bem.Scene(unit="m"))


def test_bodies_that_touch_are_refused_before_solving(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(rounds, "solve_round", lambda *_: pytest.fail("a round was begun"))
    touching = scene_of([shapes.box(1, 1, 1), shapes.box(1, 1, 1, (1.0, 0.2, 0.0))])
    with pytest.raises(bem.GeometryError) as refusal:
        bem.extract(touching, threads=1)
    assert "c0" in str(refusal.value) and "c1" in str(refusal.value)


def test_parts_of_the_bar_sum_to_the_bar() -> None:
    """All parts are there, none is negative, the two that never vanish are in use."""
    result = bem.extract(screened_pair(), tolerance=1e-2, threads=1)
    total = sum(result.budget.values())
    assert total == pytest.approx(result.error, rel=1e-9, abs=0.0)
    assert all(np.all(part >= 0.0) for part in result.budget.values())
    for name in ("discretisation", "trend", "quadrature"):
        assert np.all(result.budget[name] > 0.0), name


def test_facets_of_curved_bodies_have_their_part_of_the_bar() -> None:
    flat = bem.extract(cube_scene(), tolerance=1e-2, threads=1)
    curved = bem.extract(scene_of([shapes.sphere(1.0)]), tolerance=1e-2, threads=1)
    assert not flat.budget["faceting"].any()
    assert np.all(curved.budget["faceting"] > 0.0)


def test_densities_reproduce_the_charges() -> None:
    """Area times density in C/m^2 per volt, summed over a conductor, is the raw matrix entry.

    It differs from the value by the extrapolation, which is of the size of the bar.
    """
    result = bem.extract(screened_pair(), tolerance=1e-3, threads=1)
    corners = result.panel_corners
    area = 0.5 * np.linalg.norm(
        np.cross(corners[:, 2] - corners[:, 0], corners[:, 3] - corners[:, 1]), axis=1
    )
    owner = result.panel_conductor[:, None] == np.arange(3)
    charge = owner.T @ (area[:, None] * result.density)
    assert corners.shape == (result.panels, 4, 3)
    assert area @ owner == pytest.approx([0.54, 0.54, 4.0])
    root = np.sqrt(np.diag(result.capacitance))
    assert np.all(np.abs(charge - result.capacitance) < 5e-3 * np.outer(root, root))
    assert charge == pytest.approx(charge.T, rel=1e-9, abs=0.0)
    assert np.all(np.diag(charge) < np.diag(result.capacitance))


@pytest.mark.parametrize("size", [1e-6, 1e3])
def test_densities_and_corners_wear_metres(size: float) -> None:
    """A uniform density on a ball: eps0 / R per volt, whatever its size and medium."""
    scene = bem.Scene(unit="m", relative_permittivity=2.0)
    scene.add_conductor("ball", shapes.sphere(size))
    result = bem.extract(scene, tolerance=1e-2, threads=1)
    assert np.linalg.norm(result.panel_corners, axis=2).max() == pytest.approx(
        size, rel=1e-9, abs=0.0
    )
    assert np.median(result.density) == pytest.approx(2.0 * bem.EPS0 / size, rel=0.05, abs=0.0)
    assert np.all(result.density > 0.0)


def test_what_determines_the_run_travels_with_the_result() -> None:
    result = bem.extract(cube_scene(), tolerance=0.1, threads=1)
    assert result.version == bem.__version__
    assert result.settings["max_panels"] == module.MAX_PANELS
    assert result.settings["relative_permittivity"] == 1.0
    assert result.conductors == ("c0",)
    assert [entry["name"] for entry in result.inputs] == ["c0"]
    assert set(result.seconds) == {"geometry", "rounds", "audit", "total"}
    parts = sum(result.seconds[k] for k in ("geometry", "rounds", "audit"))
    assert parts <= result.seconds["total"] * (1.0 + 1e-9)


def test_two_runs_give_the_same_bits() -> None:
    first, second = (bem.extract(screened_pair(), 1e-2, threads=1) for _ in range(2))
    assert np.array_equal(first.capacitance, second.capacitance)
    assert np.array_equal(first.error, second.error)
    assert first.audit == second.audit


@pytest.mark.parametrize("shape", [shapes.box(1.0, 1.0, 1.0), shapes.sphere(0.6)])
def test_what_leaks_past_a_shield_is_inside_its_bar(shape: bem.Surface) -> None:
    """Couplings of 1e-5 of the diagonal, by default and asked for by name, against a tight pair."""
    scene = bem.Scene(unit="mm")
    scene.add_conductor("above", shape, place=bem.Place(shift=(1.0, 0.0, 3.0)))
    scene.add_conductor("below", shape, place=bem.Place(shift=(0.0, 0.0, -2.0)))
    scene.add_conductor("shield", shapes.plate(20.0, 20.0))
    pair = ("above", "below")
    truth = bem.extract(scene, pairs={pair: 0.01}, threads=1)
    assert truth.converged
    for pairs in ({}, {pair: 0.2}, {pair: 0.05}):
        found = bem.extract(scene, pairs=pairs, threads=1)
        apart = abs(found.capacitance[0, 1] - truth.capacitance[0, 1])
        assert apart <= found.error[0, 1] + truth.error[0, 1]
        assert found.error[0, 1] <= max(pairs.values(), default=1.0) * abs(found.capacitance[0, 1])
