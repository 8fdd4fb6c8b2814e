"""Constants and units, against what they are elsewhere."""

from __future__ import annotations

import pytest
import scipy.constants

import bem
from bem.units import METRES_PER, farad_unit, metres_per


def test_electric_constant() -> None:
    """CODATA 2022: 8.8541878188(14)e-12 F/m; older tables differ in the tenth digit."""
    assert bem.EPS0 == 8.8541878188e-12
    assert bem.EPS0 == pytest.approx(scipy.constants.epsilon_0, rel=1e-9, abs=0.0)


@pytest.mark.parametrize(
    ("unit", "metres"),
    [
        ("m", 1.0),
        ("cm", scipy.constants.centi),
        ("mm", scipy.constants.milli),
        ("um", scipy.constants.micro),
        ("nm", scipy.constants.nano),
        ("in", scipy.constants.inch),
        ("mil", scipy.constants.mil),
    ],
)
def test_lengths(unit: str, metres: float) -> None:
    assert metres_per(unit) == pytest.approx(metres, rel=1e-15, abs=0.0)


def test_no_unit_without_a_check() -> None:
    assert len(METRES_PER) == 7


@pytest.mark.parametrize("unit", ["MM", "inch", "metre", "", "mils"])
def test_unknown_units_are_refused_with_those_known(unit: str) -> None:
    with pytest.raises(bem.UsageError, match=f"found {unit!r}.*allowed are m, cm, mm"):
        metres_per(unit)


@pytest.mark.parametrize(
    ("farad", "name"), [(2e-12, "pF"), (9.9e-13, "fF"), (-3e-9, "nF"), (1e-20, "aF"), (0.0, "F")]
)
def test_sensible_units(farad: float, name: str) -> None:
    assert farad_unit(farad)[0] == name


def test_the_nearest_unit_is_suggested_whatever_its_case() -> None:
    with pytest.raises(bem.UsageError, match=r"found 'MM' \(did you mean 'mm'\?\)"):
        metres_per("MM")
