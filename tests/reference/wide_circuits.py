"""Draws circuits of every shape and every class of fault, so that no corner of the case format is unjudged.

Each row of `PLAN` names a shape, its loads, a wanted share of current and a fault; values and severities
come from a fixed seed, in the ranges of the case format's section 4. The four statements of the published
values on open zeners, dried reservoirs and open diodes are there with figures of their own.
`python -m tests.reference.wide_circuits` rewrites wide_circuits.json.

THE LIST IS FIXED: wide_circuits.json was written before any other solver was run on its circuits. Circuits are added at its end,
and none is changed or taken out to suit a solver.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np

from tests.reference.circuits import E6, E12, E24, nearest, write
from tests.reference.parts import COMMON, METER, Circuit, by_name
from tests.reference.wide_plan import PLAN, STATEMENTS

WIDE = Path(__file__).with_name("wide_circuits.json")
SEED = 40823
MAINS = ((230.0, 50.0), (120.0, 60.0), (240.0, 50.0))
MAIN, BIAS = "main rail", 2e-4  # A, where nothing else draws
LAYOUTS: dict[str, list[tuple[str, str, str]]] = {  # rails after the first: name, fed by, fed through
    "single": [],
    "stacked": [("low rail", MAIN, "zener")],
    "three levels": [("middle rail", MAIN, "zener"), ("low rail", "middle rail", "zener")],
    "resistor": [("logic rail", MAIN, "resistor")],
    "regulator": [("logic rail", MAIN, "regulator")],
    "stacked, resistor": [("low rail", MAIN, "zener"), ("logic rail", "low rail", "resistor")],
    "stacked, regulator": [("low rail", MAIN, "zener"), ("logic rail", "low rail", "regulator")],
    "resistor, regulator": [("middle rail", MAIN, "resistor"), ("logic rail", "middle rail", "regulator")],
    "regulator, resistor": [("middle rail", MAIN, "regulator"), ("logic rail", "middle rail", "resistor")],
    "resistor, resistor": [("middle rail", MAIN, "resistor"), ("logic rail", "middle rail", "resistor")],
}
REGULATORS = {  # regulated voltage: dropout [V] and ground current [A], of an older and a newer type
    9.0: ((1.7, 3e-3), (0.4, 80e-6)),
    5.0: ((1.7, 3e-3), (0.4, 80e-6)),
    3.3: ((1.1, 0.5e-3), (0.3, 60e-6)),
}


def draw(number: int, rng: np.random.Generator) -> Circuit:
    """Return circuit `number`; all choices that are not fixed by its row come from `rng`."""
    rectifier, dropper, layout, letters, share, fault = PLAN[number]
    mains = MAINS[number % len(MAINS)]
    rails = _rails(rectifier, layout, rng)
    loads = [_load(letter, rails, rng) for letter in letters]
    _size_feeds(rails, loads, mains[1])
    wanted = max(_flow(MAIN, rails, loads, mains[1]), BIAS)
    board: dict[str, Any] = {"rectifier": rectifier}
    board["inrush"] = {"resistance": float(rng.choice([47.0, 100.0, 220.0, 330.0]))}
    board["dropper"] = _dropper(rectifier, dropper, mains, rails[0]["zener"]["voltage"], share * wanted, rng)
    if dropper != "resistor":
        board["bleeder"] = {"resistance": float(rng.choice([220e3, 330e3, 470e3])), "in_series": 2}
    _reservoirs(rails, wanted, mains[1] * (2.0 if rectifier == "bridge" else 1.0))
    board |= {"rail": rails, "load": loads}
    off = fault.startswith("switch-stuck") or number % 5 == 3
    on = [load["name"] for load in loads if load["switched"] and not off]
    name = f"{number:03d} {rectifier}, {dropper}, {layout}: {fault}"
    circuit: Circuit = {"name": name, "mains": {"voltage": mains[0], "frequency": mains[1]}, "board": board}
    circuit |= {"on": on, "meter": METER}
    return circuit | ({} if fault == "no-fault" else {"fault": _fault(fault, circuit, wanted, rng)})


def _rails(rectifier: str, layout: str, rng: np.random.Generator) -> list[dict[str, Any]]:
    stacked = layout.startswith(("stacked", "three"))
    top = float(rng.choice([10.0, 12.0, 15.0] if stacked else [12.0, 15.0, 18.0, 24.0]))
    rails: list[dict[str, Any]] = [{"name": MAIN, "fed_by": "rectifier", "zener": {"voltage": top}}]
    for name, parent, through in LAYOUTS[layout]:
        rail: dict[str, Any] = {"name": name, "fed_by": parent, "fed_through": through}
        deep = parent != MAIN
        if through == "regulator":
            volts = 9.0 if name == "middle rail" else 3.3 if deep else float(rng.choice([5.0, 3.3]))
            dropout, ground = REGULATORS[volts][int(rng.integers(2))]
            rail |= {"regulated_voltage": volts, "dropout": dropout, "ground_current": ground}
        else:
            middle, logic = 6.2 if through == "zener" else 9.1, 3.3 if deep else 5.1
            rail["zener"] = {"voltage": {"middle rail": middle, "low rail": 5.6, "logic rail": logic}[name]}
        if through == "zener":
            by_name(rails, parent)["zener"]["clamps_to"] = name
        rails.append(rail)
    return rails


def _load(letter: str, rails: list[dict[str, Any]], rng: np.random.Generator) -> dict[str, Any]:
    """Return a load by its letter, see `PLAN`: capitals return to common or sit on the main rail."""
    last = rails[-1]["name"]
    below = rails[0]["zener"].get("clamps_to", COMMON)
    coil, ohms = {"name": "relay", "kind": "coil", "rail": MAIN, "switched": True}, [576.0, 720.0, 1100.0, 1600.0]
    lamp = {"kind": "led", "switched": True, "forward_voltage": 1.9}
    gate = {"kind": "gate", "pulse": float(rng.choice([250e-6, 500e-6]))}
    gate["current"] = float(rng.choice([10e-3, 20e-3, 35e-3]))
    return {
        "c": {"name": "controller", "kind": "current", "rail": last, "switched": False,
              "current": round(float(rng.uniform(1e-3, 4e-3)), 4)},
        "x": {"name": "sleeper", "kind": "current", "rail": last, "switched": False,
              "current": round(float(rng.uniform(0.15e-3, 0.6e-3)), 5)},
        "k": coil | {"returns_to": below, "resistance": float(rng.choice(ohms))},
        "K": coil | {"returns_to": COMMON, "resistance": float(rng.choice(ohms))},
        "r": {"name": "divider chain", "kind": "resistor", "rail": MAIN, "switched": False,
              "resistance": float(rng.choice([2200.0, 4700.0, 6800.0]))},
        "l": lamp | {"name": "lamp", "rail": last, "resistance": float(rng.choice([470.0, 820.0, 1500.0]))},
        "L": lamp | {"name": "display", "rail": MAIN, "resistance": float(rng.choice([1500.0, 3300.0]))},
        "g": gate | {"name": "triac", "rail": last, "switched": False},
        "G": gate | {"name": "main triac", "rail": MAIN, "switched": True},
    }[letter]  # fmt: skip


def standing(rails: list[dict[str, Any]], name: str) -> float:
    """Return a rail's regulated voltage over common [V], zeners added up."""
    if name == COMMON:
        return 0.0
    rail = by_name(rails, name)
    if "regulated_voltage" in rail:
        return float(rail["regulated_voltage"])
    return float(rail["zener"]["voltage"]) + standing(rails, rail["zener"].get("clamps_to", COMMON))


def _amps(rails: list[dict[str, Any]], load: dict[str, Any], frequency: float) -> float:
    """Return a load's mean current [A] on regulated rails."""
    if load["kind"] == "gate":
        return float(2.0 * frequency * load["pulse"] * load["current"])
    if load["kind"] == "current":
        return float(load["current"])
    volts = standing(rails, load["rail"]) - standing(rails, load.get("returns_to", COMMON))
    return (volts - float(load.get("forward_voltage", 0.0))) / float(load["resistance"])


def _flow(name: str, rails: list[dict[str, Any]], loads: list[dict[str, Any]], frequency: float) -> float:
    """Return roughly what must flow into a rail [A] for it and all below: enough to choose a dropper by."""
    own = sum(_amps(rails, load, frequency) for load in loads if load["rail"] == name)
    own += sum(
        rail.get("ground_current", 0.0) + _flow(rail["name"], rails, loads, frequency)
        for rail in rails
        if rail["fed_by"] == name and rail["fed_through"] != "zener"
    )
    lower = [r["name"] for r in rails if r["fed_by"] == name and r["fed_through"] == "zener"]
    return float(max([own, *(_flow(below, rails, loads, frequency) for below in lower)]))


def _size_feeds(rails: list[dict[str, Any]], loads: list[dict[str, Any]], frequency: float) -> None:
    """Choose feed resistors that give a third more than the rail takes, the last rail first."""
    for rail in reversed(rails):
        if rail.get("fed_through") == "resistor":
            drop = standing(rails, rail["fed_by"]) - standing(rails, rail["name"])
            amps = max(1.3 * _flow(rail["name"], rails, loads, frequency), 1e-3)
            rail["feed_resistance"] = nearest(drop / amps, E24)


def _dropper(
    rectifier: str, kind: str, mains: tuple[float, float], top: float, amps: float, rng: np.random.Generator
) -> dict[str, Any]:
    """Return the part that gives about `amps` by charge balance, or by the mean of a rectified sine."""
    whole, crest = rectifier == "bridge", math.sqrt(2.0) * mains[0]
    if kind == "resistor":
        mean = (crest - top) * (2.0 if whole else 1.0) / math.pi
        return {"kind": kind, "resistance": nearest(mean / amps, E12)}
    ratio = float(rng.uniform(0.3, 0.6)) if kind == "divider" else 1.0
    crest *= ratio
    farads = amps / (mains[1] * (4.0 * (crest - top - 1.4) if whole else 2.0 * crest - top - 1.4))
    found = {"kind": kind, "capacitance": _shelf(ratio * farads)}
    return found | ({"shunt_capacitance": _shelf((1.0 - ratio) * farads)} if kind == "divider" else {})


def _shelf(farads: float) -> float:
    value = nearest(farads, E12)
    return 180e-9 if value == 220e-9 else value


def _reservoirs(rails: list[dict[str, Any]], amps: float, charges: float) -> None:
    for rail in rails:
        volts, fed = standing(rails, rail["name"]), rail.get("fed_through")
        least = {"resistor": 100e-6, "regulator": 47e-6}.get(str(fed), amps / (charges * 0.03 * volts))
        rail["reservoir"] = {"capacitance": max(nearest(1.2 * least, E6), 47e-6)}


# ---- faults --------------------------------------------------------------------------------------


def _fault(text: str, circuit: Circuit, wanted: float, rng: np.random.Generator) -> dict[str, Any]:
    """Return a fault and its severity from "fault@place=value + second"; what is not said is drawn."""
    first, *others = text.split(" + ")
    name, _, value = first.partition("=")
    name, _, place = name.partition("@")
    fault: dict[str, Any] = {"fault": name}
    if place:
        key = "junction" if name.startswith("diode") else "rail" if place.endswith("rail") else "load"
        fault[key] = place
    if name in SEVERITIES:
        fault |= SEVERITIES[name](circuit, fault, wanted, rng)
    if value:
        fault["resistance"] = float(value)
    return fault | ({"with": _fault(others[0], circuit, wanted, rng)} if others else {})


def _log(rng: np.random.Generator, low: float, high: float) -> float:
    return float(f"{math.exp(rng.uniform(math.log(low), math.log(high))):.4g}")


def _part(circuit: Circuit, fault: dict[str, Any]) -> dict[str, Any]:
    kind = "rail" if "rail" in fault else "load"
    return by_name(circuit["board"][kind], fault[kind])


def _share_of(key: str, low: float, high: float) -> Callable[..., dict[str, Any]]:
    """A dropper's or shunt's capacitance times a drawn share."""

    def severity(circuit: Circuit, fault: Any, wanted: float, rng: np.random.Generator) -> dict[str, Any]:
        return {"capacitance": float(f"{circuit['board']['dropper'][key] * rng.uniform(low, high):.4g}")}

    return severity


def _leaking(circuit: Circuit, fault: Any, wanted: float, rng: np.random.Generator) -> dict[str, Any]:
    return {"current": _log(rng, 0.5 * wanted, 4.0 * wanted)}


def _mains_at(low: float, high: float) -> Callable[..., dict[str, Any]]:
    def severity(circuit: Circuit, fault: Any, wanted: float, rng: np.random.Generator) -> dict[str, Any]:
        return {"voltage": round(circuit["mains"]["voltage"] * float(rng.uniform(low, high)), 1)}

    return severity


SEVERITIES: dict[str, Callable[..., dict[str, Any]]] = {  # ranges of the case format, section 4
    "dropper-capacitance-lost": _share_of("capacitance", 0.1, 0.85),
    "wrong-part": _share_of("capacitance", 0.6, 0.7),
    "dropper-open": _share_of("capacitance", 0.001, 0.02),
    "shunt-capacitor-lost": _share_of("shunt_capacitance", 0.1, 0.85),
    "inrush-high": lambda c, f, w, rng: {
        "resistance": _log(rng, 3.0, 100.0) * c["board"]["inrush"]["resistance"]
    },
    "bleeder-low": lambda c, f, w, rng: {"resistance": _log(rng, 0.02, 0.3) * c["board"]["bleeder"]["resistance"]},
    "zener-short": lambda c, f, w, rng: {"resistance": _log(rng, 0.3, 20.0)},
    "zener-low": lambda c, f, w, rng: {
        "voltage": round(_part(c, f)["zener"]["voltage"] * float(rng.uniform(0.25, 0.85)), 2)
    },
    "reservoir-dried": lambda c, f, w, rng: {"factor": _log(rng, 0.005, 0.4), "extra_esr": _log(rng, 0.5, 20.0)},
    "reservoir-leaky": _leaking,
    "board-leakage": _leaking,
    "load-excess": _leaking,
    "feed-high": lambda c, f, w, rng: {
        "resistance": float(f"{_part(c, f)['feed_resistance'] * _log(rng, 2.0, 30.0):.4g}")
    },
    "coil-shorted-turns": lambda c, f, w, rng: {
        "resistance": round(_part(c, f)["resistance"] * float(rng.uniform(0.15, 0.65)), 1)
    },
    "mains-low": _mains_at(0.75, 0.88),
    "mains-high": _mains_at(1.11, 1.2),
}


def draw_all() -> list[Circuit]:
    """Return the circuits of the fixed draw, the statements after them."""
    rng = np.random.default_rng(SEED)
    return [draw(number, rng) for number in range(len(PLAN))] + [dict(circuit) for circuit in STATEMENTS]


if __name__ == "__main__":
    write(draw_all(), WIDE)
