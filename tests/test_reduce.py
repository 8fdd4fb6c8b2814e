"""Grounded, floating and tied: reduced matrices and their bars, against other routes."""

from __future__ import annotations

import dataclasses
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from reference_values import BY_NAME
from scenes import FARAD, scene_of_reference
from test_results import assert_same, sample_result

import bem
from bem.errors import SolutionError, UsageError
from bem.results.reduction import SECOND_ORDER
from bem.results.result import CapacitanceResult, Reduction, Round

GUARD_RING = BY_NAME["guard ring"].matrix
"""L of a thin disc, the ring around it and the plate below (spectral method, ten digits)."""

DISC, RING, PLATE = NAMES = ("disc", "ring", "plate")


def result_of(value: np.ndarray, bar: Any = None, **changes: Any) -> CapacitanceResult:
    """Make a result of a matrix of lengths, with bars, conductors c0, c1, ... or as named."""
    matrix = FARAD * np.asarray(value, dtype=float)
    bars = FARAD * np.broadcast_to(1e-4 if bar is None else bar, matrix.shape)
    usual = {"names": tuple(f"c{k}" for k in range(len(matrix))), "row_sum": matrix.sum(axis=1)}
    return sample_result(matrix, bars, **{**usual, **changes})


def guard_ring(**changes: Any) -> CapacitanceResult:
    return result_of(GUARD_RING, names=NAMES, **changes)


def network(count: int, seed: int) -> np.ndarray:
    """Capacitance matrix (count, count) of capacitors between all nodes and to ground."""
    rng = np.random.default_rng(seed)
    between = np.triu(rng.uniform(0.05, 1.0, (count, count)), 1)
    between += between.T
    return np.diag(between.sum(axis=1) + rng.uniform(0.02, 1.0, count)) - between


def charges(value: np.ndarray, grounded: list[int], afloat: list[list[int]], tied: list[list[int]]):
    """Matrix of the terminals ``tied`` from one linear system for all potentials and charges.

    Unknown are n potentials and n charges; every conductor gives Q = C V, every node one
    potential, and each terminal a potential that is set, each floating node no charge.
    """
    n = len(value)
    found = np.empty((len(tied), len(tied)))
    for column in range(len(tied)):
        rows, right = [np.hstack([value, -np.eye(n)])], [np.zeros(n)]
        for group in [*tied, *afloat]:
            for other in group[1:]:
                rows.append(np.eye(1, 2 * n, group[0]) - np.eye(1, 2 * n, other))
                right.append(np.zeros(1))
        for k in grounded:
            rows.append(np.eye(1, 2 * n, k))
            right.append(np.zeros(1))
        for group in afloat:
            rows.append(sum(np.eye(1, 2 * n, n + k) for k in group))
            right.append(np.zeros(1))
        for number, group in enumerate(tied):
            rows.append(np.eye(1, 2 * n, group[0]))
            right.append(np.full(1, float(number == column)))
        state = np.linalg.solve(np.vstack(rows), np.concatenate(right))
        found[:, column] = [state[n:][group].sum() for group in tied]
    return found


def close(found: np.ndarray, lengths: Any, rel: float = 1e-12) -> None:
    np.testing.assert_allclose(found, FARAD * np.asarray(lengths), rtol=rel, atol=0.0)


# by hand


def test_grounding_is_leaving_out_rows_and_columns() -> None:
    small = guard_ring().reduced(ground=[RING])
    assert small.conductors == (DISC, PLATE)
    close(small.capacitance, GUARD_RING[np.ix_([0, 2], [0, 2])])
    close(small.error, np.full((2, 2), 1e-4))


def test_row_sums_then_lead_to_ground_too() -> None:
    small = guard_ring().reduced(ground=[RING])
    close(small.row_sum, [1.4889468833 - 0.5721820418, 3.1308069413 - 0.5721820418])


def test_one_floating_node_by_its_formula() -> None:
    """C_ij - C_if C_fj / C_ff (condensation by hand)."""
    small = guard_ring().reduced(floating=[RING])
    f = GUARD_RING[[0, 2], 1]
    expected = GUARD_RING[np.ix_([0, 2], [0, 2])] - np.outer(f, f) / GUARD_RING[1, 1]
    close(small.capacitance, expected)
    close(small.row_sum, expected.sum(axis=1))


def test_tied_conductors_add_up() -> None:
    small = guard_ring().reduced(tie=[(DISC, RING)])
    assert small.conductors == ("disc+ring", PLATE)
    own = 1.4889468833 + 3.2985860925 - 2 * 0.8291798008
    mutual = -0.5721820418 - 1.8288243487
    close(small.capacitance, [[own, mutual], [mutual, 3.1308069413]])
    close(small.error, [[4e-4, 2e-4], [2e-4, 1e-4]])


def test_a_floating_plate_between_two_makes_a_series() -> None:
    """1 / (1 / C1 + 1 / C2), with nothing to the surroundings."""
    c1, c2 = 2.0, 3.0
    value = [[c1, -c1, 0], [-c1, c1 + c2, -c2], [0, -c2, c2]]
    small = result_of(value, 1e-9).reduced(floating=["c1"])
    series = 1.0 / (1.0 / c1 + 1.0 / c2)
    close(small.capacitance, [[series, -series], [-series, series]])
    assert np.all(np.abs(small.row_sum) <= 1e-15 * FARAD)


def test_two_spheres_and_a_floating_third_far_apart() -> None:
    """Potentials of point charges: the third one holds none, and so might as well be absent."""
    radius, d = np.array([1.0, 2.0, 1.5]), np.array([[0, 50, 80], [50, 0, 60], [80, 60, 0]])
    potential = np.divide(1.0, d, out=np.zeros((3, 3)), where=d > 0) + np.diag(1.0 / radius)
    small = result_of(np.linalg.inv(potential), 1e-9).reduced(floating=["c2"])
    close(small.capacitance, np.linalg.inv(potential[:2, :2]))


def test_grounded_between_concentric_shells() -> None:
    """Radii 1, 2, 4: with the middle one grounded inside and outside are apart.

    C' of the outer gap is r R / (R - r); the outermost has R to infinity besides.
    """
    a, b, c = 1.0, 2.0, 4.0
    inner, outer = a * b / (b - a), b * c / (c - b)
    value = [[inner, -inner, 0], [-inner, inner + outer, -outer], [0, -outer, outer + c]]
    small = result_of(value, 1e-6).reduced(ground=["c1"])
    close(small.capacitance, [[inner, 0], [0, outer + c]])
    afloat = result_of(value, 1e-6).reduced(floating=["c1"])
    series = 1.0 / (1.0 / inner + 1.0 / outer)
    close(afloat.capacitance, [[series, -series], [-series, series + c]])


# any wiring of any network


@st.composite
def wirings(draw: st.DrawFn) -> tuple[int, dict[str, list[list[int]]]]:
    """Draw a seed and a split of six conductors to grounded, floating and terminal nodes."""
    group = draw(st.lists(st.integers(0, 4), min_size=6, max_size=6))
    group[0] = 0
    state = ["tied", *draw(st.lists(st.sampled_from(["tied", "afloat", "ground"]), min_size=4,
                                    max_size=4))]  # fmt: skip
    nodes: dict[str, list[list[int]]] = {"tied": [], "afloat": [], "ground": []}
    for number in dict.fromkeys(group):
        nodes[state[number]].append([k for k in range(6) if group[k] == number])
    return draw(st.integers(0, 10**6)), nodes


def reduce_by(result: CapacitanceResult, nodes: dict[str, list[list[int]]]) -> CapacitanceResult:
    label = {id(g): f"n{g[0]}" for groups in nodes.values() for g in groups if len(g) > 1}
    ties = {label[id(g)]: [f"c{k}" for k in g] for gs in nodes.values() for g in gs if len(g) > 1}
    ground, afloat = ([f"c{g[0]}" for g in nodes[state]] for state in ("ground", "afloat"))
    return result.reduced(ground, afloat, ties)


@settings(max_examples=60, deadline=None)
@given(drawn=wirings())
def test_any_wiring_agrees_with_one_system_for_potentials_and_charges(drawn: Any) -> None:
    seed, nodes = drawn
    value = network(6, seed)
    small = reduce_by(result_of(value), nodes)
    grounded = [k for group in nodes["ground"] for k in group]
    expected = charges(value, grounded, nodes["afloat"], nodes["tied"])
    close(small.capacitance, expected, 1e-9)
    close(small.row_sum, expected.sum(axis=1), 1e-9)


def perturbed(value: np.ndarray, bar: np.ndarray, row_bar: np.ndarray, rng: Any) -> np.ndarray:
    """Move a matrix inside its bars, symmetrically, so that row sums stay inside theirs."""
    move = np.triu(rng.uniform(-1.0, 1.0, value.shape) if rng.random() < 0.5
                   else rng.choice([-1.0, 1.0], value.shape))  # fmt: skip
    move = (move + np.triu(move, 1).T) * bar
    return value + move * min(1.0, float((row_bar / np.abs(move.sum(axis=1))).min()))


@settings(max_examples=80, deadline=None)
@given(drawn=wirings(), size=st.sampled_from([1e-5, 1e-3, 1e-2]), narrow=st.booleans())
def test_bars_hold_for_every_matrix_inside_the_bars(drawn: Any, size: float, narrow: bool) -> None:
    """Also where they are so large that the second order counts, and with tight row sums."""
    seed, nodes = drawn
    value, rng = network(6, seed), np.random.default_rng(seed)
    bar = size * rng.uniform(0.1, 1.0, (6, 6))
    bar = bar + bar.T
    row_bar = bar.sum(axis=1) * (0.05 if narrow else 1.0)
    small = reduce_by(result_of(value, bar, row_sum_error=FARAD * row_bar), nodes)
    grounded = [k for group in nodes["ground"] for k in group]
    for _ in range(40):
        true = FARAD * charges(
            perturbed(value, bar, row_bar, rng), grounded, nodes["afloat"], nodes["tied"]
        )
        slack = 1e-12 * np.abs(true).max()
        assert np.all(np.abs(true - small.capacitance) <= small.error + slack)
        assert np.all(np.abs(true.sum(axis=1) - small.row_sum) <= small.row_sum_error + slack)


def test_bars_are_no_larger_than_they_must_be() -> None:
    """Some matrix inside the bars comes within 1 % of every bar of a floating reduction."""
    value, bar = network(4, 3), 1e-4
    small = result_of(value, bar).reduced(floating=["c3"])
    true = FARAD * charges(value + bar, [], [[3]], [[0], [1], [2]])
    assert np.all(np.abs(true - small.capacitance) >= 0.99 * small.error)


@pytest.fixture(scope="module")
def extracted() -> CapacitanceResult:
    """Solve the guard ring itself."""
    return bem.extract(scene_of_reference(BY_NAME["guard ring"]), tolerance=5e-3, threads=1)


@pytest.mark.parametrize(
    ("ground", "afloat", "tied"),
    [
        ([], [[1]], [[0], [2]]),
        ([1], [[2]], [[0]]),
        ([2], [], [[0, 1]]),
        ([], [[1, 2]], [[0]]),
        ([], [], [[0, 1, 2]]),
        ([], [[0], [1]], [[2]]),
    ],
)
def test_an_extraction_keeps_its_bars_and_tolerance(
    extracted: CapacitanceResult, ground: list[int], afloat: list[list[int]], tied: list[list[int]]
) -> None:
    """Spectral values of the record, reduced by one linear system."""
    nodes = {"ground": [[k] for k in ground], "afloat": afloat, "tied": tied}
    small = reduce_by(extracted, nodes)
    expected = FARAD * charges(GUARD_RING, ground, afloat, tied)
    assert small.converged and small.used.max() <= 2.5
    assert np.all(np.abs(small.capacitance - expected) <= small.error)
    assert np.all(np.abs(small.capacitance - expected) <= small.allowance)
    assert np.all(np.abs(small.row_sum - expected.sum(axis=1)) <= small.row_sum_error)


# the order does not matter


def test_grounding_one_by_one_or_together_is_the_same() -> None:
    result = result_of(network(5, 1))
    together = result.reduced(ground=["c1", "c3"])
    after = result.reduced(ground=["c1"]).reduced(ground=["c3"])
    np.testing.assert_allclose(after.capacitance, together.capacitance, rtol=1e-13)
    assert after.reduction == together.reduction


def test_floating_one_by_one_or_together_is_the_same() -> None:
    result = result_of(network(5, 2))
    together = result.reduced(floating=["c1", "c3"])
    after = result.reduced(floating=["c1"]).reduced(floating=["c3"])
    np.testing.assert_allclose(after.capacitance, together.capacitance, rtol=1e-12)
    assert after.reduction == together.reduction
    assert np.all(after.error >= together.error * (1.0 - 1e-9))


def test_tied_and_then_floating_is_one_floating_node() -> None:
    result = result_of(network(5, 4))
    at_once = result.reduced(tie=[("c1", "c3")], floating=["c1+c3"])
    after = result.reduced(tie=[("c1", "c3")]).reduced(floating=["c1+c3"])
    np.testing.assert_allclose(after.capacitance, at_once.capacitance, rtol=1e-12)
    assert (
        after.reduction
        == at_once.reduction
        == Reduction({name: (name,) for name in ("c0", "c2", "c4")}, (), (("c1", "c3"),))
    )


def test_tied_to_ground_is_grounded() -> None:
    result = result_of(network(4, 5))
    tied = result.reduced(ground=["c1"]).capacitance
    both = result.reduced(ground=["c1"], tie=[("c1", "c2")])
    assert both.conductors == ("c0", "c3")
    np.testing.assert_array_equal(both.capacitance, tied[np.ix_([0, 2], [0, 2])])


# bars of row sums


def test_row_sums_of_a_shielded_body_keep_their_tight_bars() -> None:
    value = np.array([[5.0, -5.0, 0.0], [-5.0, 9.0, -1.0], [0.0, -1.0, 2.0]])
    tight = FARAD * np.array([1e-9, 1e-4, 1e-4])
    result = result_of(value, 1e-3, row_sum_error=tight)
    tied = result.reduced(tie=[("c1", "c2")])
    close(tied.row_sum_error, [1e-9, 2e-4], 1e-9)
    afloat = result.reduced(floating=["c2"])
    shielded, potential = afloat.row_sum_error[0] / FARAD, 0.5
    assert shielded == pytest.approx(1e-9 + 1e-3 * (1 - potential), rel=0.01)


def test_a_single_terminal_has_one_bar_for_both() -> None:
    small = guard_ring().reduced(ground=[RING, PLATE])
    close(small.row_sum, small.capacitance[0] / FARAD, 1e-9)
    close(small.row_sum_error, small.error[0] / FARAD)


# what travels along


def test_rounds_are_reduced_by_their_own_matrices() -> None:
    first = Round(12, FARAD * network(3, 7), np.full((3, 3), FARAD * 1e-2), 5.0, 0.1)
    last = Round(40, FARAD * network(3, 8), np.full((3, 3), FARAD * 1e-4), 0.5, 0.2)
    result = result_of(network(3, 8), rounds=(first, last))
    small = result.reduced(floating=["c2"])
    assert [r.panels for r in small.rounds] == [12, 40]
    close(small.rounds[0].capacitance, charges(network(3, 7), [], [[2]], [[0], [1]]))
    np.testing.assert_array_equal(small.rounds[1].error, small.error)
    assert small.rounds[1].worst == pytest.approx(small.used.max())


def test_a_round_whose_bars_are_too_large_has_no_bars() -> None:
    early = Round(12, FARAD * network(3, 8), np.full((3, 3), FARAD * 10.0), 99.0, 0.1)
    small = result_of(network(3, 8), rounds=(early,)).reduced(floating=["c2"])
    assert np.isinf(small.rounds[0].error).all() and np.isfinite(small.error).all()


def test_parts_of_the_bars_still_add_up() -> None:
    small = result_of(network(4, 9), 1e-3).reduced(ground=["c1"], floating=["c3"])
    assert list(small.budget) == ["discretisation", "quadrature", SECOND_ORDER]
    np.testing.assert_allclose(sum(small.budget.values()), small.error, rtol=1e-12)
    kept = result_of(network(4, 9), 1e-3).reduced(ground=["c1"])
    assert list(kept.budget) == ["discretisation", "quadrature"]
    np.testing.assert_allclose(kept.budget["quadrature"], 0.25 * kept.error, rtol=1e-12)


def test_densities_are_those_of_the_potentials() -> None:
    rng = np.random.default_rng(4)
    owner = np.array([0, 1, 2, 3, 3])
    result = result_of(
        network(4, 9), density=rng.normal(size=(5, 4)), panel_conductor=owner,
        panel_corners=np.zeros((5, 4, 3)),
    )  # fmt: skip
    small = result.reduced(ground=["c1"], tie=[("c0", "c2")], floating=["c3"])
    weight = -network(4, 9)[3, [0, 2]].sum() / network(4, 9)[3, 3]
    expected = result.density @ [1.0, 0.0, 1.0, weight]
    np.testing.assert_allclose(small.density[:, 0], expected, rtol=1e-12)
    np.testing.assert_array_equal(small.panel_conductor, [0, -1, 0, -1, -1])
    again = result.reduced(ground=["c1"]).reduced(ground=["c0"])
    np.testing.assert_array_equal(again.panel_conductor, [-1, -1, 0, 1, 1])
    bare = dataclasses.replace(result, density=None, panel_conductor=None)
    assert bare.reduced(ground=["c1"]).density is None


def test_pairs_asked_for_stay_if_both_are_alone() -> None:
    result = guard_ring(pairs={(DISC, PLATE): 0.01, (RING, PLATE): 0.02})
    assert result.reduced(ground=[RING]).pairs == {(DISC, PLATE): 0.01}
    assert result.reduced(tie=[(DISC, RING)]).pairs == {}


# states of the scene


def wired(**changes: Any) -> CapacitanceResult:
    """Make a result whose scene grounds c1, leaves c4 floating, and ties c2 and c3 to pad."""
    given = {
        "states": ("terminal", "grounded", "terminal", "terminal", "floating"),
        "nodes": (None, None, "pad", "pad", None),
    }
    return result_of(network(5, 6), **{**given, **changes})


def test_the_scene_says_what_the_terminals_are() -> None:
    small = wired().terminals
    assert small.conductors == ("c0", "pad")
    close(small.capacitance, charges(network(5, 6), [1], [[4]], [[0], [2, 3]]), 1e-12)
    assert small.reduction == Reduction({"c0": ("c0",), "pad": ("c2", "c3")}, ("c1",), (("c4",),))
    assert small.terminals is small
    plain = guard_ring()
    assert plain.terminals is plain and plain.reduced(free=NAMES) is plain


@pytest.mark.parametrize(
    ("changes", "terminals"),
    [
        ({"free": ["c1", "c4"]}, ("c0", "c1", "pad", "c4")),
        ({"free": "c1"}, ("c0", "c1", "pad")),
        ({"free": ["c2"]}, ("c0", "c2", "pad")),
        ({"ground": ["pad"]}, ("c0",)),
        ({"ground": ["c3"]}, ("c0",)),
        ({"ground": ["c4"]}, ("c0", "pad")),
        ({"tie": [("c0", "pad")]}, ("c0+pad",)),
        ({"tie": ("c0", "c2")}, ("c0+c2",)),
        ({"tie": {"all": ["c0", "c3"]}}, ("all",)),
        ({"tie": [("c0", "c4")]}, ("c0+c4", "pad")),
        ({"tie": [("c0", "c1")]}, ("pad",)),
        ({"tie": {"x": ("c0", "c4"), "y": ("x", "pad")}}, ("y",)),
        ({"tie": [("c1", "c4")], "free": ["c1"]}, ("c0", "c1+c4", "pad")),
        ({"free": [f"c{k}" for k in range(5)]}, tuple(f"c{k}" for k in range(5))),
    ],
)
def test_changes_by_name(changes: Any, terminals: tuple[str, ...]) -> None:
    assert wired().reduced(**changes).conductors == terminals


def test_all_free_is_the_full_matrix() -> None:
    full = wired().reduced(free=wired().conductors)
    assert_same(full, wired(states=(), nodes=()))
    assert full.reduction is None and full.terminals is full


def test_a_node_named_like_its_conductor_can_be_freed() -> None:
    tied = guard_ring(states=("terminal",) * 3, nodes=(RING, RING, None))
    assert tied.terminals.conductors == (RING, PLATE)
    assert tied.reduced(free=[DISC]).conductors == NAMES


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"ground": ["dics"]}, "ground: no conductor is named 'dics' (did you mean 'disc'?); "
         "the conductors are 'disc', 'ring', 'plate'"),
        ({"floating": ["x"]}, "floating: no conductor is named 'x'; the conductors are "
         "'disc', 'ring', 'plate'"),
        ({"free": "x"}, "free: no conductor is named 'x'; the conductors are 'disc', 'ring', "
         "'plate'"),
        ({"tie": [("disc", "x")]}, "tie: no conductor is named 'x'; the conductors are 'disc', "
         "'ring', 'plate'"),
        ({"tie": [("disc",)]}, 'tie: found "disc"; give two or more that are not tied yet'),
        ({"tie": [("disc", "disc")]}, 'tie: found "disc", "disc"; give two or more that are not '
         "tied yet"),
        ({"tie": {"plate": ("disc", "ring")}}, 'tie: the name "plate" is taken by another '
         "conductor; choose another"),
        ({"tie": [(1, 2)]}, "found 1; needs names of conductors"),
        ({"ground": ["disc"], "floating": ["disc"]}, '"disc" is told both to ground and to float'),
        ({"ground": ["disc"], "free": ["disc"]}, '"disc" is told both to ground and to free'),
        ({"ground": ["disc"], "floating": ["ring"], "tie": {"n": ("disc", "ring")}},
         'node "n" is both to be grounded and to float; choose one'),
        ({"ground": NAMES}, "every conductor is grounded or floating; leave at least one a "
         "terminal, or make one so again (free)"),
    ],
)  # fmt: skip
def test_refused_changes(changes: Any, message: str) -> None:
    with pytest.raises(UsageError) as caught:
        guard_ring().reduced(**changes)
    assert str(caught.value) == message


def test_a_floating_node_that_is_lost_in_its_bar_is_refused() -> None:
    value = np.array([[2.0, 0.0, -1e-3], [0.0, 2.0, -1e-3], [-1e-3, -1e-3, 3e-3]])
    result = result_of(value, 5e-3)
    with pytest.raises(SolutionError) as caught:
        result.reduced(floating=["c2"])
    assert str(caught.value) == (
        'floating: the potential of "c2" is not known within the bars of the matrix; '
        "extract again to a smaller tolerance, or leave it a terminal"
    )
    afloat = dataclasses.replace(result, states=("terminal", "terminal", "floating"))
    text = " ".join(str(afloat).split())
    assert "this is the full matrix; floating: the potential" in text
    assert "c2" in text.partition("Mutual")[0]


# shown and saved


def test_a_reduced_result_says_what_it_is() -> None:
    text = " ".join(str(wired()).split())
    assert "conductors reduced: grounded c1; floating without charge c4; pad is c2 with c3" in text
    assert "To the surroundings and grounded conductors (row sums) in pF" in text
    assert "by the full matrix: the largest bar here is" in text
    assert str(wired()) == str(wired().terminals) != str(wired().reduced(free=["c1"]))
    assert "conductors reduced: grounded c1;" in wired()._repr_html_()
    afloat = str(wired().reduced(free=["c1"]))
    assert "To the surroundings (row sums)" in afloat and "grounded" not in afloat


def test_many_reduced_conductors_are_counted() -> None:
    result = result_of(network(30, 2))
    text = " ".join(str(result.reduced(ground=[f"c{k}" for k in range(1, 30)])).split())
    assert "grounded c1, c2, c3, c4, c5, c6, c7, c8, c9, c10, c11, c12, 17 more" in text


def test_floating_nodes_are_listed_once() -> None:
    small = result_of(network(5, 2)).reduced(floating=["c1", "c2", "c4"], tie=[("c2", "c3")])
    assert "floating without charge c1, c2 with c3, c4" in " ".join(str(small).split())


def test_many_terminals_and_ground_say_so_in_the_list() -> None:
    small = result_of(network(12, 2)).reduced(ground=["c0"])
    text = " ".join(str(small).split())
    assert "diagonal and row sums (to the surroundings and grounded conductors)" in text


def test_full_and_reduced_results_survive_on_disk(tmp_path: Path) -> None:
    for result in (wired(), wired().terminals):
        result.to_json(tmp_path / "r.json")
        assert_same(bem.load_result(tmp_path / "r.json"), result)


def test_csv_holds_the_terminals(tmp_path: Path) -> None:
    wired().to_csv(tmp_path / "a.csv")
    wired().terminals.to_csv(tmp_path / "b.csv")
    lines = (tmp_path / "a.csv").read_text().splitlines()
    assert (tmp_path / "b.csv").read_text().splitlines() == lines and len(lines) == 1 + 4 + 2
    assert lines[1].startswith('"maxwell","c0","c0",')
