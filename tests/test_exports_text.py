"""The readable report: units, digits, widths, and every fact in its line."""

from __future__ import annotations

import re
from dataclasses import replace
from html.parser import HTMLParser
from typing import Any

import numpy as np
import pytest
from test_results import sample_result

from bem.exports.budget import budget_text, tightest_entry
from bem.exports.names import columns, shown
from bem.exports.text import PLUS_MINUS_ASCII, report
from bem.results.result import Round


def ladder(n: int) -> np.ndarray:
    """Return a matrix (F) of n conductors whose couplings fall off with distance."""
    k = np.arange(n)
    matrix = -1e-12 * 0.5 ** np.abs(k[:, None] - k[None, :])
    np.fill_diagonal(matrix, 0.0)
    np.fill_diagonal(matrix, 1e-12 - matrix.sum(axis=1))
    return matrix


def test_the_whole_report_of_two_conductors() -> None:
    text = report(sample_result(pairs={("wall", "probe rod"): 0.01}, warnings=("thin gap",)))
    assert text.splitlines() == [
        "Maxwell capacitance matrix C in pF (Q = C V)",
        "",
        "                     probe rod               wall",
        "  probe rod   12.3457 ± 0.0012   -4.1000 ± 0.0012",
        "  wall        -4.1000 ± 0.0012   45.6000 ± 0.0012",
        "",
        "To the surroundings (row sums) in pF",
        "",
        "  probe rod    8.2457 ± 0.0018",
        "  wall        41.5000 ± 0.0018",
        "",
        "Mutual capacitances (-C_ij) in pF, largest first",
        "",
        "                                      bar / value   asked",
        "  probe rod, wall   4.1000 ± 0.0012       0.029 %     1 %",
        "",
        "± is a bound meant to hold for at least 95 % of entries",
        "tolerance 0.001 reached: the largest bar is 0.12 times what it allows",
        "panels 308, rounds 2, time 0.118 s, threads 2",
        "time by phase: assembly 0.081 s, solve 0.022 s",
        "bodies span 113.1 x 113.1 x 113.1 mm",
        "audit: 1 of 1 checks passed; nearest to its limit: reciprocity 2e-05 (limit",
        "  0.001)",
        "stud 0: welded 8 vertices within 1e-9 m",
        "warning: thin gap",
    ]


def test_one_conductor_has_no_couplings() -> None:
    assert "Mutual" not in report(sample_result(np.array([[1e-12]])))


@pytest.mark.parametrize(
    ("largest", "unit", "digits"),
    [
        (2.5e-15, "fF", "2.500"),
        (2.5e-12, "pF", "2.500"),
        (2.5e-9, "nF", "2.500"),
        (250e-12, "pF", "250.00"),
    ],
)
def test_the_unit_suits_the_largest_diagonal_entry(largest: float, unit: str, digits: str) -> None:
    matrix = np.array([[largest, -largest / 3], [-largest / 3, largest / 2]])
    text = report(sample_result(matrix, np.full((2, 2), largest * 4e-3)))
    assert f"in {unit} (Q = C V)" in text and digits[:5] in text


def test_small_couplings_keep_their_digits() -> None:
    matrix = np.array([[10e-12, -1.23456e-18], [-1.23456e-18, 10e-12]])
    bars = np.array([[1e-14, 1.2e-23], [1.2e-23, 1e-14]])
    text = report(sample_result(matrix, bars))
    assert "(-1.234560 ± 0.000012)e-6" in text
    assert "(1.234560 ± 0.000012)e-6" in text


@pytest.mark.parametrize("n", [1, 2, 5, 8, 9, 60])
@pytest.mark.parametrize("name", ["{}", "busbar with a long name, number {}", "液位探头的杆 {}"])
def test_no_line_is_wider_than_80_columns(n: int, name: str) -> None:
    names = tuple(name.format(k) for k in range(n))
    pairs = {(names[0], names[-1]): 0.01} if n > 1 else {}
    text = report(sample_result(ladder(n), names=names, pairs=pairs, warnings=("word " * 60,)))
    assert max(map(columns, text.splitlines())) <= 80


@pytest.mark.parametrize("length", range(1, 30))
def test_a_wide_matrix_uses_the_width_and_keeps_to_it(length: int) -> None:
    names = tuple(str(k) * length for k in range(8))
    matrix = report(sample_result(ladder(8), names=names)).partition("To the surroundings")[0]
    widths = [columns(line) for line in matrix.splitlines()]
    column = 3 + max(len("-1.0000 ± 0.0012"), min(length, 24))
    assert 80 - column < max(widths) <= 80


def test_every_entry_of_a_wide_matrix_is_there_once() -> None:
    matrix = ladder(8)
    bars = np.arange(1.0, 65.0).reshape(8, 8) * 1e-17
    text = report(sample_result(matrix, bars)).partition("To the surroundings")[0]
    for bar in range(1, 65):
        assert len(re.findall(rf"± 0\.0*{bar}0*(?![0-9])", text)) >= 1
    assert text.count("±") == 64


def test_many_conductors_get_lists_that_say_where_the_rest_is() -> None:
    text = report(sample_result(ladder(50), pairs={("probe rod", "stud 49"): 0.05}))
    assert "diagonal and row sums" in text
    assert "10 more conductors; every entry is in the JSON and CSV files" in text
    assert "1204 more pairs; every entry is in the JSON and CSV files" in text
    asked = [line for line in text.splitlines() if line.startswith("  probe rod, stud 49")]
    assert len(asked) == 1 and asked[0].endswith("5 %")


def test_couplings_are_sorted_by_size() -> None:
    text = report(sample_result(ladder(5))).partition("Mutual")[2]
    values = [float(value) for value in re.findall(r" ([0-9.]+) ±", text)]
    assert len(values) == 10 and values == sorted(values, reverse=True)


def test_a_useless_coupling_is_marked_as_such() -> None:
    matrix = np.array([[1e-12, -1e-16], [-1e-16, 1e-12]])
    assert "over 100 %" in report(sample_result(matrix))
    assert " ?" in report(sample_result(matrix, np.full((2, 2), np.nan)))


def test_missing_the_tolerance_is_loud_and_says_what_to_do() -> None:
    rounds = (Round(500, np.eye(2), np.eye(2), 3.17, 1.0),)
    text = report(sample_result(converged=False, stopped_by="max-panels", rounds=rounds))
    assert "TOLERANCE 0.001 NOT REACHED: the largest bar is 3.2 times what it allows" in text
    assert "raise max-panels or the tolerance" in " ".join(text.split())


def test_bars_that_the_audit_widened_count_as_they_are() -> None:
    result = sample_result(error=np.full((2, 2), 3e-14), converged=False)
    text = " ".join(report(result).split())
    assert "the largest bar is 2.4 times what it allows; the audit widened the bars" in text


def test_the_total_is_not_a_phase() -> None:
    text = report(sample_result(seconds={"geometry": 0.1, "total": 0.4}))
    assert "time 0.4 s" in text and "time by phase: geometry 0.1 s\n" in text


def test_a_failed_check_is_named_with_both_numbers() -> None:
    audit = {
        "far_residual": {"value": 2e-3, "limit": 1e-3, "ok": False},
        "signs": {"value": 0.0, "limit": 0.0, "ok": True},
    }
    assert "audit: 1 of 2 checks off: far residual 0.002 (limit 0.001)" in report(
        sample_result(audit=audit)
    )


def test_facts_that_are_not_known_are_not_invented() -> None:
    bare: dict[str, Any] = {
        "settings": {},
        "seconds": {},
        "audit": {},
        "inputs": (),
        "panel_corners": None,
        "rounds": (Round(3, np.eye(2), np.eye(2), np.nan, 1.0),),
    }
    text = report(sample_result(**bare))
    assert "threads not recorded" in text and "audit: no check was recorded" in text
    assert "not yet comparable" in text
    assert "time by phase" not in text and "span" not in text


def test_many_changes_are_cut_and_counted() -> None:
    inputs = ({"name": "rod", "changes": [f"change {k}" for k in range(25)]},)
    text = report(sample_result(inputs=inputs))
    assert "rod: change 9" in text and "change 10" not in text
    assert "15 more changes on reading" in text


def test_plain_ascii_when_asked() -> None:
    text = report(sample_result(), PLUS_MINUS_ASCII)
    assert text.isascii() and "12.3457 +- 0.0012" in text


def test_names_cannot_move_the_cursor() -> None:
    text = report(sample_result(names=("a\x1b[2J\nb", "\u202ewall")))
    assert "a\\x1b[2J\\nb" in text and "\x1b" not in text and "\u202e" not in text


@pytest.mark.parametrize(
    ("name", "width", "expected"),
    [
        ("short", 24, "short"),
        ("upper busbar, left end", 12, "upper..t end"),
        ("液位探头的杆", 8, "液..杆"),
        ("e\u0301" * 6, 6, "e\u0301" * 6),
    ],
)
def test_long_names_lose_their_middle(name: str, width: int, expected: str) -> None:
    assert shown(name, width) == expected
    assert columns(expected) <= width


def test_budget_shows_the_entry_nearest_to_its_allowance() -> None:
    bars = np.array([[1e-15, 8e-15], [8e-15, 2e-15]])
    result = sample_result(error=bars)
    assert tightest_entry(result) == (0, 1)
    lines = budget_text(result, "±").splitlines()
    assert lines[-1] == "  the one entry is that nearest to its allowance, C(probe rod, wall)"
    assert [line.split() for line in lines if "quadrature" in line] == [
        ["quadrature", "0.002", "25", "%", "0.002"]
    ]


def test_budget_without_parts() -> None:
    assert "no parts" in budget_text(sample_result(budget={}), "±")


class _Texts(HTMLParser):
    """Collects tags and texts; a tag left open is an error."""

    def __init__(self) -> None:
        super().__init__()
        self.open: list[str] = []
        self.texts: list[str] = []

    def handle_starttag(self, tag: str, attrs: Any) -> None:
        if tag != "br":
            self.open.append(tag)

    def handle_endtag(self, tag: str) -> None:
        assert self.open.pop() == tag

    def handle_data(self, data: str) -> None:
        self.texts.append(data)


def test_html_is_well_formed_and_names_are_text() -> None:
    page = _Texts()
    page.feed(sample_result(names=("<b>rod</b> & co", '"wall"'))._repr_html_())
    assert page.open == []
    assert "<b>rod</b> & co" in page.texts and '"wall"' in page.texts
    assert "12.3457 ± 0.0012" in page.texts
    assert "<b>rod</b> & co, " + '"wall"' in page.texts


def test_html_takes_the_colours_of_the_page() -> None:
    html = sample_result()._repr_html_()
    assert "background" not in html and "color:" not in html.replace("border-bottom", "")


def test_a_coupling_asked_for_by_name_is_reported_by_name() -> None:
    """Reached or not: its bar in per cent of its value, beside what was asked."""
    from bem.exports.summary import lines_of

    value = np.array([[4e-12, -1e-15], [-1e-15, 4e-12]])
    made = replace(
        sample_result(),
        capacitance=value,
        error=np.full((2, 2), 2e-17),
        pairs={},
        conductors=("a", "b"),
    )
    asked = replace(made, pairs={("b", "a"): 0.01}, converged=False, stopped_by="max-panels")
    text = "\n".join(lines_of(asked, "+-"))
    assert "NOT REACHED: the pair a, b has a bar of 2 % of its value, asked was 1 %" in text
    assert "the pair" not in "\n".join(lines_of(made, "+-"))
