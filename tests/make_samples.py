"""Remakes the sample cases: boards of our own invention, each with one fault and the readings it would
really give.

The readings come from the reference simulation (never from the product), on boards whose parts are drawn
within their tolerances, at a mains that is a little off, with zeners warmed by what they burn, and through
meters as inexact as the case format allows. `python -m tests.make_samples` writes sample-cases/*.toml and,
where no reader of the cases looks, tests/reference/sample_truth.json with what is really wrong.
"""

from __future__ import annotations

import copy
import json
import math
import tomllib
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np

from tests.reference.circuit import (
    Circuit,
    apply_fault,
    by_name,
    esr_of,
    loads_drawing,
    nominal_voltage,
)
from tests.reference.quantities import PREFIXES, to_si
from tests.reference.sample_boards import BOARDS
from tests.reference.sample_stories import STORIES
from tests.reference.simulate import Figures, simulate

CASES = Path(__file__).parents[1] / "sample-cases"
TRUTH = Path(__file__).parent / "reference" / "sample_truth.json"
SEED = 4077
METERS = {  # what: unit, share, floor; a two-sigma limit (case format, section 1, [meter])
    "mains-voltage": ("V", 0.01, 0.3), "dropper-voltage": ("V", 0.01, 0.3),
    "rail-voltage": ("V", 0.005, 0.02),
    "rail-ripple": ("V", 0.05, 0.02), "rail-ripple-rms": ("V", 0.015, 0.01),
    "inrush-voltage": ("V", 0.015, 0.01),
    "line-current": ("A", 0.015, 50e-6), "dropper-capacitance": ("F", 0.02, 0.2e-9),
    "reservoir-capacitance": ("F", 0.02, 0.2e-9), "fuse-resistance": ("ohm", 0.009, 0.2),
    "inrush-resistance": ("ohm", 0.009, 0.2), "bleeder-resistance": ("ohm", 0.009, 0.2),
    "coil-resistance": ("ohm", 0.009, 0.2), "reservoir-esr": ("ohm", 0.009, 0.2),
    "reservoir-leakage": ("A", 0.01, 20e-6), "load-current": ("A", 0.01, 20e-6),
}  # fmt: skip
LEAST_DIGIT = {"V": 1e-3, "A": 1e-6, "F": 1e-11, "ohm": 0.1}  # the last digit of the lowest range
# A zener's marked voltage [V] and the change of its voltage [1/K] (section 4)
WARMTH = ((3.3, -6e-4), (5.1, 0.0), (6.2, 3e-4), (12.0, 7e-4), (18.0, 8.5e-4), (24.0, 9e-4))


# ---- the true board ------------------------------------------------------------------------------


def reveal(circuit: Circuit, hidden: dict[str, float]) -> None:
    """Put the true values where the file says unknown."""
    if "inrush" in hidden:
        circuit["board"]["inrush"]["resistance"] = hidden["inrush"]
    for load in circuit["board"]["load"]:
        if load["name"] in hidden:
            load["current"] = hidden[load["name"]]


def draw_parts(circuit: Circuit, rng: np.random.Generator) -> None:
    """Change every part within its tolerance, evenly spread (section 4), and the mains by up to 4 %."""

    def off(part: dict[str, Any], key: str, otherwise: float) -> None:
        if key in part:
            part[key] *= 1.0 + part.get("tolerance", otherwise) * rng.uniform(-1.0, 1.0)

    board = circuit["board"]
    off(circuit["mains"], "voltage", 0.04)
    off(board["dropper"], "capacitance", 0.1)
    for part in (board["dropper"], board.get("inrush", {}), board.get("bleeder", {})):
        off(part, "resistance", 0.05)
    for rail in board["rail"]:
        off(rail["zener"], "voltage", 0.05)
        off(rail, "feed_resistance", 0.05)
        off(rail["reservoir"], "capacitance", 0.2)
        factor = math.exp(rng.uniform(math.log(1.5e-5), math.log(2e-4)))
        rail["reservoir"]["esr"] = max(factor / rail["reservoir"]["capacitance"], 0.02)
        rail["kelvin_per_watt"] = rng.uniform(50.0, 130.0)
    for load in board["load"]:
        off(load, "current", 0.2)
        off(load, "resistance", 0.1 if load["kind"] == "coil" else 0.05)


def true_board(story: dict[str, Any], rng: np.random.Generator) -> Circuit:
    """Return the circuit that stands on the bench, its fault applied."""
    circuit = to_si(tomllib.loads(BOARDS[story["board"]]))
    reveal(circuit, story.get("hidden", {}))
    draw_parts(circuit, rng)
    return apply_fault(circuit, story["fault"])


def warmed(circuit: Circuit) -> Figures:
    """Return the figures of a circuit whose zeners are as warm as their own loss makes them."""
    cold, figures = copy.deepcopy(circuit), simulate(circuit)
    for _ in range(2):
        for rail, start, found in zip(
            circuit["board"]["rail"], cold["board"]["rail"], figures["rails"], strict=True
        ):
            volts = start["zener"]["voltage"]
            share = float(np.interp(volts, [v for v, _ in WARMTH], [s for _, s in WARMTH]))
            kelvin = rail["kelvin_per_watt"] * found["zener_power_W"]
            rail["zener"]["voltage"] = volts * (1.0 + share * kelvin)
        figures = simulate(circuit)
    if not figures["settled"]:
        raise ArithmeticError("a sample board did not settle")
    return figures


# ---- the readings --------------------------------------------------------------------------------

LIVE = {
    "rail-voltage": "voltage_V", "rail-ripple": "ripple_pp_V", "rail-ripple-rms": "ripple_rms_V",
    "inrush-voltage": "inrush_voltage_V", "dropper-voltage": "dropper_voltage_V",
    "line-current": "line_current_A",
}  # fmt: skip


def live_value(circuit: Circuit, reading: dict[str, Any]) -> float:
    """Return what a perfect meter shows on the running board."""
    figures = warmed(copy.deepcopy(circuit) | {"on": reading["on"]})
    place = by_name(figures["rails"], reading["rail"]) if "rail" in reading else figures
    return float(place[LIVE[reading["what"]]])


def _reservoir(circuit: Circuit, reading: dict[str, Any]) -> dict[str, Any]:
    return dict(by_name(circuit["board"]["rail"], reading["rail"])["reservoir"])


def _bleeder(circuit: Circuit) -> float:
    bleeder = circuit["board"]["bleeder"]
    return float(bleeder["resistance"] * bleeder["in_series"])


def _leakage(circuit: Circuit, reading: dict[str, Any]) -> float:
    """Return the reservoir's current [A] at 80 % of its rail; a sound part's is 0.001 C V (memory)."""
    volts = 0.8 * nominal_voltage(circuit, reading["rail"])
    own = 1e-3 * _reservoir(circuit, reading)["capacitance"] * volts
    return float(own + sum(volts / ohms for upper, _, ohms in circuit["shunts"] if upper == reading["rail"]))


def _load_current(circuit: Circuit, reading: dict[str, Any]) -> float:
    parts = [load for load in loads_drawing(circuit) if load["name"] == reading["load"]]
    return float(sum(load["current"] for load in parts))


def dead_value(circuit: Circuit, reading: dict[str, Any]) -> float:
    """Return what a perfect meter shows on the dead board."""
    board = circuit["board"]
    values: dict[str, Callable[[], Any]] = {
        "fuse-resistance": lambda: 0.3,
        "dropper-capacitance": lambda: board["dropper"]["capacitance"],
        "inrush-resistance": lambda: board["inrush"]["resistance"],
        "bleeder-resistance": lambda: _bleeder(circuit),
        "reservoir-capacitance": lambda: _reservoir(circuit, reading)["capacitance"],
        "reservoir-esr": lambda: esr_of(_reservoir(circuit, reading)),
        "reservoir-leakage": lambda: _leakage(circuit, reading),
        "load-current": lambda: _load_current(circuit, reading),
        "coil-resistance": lambda: by_name(board["load"], reading["load"])["resistance"],
        "mains-voltage": lambda: circuit["mains"]["voltage"],
    }
    return float(values[reading["what"]]())


def shown(value: float, unit: str) -> str:
    """Return a value [SI] as a handheld meter of four digits shows it."""
    size = max(abs(value), LEAST_DIGIT[unit])
    fitting = [(p, f) for p, f in PREFIXES.items() if size / f >= 0.9999] or [("p", 1e-12)]
    prefix, factor = max(fitting, key=lambda pair: pair[1])
    if unit == "ohm" and factor < 1.0:
        prefix, factor = "", 1.0
    digit = max(10.0 ** (math.floor(math.log10(size)) - 3), LEAST_DIGIT[unit])
    decimals = max(0, round(math.log10(factor / digit)))
    return f"{round(value / digit) * digit / factor:.{decimals}f} {prefix}{unit}"


def take(circuit: Circuit, reading: dict[str, Any], rng: np.random.Generator) -> str:
    """Return one reading as the technician writes it down."""
    if "value" in reading:
        return str(reading["value"])
    what = reading["what"]
    value = live_value(circuit, reading) if what in LIVE else dead_value(circuit, reading)
    unit, share, floor = METERS[what]
    wrong = float(np.clip(rng.standard_normal(), -2.0, 2.0)) * math.hypot(share * value, floor) / 2.0
    return shown(max(value + wrong, LEAST_DIGIT[unit]), unit)


# ---- the files -----------------------------------------------------------------------------------


def case_text(story: dict[str, Any], values: list[str]) -> str:
    """Return the case file of a story."""
    lines = [f"# {story['story']}", "format = 1", "", "[ticket]"]
    lines += [f"{key} = {json.dumps(story[key])}" for key in ("number", "appliance", "complaint")]
    lines += [f"received = {story['received']}", BOARDS[story["board"]].rstrip()]
    for reading, value in zip(story["readings"], values, strict=True):
        lines += ["", "[[reading]]"]
        lines += [f"{key} = {json.dumps(part)}" for key, part in reading.items() if key != "value"]
        lines += [f"value = {json.dumps(value)}"]
    return "\n".join(lines) + "\n"


def make(number: int, story: dict[str, Any]) -> tuple[str, dict[str, Any]]:
    """Return one case file's text and the truth behind it; each story has its own fixed random sequence."""
    rng = np.random.default_rng([SEED, number])
    circuit = true_board(story, rng)
    values = [take(circuit, reading, rng) for reading in story["readings"]]
    dropper = circuit["board"]["dropper"]
    truth = story["fault"] | {"dropper_F": dropper.get("capacitance"), "mains_V": circuit["mains"]["voltage"]}
    return case_text(story, values), truth


def main() -> None:
    """Write all sample cases and their truths."""
    CASES.mkdir(exist_ok=True)
    truths = {}
    for number, story in enumerate(STORIES):
        text, truths[f"{story['file']}.toml"] = make(number, story)
        (CASES / f"{story['file']}.toml").write_text(text, encoding="utf-8")
    TRUTH.write_text(json.dumps(truths, indent=1) + "\n", encoding="utf-8")


if __name__ == "__main__":
    main()
