"""Values among dielectrics from outside the project, each with its source and mark."""

from __future__ import annotations

import numpy as np
import pytest
from dielectric_scenes import scene_of_record, solve
from dielectric_values import PUBLISHED, DielectricReference
from scenes import check

import bem

MOST_UNKNOWNS = 3000


def unknowns(result: bem.CapacitanceResult) -> int:
    """One on a panel of a conductor, three on one between dielectrics."""
    on_metal = int(np.count_nonzero(result.panel_conductor >= 0))
    return on_metal + 3 * (result.panels - on_metal)


@pytest.mark.parametrize("record", PUBLISHED, ids=lambda record: record.name)
def test_noted_values(record: DielectricReference) -> None:
    """High-order finite elements (N): within the tolerance and the bar, few unknowns."""
    result = solve(scene_of_record(record))
    check(result, record.matrix, record.uncertainty)
    assert unknowns(result) <= MOST_UNKNOWNS
