"""The support matrix of DEVELOPERS.md: every pair of features is solved, or refused in one line."""

from __future__ import annotations

import itertools
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

import bem
from bem.errors import BemError

GUIDE = Path(__file__).parents[1] / "DEVELOPERS.md"
YES, NO = "yes", "no"


def _solid(scene: bem.Scene) -> None:
    scene.add_conductor("block", bem.box(1.0, 1.0, 0.4, center=(0.0, 0.0, 1.0)))


def _sheet(scene: bem.Scene) -> None:
    scene.add_conductor("sheet", bem.plate(1.0, 1.0), place=bem.Place(shift=(0.0, 0.0, 1.7)))


def _curved(scene: bem.Scene) -> None:
    scene.add_conductor("ball", bem.sphere(0.3), place=bem.Place(shift=(0.0, 0.0, 2.5)))


def _dielectric(scene: bem.Scene) -> None:
    cover = bem.box(1.2, 1.2, 0.3, center=(0.0, 0.0, 1.35))
    scene.add_dielectric("cover", cover, relative_permittivity=4.0, loss_tangent=0.02)


def _half_space(scene: bem.Scene) -> None:
    scene.set_half_space(below_z=0.1, relative_permittivity=4.0)


def _layers(scene: bem.Scene) -> None:
    scene.set_flat_layers(
        from_z=0.0, thickness=[0.3], relative_permittivity=[4.0], grounded_below=True
    )


def _states(scene: bem.Scene) -> None:
    shape = bem.box(0.5, 0.5, 0.5, center=(0.0, 0.0, 4.0))
    scene.add_conductor("float", shape, state="floating")


FEATURES: dict[str, Callable[[bem.Scene], object]] = {
    "solid conductor": _solid,
    "sheet": _sheet,
    "curved conductor": _curved,
    "dielectric body": _dielectric,
    "ground plane": lambda scene: scene.set_ground_plane(z=0.0),
    "mirror plane": lambda scene: scene.add_mirror_plane(x=0.0),
    "half-space": _half_space,
    "flat layers": _layers,
    "states": _states,
    "compare": lambda scene: None,
    "frequencies": lambda scene: None,
}


def outcome(pair: tuple[str, str]) -> str:
    """Whether a scene with both features is solved or refused."""
    scene = bem.Scene(unit="m", loss_tangent=0.01 if "frequencies" in pair else None)
    try:
        for feature in dict.fromkeys(pair):
            FEATURES[feature](scene)
        if all(c.state == "floating" for c in scene.conductors):
            shape = bem.box(0.5, 0.5, 0.5, center=(2.0, 0.0, 4.0))
            scene.add_conductor("other", shape, place=bem.Place(shift=(-2.0, 0.0, 1.0)))
        if "compare" in pair:
            found = bem.compare(scene, scene, tolerance=0.3)
            assert np.abs(found.change).max() <= 1e-12 * found.before.capacitance.max()
            return YES
        result = bem.extract(scene, 0.3, frequencies=[1e3] if "frequencies" in pair else ())
    except BemError as refusal:
        assert "\n" not in str(refusal)
        return NO
    assert (np.diagonal(result.capacitance) > 0.0).all()
    assert len(result.lossy) == ("frequencies" in pair)
    return YES


def table(found: dict[tuple[str, str], str]) -> str:
    """The matrix as a table of the guide."""
    names = list(FEATURES)
    both = found | {pair[::-1]: word for pair, word in found.items()}
    rows = [["", *names], ["---"] * (len(names) + 1)]
    rows += [[row, *(both[row, column] for column in names)] for row in names]
    return "\n".join(f"| {' | '.join(row)} |" for row in rows)


@pytest.fixture(scope="module")
def outcomes() -> dict[tuple[str, str], str]:
    pairs = itertools.combinations_with_replacement(FEATURES, 2)
    return {pair: outcome(pair) for pair in pairs}


def test_the_guide_has_the_support_matrix(outcomes: dict[tuple[str, str], str]) -> None:
    assert table(outcomes) in GUIDE.read_text(), f"expected in DEVELOPERS.md:\n{table(outcomes)}"


def test_conductors_of_all_kinds_go_with_everything(
    outcomes: dict[tuple[str, str], str],
) -> None:
    kinds = ("solid conductor", "sheet", "curved conductor")
    assert all(outcomes[pair] == YES for pair in outcomes if pair[0] in kinds)
