"""Holds the reference simulator to hand limits and published figures, before it is let judge anything else.

Numbers #n are the rows of "Checks worth having" in the project's table of published values; sources are
named beside each check.
"""

from __future__ import annotations

import json
import math
import tomllib
from typing import Any

import pytest

from tests.reference.circuit import Circuit, apply_fault, junctions, nominal_voltage
from tests.reference.circuits import CIRCUITS, draw_all, to_case_text
from tests.reference.run import EXPECTED, change
from tests.reference.simulate import simulate


def supply(
    rectifier: str, dropper: dict[str, Any], zener: float, mains: tuple[float, float], inrush: float
) -> Circuit:
    """Return a one-rail board without loads; a light load keeps the reservoir from standing still."""
    rail = {"name": "rail", "fed_by": "rectifier", "zener": {"voltage": zener}}
    rail["reservoir"] = {"capacitance": 220e-6}
    board = {"rectifier": rectifier, "dropper": dropper, "inrush": {"resistance": inrush}, "rail": [rail]}
    board["load"] = [{"name": "bias", "kind": "current", "rail": "rail", "current": 0.1e-3}]
    return {"mains": {"voltage": mains[0], "frequency": mains[1]}, "board": board, "on": []}


NEARLY_NONE = 10.0  # ohm, inrush resistor of the checks with R 0: with 0.47 uF it lowers the crest by 1e-6


def capacitor(farads: float) -> dict[str, Any]:
    return {"kind": "capacitor", "capacitance": farads}


# A 23.9 V zener stands at about 24.0 V here: 5 mA at its mark, 60 mV per e-fold (case format, section 4).
@pytest.mark.parametrize(
    ("rectifier", "inrush", "amps"),
    [
        ("bridge", NEARLY_NONE, 28.19e-3),  # 2: regulator maker's sizing identity (TI, SBVS343A 8.2.1)
        ("half-wave", NEARLY_NONE, 14.69e-3),  # 3: charge balance
        ("bridge", 1000.0, 27.86e-3),  # 4: charge balance with k of the series resistance
        ("half-wave", 1000.0, 14.53e-3),
    ],
)
def test_charge_balance(rectifier: str, inrush: float, amps: float) -> None:
    figures = simulate(supply(rectifier, capacitor(0.47e-6), 23.9, (230.0, 50.0), inrush))
    assert figures["settled"]
    assert figures["rails"][0]["voltage_V"] == pytest.approx(24.0, abs=0.1)
    assert figures["supply_current_A"] == pytest.approx(amps, rel=5e-3)


def test_note_circuit_with_zener_at_the_dropper() -> None:
    """7: 115 V, 60 Hz, 0.47 uF, 470 ohm, 5.1 V: 8.98 mA (a reference design page lists 9 mA)."""
    figures = simulate(supply("half-wave-zener", capacitor(0.47e-6), 5.1, (115.0, 60.0), 470.0))
    total = figures["supply_current_A"] + figures["rails"][0]["zener_current_A"]
    assert total == pytest.approx(8.98e-3, rel=0.02)


@pytest.mark.parametrize(
    ("rectifier", "ratio"),
    [("bridge", 2.0 * math.sqrt(2.0) / math.pi), ("half-wave", math.sqrt(2.0) / math.pi)],
)
def test_mean_over_rms_of_a_vanishing_rail(rectifier: str, ratio: float) -> None:
    """8: V, Vf, R -> 0 gives 0.9003 and 0.4502; here 2300 V of mains stand against 1 V of rail."""
    figures = simulate(supply(rectifier, capacitor(47e-9), 1.0, (2300.0, 50.0), 100.0))
    assert figures["supply_current_A"] / figures["line_current_A"] == pytest.approx(ratio, rel=2e-3)


@pytest.mark.parametrize(("farads", "amps"), [(330e-9, 19.79e-3), (100e-9, 6.00e-3)])
def test_lost_dropper(farads: float, amps: float) -> None:
    """15: 330 nF fallen to 100 nF, bridge 230 V 50 Hz 24 V (charge balance)."""
    figures = simulate(supply("bridge", capacitor(farads), 23.95, (230.0, 50.0), NEARLY_NONE))
    assert figures["supply_current_A"] == pytest.approx(amps, rel=5e-3)


def test_resistor_dropper_conduction_angle() -> None:
    """I = 2/(pi R) [Vpk cos a - V'(pi/2 - a)], a = asin(V'/Vpk), V' = V + 2 Vf (analytic)."""
    ohms, crest = 10e3, 120.0 * math.sqrt(2.0)
    circuit = supply("bridge", {"kind": "resistor", "resistance": ohms}, 12.0, (120.0, 60.0), 0.0)
    figures = simulate(circuit)
    lifted = figures["rails"][0]["voltage_V"] + 2.0 * 0.69  # V, the law's drop at 13 mA
    angle = math.asin(lifted / crest)
    amps = 2.0 / (math.pi * ohms) * (crest * math.cos(angle) - lifted * (math.pi / 2.0 - angle))
    assert figures["supply_current_A"] == pytest.approx(amps, rel=2e-3)


def proofer() -> Circuit:
    """Return the example board of the case format, section 1."""
    rails = [
        {"name": "relay rail", "fed_by": "rectifier", "zener": {"voltage": 18.0, "clamps_to": "logic rail"},
         "reservoir": {"capacitance": 220e-6}},
        {"name": "logic rail", "fed_by": "relay rail", "fed_through": "zener", "zener": {"voltage": 5.1},
         "reservoir": {"capacitance": 100e-6}},
    ]  # fmt: skip
    loads = [
        {"name": "controller", "kind": "current", "rail": "logic rail", "current": 3.5e-3},
        {"name": "heater relay", "kind": "coil", "rail": "relay rail", "returns_to": "logic rail",
         "switched": True, "resistance": 810.0},
    ]  # fmt: skip
    board: dict[str, Any] = {"rectifier": "bridge", "dropper": capacitor(680e-9)}
    board["inrush"] = {"resistance": 100.0}
    board |= {"rail": rails, "bleeder": {"resistance": 470e3, "in_series": 2}, "load": loads}
    return {"mains": {"voltage": 230.0, "frequency": 50.0}, "board": board, "on": []}


def test_stacked_example_of_the_case_format() -> None:
    """Every figure of section 2's state, "confirmed by an independent simulation within 2 %"."""
    figures = simulate(proofer())
    expected = {
        "supply_current_A": 0.0409, "line_current_A": 0.0482, "inrush_voltage_V": 4.82,
        "dropper_voltage_V": 223.0, "inrush_power_W": 0.232, "apparent_power_VA": 11.1, "real_power_W": 1.31,
    }  # fmt: skip
    rail = {
        "voltage_V": 23.3, "ripple_pp_V": 0.246, "ripple_rms_V": 0.080, "zener_current_A": 0.041,
        "zener_power_W": 0.74,
    }  # fmt: skip
    assert {key: figures[key] for key in expected} == pytest.approx(expected, rel=0.02)
    assert {key: figures["rails"][0][key] for key in rail} == pytest.approx(rail, rel=0.02)


def test_lost_dropper_lowers_the_example_to_the_reading() -> None:
    """181 nF is the effective capacitance of section 2 for the reading 14.2 V with the relay on."""
    fault = {"fault": "dropper-capacitance-lost", "capacitance": 181e-9}
    figures = simulate(proofer() | {"on": ["heater relay"], "fault": fault})
    assert figures["rails"][0]["voltage_V"] == pytest.approx(14.2, rel=0.01)
    assert not figures["rails"][0]["regulating"]


@pytest.mark.parametrize(
    ("lower", "volts"),
    [(None, 10.5), (3.3, 13.7)],
)
def test_starved_relay(lower: float | None, volts: float) -> None:
    """17: 240 V, dropper fallen to 100 nF, 1600 ohm relay to common or on a 3.3 V lower rail."""
    circuit = supply("bridge", capacitor(100e-9), 24.0, (240.0, 50.0), 100.0)
    board = circuit["board"]
    coil = {"name": "relay", "kind": "coil", "rail": "rail", "resistance": 1600.0}
    if lower is not None:
        board["rail"][0]["zener"] = {"voltage": 20.7, "clamps_to": "low"}
        low = {"name": "low", "fed_by": "rail", "fed_through": "zener", "zener": {"voltage": lower}}
        board["rail"].append(low)
        coil["returns_to"] = "low"
    board["load"] = [coil]
    assert simulate(circuit)["rails"][0]["voltage_V"] == pytest.approx(volts, rel=0.02)


FAULTY = [
    {"fault": "no-fault"},
    {"fault": "dropper-capacitance-lost", "capacitance": 150e-9},
    {"fault": "inrush-high", "resistance": 3000.0},
    {"fault": "zener-short", "rail": "relay rail", "resistance": 3.0},
    {"fault": "reservoir-dried", "rail": "relay rail", "factor": 0.1, "extra_esr": 5.0},
    {"fault": "board-leakage", "rail": "logic rail", "current": 10e-3},
    {"fault": "diode-short", "junction": "bottom-b"},
    {"fault": "switch-stuck-on", "load": "heater relay"},
]


@pytest.mark.parametrize("fault", FAULTY, ids=lambda fault: str(fault["fault"]))
def test_energy_balance(fault: dict[str, Any]) -> None:
    """What the mains gives in a steady cycle turns to heat in the parts (conservation of energy)."""
    figures = simulate(proofer() | {"fault": fault})
    assert figures["settled"]
    assert figures["balance"] == pytest.approx(1.0, rel=0.01)


def test_one_bridge_diode_shorted_halves_the_current() -> None:
    """Published values, supply formulas: "half the current, ripple as half-wave"."""
    whole = simulate(proofer())
    half = simulate(proofer() | {"fault": {"fault": "diode-short", "junction": "top-a"}})
    assert half["supply_current_A"] / whole["supply_current_A"] == pytest.approx(0.52, abs=0.03)


def test_half_wave_with_open_zener_pumps_towards_twice_the_crest() -> None:
    """Published values, supply formulas: "up to twice the crest" of a nearly unloaded half-wave board."""
    circuit = supply("half-wave", capacitor(0.47e-6), 24.0, (230.0, 50.0), 100.0)
    circuit["board"]["load"] = [{"name": "bias", "kind": "resistor", "rail": "rail", "resistance": 1e6}]
    figures = simulate(circuit | {"fault": {"fault": "zener-open", "rail": "rail"}})
    # Charge balance: V / R = f C (2 Vpk - V - 2 Vf), so V = (2 Vpk - 1.2) / (1 + 1 / (R f C)).
    limit = (2.0 * 230.0 * math.sqrt(2.0) - 1.2) / (1.0 + 1.0 / (1e6 * 50.0 * 0.47e-6))
    assert figures["rails"][0]["voltage_V"] == pytest.approx(limit, rel=5e-3)


def test_open_mains_path_leaves_nothing_and_the_mains_over_the_gap() -> None:
    figures = simulate(proofer() | {"on": ["heater relay"], "fault": {"fault": "inrush-open"}})
    assert abs(figures["rails"][0]["voltage_V"]) < 0.05
    assert figures["inrush_voltage_V"] == pytest.approx(230.0, rel=0.01)


def test_faults_change_a_copy() -> None:
    circuit = proofer()
    changed = apply_fault(circuit, {"fault": "zener-low", "rail": "logic rail", "voltage": 3.0})
    assert nominal_voltage(changed, "relay rail") == 21.0
    assert nominal_voltage(circuit, "relay rail") == pytest.approx(23.1)
    assert set(junctions(circuit)) == {"top-a", "bottom-a", "top-b", "bottom-b"}


def test_stored_circuits_are_the_draw_and_their_figures_are_found_again() -> None:
    """The stored data goes with its generator; two circuits, one starving, stand for all forty."""
    stored = json.loads(CIRCUITS.read_text(encoding="utf-8"))
    expected = json.loads(EXPECTED.read_text(encoding="utf-8"))
    assert stored == draw_all()
    assert all(figures["settled"] and abs(figures["balance"] - 1.0) < 1e-3 for figures in expected)
    assert max(change(expected[number], simulate(stored[number])) for number in (13, 19)) < 1e-4


def test_case_text_holds_the_circuit() -> None:
    """The case file is read back as TOML with the units of the case format's section 1."""
    text = tomllib.loads(to_case_text(draw_all()[1]))
    first = text["board"]["rail"][0]
    assert text["mains"] == {"voltage": "120 V", "frequency": "60 Hz"}
    assert text["board"]["dropper"]["capacitance"].endswith(" F")
    assert (first["zener"]["clamps_to"], text["board"]["rail"][1]["fed_through"]) == ("low rail", "zener")
