"""Remakes bench_boards.json: boards with known faults, and every reading that could be taken on them.

A bench that asks for any check finds here what it would have shown. Parts are spread wider than the product
assumes (normal, not even; other zener knees, warmer zeners, worse reservoirs); faults are drawn evenly over
the contract's list and then by the priors of the published values. `python -m tests.reference.bench_make`
takes about twenty minutes; what is done stands in a `.part` file beside the result and is not done again
after a break.
"""

from __future__ import annotations

import copy
import json
import math
import sys
import time
from collections import Counter
from collections.abc import Callable
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from typing import Any

import numpy as np

from tests.reference.bench_boards import DESIGNS, PAIRS, WEIGHTS, Fault, Place, case_text, circuit_of, places, switched
from tests.reference.bench_measure import ENOUGH, Rng, Specimen, measured
from tests.reference.circuits import E12
from tests.reference.parts import COMMON, ZENER_CURRENT, Circuit, by_name, junctions
from tests.reference.simulate import simulate

BOARDS = Path(__file__).with_name("bench_boards.json")
SEED = 73019
EVEN, BY_PRIORS = 200, 120
BEYOND, LATENT = 0.08, 0.04  # chances: a severity beyond its range; a bleeder gone besides (published: 30 to 50 per mille)


# ---- which board gets which fault ----------------------------------------------------------------

SELDOM_ALONE = ("dropper-short", "varistor-short")
# What an unexplained board has one of each: a worn part on the mains side, another behind the rectifier
BEFORE = ("dropper-capacitance-lost", "inrush-high", "diode-short", "mains-low")
BEHIND = (
    "zener-low", "reservoir-leaky", "board-leakage", "feed-high", "load-excess", "coil-open", "coil-shorted-turns", "switch-open",
)  # fmt: skip


@dataclass(frozen=True)
class Planned:
    """A design, where it is broken, and by which draw."""

    draw: str
    design: str
    place: Place


@cache
def plan() -> list[Planned]:
    """Return what is made: every fault as often as any other, over all designs, and then as the priors have it."""
    rng = np.random.default_rng(SEED)
    able = {name: places(design) for name, design in DESIGNS.items()}
    return [*_even(able, rng), *_by_priors(able, rng)]


def _even(able: dict[str, dict[str, list[Place]]], rng: Rng) -> list[Planned]:
    labels = sorted({label for found in able.values() for label in found})
    used, drawn = Counter[str](), list[Planned]()
    while len(drawn) < EVEN:
        for label in rng.permutation(labels):
            names = [name for name in able if label in able[name]]
            least = min(used[name] for name in names)
            name = str(rng.choice([name for name in names if used[name] == least]))
            used[name] += 1
            drawn.append(Planned("even", name, _one_of(able[name][label], rng)))
    return drawn[:EVEN]


def _by_priors(able: dict[str, dict[str, list[Place]]], rng: Rng) -> list[Planned]:
    drawn = []
    for number in range(BY_PRIORS):
        name = list(able)[number % len(able)]
        shares = weights(able[name])
        label = str(rng.choice(list(shares), p=np.array(list(shares.values())) / sum(shares.values())))
        drawn.append(Planned("priors", name, _one_of(able[name][label], rng)))
    return drawn


def weights(found: dict[str, list[Place]]) -> dict[str, float]:
    """Return the prior of every fault and pair a design admits; what is absent drops out.

    A pair has a tenth of its rarer part's weight, but a cause seldom alone comes with a pair four times in
    five. Other pairs are what `unexplained` stands for.
    """
    shares: dict[str, float] = {label: WEIGHTS[label] for label in found if label in WEIGHTS}
    pairs = {f"{cause} + {effect}": (cause, effect) for cause, effect in PAIRS if f"{cause} + {effect}" in found}
    causes = Counter(cause for cause, _ in pairs.values())
    for label, (cause, effect) in pairs.items():
        rarer = 0.1 * min(WEIGHTS[cause], WEIGHTS[effect])
        shares[label] = 0.8 * WEIGHTS[cause] / causes[cause] if cause in SELDOM_ALONE else rarer
    return shares | {cause: 0.2 * WEIGHTS[cause] for cause in SELDOM_ALONE if causes[cause]}


def _one_of(items: list[Place], rng: Rng) -> Place:
    return items[int(rng.integers(len(items)))]


# ---- the true board ------------------------------------------------------------------------------


def draw(number: int) -> Specimen:
    """Return board `number` of the plan, broken; each has its own fixed random sequence."""
    planned, rng = plan()[number], np.random.default_rng([SEED, number])
    design, marked = copy.deepcopy(DESIGNS[planned.design]), circuit_of(DESIGNS[planned.design])
    true = spread_parts(marked, rng)
    laws = {"ZENER_SLOPE": true.pop("slope"), "DIODE_VOLTAGE": 0.7 + float(rng.uniform(-0.06, 0.06))}
    scene = Scene(planned.design, marked, true, rng)
    told = break_at(planned.place, scene)
    latent = planned.draw == "priors" and "bleeder" in true["board"] and rng.random() < LATENT
    if told["fault"] == "wrong-part":
        design["board"]["dropper"]["fitted"] = told["fitted"]
    return Specimen(
        design, true, told, break_at({"fault": "bleeder-open"}, scene) if latent else None, laws,
        meter=1.5 if number % 3 == 0 else 1.0,
        ramp=_log(rng, 0.02, 0.3) if rng.random() < 0.5 else 0.0,
        pull_in={load["name"]: float(rng.uniform(0.5, 0.75)) for load in true["board"]["load"]},
        rng=np.random.default_rng([SEED, number, 1]),
    )  # fmt: skip


def _log(rng: Rng, low: float, high: float) -> float:
    return math.exp(rng.uniform(math.log(low), math.log(high)))


def spread_parts(marked: Circuit, rng: Rng) -> Circuit:
    """Return a sound board: normal, two sigma at the mark's tolerance, a few just beyond; its zeners' `slope` [V] with it.

    Films are never below their band, for that is a fault.
    """
    true = copy.deepcopy(marked)
    board = true["board"]

    def off(part: dict[str, Any], key: str, otherwise: float, least: float = -1.3) -> None:
        if key in part:
            part[key] *= 1.0 + part.get("tolerance", otherwise) * float(np.clip(0.5 * rng.standard_normal(), least, 1.3))

    true["slope"] = float(rng.uniform(40e-3, 90e-3))
    true["mains"]["voltage"] *= float(rng.uniform(0.94, 1.06))
    for key, otherwise in (("capacitance", 0.1), ("shunt_capacitance", 0.1), ("resistance", 0.05)):
        off(board["dropper"], key, otherwise, -1.0)
    for part in ("inrush", "bleeder"):
        off(board.get(part, {}), "resistance", 0.05)
    for rail in board["rail"]:
        off(rail.get("zener", {}), "voltage", 0.05)
        if "zener" in rail:  # marked at another current than the zener-test's
            rail["zener"]["voltage"] -= true["slope"] * math.log(_log(rng, 2e-3, 20e-3) / ZENER_CURRENT)
        off(rail, "feed_resistance", 0.05)
        off(rail, "regulated_voltage", 0.02)
        off(rail["reservoir"], "capacitance", 0.2)
        rail["reservoir"]["esr"] = max(_log(rng, 1e-5, 4e-4) / rail["reservoir"]["capacitance"], 0.02)
        watts = rail.get("zener", {}).get("rated_power", 0.0)
        rail["kelvin_per_watt"] = float(rng.uniform(40.0, 150.0 if watts < 3.0 else 70.0))
    for load in board["load"]:
        off(load, "current", 0.2)
        off(load, "resistance", 0.1 if load["kind"] == "coil" else 0.05)
        off(load, "forward_voltage", 0.05)
    return true


# ---- how bad a fault is --------------------------------------------------------------------------


@dataclass(frozen=True)
class Scene:
    """Where a fault strikes: a design, its parts as marked and as they are."""

    design: str
    marked: Circuit
    true: Circuit
    rng: Rng

    def between(self, low: float, high: float, most: float = math.inf) -> float:
        """Return a severity evenly drawn, sometimes up to 20 % beyond an end, but never above `most`."""
        value = float(self.rng.uniform(low, high))
        if self.rng.random() < BEYOND:
            further = float(self.rng.uniform(1.0, 1.2))
            value = low / further if self.rng.random() < 0.5 else high * further
        return min(value, most)

    def decades(self, low: float, high: float) -> float:
        """Return a severity evenly drawn in the logarithm, sometimes up to 20 % beyond an end."""
        value = _log(self.rng, low, high)
        if self.rng.random() < BEYOND:
            value = low / self.rng.uniform(1.0, 1.2) if self.rng.random() < 0.5 else high * self.rng.uniform(1.0, 1.2)
        return float(value)

    def left(self) -> float:
        """Return the share of its mark that a worn film capacitor has kept."""
        low, high = [(0.02, 0.1), (0.1, 0.85), (0.85, 0.89)][int(self.rng.choice(3, p=[0.05, 0.9, 0.05]))]
        return float(self.rng.uniform(low, high))

    def either(self, fault: Fault) -> Fault:
        """Return the severity half of the time, nothing the other half."""
        return fault if self.rng.random() < 0.5 else {}

    def mark(self, key: str) -> float:
        """Return a value of the dropper as marked, nil where it has none."""
        return float(self.marked["board"]["dropper"].get(key, 0.0))

    def part(self, place: Place) -> dict[str, Any]:
        """Return the rail or load of a place as it is."""
        key = "rail" if "rail" in place else "load"
        return by_name(self.true["board"][key], place[key])

    def string(self) -> float:
        """Return the whole bleeder [ohm]."""
        bleeder = self.true["board"]["bleeder"]
        return float(bleeder["resistance"] * bleeder["in_series"])


@cache
def normal_load(name: str) -> float:
    """Return what the first rail of a design must be given for all loads on [A], all parts as marked."""
    circuit = circuit_of(DESIGNS[name]) | {"on": switched(DESIGNS[name])}
    figures, rail = simulate(circuit, ENOUGH), circuit["board"]["rail"][0]
    if circuit["board"]["rectifier"] == "half-wave-zener":
        return float(figures["supply_current_A"])
    spare = [by_name(figures["rails"], rail["name"])["zener_current_A"]]
    while rail["zener"]["clamps_to"] != COMMON:
        rail = by_name(circuit["board"]["rail"], rail["zener"]["clamps_to"])
        spare.append(by_name(figures["rails"], rail["name"])["zener_current_A"])
    return float(figures["supply_current_A"] - min(spare))


def break_at(place: Place, scene: Scene) -> Fault:
    """Return a fault with its severity; `unexplained` becomes two (`of`) that have nothing to do with each other."""
    if place["fault"] == "unexplained":
        able = places(DESIGNS[scene.design])
        two = [str(scene.rng.choice([name for name in names if name in able])) for names in (BEFORE, BEHIND)]
        return place | {"of": [break_at(_one_of(able[name], scene.rng), scene) for name in two]}
    if "with" in place:
        return _broken({key: part for key, part in place.items() if key != "with"}, scene, True) | {
            "with": _broken(place["with"], scene, True)
        }
    return _broken(place, scene, False)


def _broken(place: Place, scene: Scene, paired: bool) -> Fault:
    if place["fault"] == "varistor-short":  # a varistor that shorts outright takes the fuse with it, where there is one
        lone = (300.0, 10e3) if "fuse" in scene.marked["board"] else (1.0, 10e3)
        return place | {"resistance": scene.decades(*((1.0, 100.0) if paired else lone))}
    return place | (SEVERITIES[place["fault"]](scene, place) if place["fault"] in SEVERITIES else {})


def _junction(scene: Scene) -> str:
    return str(scene.rng.choice(list(junctions(scene.true))))


def _leaking(scene: Scene, place: Place) -> Fault:
    return {"current": normal_load(scene.design) * scene.decades(0.5, 4.0)}


def _misfit(scene: Scene, place: Place) -> Fault:
    """A smaller part from the shelf; 220 nF not beside a 24 V rail."""
    mark = scene.mark("capacitance")
    shelf = [value * step for value in E12 for step in (1e-9, 1e-8, 1e-7) if 0.2 * mark < value * step < 0.75 * mark]
    high = any(rail.get("zener", {}).get("voltage") == 24.0 for rail in scene.marked["board"]["rail"])
    farads = float(scene.rng.choice([value for value in shelf if not (high and abs(value - 220e-9) < 1e-12)]))
    true = farads * (1.0 + 0.05 * float(np.clip(scene.rng.standard_normal(), -2.0, 2.0)))
    return {"fitted": f"{farads * 1e9:.4g} nF", "capacitance": true}


def _dried(scene: Scene, place: Place) -> Fault:
    return {"factor": scene.decades(0.005, 0.4), "extra_esr": scene.decades(0.5, 20.0)}


SEVERITIES: dict[str, Callable[[Scene, Place], Fault]] = {  # case format, section 4, as `faults.apply_fault` wants them
    "dropper-capacitance-lost": lambda s, p: {"capacitance": s.mark("capacitance") * s.left()},
    "shunt-capacitor-lost": lambda s, p: {"capacitance": s.mark("shunt_capacitance") * s.left()},
    "dropper-open": lambda s, p: s.either({"capacitance": max(s.mark("capacitance") * _log(s.rng, 1e-3, 0.02), 1e-12)}),
    "dropper-short": lambda s, p: {"resistance": s.decades(0.2, 1.5)},
    "shunt-capacitor-short": lambda s, p: {"resistance": s.decades(0.2, 1.5)},
    "wrong-part": _misfit,
    "inrush-high": lambda s, p: {"resistance": s.true["board"]["inrush"]["resistance"] * s.decades(3.0, 300.0)},
    "bleeder-open": lambda s, p: s.either({"resistance": s.string() * s.decades(1.6, 10.0)}),
    "bleeder-low": lambda s, p: {"resistance": s.string() * s.decades(0.05, 0.5)},
    "diode-open": lambda s, p: {"junction": _junction(s)},
    "diode-short": lambda s, p: {"junction": _junction(s), "resistance": s.decades(0.2, 1.5)},
    "zener-short": lambda s, p: {"resistance": s.decades(0.3, 20.0)},
    "zener-low": lambda s, p: {"voltage": s.part(p)["zener"]["voltage"] * s.between(0.25, 0.85, 0.92)},
    "reservoir-dried": _dried,
    "reservoir-leaky": _leaking,
    "board-leakage": _leaking,
    "load-excess": _leaking,
    "feed-high": lambda s, p: {"resistance": s.part(p)["feed_resistance"] * s.decades(2.0, 30.0)},
    "feed-short": lambda s, p: {"resistance": s.decades(0.2, 1.5)},
    "coil-shorted-turns": lambda s, p: {"resistance": s.part(p)["resistance"] * s.between(0.15, 0.65)},
    "mains-low": lambda s, p: {"voltage": s.marked["mains"]["voltage"] * s.between(0.7, 0.9, 0.9)},
    "mains-high": lambda s, p: {"voltage": s.marked["mains"]["voltage"] * max(s.between(1.1, 1.2), 1.1)},
}


# ---- the file ------------------------------------------------------------------------------------


def prove(name: str) -> None:
    """ArithmeticError unless a sound board regulates with all loads on at the worst corner of mains and parts."""
    circuit = circuit_of(DESIGNS[name]) | {"on": switched(DESIGNS[name])}
    board = circuit["board"]
    circuit["mains"]["voltage"] *= 0.9
    for key, share in (("capacitance", 0.9), ("shunt_capacitance", 0.9), ("resistance", 1.05)):
        board["dropper"] |= {key: board["dropper"][key] * share} if key in board["dropper"] else {}
    for rail in board["rail"]:
        if "zener" in rail:
            rail["zener"]["voltage"] *= 1.05
        rail |= {"feed_resistance": rail["feed_resistance"] * 1.05} if "feed_resistance" in rail else {}
    for load in board["load"]:
        key, share = ("current", 1.2) if "current" in load else ("resistance", 0.9 if load["kind"] == "coil" else 0.95)
        load[key] *= share
    figures = simulate(circuit, ENOUGH)
    if not (figures["settled"] and all(rail["regulating"] for rail in figures["rails"])):
        raise ArithmeticError(f"{name}: not all rails regulate at the worst corner")


def make(number: int) -> dict[str, Any]:
    """Return one board of the file."""
    planned, specimen = plan()[number], draw(number)
    text = case_text(specimen.design)
    readings = measured(specimen)
    board: dict[str, Any] = {"number": number, "draw": planned.draw, "design": planned.design, "fault": _short(specimen.told)}
    if specimen.latent:
        board["latent"] = _short(specimen.latent)
    return board | {"text": text, "works": specimen.works, "powered": specimen.powered, "readings": readings}


def _short(fault: Any) -> Any:
    """Return a fault with its severities to five digits."""
    match fault:
        case dict():
            return {key: _short(part) for key, part in fault.items()}
        case list():
            return [_short(part) for part in fault]
        case float():
            return float(f"{fault:.5g}")
    return fault


def write(boards: list[dict[str, Any]]) -> None:
    """Write the file: each case text once, under the name that its boards have as `design`.

    A board's `fault` has its severities in SI units, a pair's second fault in `with`, the two of an unexplained
    board in `of`; `latent` is an open bleeder besides. `works`: all its loads do what they should. `powered`:
    it can be run, else it has no live readings. A reading is what, rail, load, on, lifted, value.
    """
    texts: dict[str, str] = {}
    for board in boards:
        fitted = board["fault"].get("fitted")
        board["design"] += f", {fitted} fitted" if fitted else ""
        texts[board["design"]] = board.pop("text")
    rows = ",\n".join(json.dumps(board, separators=(",", ":")) for board in boards)
    BOARDS.write_text(f'{{"designs": {json.dumps(texts, indent=0)},\n"boards": [\n{rows}\n]}}\n', encoding="utf-8")


def main() -> None:
    """Prove the designs, make all boards that are not yet made, and write the file."""
    for name in DESIGNS:
        prove(name)
    part, begun = BOARDS.with_suffix(".part"), time.perf_counter()
    done = part.read_text(encoding="utf-8").splitlines() if part.exists() else []
    with part.open("a", encoding="utf-8") as file:
        for number in range(len(done), len(plan())):
            board = make(number)
            file.write(json.dumps(board) + "\n")
            file.flush()
            seconds, fault = time.perf_counter() - begun, board["fault"]["fault"]
            sys.stdout.write(f"{number} {board['design']}: {fault}, {len(board['readings'])} readings, {seconds:.0f} s\n")
            sys.stdout.flush()
    write([json.loads(line) for line in part.read_text(encoding="utf-8").splitlines()])
    part.unlink()


if __name__ == "__main__":
    main()
