"""The boards of the simulated bench: designs of our own invention, and which faults each of them can have.

They stand apart from the drawing so that a reader sees what is on trial. A design is a table of the case
file, quantities as written there; `bench_make` draws boards from it, breaks and measures them. Every design
regulates with all its loads on at the worst corner (`bench_make.prove`).
"""

from __future__ import annotations

import itertools
import json
from typing import Any

from tests.reference.parts import COMMON, Circuit, by_name
from tests.reference.quantities import to_si

Design = dict[str, Any]
Fault = dict[str, Any]
Place = Fault  # a fault with its rail or load, no severity yet; a pair has `with`


# ---- how a design is written ---------------------------------------------------------------------


def _rail(name: str, zener: str, reservoir: str, clamps_to: str = COMMON, **feed: str) -> dict[str, Any]:
    """A rail from "12 V, 1.3 W" (empty: no zener) and "330 uF, 25 V"; `feed` has the keys of a rail fed by another."""
    result: dict[str, Any] = {"name": name} | (feed or {"fed_by": "rectifier"})
    if zener:
        result["zener"] = dict(zip(("voltage", "rated_power"), zener.split(", "), strict=True)) | {"clamps_to": clamps_to}
    return result | {"reservoir": dict(zip(("capacitance", "rated_voltage"), reservoir.split(", "), strict=True))}


def _below(parent: str) -> dict[str, str]:
    return {"fed_by": parent, "fed_through": "zener"}


def _by_resistor(parent: str, ohms: str) -> dict[str, str]:
    return {"fed_by": parent, "fed_through": "resistor", "feed_resistance": ohms}


def _by_regulator(parent: str, volts: str, dropout: str, ground: str) -> dict[str, str]:
    feed = {"fed_by": parent, "fed_through": "regulator", "regulated_voltage": volts}
    return feed | {"dropout": dropout, "ground_current": ground}


def _load(kind: str, name: str, rail: str, switched: bool = True, **values: str) -> dict[str, Any]:
    return {"name": name, "kind": kind, "rail": rail, "switched": switched} | values


def _controller(rail: str, amps: str) -> dict[str, Any]:
    return _load("current", "controller", rail, switched=False, current=amps)


def _coil(name: str, rail: str, volts: str, ohms: str, returns_to: str = COMMON) -> dict[str, Any]:
    return _load("coil", name, rail, returns_to=returns_to, nominal_voltage=volts, resistance=ohms)


def _lamp(name: str, rail: str, volts: str, ohms: str) -> dict[str, Any]:
    return _load("led", name, rail, forward_voltage=volts, resistance=ohms)


def _capacitor(farads: str) -> dict[str, str]:
    return {"kind": "capacitor", "capacitance": farads, "tolerance": "10 %", "safety_class": "X2"}


def _divider(farads: str, shunt: str) -> dict[str, str]:
    return _capacitor(farads) | {"kind": "divider", "shunt_capacitance": shunt}


def _resistor(ohms: str, watts: str) -> dict[str, str]:
    return {"kind": "resistor", "resistance": ohms, "rated_power": watts}


EUROPE, AMERICA, ISLES = "230 V, 50 Hz", "120 V, 60 Hz", "240 V, 50 Hz"
BRIDGE, HALF, HALF_ZENER = "bridge", "half-wave", "half-wave-zener"
EXTRAS: dict[str, Any] = {  # what a word of a design's `has` adds to the board
    "fuse": {"fuse": {"rated_current": "1 A"}},
    "varistor": {"varistor": {"voltage": "275 V"}},
    "plug": {"connected_by": "plug"},
    "fixed": {"connected_by": "fixed"},
}


def _design(
    name: str, mains: str, rectifier: str, dropper: dict[str, str], has: str, rails: list[Any], loads: list[Any]
) -> Design:
    """A design; `has` names its extras, and as inrush=100 and bleeder=330x2 its resistors in ohms and kilohms."""
    board: dict[str, Any] = {"name": name, "rectifier": rectifier}
    watts = "3 W" if rectifier == BRIDGE else "5 W"
    for word in has.split():
        part, _, value = word.partition("=")
        ohms, _, count = value.partition("x")
        made: dict[str, Any] = {"inrush": {"resistance": f"{ohms} ohm", "rated_power": watts}}
        made["bleeder"] = {"resistance": f"{ohms} kohm", "in_series": int(count or 1)}
        board |= {part: made[part]} if value else EXTRAS[part]
    voltage, frequency = mains.split(", ")
    board |= {"dropper": dropper, "rail": rails, "load": loads}
    return {"mains": {"voltage": voltage, "frequency": frequency}, "board": board}


# ---- the designs ---------------------------------------------------------------------------------

_ALL: tuple[Design, ...] = (
    _design("clothes airer", EUROPE, BRIDGE, _capacitor("560 nF"), "plug fuse inrush=100 bleeder=330x2",
        [_rail("12 V rail", "12 V, 1.3 W", "330 uF, 25 V")],
        [_controller("12 V rail", "3 mA"), _coil("heat relay", "12 V rail", "12 V", "720 ohm")]),
    _design("greenhouse vent", EUROPE, BRIDGE, _capacitor("820 nF"), "fixed fuse varistor inrush=100",
        [_rail("relay rail", "15 V, 2 W", "330 uF, 35 V", "logic rail"),
         _rail("logic rail", "5.6 V, 1 W", "220 uF, 10 V", **_below("relay rail"))],
        [_controller("logic rail", "3.5 mA"), _coil("vent relay", "relay rail", "15 V", "1.1 kohm", "logic rail"),
         _coil("mist relay", "relay rail", "15 V", "1.1 kohm", "logic rail")]),
    _design("coffee urn", EUROPE, BRIDGE, _capacitor("820 nF"), "plug inrush=100 bleeder=220x2",
        [_rail("24 V rail", "24 V, 3 W", "330 uF, 35 V"),
         _rail("logic rail", "5.1 V, 0.5 W", "100 uF, 16 V", **_by_resistor("24 V rail", "2.7 kohm"))],
        [_controller("logic rail", "3 mA"),
         _load("coil", "boil relay", "24 V rail", nominal_voltage="24 V", power="360 mW"),
         _lamp("ready lamp", "24 V rail", "2 V", "4.7 kohm")]),
    _design("pond feeder", ISLES, BRIDGE, _capacitor("390 nF"), "fixed varistor inrush=150",
        [_rail("15 V rail", "15 V, 1.3 W", "220 uF, 25 V"),
         _rail("5 V rail", "", "47 uF, 10 V", **_by_regulator("15 V rail", "5 V", "1.7 V", "3 mA"))],
        [_controller("5 V rail", "4 mA"), _load("gate", "auger triac", "5 V rail", current="20 mA", pulse="250 us"),
         _lamp("low lamp", "5 V rail", "1.9 V", "820 ohm")]),
    _design("wine cabinet", EUROPE, BRIDGE, _capacitor("680 nF"), "plug fuse inrush=100 bleeder=270x2",
        [_rail("relay rail", "18 V, 1.3 W", "220 uF, 35 V", "logic rail"),
         _rail("logic rail", "5.6 V, 1 W", "220 uF, 10 V", **_below("relay rail")),
         _rail("sensor rail", "3.3 V, 0.5 W", "47 uF, 10 V", **_by_resistor("logic rail", "470 ohm"))],
        [_controller("sensor rail", "2 mA"), _coil("cool relay", "relay rail", "18 V", "810 ohm", "logic rail"),
         _lamp("shelf lamp", "logic rail", "1.9 V", "680 ohm")]),
    _design("attic ladder lamp", AMERICA, BRIDGE, _capacitor("1.5 uF"), "plug inrush=47 bleeder=100x2",
        [_rail("12 V rail", "12 V, 1.3 W", "470 uF, 25 V")],
        [_controller("12 V rail", "4 mA"), _lamp("step lights", "12 V rail", "6 V", "390 ohm"),
         _load("resistor", "frost heater", "12 V rail", switched=False, resistance="1.5 kohm")]),
    _design("porch sentinel", AMERICA, BRIDGE, _resistor("3.3 kohm", "10 W"), "fixed fuse",
        [_rail("12 V rail", "12 V, 1.3 W", "330 uF, 25 V")],
        [_controller("12 V rail", "4 mA"), _lamp("porch lamp", "12 V rail", "2 V", "1 kohm")]),
    _design("stair call box", EUROPE, BRIDGE, _resistor("8.2 kohm", "15 W"), "fixed varistor inrush=47",
        [_rail("15 V rail", "15 V, 1.3 W", "220 uF, 25 V"),
         _rail("logic rail", "5.1 V, 0.5 W", "100 uF, 16 V", **_by_resistor("15 V rail", "2.2 kohm"))],
        [_controller("logic rail", "2 mA"), _load("gate", "chime triac", "15 V rail", current="25 mA", pulse="300 us"),
         _load("resistor", "call loop", "15 V rail", switched=False, resistance="6.8 kohm")]),
    _design("garage eye", EUROPE, BRIDGE, _divider("680 nF", "1 uF"), "plug fuse varistor inrush=100 bleeder=220x2",
        [_rail("12 V rail", "12 V, 1.3 W", "330 uF, 25 V")],
        [_controller("12 V rail", "3 mA"), _coil("door relay", "12 V rail", "12 V", "720 ohm")]),
    _design("egg incubator", EUROPE, HALF, _divider("1 uF", "1.5 uF"), "plug inrush=150 bleeder=180x2",
        [_rail("12 V rail", "12 V, 1.3 W", "680 uF, 25 V")],
        [_controller("12 V rail", "3.5 mA"), _coil("turner relay", "12 V rail", "12 V", "1.1 kohm"),
         _lamp("hatch lamp", "12 V rail", "2 V", "2.2 kohm")]),
    _design("night sensor", EUROPE, BRIDGE, _divider("330 nF", "470 nF"), "fixed fuse varistor inrush=220",
        [_rail("9 V rail", "9.1 V, 1 W", "220 uF, 16 V")],
        [_controller("9 V rail", "3 mA"),
         _load("gate", "lamp triac", "9 V rail", switched=False, current="30 mA", pulse="500 us")]),
    _design("sump alarm", EUROPE, HALF, _capacitor("1 uF"), "fixed fuse inrush=220 bleeder=180x2",
        [_rail("24 V rail", "24 V, 1.3 W", "470 uF, 35 V")],
        [_controller("24 V rail", "2.5 mA"), _coil("alarm relay", "24 V rail", "24 V", "2.304 kohm"),
         _lamp("alarm lamp", "24 V rail", "2 V", "4.7 kohm")]),
    _design("dehumidifier", ISLES, HALF, _capacitor("1.2 uF"), "plug fuse varistor inrush=100 bleeder=150x2",
        [_rail("relay rail", "12 V, 1.3 W", "680 uF, 25 V", "logic rail"),
         _rail("logic rail", "5.1 V, 1 W", "680 uF, 10 V", **_below("relay rail"))],
        [_controller("logic rail", "4 mA"), _coil("drain relay", "relay rail", "12 V", "576 ohm", "logic rail"),
         _load("gate", "fan triac", "logic rail", switched=False, current="15 mA", pulse="500 us")]),
    _design("slicer guard", AMERICA, HALF, _capacitor("2.2 uF"), "plug fuse inrush=68 bleeder=100x2",
        [_rail("15 V rail", "15 V, 1.3 W", "680 uF, 25 V"),
         _rail("5 V rail", "", "100 uF, 10 V", **_by_regulator("15 V rail", "5 V", "0.4 V", "80 uA"))],
        [_controller("5 V rail", "6 mA"), _coil("guard relay", "15 V rail", "15 V", "900 ohm")]),
    _design("boiler room vent", EUROPE, HALF_ZENER, _capacitor("680 nF"), "fixed fuse varistor inrush=150",
        [_rail("12 V rail", "12 V, 1.3 W", "470 uF, 25 V")],
        [_controller("12 V rail", "3 mA"), _lamp("run lamp", "12 V rail", "2 V", "1.5 kohm")]),
    _design("seed propagator", ISLES, HALF_ZENER, _capacitor("1 uF"), "plug fuse inrush=100 bleeder=180x2",
        [_rail("15 V rail", "15 V, 1.3 W", "470 uF, 25 V"),
         _rail("logic rail", "3.3 V, 0.5 W", "100 uF, 10 V", **_by_resistor("15 V rail", "2.7 kohm"))],
        [_controller("logic rail", "2 mA"), _coil("mat relay", "15 V rail", "15 V", "1.6 kohm")]),
    _design("doorbell light", AMERICA, HALF_ZENER, _resistor("3.3 kohm", "7 W"), "fixed inrush=47",
        [_rail("10 V rail", "10 V, 1 W", "470 uF, 16 V")],
        [_controller("10 V rail", "2 mA"), _lamp("bell lamp", "10 V rail", "2 V", "2.2 kohm")]),
    _design("hall thermostat", AMERICA, HALF, _resistor("2.2 kohm", "10 W"), "fixed fuse",
        [_rail("12 V rail", "12 V, 1 W", "470 uF, 25 V")],
        [_controller("12 V rail", "2 mA"), _coil("heat relay", "12 V rail", "12 V", "1.5 kohm")]),
    _design("tumble dryer", ISLES, BRIDGE, _capacitor("1 uF"), "plug fuse varistor inrush=68 bleeder=180x2",
        [_rail("24 V rail", "24 V, 5 W", "470 uF, 35 V"),
         _rail("9 V rail", "9.1 V, 1 W", "100 uF, 16 V", **_by_resistor("24 V rail", "1.8 kohm")),
         _rail("3.3 V rail", "", "47 uF, 6.3 V", **_by_regulator("9 V rail", "3.3 V", "1.1 V", "0.5 mA"))],
        [_controller("3.3 V rail", "4 mA"), _coil("heat relay", "24 V rail", "24 V", "1.6 kohm"),
         _coil("drum relay", "24 V rail", "24 V", "1.6 kohm")]),
    _design("rice cooker", EUROPE, BRIDGE, _capacitor("680 nF"), "plug inrush=100 bleeder=270x2",
        [_rail("relay rail", "12 V, 1.3 W", "220 uF, 35 V", "display rail"),
         _rail("display rail", "6.2 V, 1 W", "220 uF, 16 V", "logic rail", **_below("relay rail")),
         _rail("logic rail", "3.3 V, 1 W", "220 uF, 10 V", **_below("display rail"))],
        [_controller("logic rail", "3 mA"), _coil("heat relay", "relay rail", "12 V", "576 ohm", "display rail"),
         _lamp("warm lamp", "display rail", "2 V", "1.5 kohm")]),
    _design("well pump timer", EUROPE, HALF, _capacitor("1.5 uF"), "fixed fuse inrush=150 bleeder=120x2",
        [_rail("18 V rail", "18 V, 2 W", "680 uF, 35 V"),
         _rail("9 V rail", "9.1 V, 1 W", "100 uF, 16 V", **_by_resistor("18 V rail", "820 ohm")),
         _rail("logic rail", "3.3 V, 0.5 W", "100 uF, 10 V", **_by_resistor("9 V rail", "1.5 kohm"))],
        [_controller("logic rail", "2.5 mA"), _coil("pump relay", "18 V rail", "18 V", "1.1 kohm"),
         _lamp("dry lamp", "9 V rail", "2 V", "2.2 kohm")]),
    _design("freezer alarm", EUROPE, BRIDGE, _capacitor("150 nF"), "plug inrush=220 bleeder=1000",
        [_rail("5 V rail", "5.1 V, 1 W", "220 uF, 10 V")],
        [_controller("5 V rail", "2 mA"), _lamp("alarm lamp", "5 V rail", "1.9 V", "1 kohm")]),
)  # fmt: skip
DESIGNS: dict[str, Design] = {design["board"]["name"]: design for design in _ALL}


# ---- as a case file, and as a circuit ------------------------------------------------------------


def case_text(design: Design) -> str:
    """Return a design as a case file without readings."""
    board = design["board"]
    plain = {key: value for key, value in board.items() if isinstance(value, str)}
    lines = ["format = 1", "", "[mains]", *_table(design["mains"]), "", "[board]", *_table(plain)]
    for key in ("fuse", "varistor", "dropper", "inrush", "bleeder"):
        lines += ["", f"[board.{key}]", *_table(board[key])] if key in board else []
    for key in ("rail", "load"):
        for part in board[key]:
            lines += ["", f"[[board.{key}]]", *_table(part)]
    return "\n".join(lines) + "\n"


def _table(items: dict[str, Any]) -> list[str]:
    return [f"{key} = {_value(value)}" for key, value in items.items()]


def _value(value: Any) -> str:
    return "{ " + ", ".join(_table(value)) + " }" if isinstance(value, dict) else json.dumps(value)


def circuit_of(design: Design) -> Circuit:
    """Return the circuit of a design, all parts as marked [SI]."""
    circuit: Circuit = to_si(design)
    for load in circuit["board"]["load"]:
        if "power" in load:
            load["resistance"] = load["nominal_voltage"] ** 2 / load["power"]
    return circuit


def switched(design: Design) -> list[str]:
    """Return the names of the loads that an appliance function turns on."""
    return [load["name"] for load in design["board"]["load"] if load["switched"]]


def states(design: Design) -> list[list[str]]:
    """Return what is commanded on while reading: nothing, everything, each switched load alone."""
    names = switched(design)
    wanted = [[], names, *([name] for name in names)]
    return [state for place, state in enumerate(wanted) if state not in wanted[:place]]


def acting(fault: Fault) -> Fault:
    """A fault in the reference's words: a rail's joint parts it from its feed, a risen bleeder is one of another value."""
    if fault["fault"] == "joint-open" and "rail" in fault:
        return fault | {"fault": "feed-open"}
    if fault["fault"] == "bleeder-open" and "resistance" in fault:
        return fault | {"fault": "bleeder-low"}
    return {key: part for key, part in fault.items() if key != "with"}


# ---- which faults a design can have --------------------------------------------------------------


def places(design: Design) -> dict[str, list[Place]]:
    """Return every fault of the contract this design admits, and its places; pairs are named "cause + effect"."""
    board = design["board"]
    rails, loads = board["rail"], board["load"]
    film = board["dropper"]["kind"] != "resistor"
    fed = [rail for rail in rails if rail.get("fed_through") in ("resistor", "regulator")]
    coils = [load for load in loads if load["kind"] == "coil"]
    found = {name: [{"fault": name}] for name in _plain(board, film)}
    by_rail = {
        ("zener-open", "zener-short", "zener-low"): [rail for rail in rails if "zener" in rail],
        ("reservoir-dried", "reservoir-leaky", "board-leakage"): rails,
        ("feed-open", "feed-short"): fed,
        ("feed-high",): [rail for rail in fed if rail["fed_through"] == "resistor"],
    }
    by_load = {
        ("load-excess",): loads,
        ("load-open",): [load for load in loads if load not in coils],
        ("coil-open", "coil-shorted-turns"): coils,
        ("switch-open", "switch-stuck-on"): [load for load in loads if load["switched"]],
    }
    for key, groups in (("rail", by_rail), ("load", by_load)):
        for names, parts in groups.items():
            found |= {name: [{"fault": name, key: part["name"]} for part in parts] for name in names}
    found["joint-open"] = [{"fault": "joint-open"}, *({"fault": "joint-open", "rail": rail["name"]} for rail in fed)]
    found |= _pairs(design, found)
    return {name: where for name, where in found.items() if where}


def _plain(board: dict[str, Any], film: bool) -> list[str]:
    """Return the faults that need no rail or load to be told; a resistor dropper does not short."""
    names = ["no-fault", "unexplained", "dropper-open", "diode-open", "diode-short", "mains-low", "mains-high"]
    names += ["dropper-capacitance-lost", "dropper-short", "wrong-part"] if film else []
    if board["dropper"]["kind"] == "divider":
        names += ["shunt-capacitor-lost", "shunt-capacitor-open", "shunt-capacitor-short"]
    belongs = {"fuse": ["fuse-open"], "varistor": ["varistor-short"], "inrush": ["inrush-open", "inrush-high"]}
    belongs["bleeder"] = ["bleeder-open", "bleeder-low"]
    return names + [name for part, faults in belongs.items() if part in board for name in faults]


PAIRS = (
    ("dropper-short", "inrush-open"), ("dropper-short", "fuse-open"), ("dropper-short", "zener-short"),
    ("varistor-short", "fuse-open"), ("zener-open", "reservoir-leaky"), ("zener-open", "load-excess"),
    ("dropper-capacitance-lost", "reservoir-dried"),
)  # fmt: skip


def _pairs(design: Design, found: dict[str, list[Place]]) -> dict[str, list[Place]]:
    pairs = {}
    for cause, effect in PAIRS:
        both = itertools.product(found.get(cause, []), found.get(effect, []))
        pairs[f"{cause} + {effect}"] = [here | {"with": there} for here, there in both if _harms(design, here, there)]
    return pairs


def _harms(design: Design, cause: Place, effect: Place) -> bool:
    """Whether the first fault can bring the second about: an open zener harms what hangs on its own rail."""
    if cause["fault"] == "dropper-short" and effect["fault"] == "zener-short":
        return bool(effect["rail"] == design["board"]["rail"][0]["name"])
    if "load" in effect:
        return bool(by_name(design["board"]["load"], effect["load"])["rail"] == cause["rail"])
    return "rail" not in cause or cause["rail"] == effect["rail"]


# ---- what the contract and the published values say ----------------------------------------------

# Published values, "Priors on boards of this kind" [per mille]; bleeders are latent, see LATENT
WEIGHTS = {
    "dropper-capacitance-lost": 500, "dropper-open": 15, "dropper-short": 5, "inrush-open": 55, "inrush-high": 8,
    "fuse-open": 10, "varistor-short": 8, "diode-open": 5, "diode-short": 12, "zener-open": 5, "zener-short": 35,
    "zener-low": 8, "reservoir-dried": 95, "reservoir-leaky": 15, "board-leakage": 8, "feed-open": 10, "feed-high": 5,
    "feed-short": 4, "load-excess": 15, "load-open": 5, "joint-open": 35, "coil-open": 8, "coil-shorted-turns": 4,
    "wrong-part": 5, "switch-open": 10, "switch-stuck-on": 10, "mains-low": 3, "mains-high": 1, "no-fault": 80,
    "unexplained": 12, "shunt-capacitor-lost": 60, "shunt-capacitor-open": 5, "shunt-capacitor-short": 3,
    "bleeder-open": 0, "bleeder-low": 0,
}  # fmt: skip
FILM, ZENER, RESERVOIR, BROWNED = "cracked dropper", "burnt zener", "bulged reservoir", "browned board"
SIGNS: dict[str, tuple[float, str]] = {  # published values, "sign" [%], and which word it is
    "dropper-capacitance-lost": (3, FILM), "dropper-open": (10, FILM), "dropper-short": (60, FILM),
    "shunt-capacitor-lost": (3, FILM), "shunt-capacitor-open": (10, FILM), "shunt-capacitor-short": (60, FILM),
    "inrush-open": (50, "scorched inrush"), "inrush-high": (50, "scorched inrush"), "fuse-open": (50, "blown fuse"),
    "varistor-short": (85, "cracked varistor"), "diode-open": (5, BROWNED), "diode-short": (10, BROWNED),
    "zener-open": (30, ZENER), "zener-short": (25, ZENER), "zener-low": (15, ZENER), "reservoir-dried": (30, RESERVOIR),
    "reservoir-leaky": (40, RESERVOIR), "board-leakage": (70, "residue"), "feed-open": (30, BROWNED),
    "feed-high": (30, BROWNED), "feed-short": (15, BROWNED), "load-excess": (10, BROWNED),
    "load-open": (10, BROWNED), "joint-open": (60, "dry joint"), "coil-open": (3, BROWNED),
    "coil-shorted-turns": (25, BROWNED), "wrong-part": (50, "earlier repair"), "switch-open": (5, BROWNED),
    "switch-stuck-on": (8, BROWNED),
}  # fmt: skip
OLD_AGE = {BROWNED: 1.0 / 3.0, "dry joint": 0.1}  # published values: what a sound old board shows
METERS = {  # unit, share, floor: a two-sigma limit (case format, section 1, [meter])
    "dc_voltage": ("V", 0.005, 0.02), "ac_voltage": ("V", 0.01, 0.3), "ac_low_voltage": ("V", 0.015, 0.01),
    "ripple": ("V", 0.05, 0.02), "capacitance": ("F", 0.02, 0.2e-9), "resistance": ("ohm", 0.009, 0.2),
    "ac_current": ("A", 0.015, 50e-6), "dc_current": ("A", 0.01, 20e-6),
}  # fmt: skip
BY = {  # which of them takes what (case format, section 1 and 4); what is not named has its kind in its name
    "mains-voltage": "ac_voltage", "dropper-voltage": "ac_voltage", "rail-voltage": "dc_voltage", "rail-ripple": "ripple",
    "rail-ripple-rms": "ac_low_voltage", "inrush-voltage": "ac_low_voltage", "dropper-dc-voltage": "dc_voltage",
    "line-current": "ac_current", "zener-test": "dc_voltage", "rail-injection": "dc_voltage", "reservoir-esr": "resistance",
    "reservoir-leakage": "dc_current", "rail-leakage": "dc_current", "load-current": "dc_current",
}  # fmt: skip
WORDS = {
    "load-responds": ("yes", "no", "always on", "chatters", "lets go"), "rectifier-test": ("good", "open", "short"),
    "switch-test": ("good", "open", "short"), "tap-test": ("no change", "cuts out", "comes back"),
}  # fmt: skip
