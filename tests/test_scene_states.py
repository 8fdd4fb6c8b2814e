"""State and node of conductors: from Python and scene files, and what is refused."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
from made_bodies import write_cube

import bem
from bem.errors import InputError, UsageError
from bem.scene.inspect import check_scene
from bem.scene.report import report

Wire = tuple[str, str, str | None]


def scene_of(*wires: Wire) -> bem.Scene:
    """Scene of unit cubes, each with a name, a state and a node."""
    scene = bem.Scene(unit="mm")
    for k, (name, state, node) in enumerate(wires):
        place = bem.Place(shift=(3.0 * k, 0.0, 0.0))
        scene.add_conductor(name, bem.box(1, 1, 1), place=place, state=state, node=node)
    return scene


def test_a_conductor_is_a_terminal_of_its_own_unless_told() -> None:
    scene = bem.Scene(unit="mm").add_conductor("a", bem.box(1, 1, 1))
    assert (scene.conductors[0].state, scene.conductors[0].node) == ("terminal", None)


FILE = """
unit = "mm"
[[conductor]]
name = "a"
mesh = "cube.stl"
[[conductor]]
name = "shield"
mesh = "cube.stl"
place = { shift = [3, 0, 0] }
state = "grounded"
node = "shield"
[[conductor]]
name = "pad"
mesh = "cube.stl"
place = { shift = [6, 0, 0] }
state = "floating"
"""


def test_scene_files_have_both_keys(tmp_path: Path) -> None:
    write_cube(tmp_path / "cube.stl")
    path = tmp_path / "scene.toml"
    path.write_text(FILE)
    found = [(c.state, c.node) for c in bem.load_scene(path).conductors]
    assert found == [("terminal", None), ("grounded", "shield"), ("floating", None)]
    path.write_text(FILE.replace('"a"', '"a"\nstate = "floating"'))
    with pytest.raises(InputError) as caught:
        bem.load_scene(path)
    assert str(caught.value) == (
        f'{path}: state: "a", "shield", "pad": every conductor is grounded or floating; '
        "leave at least one a terminal"
    )


@pytest.mark.parametrize(
    ("wires", "message"),
    [
        ([("a", "earthed", None)], 'conductor 1 ("a"): state: found "earthed"; allowed are '
         '"terminal", "grounded", "floating"'),
        ([("a", "terminal", " ")], 'conductor 1 ("a"): node: found " ", needs text that is not '
         "blank"),
        ([("a", "terminal", "n"), ("b", "grounded", "n")], 'conductor 2 ("b"): node "n": its '
         'state is grounded, but "a" of the same node is terminal; give all conductors of a '
         "node the same state"),
        ([("a", "terminal", None), ("b", "terminal", "a")], 'conductor 2 ("b"): "a" names a node '
         'and conductor "a", which is not in it; rename one, or put the conductor in that node'),
        ([("a", "terminal", "b"), ("b", "terminal", None)], 'conductor 2 ("b"): "b" names a node '
         'and conductor "b", which is not in it; rename one, or put the conductor in that node'),
    ],
)  # fmt: skip
def test_refused(wires: list[Wire], message: str) -> None:
    with pytest.raises(InputError) as caught:
        scene_of(*wires)
    assert str(caught.value) == message


def test_a_node_may_be_called_like_a_conductor_in_it() -> None:
    scene = scene_of(("a", "terminal", "b"), ("b", "terminal", "b"), ("c", "terminal", "n"))
    assert [c.node for c in scene.conductors] == ["b", "b", "n"]


def test_a_scene_without_terminals_is_not_solved() -> None:
    with pytest.raises(UsageError, match="leave at least one a terminal"):
        bem.extract(scene_of(("a", "grounded", None), ("b", "floating", None)))


def test_inspection_shows_what_is_not_usual() -> None:
    scene = scene_of(("a", "terminal", None), ("b", "grounded", None), ("c", "floating", "n"))
    lines = [line for line in report(scene, check_scene(scene)).splitlines() if "state" in line]
    assert lines == ["  state   grounded", '  state   floating, node "n"']


def extracted(*wires: Wire, **options: Any) -> bem.CapacitanceResult:
    return bem.extract(scene_of(*wires), 1e-2, **options)


def test_the_extraction_holds_all_and_prints_the_terminals() -> None:
    """States change nothing in the matrix that is solved."""
    plain = extracted(("a", "terminal", None), ("b", "terminal", None), ("c", "terminal", None))
    wired = extracted(("a", "terminal", None), ("b", "grounded", None), ("c", "floating", None))
    assert (plain.states, plain.nodes) == ((), ())
    assert wired.states == ("terminal", "grounded", "floating")
    assert wired.nodes == (None, None, None)
    np.testing.assert_array_equal(wired.capacitance, plain.capacitance)
    small = plain.reduced(ground=["b"], floating=["c"])
    assert wired.terminals.conductors == ("a",)
    np.testing.assert_array_equal(wired.terminals.capacitance, small.capacitance)
    assert str(wired).partition("tolerance")[0] == str(small).partition("tolerance")[0]


def test_two_halves_tied_are_the_whole() -> None:
    """Two half plates almost in contact, tied, against the plate in one piece.

    The slit of 1e-4 changes the plate far less than the bars allow.
    """
    halves = bem.Scene(unit="m")
    for name, side in (("left", -1.0), ("right", 1.0)):
        place = bem.Place(shift=(side * 0.25005, 0.0, 0.0))
        halves.add_conductor(name, bem.plate(0.5, 1.0), place=place, node="plate")
    whole = bem.Scene(unit="m").add_conductor("plate", bem.plate(1.0001, 1.0))
    for scene in (halves, whole):
        scene.add_conductor("far", bem.box(0.5, 0.5, 0.5), place=bem.Place(shift=(0, 0, 0.8)))
    tied, one = (bem.extract(scene, 1e-2).terminals for scene in (halves, whole))
    assert tied.conductors == one.conductors == ("plate", "far")
    assert np.all(np.abs(tied.capacitance - one.capacitance) <= tied.error + one.error)
    apart = np.abs(tied.row_sum - one.row_sum)
    assert np.all(apart <= tied.row_sum_error + one.row_sum_error)
    assert np.all(tied.error <= 0.03 * tied.capacitance[0, 0])


def test_a_thin_floating_plate_in_the_plane_between_opposite_voltages_changes_nothing() -> None:
    """By symmetry it lies at 0 V, grounded or floating; and neither holds charge."""
    scene = bem.Scene(unit="m")
    for name, z in (("top", 0.5), ("bottom", -0.5)):
        scene.add_conductor(name, bem.plate(1.0, 1.0), place=bem.Place(shift=(0, 0, z)))
    scene.add_conductor("middle", bem.plate(1.0, 1.0), state="floating")
    result = bem.extract(scene, 1e-2)
    afloat, grounded = result.terminals, result.reduced(ground=["middle"], free=[])
    odd = np.array([1.0, -1.0])
    charge = [r.capacitance @ odd for r in (afloat, grounded)]
    slack = sum(r.error.sum(axis=1) for r in (afloat, grounded))
    assert np.all(np.abs(charge[0] - charge[1]) <= slack)
    middle = result.capacitance[2, :2] @ odd
    assert abs(middle) <= result.error[2, :2].sum()
