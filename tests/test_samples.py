"""The sample cases: their readings were made by the independent time-step reference, so their truth is known from outside.

`reference/sample_truth.json` says what was broken and what the true values were. The keys of the result are those of the case
format, section 2, written out here by hand.
"""

from __future__ import annotations

import json
import math
import re
from collections.abc import Iterator
from functools import cache
from pathlib import Path
from typing import Any

import pytest

from benchtool import assess, load
from tests.some_boards import CONTRACT, samples

TRUTH: dict[str, dict[str, Any]] = json.loads(
    (Path(__file__).parent / "reference" / "sample_truth.json").read_text(encoding="utf-8")
)
NAMES = tuple(sorted(TRUTH))

# source: the case format, section 2
KEYS = {
    "": {"format", "case", "states", "budget", "effective", "suspects", "disagreements", "next_checks", "safety", "cautions"},
    "states": {
        "on", "supply_current_A", "line_current_A", "inrush_voltage_V", "dropper_voltage_V", "dropper_dc_V", "inrush_power_W",
        "apparent_power_VA", "real_power_W", "power_factor", "rails",
    },
    "rails": {
        "name", "voltage_V", "voltage_low_V", "voltage_high_V", "ripple_pp_V", "ripple_rms_V", "regulating", "zener_current_A",
        "zener_power_W",
    },
    "budget": {
        "on", "available_A", "available_low_A", "available_high_A", "demand_A", "margin_A", "dropout_capacitance_F",
    },
    "effective": {
        "capacitance_F", "capacitance_low_F", "capacitance_high_F", "current_A", "current_low_A", "current_high_A", "from",
    },
    "suspects": {"fault", "part", "rail", "load", "with", "probability", "explains_complaint", "because"},
    "with": {"fault", "rail", "load"},
    "because": {"what", "rail", "load", "on", "read", "expected_if_this", "expected_if_healthy", "weight"},
    "next_checks": {
        "what", "rail", "load", "on", "lifted", "when", "clamp_A", "limit_V", "condition", "gain_bits", "minutes",
    },
    "safety": {"fault", "probability"},
}
PROMISES = re.compile(
    r"safe to|is safe|are safe|it'?s safe|harmless|may be touched|can be touched|no danger|not dangerous|no risk|without risk"
)
"""Words that would promise that something may be touched."""


@cache
def result(name: str) -> dict[str, Any]:
    """The verdict on a sample case, worked out once."""
    return assess(load(samples()[0].with_name(name))).as_dict()


def tables(found: dict[str, Any]) -> Iterator[tuple[str, dict[str, Any]]]:
    """Every table of a result with the name of its kind."""
    yield "", found
    for kind in ("states", "suspects", "next_checks", "safety"):
        yield from ((kind, table) for table in found[kind])
    yield from ((kind, found[kind]) for kind in ("budget", "effective") if found[kind] is not None)
    yield from (("rails", rail) for state in found["states"] for rail in state["rails"])
    yield from (("because", row) for suspect in found["suspects"] for row in suspect["because"])
    yield from (("with", suspect["with"]) for suspect in found["suspects"] if suspect["with"] is not None)


def numbers(node: Any) -> Iterator[float]:
    """Every number of a result."""
    if isinstance(node, dict):
        node = list(node.values())
    if isinstance(node, list):
        for child in node:
            yield from numbers(child)
    elif isinstance(node, float):
        yield node


def check_result(found: dict[str, Any]) -> None:
    """What holds for every result, whatever was read."""
    for kind, table in tables(found):
        assert KEYS[kind] <= set(table), kind
    json.dumps(found, allow_nan=False)
    assert all(math.isfinite(number) for number in numbers(found))
    if found["suspects"]:
        assert math.fsum(suspect["probability"] for suspect in found["suspects"]) == pytest.approx(1.0, abs=1e-9)
        assert {"no-fault", "unexplained"} <= {suspect["fault"] for suspect in found["suspects"]}
    chances = [suspect["probability"] for suspect in found["suspects"]]
    assert chances == sorted(chances, reverse=True)
    assert all(0.0 <= chance <= 1.0 for chance in chances)
    text = " ".join(found["cautions"]).lower()
    assert "isolat" in text
    assert "discharg" in text
    assert PROMISES.search(json.dumps(found).lower()) is None


def ranked(found: dict[str, Any]) -> tuple[Any, ...]:
    first = found["suspects"][0]
    return first["fault"], first["rail"], first["load"]


# --- the truth


def test_every_sample_has_a_truth() -> None:
    assert {path.name for path in samples()} == set(TRUTH)


@pytest.mark.parametrize("name", NAMES)
def test_the_injected_fault_leads(name: str) -> None:
    truth = TRUTH[name]
    if truth["fault"] == "bleeder-open":  # a safety finding: it causes no complaint and does not compete
        assert ranked(result(name)) == ("no-fault", None, None)
        first = result(name)["safety"][0]
        assert (first["fault"], first["probability"]) == ("bleeder-open", 1.0)
    else:
        assert ranked(result(name)) == (truth["fault"], truth.get("rail"), truth.get("load"))
        assert "bleeder-open" not in [item["fault"] for item in result(name)["safety"]]


@pytest.mark.parametrize("name", NAMES)
def test_the_true_dropper_lies_within_what_it_is_said_to_act_as(name: str) -> None:
    true, effective = TRUTH[name]["dropper_F"], result(name)["effective"]
    low, high = effective["capacitance_low_F"], effective["capacitance_high_F"]
    if true is not None:
        assert low is None or low <= true
        assert high is None or true <= high
    else:
        assert (low, high) == (None, None)  # a resistor dropper has no capacitance


@pytest.mark.parametrize("name", NAMES)
def test_true_readings_of_one_board_do_not_disagree(name: str) -> None:
    assert result(name)["disagreements"] == []


@pytest.mark.parametrize("name", NAMES)
def test_the_result_is_whole(name: str) -> None:
    check_result(result(name))


@pytest.mark.parametrize("name", NAMES)
def test_every_reading_has_its_say(name: str) -> None:
    readings = load(samples()[0].with_name(name)).readings
    known = [reading.what for reading in readings if reading.what != "bleeder-resistance"]
    for suspect in result(name)["suspects"]:
        assert suspect["fault"] == "unexplained" or [row["what"] for row in suspect["because"]] == known


@pytest.mark.parametrize("name", NAMES)
def test_states_are_off_on_and_those_read_in_each_once(name: str) -> None:
    case = load(samples()[0].with_name(name))
    wanted = [frozenset[str](), frozenset(case.board.switched_loads()), *(frozenset(r.on or ()) for r in case.readings)]
    found = [frozenset(state["on"]) for state in result(name)["states"]]
    assert found == list(dict.fromkeys(wanted))


def test_no_fault_has_no_part_and_explains_no_complaint() -> None:
    healthy = next(s for s in result("proofer-healthy.toml")["suspects"] if s["fault"] == "no-fault")
    assert (healthy["part"], healthy["explains_complaint"]) == (None, False)
    assert all(row["weight"] == 0.0 for row in healthy["because"])


# --- the case format's own example


@cache
def contract_result() -> dict[str, Any]:
    return assess(CONTRACT).as_dict()


def test_the_contract_board_is_judged_as_in_its_section_2() -> None:
    found = contract_result()
    check_result(found)
    first = found["suspects"][0]
    assert found["case"] == "R-2207"
    assert (first["fault"], first["part"], first["explains_complaint"]) == ("dropper-capacitance-lost", "dropper", True)
    assert first["because"][2]["read"] == "182 nF, lifted"
    assert first["probability"] > 0.9
    assert found["disagreements"] == []


def test_a_lost_dropper_carries_the_complaint_where_the_relay_lets_go() -> None:
    assert result("proofer-relay-lets-go.toml")["suspects"][0]["explains_complaint"] is True
    assert result("towel-rail-relay-buzzes.toml")["suspects"][0]["explains_complaint"] is True
