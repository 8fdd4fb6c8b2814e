"""Options: what they accept, and what they say about the rest."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest

from bem.cli.pairs import match_pairs, read_pair
from bem.cli.values import count, fraction, frequency, memory, positive
from bem.errors import UsageError

CONDUCTORS = ["probe rod", "wall", "a,b", "x=y", "Füllstand"]


def refusal(call: Callable[[], Any]) -> str:
    with pytest.raises(UsageError) as caught:
        call()
    return str(caught.value)


@pytest.mark.parametrize(
    ("text", "value"),
    [("1e-3", 1e-3), ("0.1%", 1e-3), (" 2 % ", 0.02), ("0.5", 0.5), ("99%", 0.99)],
)
def test_fractions(text: str, value: float) -> None:
    assert fraction("--tolerance")(text) == pytest.approx(value, rel=1e-15)


@pytest.mark.parametrize("text", ["0", "-1", "1", "100%", "nan", "inf", "1%%", "%", "", "1 per"])
def test_fractions_that_are_refused(text: str) -> None:
    message = refusal(lambda: fraction("--tolerance")(text))
    assert message == (
        f"--tolerance: found {text!r}; give a fraction above 0 and below 1, such as 0.001 or 0.1%"
    )


@pytest.mark.parametrize(("text", "value"), [("1", 1), ("20000", 20000), ("20_000", 20000)])
def test_counts(text: str, value: int) -> None:
    assert count("--threads")(text) == value


@pytest.mark.parametrize("text", ["0", "-2", "1.5", "two", "", "9" * 30, "²"])
def test_counts_that_are_refused(text: str) -> None:
    message = refusal(lambda: count("--threads")(text))
    assert message == f"--threads: found {text!r}; give a whole number of 1 or more"


@pytest.mark.parametrize("text", ["0", "-2.1", "nan", "inf", "glass"])
def test_positive_numbers_that_are_refused(text: str) -> None:
    option = "--surroundings-permittivity"
    assert positive(option)("2.1") == 2.1
    message = refusal(lambda: positive(option)(text))
    assert message == f"{option}: found {text!r}; give a number above 0, such as 2.1"


@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("8GB", 8_000_000_000),
        ("8 gb", 8_000_000_000),
        ("1.5GiB", 3 * 2**29),
        ("500MB", 500_000_000),
        ("64 KiB", 65536),
        ("10kB", 10_000),
        ("1e3B", 1000),
        ("2TiB", 2**41),
    ],
)
def test_memory(text: str, value: int) -> None:
    assert memory("--memory")(text) == value


@pytest.mark.parametrize(
    "text", ["8", "GB", "-1GB", "0GB", "8 cows", "", "nanGB", "0.1B", "1e999B"]
)
def test_memory_that_is_refused(text: str) -> None:
    message = refusal(lambda: memory("--memory")(text))
    assert message.startswith(f"--memory: found {text!r}")
    assert "such as 8GB; the units are B, kB, MB, GB, TB, KiB, MiB, GiB, TiB" in message


def test_memory_suggests_the_nearest_unit() -> None:
    assert "(did you mean 'GiB'?)" in refusal(lambda: memory("--memory")("8Gib s".replace(" ", "")))


@pytest.mark.parametrize(
    ("text", "pair", "accuracy"),
    [
        ("probe rod,wall=1%", ("probe rod", "wall"), 0.01),
        ("wall , probe rod = 0.02", ("wall", "probe rod"), 0.02),
        ("a,b,wall=1%", ("a,b", "wall"), 0.01),
        ("wall,a,b=1%", ("wall", "a,b"), 0.01),
        ("x=y,Füllstand=5%", ("x=y", "Füllstand"), 0.05),
    ],
)
def test_pairs(text: str, pair: tuple[str, str], accuracy: float) -> None:
    assert match_pairs([read_pair(text)], CONDUCTORS) == {pair: pytest.approx(accuracy)}


@pytest.mark.parametrize("text", ["", "wall", "wall=1%", "rod,wall", "=1%"])
def test_pairs_without_two_names_and_an_accuracy(text: str) -> None:
    message = refusal(lambda: read_pair(text))
    assert message == (
        f"--pair: found {text!r}; give two names and an accuracy, such as 'rod,wall=1%'"
    )


def test_the_accuracy_of_a_pair_is_checked() -> None:
    assert "--pair rod,wall: found 'much'" in refusal(lambda: read_pair("rod,wall=much"))


def match_refusal(*texts: str, conductors: list[str] = CONDUCTORS) -> str:
    options = [read_pair(text) for text in texts]
    return refusal(lambda: match_pairs(options, conductors))


def test_an_unknown_name_gets_the_nearest_known_one() -> None:
    message = match_refusal("prob rod,wall=1%")
    assert message == (
        "--pair: no conductor is named 'prob rod' (did you mean 'probe rod'?); "
        "the conductors are 'probe rod', 'wall', 'a,b', 'x=y', 'Füllstand'"
    )
    assert "named 'wal' (did you mean 'wall'?)" in match_refusal("probe rod,wal=1%")


def test_long_lists_of_names_are_cut() -> None:
    message = match_refusal("a,b=1%", conductors=[f"stud {k}" for k in range(30)])
    assert "'stud 11' and 18 more" in message and "stud 12" not in message


def test_pairs_that_make_no_sense() -> None:
    assert "names one conductor twice" in match_refusal("wall,wall=1%")
    assert "is given twice" in match_refusal("wall,probe rod=1%", "probe rod,wall=2%")
    ambiguous = ["a", "b,c", "a,b", "c"]
    assert "can be read in 2 ways" in match_refusal("a,b,c=1%", conductors=ambiguous)


@pytest.mark.parametrize(
    ("text", "value"),
    [("50", 50.0), ("50Hz", 50.0), ("1.5 kHz", 1500.0), ("1MHz", 1e6), ("2.4ghz", 2.4e9)],
)
def test_frequency(text: str, value: float) -> None:
    assert frequency("--frequency")(text) == pytest.approx(value, rel=1e-15)


@pytest.mark.parametrize("text", ["", "0", "-1Hz", "1THz", "fast", "inf", "nan"])
def test_frequency_that_is_refused(text: str) -> None:
    with pytest.raises(UsageError, match="give a frequency above 0, such as 50Hz"):
        frequency("--frequency")(text)
