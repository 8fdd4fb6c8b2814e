"""Results with frequencies: saved, printed, reduced and reordered; and lines about media."""

from __future__ import annotations

import csv
import json
from pathlib import Path

import jsonschema
import numpy as np
import pytest
from test_results import assert_same, sample_result

import bem
from bem.exports.csv_file import HEADER, MORE
from bem.results.comparison import in_order
from bem.results.lossy import Lossy
from bem.results.result import CapacitanceResult, load_result
from bem.scene.media_record import media_record
from bem.scene.scene import Scene

SCHEMA = Path(bem.__file__).parent / "exports" / "result.schema.json"
NAMES = ("a", "b", "c", "d")


def matrix(n: int, seed: int) -> np.ndarray:
    """Symmetric, diagonally dominant, negative off the diagonal."""
    part = np.random.default_rng(seed).uniform(0.1, 1.0, (n, n))
    part = part + part.T
    return np.diag(part.sum(axis=1) + 1.0) - part


def lossy(n: int, frequency: float, **changes) -> Lossy:
    value, conductance = 1e-12 * matrix(n, 1), 1e-10 * matrix(n, 2)
    bar = np.abs(value) * 1e-3
    fields = {
        "frequency": frequency,
        "capacitance": value,
        "error": bar,
        "conductance": conductance,
        "conductance_error": 100.0 * bar,
        "row_sum": value.sum(axis=1),
        "row_sum_error": bar.sum(axis=1),
        "row_conductance": conductance.sum(axis=1),
        "row_conductance_error": 100.0 * bar.sum(axis=1),
        "converged": True,
        "panels": 400,
    }
    return Lossy(**(fields | changes))


def result(n: int = 2, frequencies: tuple[float, ...] = (50.0, 2.4e9)) -> CapacitanceResult:
    entries = tuple(lossy(n, f) for f in frequencies)
    return sample_result(1e-12 * matrix(n, 1), names=NAMES[:n], lossy=entries)


def test_saved_and_read_back(tmp_path: Path) -> None:
    first = result()
    first.to_json(tmp_path / "r.json")
    assert_same(load_result(tmp_path / "r.json"), first)
    saved = json.loads((tmp_path / "r.json").read_text())
    jsonschema.validate(saved, json.loads(SCHEMA.read_text()))
    assert [entry["frequency_Hz"] for entry in saved["frequencies"]] == [50.0, 2.4e9]
    sample_result().to_json(tmp_path / "r.json")
    assert "frequencies" not in json.loads((tmp_path / "r.json").read_text())


def test_a_damaged_frequency_is_named(tmp_path: Path) -> None:
    result().to_json(tmp_path / "r.json")
    saved = json.loads((tmp_path / "r.json").read_text())
    del saved["frequencies"][1]["conductance_S"]
    (tmp_path / "r.json").write_text(json.dumps(saved))
    with pytest.raises(bem.InputError, match="entry 'frequencies' is damaged"):
        load_result(tmp_path / "r.json")


def test_csv_lines_follow_for_each_frequency(tmp_path: Path) -> None:
    result().to_csv(tmp_path / "r.csv")
    with open(tmp_path / "r.csv", newline="") as file:
        head, *rows = list(csv.reader(file))
    assert tuple(head) == HEADER + MORE
    assert [row[5] for row in rows] == [""] * 6 + ["50.0"] * 6 + ["2400000000.0"] * 6
    entry = result().lossy[0]
    cells = [[float(x) for x in row[3:]] for row in rows[6:12]]
    for row, (i, j) in zip(cells, [(0, 0), (0, 1), (1, 0), (1, 1)], strict=False):
        assert row == [entry.capacitance[i, j], entry.error[i, j], 50.0,
                       entry.conductance[i, j], entry.conductance_error[i, j]]  # fmt: skip
    assert cells[5][0] == entry.row_sum[1] and cells[5][3] == entry.row_conductance[1]


def test_the_report_shows_both_matrices() -> None:
    text = str(result())
    assert "At 50 Hz: capacitance matrix C in pF" in text
    assert "At 50 Hz: conductance matrix G in pS" in text
    assert "At 2.4 GHz: conductance matrix G in pS" in text
    assert "currents I = (G + j 2 pi f C) V" in text
    missed = sample_result(lossy=(lossy(2, 1e3, converged=False),))
    assert "TOLERANCE NOT REACHED at 1 kHz" in str(missed)
    assert "At 50 Hz" in result()._repr_html_()
    many = result(frequencies=tuple(float(k) for k in range(1, 12)))
    assert "At 8 Hz" in str(many) and "At 9 Hz" not in str(many)
    assert "3 more frequencies; every entry is in the JSON and CSV files" in str(many)


def condensed(entry: Lossy, kept: np.ndarray, floating: list[int]) -> np.ndarray:
    """Complex matrix of terminals, by solving for the floating potentials one by one."""
    omega = 2 * np.pi * entry.frequency
    value = entry.capacitance - 1j * entry.conductance / omega
    potentials = kept.astype(complex)
    potentials[floating] = -np.linalg.inv(value[np.ix_(floating, floating)]) @ (
        value[floating] @ kept
    )
    return kept.T @ value @ potentials


def test_reduced_at_each_frequency() -> None:
    """A and b tied, c floats, d grounded."""
    full = result(4)
    small = full.reduced(ground=["d"], floating=["c"], tie={"ab": ["a", "b"]})
    kept = np.array([[1.0], [1.0], [0.0], [0.0]])
    for before, after in zip(full.lossy, small.lossy, strict=True):
        want = condensed(before, kept, [2])
        omega = 2 * np.pi * before.frequency
        assert after.capacitance == pytest.approx(want.real, rel=1e-12, abs=0.0)
        assert after.conductance == pytest.approx(-omega * want.imag, rel=1e-9, abs=0.0)
        assert after.row_sum == pytest.approx(after.capacitance.sum(axis=1), rel=1e-12, abs=0.0)


def test_bars_of_reductions_hold_the_changes_they_bound() -> None:
    """Move every entry by its bar, in signs at random: terminals move by no more than theirs."""
    full = result(4, (50.0,))
    small = full.reduced(floating=["c"], ground=["d"])
    random = np.random.default_rng(4)
    entry = full.lossy[0]
    for _ in range(200):
        signs = np.triu(random.choice([-1.0, 1.0], (2, 4, 4)))
        signs = signs + np.transpose(np.triu(signs, 1), (0, 2, 1))
        moved = lossy(
            4,
            50.0,
            capacitance=entry.capacitance + signs[0] * entry.error,
            conductance=entry.conductance + signs[1] * entry.conductance_error,
        )
        other = sample_result(full.capacitance, names=NAMES, lossy=(moved,))
        found = other.reduced(floating=["c"], ground=["d"]).lossy[0]
        want = small.lossy[0]
        assert np.all(np.abs(found.capacitance - want.capacitance) <= want.error)
        assert np.all(np.abs(found.conductance - want.conductance) <= want.conductance_error)


def test_ties_alone_keep_the_bars_of_row_sums() -> None:
    full = sample_result(
        1e-12 * matrix(3, 1), names=NAMES[:3],
        lossy=(lossy(3, 50.0, row_sum_error=np.full(3, 1e-16)),),
    )  # fmt: skip
    small = full.reduced(tie={"ab": ["a", "b"]}).lossy[0]
    assert small.row_sum_error == pytest.approx([2e-16, 1e-16], abs=0.0)


def test_reordered() -> None:
    full = result(3)
    turned = in_order(full, ["c", "a", "b"])
    assert turned.lossy[0].conductance[0, 1] == full.lossy[0].conductance[2, 0]
    assert turned.lossy[0].row_sum[2] == full.lossy[0].row_sum[1]
    assert_same(in_order(turned, NAMES[:3]).lossy, full.lossy)


# media


def scene_of_media() -> Scene:
    scene = Scene("mm", 2.0, conductivity=1e-9)
    scene.add_dielectric("cover", bem.box(1, 1, 1), relative_permittivity=7)
    scene.add_dielectric("grain", bem.box(1, 1, 1), relative_permittivity=2.8, loss_tangent=0.1)
    return scene


def flowing(found: CapacitanceResult) -> str:
    """The report without its line breaks."""
    return " ".join(str(found).split())


def test_media_in_record_and_report() -> None:
    scene = scene_of_media().set_flat_layers(
        thickness=[0.2, 1.2], relative_permittivity=[3.6, 4.4], from_z=0, grounded_below=True
    )
    settings = {"relative_permittivity": 2.0, **media_record(scene)}
    found = sample_result(settings=settings)
    text = flowing(found)
    assert "relative permittivity 2, conductivity 1e-09 S/m" in text
    assert "dielectrics: cover (7), grain (2.8, loss tangent 0.1) " in text
    assert "flat layers from z = 0 m upward, grounded below: 200 um (3.6), 1.2 mm (4.4) " in text
    assert "To the surroundings and the grounded plane (row sums)" in text
    half = Scene("mm").set_half_space(above_x=-1, relative_permittivity=4)
    text = flowing(sample_result(settings={"relative_permittivity": 1.0, **media_record(half)}))
    assert "half-space above x = -1 mm: relative permittivity 4 " in text


def test_the_record_of_media_fits_the_schema(tmp_path: Path) -> None:
    scene = scene_of_media().set_half_space(below_z=0, relative_permittivity=4)
    settings = {"relative_permittivity": 2.0, **media_record(scene)}
    sample_result(settings=settings).to_json(tmp_path / "r.json")
    saved = json.loads((tmp_path / "r.json").read_text())
    jsonschema.validate(saved, json.loads(SCHEMA.read_text()))
    assert [body["name"] for body in saved["settings"]["dielectrics"]] == ["cover", "grain"]
    assert saved["settings"]["half_space"] == {"below_z_m": 0.0, "relative_permittivity": 4.0}
    assert media_record(Scene("mm")) == {}
