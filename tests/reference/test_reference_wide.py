"""Holds the reference's further shapes, faults and its bench supply to hand limits and published figures.

As in test_reference, sources are named beside each check; the stored wide circuits go with their generator.
"""

from __future__ import annotations

import json
import math
import tomllib
from collections import Counter
from typing import Any

import pytest

from tests.reference.bench_supply import inject
from tests.reference.circuit import Circuit, Netlist, faulty_values, netlist
from tests.reference.circuits import UNITS, to_case_text
from tests.reference.parts import METER, OPEN
from tests.reference.run import change
from tests.reference.simulate import simulate
from tests.reference.wide_circuits import WIDE, draw_all
from tests.reference.wide_run import WIDE_EXPECTED, injections

CIRCUITS: list[Circuit] = json.loads(WIDE.read_text(encoding="utf-8"))
EXPECTED: list[dict[str, Any]] = json.loads(WIDE_EXPECTED.read_text(encoding="utf-8"))
BY_NAME = {circuit["name"]: circuit for circuit in CIRCUITS}


def supply(rectifier: str, dropper: dict[str, Any], zener: float, *loads: dict[str, Any]) -> Circuit:
    """Return a one-rail board on 230 V 50 Hz; without loads a bias keeps the reservoir from standing still."""
    rail: dict[str, Any] = {"name": "rail", "fed_by": "rectifier", "zener": {"voltage": zener}}
    rail["reservoir"] = {"capacitance": 220e-6}
    bias = {"name": "bias", "kind": "current", "rail": "rail", "current": 0.1e-3}
    board = {"rectifier": rectifier, "dropper": dropper, "rail": [rail], "load": list(loads) or [bias]}
    return {"mains": {"voltage": 230.0, "frequency": 50.0}, "board": board, "on": []}


def resistor(ohms: float, rail: str = "rail") -> dict[str, Any]:
    return {"name": "resistor", "kind": "resistor", "rail": rail, "resistance": ohms}


def capacitor(farads: float) -> dict[str, Any]:
    return {"kind": "capacitor", "capacitance": farads}


# ---- divider -------------------------------------------------------------------------------------


@pytest.mark.parametrize("rectifier", ["bridge", "half-wave"])
def test_divider_is_its_thevenin_equivalent(rectifier: str) -> None:
    """Thevenin's theorem: two capacitors feed like C1 + C2 from mains * C1 / (C1 + C2); charge balance after."""
    upper, lower = 680e-9, 1000e-9
    divided = simulate(supply(rectifier, capacitor(upper) | {"kind": "divider", "shunt_capacitance": lower}, 23.9))
    plain = supply(rectifier, capacitor(upper + lower), 23.9)
    ratio = upper / (upper + lower)
    plain["mains"]["voltage"] *= ratio
    equal = simulate(plain)
    assert divided["settled"]
    assert divided["supply_current_A"] == pytest.approx(equal["supply_current_A"], rel=1e-3)
    crest, volts = ratio * 230.0 * math.sqrt(2.0), divided["rails"][0]["voltage_V"]
    swing = 4.0 * (crest - volts - 1.4) if rectifier == "bridge" else 2.0 * crest - volts - 1.4
    assert divided["supply_current_A"] == pytest.approx(50.0 * (upper + lower) * swing, rel=5e-3)


def test_divider_without_its_second_capacitor_is_a_plain_dropper() -> None:
    dropper = capacitor(330e-9) | {"kind": "divider", "shunt_capacitance": 470e-9}
    lost = simulate(supply("bridge", dropper, 18.0) | {"fault": {"fault": "shunt-capacitor-open"}})
    plain = simulate(supply("bridge", capacitor(330e-9), 18.0))
    assert lost["supply_current_A"] == pytest.approx(plain["supply_current_A"], rel=1e-6)


@pytest.mark.parametrize("rectifier", ["bridge", "half-wave"])
def test_shorted_second_capacitor_leaves_nothing(rectifier: str) -> None:
    dropper = capacitor(330e-9) | {"kind": "divider", "shunt_capacitance": 470e-9}
    figures = simulate(supply(rectifier, dropper, 18.0) | {"fault": {"fault": "shunt-capacitor-short"}})
    assert figures["settled"]
    assert abs(figures["rails"][0]["voltage_V"]) < 0.05


# ---- regulator -----------------------------------------------------------------------------------


def regulated(farads: float, ohms: float) -> Circuit:
    """Return a 12 V rail with a 5 V regulator (dropout 1.2 V, 2 mA of its own) and a resistor behind it."""
    circuit = supply("bridge", capacitor(farads), 12.0, resistor(ohms, "logic"))
    logic = {"name": "logic", "fed_by": "rail", "fed_through": "regulator", "regulated_voltage": 5.0}
    logic |= {"dropout": 1.2, "ground_current": 2e-3, "reservoir": {"capacitance": 47e-6}}
    circuit["board"]["rail"].append(logic)
    return circuit


def test_regulator_holds_its_voltage_and_draws_load_and_ground_current() -> None:
    """5 V into 1 kohm is 5 mA; with 2 mA of its own 7 mA are missing at the zener (Kirchhoff)."""
    figures = simulate(regulated(470e-9, 1000.0))
    first, logic = figures["rails"]
    assert logic["voltage_V"] == pytest.approx(5.0, abs=5e-3)
    assert figures["supply_current_A"] - first["zener_current_A"] == pytest.approx(7e-3, rel=2e-3)


@pytest.mark.parametrize("ohms", [560.0, 680.0, 820.0])
def test_regulator_out_of_reach_stands_its_dropout_below_the_input(ohms: float) -> None:
    """Output = input - dropout (case format); the supply's current is that of load and regulator."""
    figures = simulate(regulated(82e-9, ohms))
    first, logic = figures["rails"]
    assert figures["settled"]
    assert logic["voltage_V"] < 4.9
    assert first["voltage_V"] - logic["voltage_V"] == pytest.approx(1.2, abs=0.01)
    assert figures["supply_current_A"] == pytest.approx(logic["voltage_V"] / ohms + 2e-3, rel=2e-3)


def test_regulator_passes_nothing_backwards() -> None:
    """Fed from its output by a bench supply the first rail stays empty: 5 mA in 1 kohm are 5 V."""
    assert inject(regulated(470e-9, 1000.0), "logic", 5e-3, 9.0) == pytest.approx(5.0, abs=5e-3)


# ---- gate loads ----------------------------------------------------------------------------------


def test_gate_pulses_have_their_mean_current() -> None:
    """Twice a cycle I for a time t is 2 f I t: 100 Hz * 30 mA * 400 us = 1.2 mA."""
    gate = {"name": "gate", "kind": "gate", "rail": "rail", "current": 30e-3, "pulse": 400e-6}
    circuit = supply("bridge", capacitor(330e-9), 12.0, gate)
    figures = simulate(circuit)
    drawn = figures["supply_current_A"] - figures["rails"][0]["zener_current_A"]
    assert drawn == pytest.approx(2.0 * 50.0 * 30e-3 * 400e-6, rel=2e-3)
    assert figures["balance"] == pytest.approx(1.0, abs=1e-4)


# ---- bench supply --------------------------------------------------------------------------------


def test_injected_resistor_takes_the_clamp_or_the_limit() -> None:
    """Ohm's law: 20 mA in 470 ohm are 9.4 V, 5 mA 2.35 V; what would exceed the limit stands at it."""
    circuit = supply("bridge", capacitor(330e-9), 24.0, resistor(470.0))
    assert inject(circuit, "rail", 20e-3, 28.8) == pytest.approx(9.4, rel=1e-4)
    assert inject(circuit, "rail", 5e-3, 28.8) == pytest.approx(2.35, rel=1e-4)
    assert inject(circuit, "rail", 20e-3, 6.0) == pytest.approx(6.0, abs=0.01)


def test_injected_zener_shows_its_mark_at_five_milliamperes() -> None:
    """Case format, section 4: marked voltage at 5 mA, 60 mV per e-fold."""
    circuit = supply("bridge", capacitor(330e-9), 12.0, resistor(METER))
    assert inject(circuit, "rail", 5e-3, 14.4) == pytest.approx(12.0, abs=1e-3)
    assert inject(circuit, "rail", 20e-3, 14.4) == pytest.approx(12.0 + 0.06 * math.log(4.0), abs=1e-3)


def test_zener_before_the_series_diode_does_not_clamp_a_bench_supply() -> None:
    circuit = supply("half-wave-zener", capacitor(330e-9), 12.0, resistor(METER))
    assert inject(circuit, "rail", 20e-3, 13.6) == pytest.approx(13.6, abs=0.01)


def test_lost_dropper_is_not_seen_by_a_bench_supply_but_a_leak_is() -> None:
    """Published values, "near-identical readings": lost dropper healthy, leaky low."""
    circuit = supply("bridge", capacitor(330e-9), 12.0)
    sound = inject(circuit, "rail", 5e-3, 14.4)
    lost = {"fault": "dropper-capacitance-lost", "capacitance": 50e-9}
    leaky = {"fault": "reservoir-leaky", "rail": "rail", "current": 20e-3}
    assert inject(circuit | {"fault": lost}, "rail", 5e-3, 14.4) == pytest.approx(sound, abs=1e-4)
    assert inject(circuit | {"fault": leaky}, "rail", 5e-3, 14.4) == pytest.approx(0.0049 * 600.0, rel=2e-3)


# ---- published figures ---------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("name", "volts"),
    [("c: half-wave, zener open, 15 mA", 496.0), ("c: half-wave, zener open, nearly unloaded", 668.0)],
)
def test_open_zener_pumps_to_the_published_figures(name: str, volts: float) -> None:
    """Published values, supply formulas: "496 V at 15 mA, 668 V nearly unloaded, 240 V mains".

    Assumed, for no values are published: 50 Hz, 100 ohm inrush, no bleeder; 1.65 uF, which is what charge
    balance asks for at 496 V and 15 mA; nearly unloaded is taken as 0.6 mA beside a meter of 10 Mohm. So the
    first figure says that balance and simulation agree, the second that one board gives both.
    """
    figures = simulate(BY_NAME[name])
    assert figures["settled"]
    assert figures["rails"][0]["voltage_V"] == pytest.approx(volts, rel=5e-3)


def test_bridge_with_open_zener_climbs_past_250_volts() -> None:
    """Charge balance: V = Vpk - 1.4 - I / (4 f C) (the drops are less at such currents)."""
    for name, amps in (("light load", 1.5e-3), ("heavier load", 5e-3)):
        volts = simulate(BY_NAME[f"b: bridge, zener open, {name}"])["rails"][0]["voltage_V"]
        assert volts > 250.0
        balance = 230.0 * math.sqrt(2.0) - 1.4 - (amps + volts / METER) / (4.0 * 50.0 * 470e-9)
        assert volts == pytest.approx(balance, rel=2e-3)


def test_open_bridge_diode_stops_the_current() -> None:
    """Published values: "no current. The dropper charges to the crest ... at about 1.4 x the RMS reading"."""
    figures = simulate(BY_NAME["d: bridge diode open, no bleeder"])
    assert figures["settled"]
    assert figures["supply_current_A"] < 1e-5
    assert abs(figures["rails"][0]["voltage_V"]) < 0.05
    assert figures["dropper_dc_V"] == pytest.approx(230.0 * math.sqrt(2.0), rel=5e-3)


def test_shorted_series_diode_leaves_the_droppers_charge_as_ripple() -> None:
    """Published values: "rail = 0 with the dropper's charge as ripple": 2 Vpk C1 / (C1 + C) between peaks."""
    circuit = supply("half-wave", capacitor(470e-9), 15.0, resistor(1e4))
    figures = simulate(circuit | {"fault": {"fault": "diode-short", "junction": "series"}})
    rail = figures["rails"][0]
    assert figures["settled"]
    assert abs(rail["voltage_V"]) < 0.5
    ripple = 2.0 * 230.0 * math.sqrt(2.0) * 470e-9 / 220e-6
    assert rail["ripple_pp_V"] == pytest.approx(ripple, rel=0.1)


# ---- stored circuits -----------------------------------------------------------------------------


def test_stored_circuits_are_the_draw() -> None:
    assert draw_all() == CIRCUITS
    assert [figures["name"] for figures in EXPECTED] == [circuit["name"] for circuit in CIRCUITS]


def test_stored_figures_stand_still_and_keep_the_energy() -> None:
    """Conservation of energy: what the mains gives in a steady cycle turns to heat."""
    for figures in EXPECTED:
        assert figures["settled"], figures["name"]
        power = figures["real_power_W"]
        assert abs(figures["balance"] - 1.0) * power < 1e-3 * power + 1e-6, figures["name"]
        assert figures["error"] is None or figures["error"] < 1e-3, figures["name"]


@pytest.mark.parametrize("number", [19, 27, 107])
def test_stored_figures_are_found_again(number: int) -> None:
    circuit, expected = CIRCUITS[number], EXPECTED[number]
    assert change(expected, simulate(circuit)) < 1e-5
    for stored, found in zip(expected["injection"], injections(circuit), strict=True):
        assert found["voltage_V"] == pytest.approx(stored["voltage_V"], rel=1e-5)


def test_every_shape_and_class_of_fault_is_there_three_times() -> None:
    shapes, classes = Counter[str](), Counter[str]()
    for circuit in CIRCUITS:
        board, fault = circuit["board"], circuit.get("fault", {"fault": "no-fault"})
        parts_of = {f"fed through {rail.get('fed_through', 'rectifier')}" for rail in board["rail"]}
        parts_of |= {f"load {load['kind']}" for load in board["load"]} | {f"{len(board['rail'])} rails"}
        shapes.update({f"{board['rectifier']} behind {board['dropper']['kind']}", *parts_of})
        classes["pair" if "with" in fault else fault["fault"].rsplit("-", 1)[0]] += 1
    extra = [shapes.pop(f"half-wave-zener behind {kind}") for kind in ("resistor", "divider")]
    assert min(extra) >= 1  # beyond the wanted shapes
    assert min(shapes.values()) >= 3
    assert len(shapes) == 7 + 4 + 5 + 3
    wanted = {"dropper-capacitance", "inrush", "diode", "zener", "reservoir", "feed", "load", "mains", "pair"}
    wanted |= {"board", "shunt-capacitor", "coil-shorted"}
    assert min(classes[name] for name in wanted) >= 3


def quantities(table: Any) -> Any:
    """Return a table of the case file with its quantities in SI units read as floats."""
    if isinstance(table, dict):
        return {key: quantities(value) for key, value in table.items() if key != "nominal_voltage"}
    if isinstance(table, list):
        return [quantities(value) for value in table]
    number, _, unit = str(table).partition(" ")
    return float(number) if unit in set(UNITS.values()) else table


def test_case_texts_hold_the_boards() -> None:
    for circuit in CIRCUITS:
        board = quantities(tomllib.loads(to_case_text(circuit)))["board"]
        assert {key: board[key] for key in circuit["board"]} == circuit["board"], circuit["name"]


def parts(net: Netlist) -> Counter[tuple[Any, ...]]:
    """Return what lies between which nodes, whatever it is called; nodes inside parts by their place only."""

    def ends(part: Any) -> tuple[str, str]:
        return tuple(node.split(" ")[0] if node.startswith("inside") else node for node in (part.plus, part.minus))

    found = [(branch.law, *ends(branch), *branch.values) for branch in net.branches]
    found += [("regulator", *ends(part), *part.values) for part in net.regulators]
    return Counter([*found, net.source])


@pytest.mark.parametrize("circuit", [circuit for circuit in CIRCUITS if "fault" in circuit], ids=lambda c: c["name"])
def test_faulty_values_are_the_faulty_circuit(circuit: Circuit) -> None:
    """A board with the fault folded into its values has, part for part, the netlist of the faulty board."""
    folded = faulty_values(circuit)
    assert "fault" not in folded
    assert parts(netlist(folded)) == parts(netlist(circuit))


def test_faulty_values_leave_only_what_is_no_value() -> None:
    kinds = Counter(part.partition(":")[0] for c in CIRCUITS for part in faulty_values(c)["removed"])
    assert set(kinds) <= {"feed", "zener", "top-a", "top-b", "bottom-a", "bottom-b", "series", "return"}
    opened = next(circuit for circuit in CIRCUITS if circuit.get("fault", {}).get("fault") == "inrush-open")
    assert faulty_values(opened)["board"]["inrush"]["resistance"] == OPEN
