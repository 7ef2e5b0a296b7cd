"""The physics against figures from outside the project; `published/checks.json` holds each with its tolerance and source.

Each row is answered by a function that `assess` itself reaches, never by a formula retyped here. The way down:
assess → budget_of → supply_current → laws.capacitor_current, laws.rule_of_thumb_current → laws.reactance;
assess → effective_of → back_solved_capacitance → laws.capacitance_for; and means → supply_current, line_current;
assess → states_of → settle, the cycle step by step; and mains_power;
assess → safety_findings → discharge_of → laws.discharge_time, bleeder_share → laws.string_share;
assess → posterior_of → settle(warm) → laws.copper_ratio.
"""

from __future__ import annotations

import json
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from benchtool.assessment import states_of
from benchtool.board import Bleeder, Board, Dropper
from benchtool.case import Case
from benchtool.casefile import load
from benchtool.diagnosis.effective import effective_of
from benchtool.diagnosis.safety import safety_findings
from benchtool.physics import laws
from benchtool.physics.budget import Budget, back_solved_capacitance, budget_of, regulating
from benchtool.physics.discharge import discharge_of
from benchtool.physics.settled import Settled
from benchtool.physics.specimens import as_marked
from benchtool.physics.stress import bleeder_share
from benchtool.physics.supply import feed_of, line_current, supply_current
from benchtool.physics.waveform import settle
from tests.small_boards import board, coil, rail, stacked

HERE = Path(__file__).parent
CHECKS: list[dict[str, Any]] = json.loads((HERE / "published" / "checks.json").read_text(encoding="utf-8"))
EXAMPLE: dict[str, Any] = json.loads((HERE / "published" / "example.json").read_text(encoding="utf-8"))
ROWS = range(1, 19)


def one_rail(zener: float, rectifier: str = "bridge", **parts: Any) -> Board:
    return board(rectifier, rails=(rail(zener=zener),), **parts)


def settled_of(made: Board, on: tuple[str, ...] = ()) -> Settled:
    settled = settle(as_marked(made), on)
    assert settled.converged.all()
    return settled


def available(**inputs: Any) -> float | None:
    # assess → budget_of → supply_current → laws.capacitor_current
    return budget_of(one_rail(**inputs)).available


def capacitance_for(volts: float, frequency: float, current: float, half_swing: float) -> float:
    # assess → effective_of → back_solved_capacitance → laws.capacitance_for
    return float(laws.capacitance_for(current, np.sqrt(2.0) * volts, frequency, 0.0, half_swing))


def back_solved(volts: float, hertz: float, current: float, rail_voltage: float) -> float:
    # assess → effective_of → back_solved_capacitance
    marked = as_marked(board(volts=volts, hertz=hertz))
    return float(back_solved_capacitance(marked, np.array([current]), np.array([rail_voltage]))[0])


def mean_over_rms(rectifier: str) -> float:
    # assess → effective_of → means → supply_current, line_current. At minus two diode drops the rectifier sees no voltage.
    feed, nil = feed_of(as_marked(board(rectifier))), np.array([-1.4])
    return float(supply_current(feed, nil)[0][0] / line_current(feed, nil)[0])


def drained(capacitance: float, bleeder: float) -> Board:
    """The values themselves, without spread, so that the crest is 230 V · √2 and the discharge is the row's own."""
    return board(capacitance=capacitance, bleeder=bleeder, variation=0.0, tolerance=0.0)


def time_constant(capacitance: float, bleeder: float) -> float | None:
    # assess → safety_findings → discharge_of: its capacitance and bleeder are what the time to the limit is made of
    found = discharge_of(drained(capacitance, bleeder))
    return None if found.bleeder is None or found.capacitance is None else found.bleeder * found.capacitance


def relay_demand(capacitance: float, power: float) -> float | None:
    # assess → budget_of → demand
    relay = replace(coil(1.0), resistance=None, power=power, nominal_voltage=24.0)
    return budget_of(board(capacitance=capacitance, loads=(relay,))).demand


def heat_of_resistor_dropper(resistance: float, volts: float, zener: float) -> float:
    # assess → states_of → settle
    made = one_rail(zener, dropper=Dropper(kind="resistor", resistance=resistance), volts=volts)
    return float(settled_of(made).line_current[0] ** 2) * resistance


def starved_rail(on_lower: bool) -> float:
    # assess → states_of → settle; the dropper of a 24 V supply fallen to 100 nF, its relay of 24 V 15 mA on
    rails = stacked(20.7, 3.3) if on_lower else (rail(),)
    relay = coil(1600.0, returns_to="logic" if on_lower else "common")
    made = board(capacitance=100e-9, volts=240.0, rails=rails, loads=(relay,))
    return float(settled_of(made, ("relay",)).rail_voltage[0, 0])


def string_overloaded(in_series: int, volts: float, rated: float) -> float:
    # assess → safety_findings → bleeder_share → laws.string_share
    made = board(volts=volts, bleeder=470e3, in_series=in_series)
    made = replace(made, bleeder=Bleeder(resistance=470e3, in_series=in_series, rated_voltage=rated))
    share = bleeder_share(made)
    assert share is not None
    found = any(finding.fault == "bleeder-overvoltage" for finding in safety_findings(made, ()))
    assert found == (share > rated)
    return float(found)


ANSWERS: dict[str, Callable[..., Any]] = {
    "reactance": laws.reactance,  # assess → budget_of → rule_of_thumb_current → reactance
    "available": available,
    "capacitance_for": capacitance_for,
    "back_solved": back_solved,
    "rule_of_thumb": laws.rule_of_thumb_current,  # assess → budget_of → rule_of_thumb_current
    "rule_of_thumb_of_board": lambda **inputs: budget_of(one_rail(**inputs)).rule_of_thumb,
    "settled_supply": lambda **inputs: settled_of(one_rail(**inputs)).supply_current[0],
    "mean_over_rms": mean_over_rms,
    "discharge_voltage": laws.discharge_voltage,  # the law that discharge_time turns round
    "discharge_time": laws.discharge_time,  # assess → safety_findings → discharge_of → discharge_time
    "time_to_limit": lambda **inputs: discharge_of(drained(**inputs)).to_limit,
    "slow": lambda **inputs: float(bool(discharge_of(drained(**inputs)).slow)),
    "time_constant": time_constant,
    "at_celsius": lambda at_25, celsius: at_25 * laws.copper_ratio(celsius),  # assess → settle(warm) → copper_ratio
    "at_celsius_20": lambda celsius: laws.copper_ratio(celsius) / laws.copper_ratio(20.0),
    "lowest_true": lambda value, relative, floor: laws.accuracy_band(value, relative, floor)[0],
    "highest_true": lambda value, relative, floor: laws.accuracy_band(value, relative, floor)[1],
    "relay_demand": relay_demand,
    "line_current": lambda **inputs: settled_of(one_rail(**inputs)).line_current[0],
    "heat_of_resistor_dropper": heat_of_resistor_dropper,
    "starved_rail": starved_rail,
    "string_overloaded": string_overloaded,
    "stored_energy": lambda **inputs: discharge_of(drained(**inputs)).energy,  # assess → safety_findings → discharge_of
}


def name_of(check: dict[str, Any]) -> str:
    return f"{check['row']}-{check['what']}"


@pytest.mark.parametrize("check", CHECKS, ids=name_of)
def test_published_figure(check: dict[str, Any]) -> None:
    found = float(ANSWERS[check["what"]](**check["inputs"]))
    if "low" in check:
        assert check["low"] <= found <= check["high"], check["source"]
    else:
        within = {"rel": check.get("relative"), "abs": check.get("absolute", 0.0)}
        assert found == pytest.approx(check["expected"], **within), check["source"]


def test_every_published_row_is_checked_and_names_its_source() -> None:
    assert {check["row"] for check in CHECKS} >= set(ROWS)
    assert all(check["source"].strip() for check in CHECKS)
    assert all(("expected" in check) != ("low" in check) for check in CHECKS)


@pytest.mark.parametrize(("capacitance", "runs"), [(330e-9, True), (100e-9, False)])
def test_relay_starves_where_the_dropper_has_fallen_to_100_nf(capacitance: float, runs: bool) -> None:
    # Row 15: a 0.4 W 24 V relay takes 16.7 mA; 330 nF gives 19.79 mA, 100 nF 6.00 mA (Hongfa HF115F-I sheet, charge balance).
    made = board(capacitance=capacitance, loads=(coil(1440.0),))
    budget, settled = budget_of(made), settled_of(made, ("relay",))
    assert budget.margin is not None
    assert (budget.margin > 0.0) == runs
    assert (budget.dropout_capacitance or 0.0) < capacitance if runs else (budget.dropout_capacitance or 0.0) > capacitance
    holds = regulating(settled, 0)
    assert holds is not None
    assert bool(holds[0]) == runs


@pytest.fixture(scope="module")
def example() -> Case:
    return load(HERE / "data" / "contract.toml")


def near(figure: float) -> Any:
    return pytest.approx(figure, rel=EXAMPLE["relative"])


def test_states_of_the_format_s_own_example(example: Case) -> None:
    off = states_of(example.board, example.readings)[0].as_dict()
    assert off["on"] == []
    assert {key: off[key] for key in EXAMPLE["states_off"]} == {key: near(value) for key, value in EXAMPLE["states_off"].items()}
    assert off["dropper_dc_V"] == pytest.approx(0.0, abs=1e-3)


def test_relay_rail_of_the_format_s_own_example(example: Case) -> None:
    relay = states_of(example.board, example.readings)[0].rails[0]
    found, wanted = relay.as_dict(), EXAMPLE["relay_rail_off"]
    assert relay.regulating is True
    assert {key: found[key] for key in wanted} == {key: near(value) for key, value in wanted.items()}


def test_ripple_of_the_format_s_own_example_lies_within_its_estimate(example: Case) -> None:
    relay = states_of(example.board, example.readings)[0].rails[0]
    assert relay.ripple_pp_low is not None
    assert relay.ripple_pp_high is not None
    assert relay.ripple_pp_low <= EXAMPLE["ripple_pp_V"] <= relay.ripple_pp_high


def figures_of(budget: Budget) -> dict[str, float | None]:
    return {
        "available_A": budget.available,
        "available_low_A": budget.available_low,
        "available_high_A": budget.available_high,
        "demand_A": budget.demand,
        "margin_A": budget.margin,
        "dropout_capacitance_F": budget.dropout_capacitance,
    }


def test_budget_of_the_format_s_own_example(example: Case) -> None:
    budget = budget_of(example.board)
    assert budget.on == ("heater relay",)
    assert figures_of(budget) == {key: near(value) for key, value in EXAMPLE["budget"].items()}


def test_effective_dropper_of_the_format_s_own_example(example: Case) -> None:
    # 14.2 V with the relay on is what 181 nF leaves of a rail of 23.1 V.
    found, wanted = effective_of(example.board, example.meter, example.readings), EXAMPLE["effective"]
    figures = {key: getattr(found, key.rsplit("_", 1)[0]) for key in wanted}
    assert figures == {key: near(value) for key, value in wanted.items()}
    assert [(reading.what, reading.rail, reading.on) for reading in found.readings] == [
        ("rail-voltage", "relay rail", ("heater relay",))
    ]


def test_discharge_of_the_format_s_own_example(example: Case) -> None:
    assert discharge_of(example.board).to_limit == near(EXAMPLE["discharge_time_s"])
    assert discharge_of(example.board).slow is True
