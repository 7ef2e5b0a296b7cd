"""Draws the circuits on which the product is compared with the reference, and writes them as case files.

The draw has a fixed seed and uses values that a shelf holds (E12 droppers, E24 zeners and resistors, E6
reservoirs). Loads are drawn first; the dropper is then chosen for a wanted share of their current, so that
boards which regulate and boards which starve are mixed. `python -m tests.reference.circuits` rewrites
circuits.json.
"""

from __future__ import annotations

import json
import math
from pathlib import Path
from typing import Any

import numpy as np

from tests.reference.parts import Circuit

CIRCUITS = Path(__file__).with_name("circuits.json")
SEED, COUNT = 20611, 40
E6 = (10, 15, 22, 33, 47, 68)
E12 = (10, 12, 15, 18, 22, 27, 33, 39, 47, 56, 68, 82)
E24 = tuple(sorted({*E12, 11, 13, 16, 20, 24, 30, 36, 43, 51, 62, 75, 91}))
MAINS = ((230.0, 50.0), (120.0, 60.0), (240.0, 50.0))
SHAPES = (
    ("bridge", "single"), ("bridge", "stacked"), ("half-wave", "single"), ("half-wave-zener", "single"),
    ("bridge", "feed"), ("bridge", "three levels"), ("half-wave", "feed"), ("half-wave-zener", "feed"),
    ("half-wave", "stacked"), ("bridge", "single"),
)  # fmt: skip
SHARES = (1.6, 0.7, 1.25, 2.2, 0.85, 0.6, 1.4)  # current to be had over current wanted
FAULTS: dict[int, dict[str, Any]] = {  # circuit number to a fault that no plain board can stand for
    4: {"fault": "diode-short", "junction": "top-a"},
    16: {"fault": "feed-high", "rail": "logic rail"},
    21: {"fault": "reservoir-dried", "rail": "main rail", "factor": 0.6, "extra_esr": 1.5},
    35: {"fault": "zener-short", "rail": "low rail", "resistance": 3.0},
}


def nearest(value: float, series: tuple[int, ...]) -> float:
    """Return the value of a decade series nearest in ratio."""
    decade = 10.0 ** math.floor(math.log10(value) - 1.0)
    values = (float(f"{s * decade * step:.3g}") for s in series for step in (1, 10))
    return min(values, key=lambda v: abs(math.log(v / value)))


def draw(number: int, rng: np.random.Generator) -> Circuit:
    """Return circuit `number`; all choices that are not fixed by the number come from `rng`."""
    rectifier, shape = SHAPES[number % len(SHAPES)]
    mains = MAINS[number % len(MAINS)]
    rails, loads = _rails(rectifier, shape, rng), _loads(shape, number, rng)
    share = SHARES[number % len(SHARES)]
    if shape == "feed":
        _size_feed(rails, loads, share)
    wanted = _demand(rails, loads)
    board: dict[str, Any] = {"rectifier": rectifier, "inrush": {"resistance": _inrush(number, rng)}}
    board["dropper"] = _dropper(number, rectifier, mains, rails, share * wanted)
    if board["dropper"]["kind"] == "capacitor":
        board["bleeder"] = {"resistance": float(rng.choice([220e3, 330e3, 470e3])), "in_series": 2}
    _reservoirs(rails, wanted, mains[1] * (2.0 if rectifier == "bridge" else 1.0))
    if number in (9, 22, 34):  # a rail without zener stands where its loads put it
        del rails[-1]["zener"]
    board |= {"rail": rails, "load": loads}
    on = [load["name"] for load in loads if load["switched"]] if number % 5 != 3 else []
    name = f"{number:02d} {rectifier}, {shape}"
    circuit: Circuit = {"name": name, "mains": {"voltage": mains[0], "frequency": mains[1]}, "board": board}
    return circuit | {"on": on} | _fault(number, rails)


def _fault(number: int, rails: list[dict[str, Any]]) -> dict[str, Any]:
    if number not in FAULTS:
        return {}
    fault = dict(FAULTS[number])
    if fault["fault"] == "feed-high":
        fault["resistance"] = 3.0 * rails[1]["feed_resistance"]
    return {"fault": fault}


def _rails(rectifier: str, shape: str, rng: np.random.Generator) -> list[dict[str, Any]]:
    top = float(rng.choice([12.0, 18.0] if shape == "stacked" else [12.0, 15.0, 18.0, 24.0, 27.0]))
    rails: list[dict[str, Any]] = [{"name": "main rail", "fed_by": "rectifier", "zener": {"voltage": top}}]
    names = {"feed": ["logic rail"], "stacked": ["low rail"], "three levels": ["middle rail", "low rail"]}
    for name in names.get(shape, []):
        above = rails[-1]
        volts = {"middle rail": 6.2, "low rail": 3.3 if len(rails) == 2 else 5.1, "logic rail": 5.1}[name]
        through = "resistor" if shape == "feed" else "zener"
        rail = {"name": name, "fed_by": above["name"], "fed_through": through, "zener": {"voltage": volts}}
        rails.append(rail)
        if through == "zener":
            above["zener"]["clamps_to"] = name
    return rails


def _loads(shape: str, number: int, rng: np.random.Generator) -> list[dict[str, Any]]:
    """A coil on the first rail, a controller on the last, on every other board an LED or a leak."""
    last = {"single": "main rail", "feed": "logic rail"}.get(shape, "low rail")
    below = {"stacked": "low rail", "three levels": "middle rail"}.get(shape, "common")
    coil: dict[str, Any] = {"name": "relay", "kind": "coil", "rail": "main rail", "returns_to": below}
    coil |= {"switched": True}
    coil["resistance"] = float(rng.choice([576.0, 720.0, 810.0, 1100.0, 1600.0, 2304.0]))
    loads: list[dict[str, Any]] = [coil]
    amps = round(float(rng.uniform(1e-3, 4e-3)), 4)
    loads.append({"name": "controller", "kind": "current", "rail": last, "switched": False, "current": amps})
    if number % 2 == 0:
        lamp = {"name": "lamp", "kind": "led", "rail": last, "switched": True, "forward_voltage": 1.9}
        loads.append(lamp | {"resistance": float(rng.choice([820.0, 1500.0, 2200.0]))})
    if number % 4 == 1:
        leak = {"name": "leak", "kind": "resistor", "rail": "main rail", "switched": False}
        loads.append(leak | {"resistance": float(rng.choice([2200.0, 4700.0, 6800.0]))})
    return loads


def _standing(rails: list[dict[str, Any]], name: str) -> float:
    """Return a rail's regulated voltage over common [V], zeners added up."""
    if name == "common":
        return 0.0
    rail = next(rail for rail in rails if rail["name"] == name)
    return float(rail["zener"]["voltage"]) + _standing(rails, rail["zener"].get("clamps_to", "common"))


def _amps(rails: list[dict[str, Any]], load: dict[str, Any]) -> float:
    if load["kind"] == "current":
        return float(load["current"])
    volts = _standing(rails, load["rail"]) - _standing(rails, load.get("returns_to", "common"))
    return (volts - float(load.get("forward_voltage", 0.0))) / float(load["resistance"])


def _demand(rails: list[dict[str, Any]], loads: list[dict[str, Any]]) -> float:
    """Return roughly what the first rail must be given [A]: enough to choose a dropper by."""
    upper = sum(_amps(rails, load) for load in loads if load["rail"] == "main rail")
    lower = sum(_amps(rails, load) for load in loads if load["rail"] != "main rail")
    return max(upper, lower) if "clamps_to" in rails[0]["zener"] else upper + lower


def _size_feed(rails: list[dict[str, Any]], loads: list[dict[str, Any]], share: float) -> None:
    lower = sum(_amps(rails, load) for load in loads if load["rail"] == "logic rail")
    drop = rails[0]["zener"]["voltage"] - rails[1]["zener"]["voltage"]
    rails[1]["feed_resistance"] = nearest(drop / (max(share, 0.8) * lower), E24)


def _inrush(number: int, rng: np.random.Generator) -> float:
    raised = number % 7 == 2
    return float(rng.choice([1000.0, 1800.0, 2700.0] if raised else [47.0, 100.0, 220.0, 330.0]))


def _dropper(
    number: int, rectifier: str, mains: tuple[float, float], rails: list[dict[str, Any]], amps: float
) -> dict[str, Any]:
    """Return the part that gives about `amps` by charge balance, or by the mean of a rectified sine."""
    whole, top = rectifier == "bridge", _standing(rails, "main rail")
    crest = math.sqrt(2.0) * mains[0]
    if number % 10 in (7, 9) and mains[0] < 200.0:
        mean = (crest - top) * (2.0 if whole else 1.0) / math.pi
        return {"kind": "resistor", "resistance": nearest(mean / amps, E12)}
    swing = 4.0 * (crest - top - 1.4) if whole else 2.0 * crest - top - 1.4
    farads = nearest(amps / (mains[1] * swing), E12)
    return {"kind": "capacitor", "capacitance": 180e-9 if farads == 220e-9 else farads}


def _reservoirs(rails: list[dict[str, Any]], amps: float, charges: float) -> None:
    for rail in rails:
        volts = _standing(rails, rail["name"])
        least = amps / (charges * 0.03 * volts) if rail.get("fed_through") != "resistor" else 220e-6
        rail["reservoir"] = {"capacitance": max(nearest(1.2 * least, E6), 47e-6)}


def draw_all() -> list[Circuit]:
    """Return the circuits of the fixed draw."""
    rng = np.random.default_rng(SEED)
    return [draw(number, rng) for number in range(COUNT)]


# ---- case files ----------------------------------------------------------------------------------

UNITS = {"voltage": "V", "frequency": "Hz", "capacitance": "F", "resistance": "ohm", "current": "A"}
UNITS |= {"shunt_capacitance": "F", "feed_resistance": "ohm", "forward_voltage": "V", "pulse": "s"}
UNITS |= {"regulated_voltage": "V", "dropout": "V", "ground_current": "A"}


def to_case_text(circuit: Circuit) -> str:
    """Return the circuit's board as a case file of format 1; a `fault` entry is not in it.

    Coils are given a nominal voltage, which has no bearing on the electrical figures. What a circuit holds
    beside its board and mains (loads on, meter, fault) is not in a case file either.
    """
    board = dict(circuit["board"])
    lines = ["format = 1", "", "[mains]", *_table(circuit["mains"]), "", "[board]"]
    lines += [f'name = {json.dumps(circuit.get("name", "board"))}', f'rectifier = "{board.pop("rectifier")}"']
    for key in ("dropper", "inrush", "bleeder"):
        lines += ["", f"[board.{key}]", *_table(board[key])] if key in board else []
    for key in ("rail", "load"):
        for item in board.get(key, []):
            lines += ["", f"[[board.{key}]]", *_table(item)]
            lines += ['nominal_voltage = "12 V"'] if item.get("kind") == "coil" else []
    return "\n".join(lines) + "\n"


def _table(items: dict[str, Any]) -> list[str]:
    return [f"{key} = {_value(key, value)}" for key, value in items.items()]


def _value(key: str, value: Any) -> str:
    if key in ("zener", "reservoir"):
        inner = (f"{name} = {_value(name, part)}" for name, part in value.items() if name != "esr")
        return "{ " + ", ".join(inner) + " }"
    return f'"{value:.9g} {UNITS[key]}"' if key in UNITS else json.dumps(value)


def write(circuits: list[Circuit], path: Path = CIRCUITS) -> None:
    """Write circuits as JSON."""
    path.write_text(json.dumps(circuits, indent=1) + "\n", encoding="utf-8")


if __name__ == "__main__":
    write(draw_all())
