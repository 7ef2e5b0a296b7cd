"""What a refusal of a file's value shows as allowed is itself taken, and a value without quotes is told as such."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest

from benchtool import casefile
from benchtool.board import (
    Bleeder,
    Board,
    Dropper,
    Fuse,
    Inrush,
    Load,
    Mains,
    Quantity,
    Rail,
    Reservoir,
    Varistor,
    Zener,
)
from benchtool.case import Safe
from benchtool.casefile.schema import fields_of
from benchtool.casefile.values import bounds_text, describe, in_quotes, read
from benchtool.errors import CaseError, Problem, QuantityError
from benchtool.observed import Check

CONTRACT = (Path(__file__).parent / "data" / "contract.toml").read_text(encoding="utf-8")
RECORDS = (Mains, Fuse, Varistor, Dropper, Inrush, Bleeder, Zener, Reservoir, Rail, Load, Board, Safe, Check)


def swapped(old: str, new: str) -> str:
    assert old in CONTRACT
    return CONTRACT.replace(old, new, 1)


def only(text: str) -> Problem:
    with pytest.raises(CaseError) as caught:
        casefile.loads(text)
    (problem,) = caught.value.problems
    return problem


def quantities() -> Iterator[tuple[str, Quantity]]:
    """Every key of a case file that is a quantity, with its rule."""
    for record in RECORDS:
        for each in fields_of(record):
            if isinstance(each.rule, Quantity):
                yield f"{record.__name__}.{each.key}", each.rule


@pytest.mark.parametrize(("key", "rule"), list(quantities()), ids=lambda value: value if isinstance(value, str) else "")
def test_examples_and_bounds_that_are_shown_are_themselves_taken(key: str, rule: Quantity) -> None:
    with pytest.raises(QuantityError) as refused:
        read(rule, -3e30)
    assert refused.value.allowed == describe(rule)
    shown = describe(rule).split(', or "unknown"')[0]
    example = shown.split('as "')[1].split('"')[0]
    low, high = shown.split('", ')[1].split(" to ")
    assert shown == f"{in_quotes(rule.unit, example)}, {low} to {high}"
    for text in (example, low, high):
        number = read(rule, text)
        assert isinstance(number, float)
        assert rule.low <= number <= rule.high


def test_computed_bounds_are_short_and_lie_inside() -> None:
    # 2.2 x 1.1 x 230 V x sqrt 2, as the case format bounds a rail on 230 V mains: 787.16 V
    assert bounds_text(-5.0, 787.157, "V") == "-5 V to 787 V"
    assert bounds_text(-5.0, 787.96, "V") == "-5 V to 787 V"
    assert bounds_text(1.0001e-12, 9.999e-5, "F") == "1.01 pF to 99.9 uF"


@pytest.mark.parametrize(
    ("old", "new", "quotes"),
    [
        ('capacitance = "680 nF"', "capacitance = 470 nF", "470 nF"),
        ('capacitance = "680 nF"', "capacitance = 0u47", "0u47"),
        ('capacitance = "680 nF"', "capacitance = 0,47 uF", "0,47 uF"),
        ('tolerance = "10 %"\nfitted', "tolerance = 10 % # a note = more\nfitted", "10 %"),
        ('voltage = "18 V", ', "voltage = 18 V, ", "18 V"),
        ('rectifier = "bridge"', "rectifier = bridge", "bridge"),
    ],
)
def test_a_value_without_quotes_is_told_so(old: str, new: str, quotes: str) -> None:
    assert only(swapped(old, new)).allowed == f'put the value in quotes: "{quotes}"'


@pytest.mark.parametrize("line", ['a = "470 nF', "a = ", 'a = "470 nF # b = c', "a = 5 ]", 'a = "b" c', "= " * 50_000])
def test_other_slips_of_toml_are_told_in_the_parser_s_words(line: str) -> None:
    assert only(f"format = 1\n{line}\n").allowed.startswith("TOML (")
