"""A reading typed on one line. The first two lines are those of the case format's section 5."""

from __future__ import annotations

import time
from pathlib import Path
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from benchtool import casefile
from benchtool.casefile.readingline import parse_reading
from benchtool.errors import CaseError, Problem
from benchtool.observed import Reading
from benchtool.report.template import TEMPLATE

CONTRACT = (Path(__file__).parent / "data" / "contract.toml").read_text(encoding="utf-8")
BOARD = casefile.loads(CONTRACT).board


def problems(text: str) -> tuple[Problem, ...]:
    with pytest.raises(CaseError) as caught:
        parse_reading(text, BOARD, "--reading")
    assert all(line.startswith("--reading: ") for line in str(caught.value).splitlines())
    return caught.value.problems


@pytest.mark.parametrize(
    ("text", "fields"),
    [
        ("dropper-capacitance lifted 182n", {"value": 182e-9, "lifted": True}),
        (
            "rail-voltage 'relay rail' on 'heater relay' 14.2 V",
            {"value": 14.2, "rail": "relay rail", "on": ("heater relay",)},
        ),
        (
            "rail-voltage relay rail on heater relay 14.2",
            {"value": 14.2, "rail": "relay rail", "on": ("heater relay",)},
        ),
        ("rail-voltage rail 'logic rail' 5V1", {"value": 5.1, "rail": "logic rail", "on": ()}),
        ('rail-ripple "logic rail" 120mV', {"value": 0.12, "rail": "logic rail", "on": ()}),
        (
            "rail-voltage 'relay rail' warm -3 V",
            {"value": -3.0, "rail": "relay rail", "on": (), "when": "warm"},
        ),
        ("dropper-capacitance 182 nF lifted", {"value": 182e-9, "lifted": True}),
        ("dropper-capacitance open", {"value": "open"}),
        ("line-current on 'heater relay', 48.2 mA", {"value": 0.0482, "on": ("heater relay",)}),
        ("mains-voltage 229", {"value": 229.0}),
        ("mains-voltage ~225 VAC", {"value": 225.0}),
        (
            "rail-voltage 'relay rail' 7.4VDC on 'heater relay'",
            {"value": 7.4, "rail": "relay rail", "on": ("heater relay",)},
        ),
        (
            "rail-voltage relay rail 7.4 V DC on heater relay warm",
            {"value": 7.4, "rail": "relay rail", "on": ("heater relay",), "when": "warm"},
        ),
        ("fuse-resistance OL", {"value": "open"}),
        ("bleeder-resistance O.L", {"value": "open"}),
        ("reservoir-esr logic rail 0L", {"value": "open", "rail": "logic rail"}),
        ("coil-resistance 810", {"value": 810.0, "load": "heater relay"}),  # the only coil
        ("switch-test open", {"value": "open", "load": "heater relay"}),  # the only switched load
        ("load-responds controller always on", {"value": "always on", "load": "controller"}),
        ("load-responds load 'heater relay' lets go", {"value": "lets go", "load": "heater relay"}),
        ("look bulged reservoir, dry joint", {"value": ("bulged reservoir", "dry joint")}),
        ("look relay rail burnt zener", {"value": ("burnt zener",), "rail": "relay rail"}),
        ("look load 'heater relay' dry joint", {"value": ("dry joint",), "load": "heater relay"}),
        (
            "rail-injection 'logic rail' clamp 20 mA limit 6V 5.2 V",
            {"value": 5.2, "rail": "logic rail", "on": (), "clamp": 0.02, "limit": 6.0},
        ),
        (
            "rail-injection logic rail limit '6 V' clamp 20mA on heater relay 5.2",
            {"value": 5.2, "rail": "logic rail", "on": ("heater relay",), "clamp": 0.02, "limit": 6.0},
        ),
    ],
)
def test_lines_that_are_readings(text: str, fields: dict[str, Any]) -> None:
    assert parse_reading(text, BOARD) == Reading(what=text.split()[0], **fields)


@pytest.mark.parametrize(
    ("text", "key", "allowed"),
    [
        ("", "", "dropper-capacitance lifted 182n"),
        ("   ", "", "dropper-capacitance lifted 182n"),
        ("x" * 3001, "", "a reading"),
        ("rail-voltage 'relay rail 14", "", "a reading"),
        ("rail-voltag 'relay rail' 14", "what", "rail-voltage (probably meant)"),
        ("dropper-capacitance 182", "value", "nF"),
        ("dropper-capacitance shrunk", "value", '"open" or "short"'),
        ("dropper-capacitance", "value", '"680 nF"'),
        ("rail-voltage 'motor rail' 14 V", "rail", '"logic rail"'),
        ("rail-voltage relay rial 14 V", "rail", '"relay rail" (probably meant) or "logic rail"'),
        ("rail-voltage Logic 5 V", "rail", '"logic rail" (probably meant) or "relay rail"'),
        ("rail-voltage 14 V", "rail", 'say which rail first: "relay rail" or "logic rail"'),
        ("rail-voltage on 'heater relay' 14 V", "rail", 'say which rail first: "relay rail" or "logic rail"'),
        ("reservoir-capacitance 40", "rail", 'say which rail first: "relay rail" or "logic rail"'),
        ("load-responds yes", "load", 'say which load first: "controller" or "heater relay"'),
        ("feed-resistance 40", "rail", "other readings: no rail of this board suits feed-resistance"),
        ("coil-resistance controller 40", "load", '"heater relay": this load is no coil'),
        ("dropper-capacitance OL", "value", '"open" or "short"'),
        ("rail-voltage relay rail 14 V on heater relai", "on", '"heater relay" (probably meant)'),
        ("rail-voltage relay rail -14 V", "value", "-5 V to 787 V; leads swapped?"),
        ("dropper-dc-voltage -150", "value", "leads swapped?"),
        ("rail-voltage", "rail", '"relay rail" or "logic rail"'),
        ("rail-voltage 'relay rail' on controller 14 V", "on", '"heater relay"'),
        ("rail-voltage 'relay rail' on 'heater relay' on 'heater relay' 14 V", "on", "each name once"),
        ("rail-voltage 'relay rail' 900 V", "value", "-5 V to 787"),
        ("rail-voltage 'relay rail' 14 A", "value", "volts"),
        ("mains-voltage lifted 230", "lifted", "mains-voltage"),
        ("mains-voltage clamp 20 mA 230", "clamp", "mains-voltage"),
        ("rail-injection 'logic rail' clamp 0 A 5 V", "clamp", "10 uA to 1 A"),
        ("load-responds 'heater relay' maybe", "value", '"lets go"'),
        ("look shiny", "value", '"nothing seen"'),
        ("shunt-capacitance 1 nF", "what", "divider"),
    ],
)
def test_lines_that_are_none_say_what_is_allowed(text: str, key: str, allowed: str) -> None:
    found = {problem.key: problem.allowed for problem in problems(text)}
    assert allowed in found[key]


def test_several_problems_of_a_line_come_together() -> None:
    keys = [problem.key for problem in problems("rail-voltage 'motor rail' on fan 14 A")]
    assert keys == ["rail", "on", "value"]


ONE_RAIL = casefile.loads(TEMPLATE).board


@pytest.mark.parametrize(
    ("text", "fields"),
    [
        ("reservoir-capacitance 40uF", {"value": 40e-6}),
        ("rail-voltage 7.4 V", {"value": 7.4, "on": ()}),
        ("rail-voltage on motor relay 7.4", {"value": 7.4, "on": ("motor relay",)}),
        ("zener-test open", {"value": "open"}),
    ],
)
def test_the_only_rail_need_not_be_named(text: str, fields: dict[str, Any]) -> None:
    assert parse_reading(text, ONE_RAIL) == Reading(what=text.split()[0], rail="12 V rail", **fields)


def test_a_missing_unit_is_told_where_the_rail_is_plain() -> None:
    with pytest.raises(CaseError, match="40 needs a unit") as caught:
        parse_reading("reservoir-capacitance 40", ONE_RAIL)
    assert [problem.key for problem in caught.value.problems] == ["value"]


def test_a_strange_name_with_figures_reaches_to_the_value() -> None:
    with pytest.raises(CaseError) as caught:
        parse_reading("rail-voltage 12 V rial 7 V", ONE_RAIL)
    (problem,) = caught.value.problems
    assert (problem.key, problem.found, problem.allowed) == ("rail", '"12 V rial"', '"12 V rail" (probably meant)')


def test_a_line_of_the_most_words_takes_no_longer_than_its_length_warrants() -> None:
    def seconds(text: str) -> float:
        spans = []
        for _ in range(3):
            start = time.perf_counter()
            answer(text)
            spans.append(time.perf_counter() - start)
        return min(spans)

    # eight times the words: linear and half quadratic work with room for noise, far from the cubic 512
    assert seconds("rail-voltage " + "on x " * 560) < 150 * seconds("rail-voltage " + "on x " * 70)


PIECES = (
    *("rail-voltage", "look", "rail-injection", "load-responds", "relay", "rail", "on", "heater", "lifted"),
    *(
        "clamp",
        "limit",
        "20",
        "mA",
        "always",
        "'relay rail'",
        "14.2 V",
        "open",
        "'",
        '"',
        "\\",
        ",",
        "\x1b[2J",
        "Ω",
        "load",
        "warm",
    ),
)


@settings(derandomize=True, deadline=None)
@given(st.lists(st.one_of(st.sampled_from(PIECES), st.text(max_size=5)), max_size=9).map(" ".join))
def test_any_line_is_a_reading_or_a_sentence(text: str) -> None:
    said = answer(text)
    assert said
    assert all(line.isprintable() for line in said.splitlines())


def answer(text: str) -> str:
    """The kind of reading the line is, or why it is none."""
    try:
        return parse_reading(text, BOARD).what
    except CaseError as refusal:
        return str(refusal)
