"""What a board is to the reference: a plain dictionary of SI floats, its faults, and the netlist made from
it.

The dictionary mirrors the case file (`mains`, `board`, `on`) so that one set of circuits can be read by the
product and by this simulator, yet nothing of the product is needed to build the network. Part laws are
those of section 4 of the case format. A circuit may hold `fault`; `apply_fault` turns it into changed
values, `removed` parts and `shunts`.
"""

from __future__ import annotations

import copy
from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Any

Circuit = dict[str, Any]

DIODE_CURRENT, DIODE_VOLTAGE, DIODE_SLOPE = 20e-3, 0.7, 0.1 / 2.302585092994046  # A, V, V per e-fold
ZENER_CURRENT, ZENER_SLOPE = 5e-3, 60e-3  # A at the marked voltage, V per e-fold
LED_CURRENT, LED_SLOPE = 6e-3, 50e-3  # A at the forward voltage; V per e-fold, value from memory
LOAD_KNEE = 0.5  # V, current load: I * tanh(V / knee)
ESR_FACTOR, ESR_LEAST = 6e-5, 0.02  # ohm farad, ohm
SHORT = 0.5  # ohm, a shorted junction or feed
LEAD = 2.0  # ohm, wiring and mains of a board without inrush resistor
OPEN = 1e9  # ohm, an open mains path, kept finite so that the nodes behind it are not left floating
STRAY = 50e-12  # F at every node: makes the equations an ODE, see `network`
COMMON = "common"


@dataclass
class Branch:
    """One two-terminal element: `law` is a key of `network.LAWS`, `values` its SI parameters."""

    name: str
    law: str
    plus: str
    minus: str
    values: tuple[float, ...]


@dataclass
class Netlist:
    """All branches of a circuit, and between which nodes the mains drives its series resistance."""

    branches: list[Branch] = field(default_factory=list)
    source: tuple[str, str, float] = ("", "", 0.0)  # node behind the series resistance, return node, ohm

    def add(self, name: str, law: str, plus: str, minus: str, *values: float) -> None:
        """Append one branch from node `plus` to node `minus`."""
        self.branches.append(Branch(name, law, plus, minus, values))

    def diode(self, name: str, anode: str, cathode: str) -> None:
        """Append a rectifier diode."""
        self.add(name, "junction", anode, cathode, DIODE_CURRENT, DIODE_VOLTAGE, DIODE_SLOPE)


def by_name(items: list[dict[str, Any]], name: str) -> dict[str, Any]:
    """Return the rail or load called `name`; KeyError if there is none."""
    for item in items:
        if item["name"] == name:
            return item
    raise KeyError(name)


def nominal_voltage(circuit: Circuit, rail: str) -> float:
    """Return the sum of the zeners from `rail` down to common [V]; half-wave-zener: the first 0.7 V less."""
    board = circuit["board"]
    zener = by_name(board["rail"], rail)["zener"]
    below = zener.get("clamps_to", COMMON)
    total = float(zener["voltage"]) + (0.0 if below == COMMON else nominal_voltage(circuit, below))
    first = board["rail"][0]["name"] == rail and board["rectifier"] == "half-wave-zener"
    return total - DIODE_VOLTAGE if first else total


def esr_of(reservoir: dict[str, Any]) -> float:
    """Return the reservoir's series resistance [ohm], stated or as section 4 assumes it."""
    return float(reservoir.get("esr", max(ESR_FACTOR / reservoir["capacitance"], ESR_LEAST)))


def loads_drawing(circuit: Circuit) -> list[dict[str, Any]]:
    """Return the loads that draw: unswitched, named in `on` or stuck, less the removed."""
    live = set(circuit.get("on", [])) | set(circuit.get("stuck", []))
    removed = circuit.get("removed", [])
    return [
        load
        for load in circuit["board"].get("load", [])
        if (not load.get("switched", False) or load["name"] in live) and f"load:{load['name']}" not in removed
    ]


# ---- faults --------------------------------------------------------------------------------------


def _remove(part: str) -> Callable[[Circuit, dict[str, Any]], None]:
    def act(circuit: Circuit, fault: dict[str, Any]) -> None:
        circuit["removed"].append(part.format(**fault))

    return act


def _shunt(plus: str, minus: str) -> Callable[[Circuit, dict[str, Any]], None]:
    def act(circuit: Circuit, fault: dict[str, Any]) -> None:
        ends = (plus.format(**fault), minus.format(**fault))
        circuit["shunts"].append([*ends, float(fault.get("resistance", SHORT))])

    return act


def _dropper_value(circuit: Circuit, fault: dict[str, Any]) -> None:
    circuit["board"]["dropper"]["capacitance"] = float(fault["capacitance"])


def _dropper_open(circuit: Circuit, fault: dict[str, Any]) -> None:
    circuit["board"]["dropper"] = {"kind": "capacitor", "capacitance": float(fault.get("capacitance", 1e-12))}


def _dropper_short(circuit: Circuit, fault: dict[str, Any]) -> None:
    circuit["board"]["dropper"] = {"kind": "resistor", "resistance": float(fault.get("resistance", SHORT))}


def _inrush(circuit: Circuit, fault: dict[str, Any]) -> None:
    circuit["board"]["inrush"] = {"resistance": float(fault.get("resistance", OPEN))}


def _zener_short(circuit: Circuit, fault: dict[str, Any]) -> None:
    circuit["removed"].append(f"zener:{fault['rail']}")
    rail = by_name(circuit["board"]["rail"], fault["rail"])
    ends = (zener_cathode(circuit, rail), rail["zener"].get("clamps_to", COMMON))
    circuit["shunts"].append([*ends, float(fault["resistance"])])


def _zener_low(circuit: Circuit, fault: dict[str, Any]) -> None:
    by_name(circuit["board"]["rail"], fault["rail"])["zener"]["voltage"] = float(fault["voltage"])


def _dried(circuit: Circuit, fault: dict[str, Any]) -> None:
    reservoir = by_name(circuit["board"]["rail"], fault["rail"])["reservoir"]
    reservoir["esr"] = esr_of(reservoir) + float(fault["extra_esr"])
    reservoir["capacitance"] *= float(fault["factor"])


def _leak(circuit: Circuit, fault: dict[str, Any]) -> None:
    ohms = nominal_voltage(circuit, fault["rail"]) / float(fault["current"])
    circuit["shunts"].append([fault["rail"], COMMON, ohms])


def _feed_value(circuit: Circuit, fault: dict[str, Any]) -> None:
    rail = by_name(circuit["board"]["rail"], fault["rail"])
    rail["feed_resistance"] = float(fault.get("resistance", SHORT))


def _excess(circuit: Circuit, fault: dict[str, Any]) -> None:
    load = by_name(circuit["board"]["load"], fault["load"])
    extra: dict[str, Any] = {key: load[key] for key in ("rail", "returns_to", "switched") if key in load}
    extra |= {"name": load["name"], "kind": "current", "current": float(fault["current"])}
    circuit["board"]["load"].append(extra)


def _shorted_turns(circuit: Circuit, fault: dict[str, Any]) -> None:
    by_name(circuit["board"]["load"], fault["load"])["resistance"] = float(fault["resistance"])


def _stuck(circuit: Circuit, fault: dict[str, Any]) -> None:
    circuit["stuck"].append(fault["load"])


def _joint(circuit: Circuit, fault: dict[str, Any]) -> None:
    """Open the mains path, or with `rail` the joint between that rail's reservoir and the rest."""
    if "rail" in fault:
        circuit["removed"].append(f"reservoir:{fault['rail']}")
    else:
        _inrush(circuit, {})


def _mains(circuit: Circuit, fault: dict[str, Any]) -> None:
    circuit["mains"]["voltage"] = float(fault["voltage"])


def _nothing(circuit: Circuit, fault: dict[str, Any]) -> None:
    """A healthy board."""


FAULTS: dict[str, Callable[[Circuit, dict[str, Any]], None]] = {
    "no-fault": _nothing,
    "dropper-capacitance-lost": _dropper_value,
    "wrong-part": _dropper_value,
    "dropper-open": _dropper_open,
    "dropper-short": _dropper_short,
    "fuse-open": _inrush,
    "inrush-open": _inrush,
    "inrush-high": _inrush,
    "bleeder-open": _remove("bleeder"),
    "diode-open": _remove("{junction}"),
    "diode-short": _shunt("{anode}", "{cathode}"),
    "zener-open": _remove("zener:{rail}"),
    "zener-short": _zener_short,
    "zener-low": _zener_low,
    "reservoir-dried": _dried,
    "reservoir-leaky": _leak,
    "board-leakage": _leak,
    "feed-open": _remove("feed:{rail}"),
    "feed-high": _feed_value,
    "feed-short": _feed_value,
    "load-excess": _excess,
    "load-open": _remove("load:{load}"),
    "coil-open": _remove("load:{load}"),
    "coil-shorted-turns": _shorted_turns,
    "switch-open": _remove("load:{load}"),
    "switch-stuck-on": _stuck,
    "joint-open": _joint,
    "mains-low": _mains,
    "mains-high": _mains,
}


def apply_fault(circuit: Circuit, fault: dict[str, Any] | None = None) -> Circuit:
    """Return a copy of `circuit` with `fault` (default: its own `fault` entry) put in as changed parts.

    Severities are SI: `capacitance` [F], `resistance` [ohm], `voltage` [V], `current` [A], `factor` and
    `extra_esr` [ohm] for a dried reservoir, `junction` (a key of `junctions`) for a diode, `rail`, `load`.
    KeyError for an unknown fault or a missing severity.
    """
    result = copy.deepcopy(circuit)
    own = result.pop("fault", None)
    fault = dict(fault or own or {"fault": "no-fault"})
    for key in ("removed", "shunts", "stuck"):
        result.setdefault(key, [])
    if "junction" in fault:
        fault["anode"], fault["cathode"] = junctions(result)[fault["junction"]]
    FAULTS[fault["fault"]](result, fault)
    return result


# ---- netlist -------------------------------------------------------------------------------------


def junctions(circuit: Circuit) -> dict[str, tuple[str, str]]:
    """Return the rectifier's diodes: name to (anode node, cathode node)."""
    first = circuit["board"]["rail"][0]["name"]
    series, back = ("dropped", first), (COMMON, "dropped")
    return {
        "bridge": {
            "top-a": series, "bottom-a": back, "top-b": ("return", first), "bottom-b": (COMMON, "return"),
        },
        "half-wave": {"series": series, "return": back},
        "half-wave-zener": {"series": series},
    }[circuit["board"]["rectifier"]]


def zener_cathode(circuit: Circuit, rail: dict[str, Any]) -> str:
    """Return the node at the upper end of the rail's zener."""
    board = circuit["board"]
    early = board["rectifier"] == "half-wave-zener" and rail is board["rail"][0]
    return "dropped" if early else str(rail["name"])


def netlist(circuit: Circuit) -> Netlist:
    """Build the branches of a circuit; a `fault` entry is applied first."""
    circuit = apply_fault(circuit)
    net = Netlist()
    _front_end(net, circuit)
    for rail in circuit["board"]["rail"]:
        _rail(net, circuit, rail)
    for load in loads_drawing(circuit):
        _load(net, load)
    for number, (plus, minus, ohms) in enumerate(circuit["shunts"]):
        net.add(f"shunt:{number}", "resistor", plus, minus, ohms)
    net.branches = [branch for branch in net.branches if branch.name not in circuit["removed"]]
    return net


def _front_end(net: Netlist, circuit: Circuit) -> None:
    """Mains, inrush, (dropper || bleeder), rectifier, other mains line."""
    board = circuit["board"]
    back = "return" if board["rectifier"] == "bridge" else COMMON
    ohms = float(board.get("inrush", {}).get("resistance", LEAD))
    net.source = ("limited", back, max(ohms, LEAD))
    dropper = board["dropper"]
    if dropper["kind"] == "resistor":
        net.add("dropper", "resistor", "limited", "dropped", dropper["resistance"])
    else:
        net.add("dropper", "capacitor", "limited", "dropped", dropper["capacitance"])
    if "shunt_capacitance" in dropper:
        net.add("shunt", "capacitor", "dropped", back, dropper["shunt_capacitance"])
    if "bleeder" in board:
        total = board["bleeder"]["resistance"] * board["bleeder"].get("in_series", 1)
        net.add("bleeder", "resistor", "limited", "dropped", total)
    for name, (anode, cathode) in junctions(circuit).items():
        net.diode(name, anode, cathode)


def _rail(net: Netlist, circuit: Circuit, rail: dict[str, Any]) -> None:
    name = rail["name"]
    if "reservoir" in rail:
        net.add(f"esr:{name}", "resistor", name, f"inside {name}", esr_of(rail["reservoir"]))
        net.add(f"reservoir:{name}", "capacitor", f"inside {name}", COMMON, rail["reservoir"]["capacitance"])
    if rail.get("fed_through") == "resistor":
        net.add(f"feed:{name}", "resistor", rail["fed_by"], name, rail["feed_resistance"])
    if "zener" in rail:
        volts, lower = rail["zener"]["voltage"], rail["zener"].get("clamps_to", COMMON)
        upper = zener_cathode(circuit, rail)
        net.add(f"zener:{name}", "junction", upper, lower, ZENER_CURRENT, volts, ZENER_SLOPE)
        net.add(f"zener:{name}", "junction", lower, upper, DIODE_CURRENT, DIODE_VOLTAGE, DIODE_SLOPE)


def _load(net: Netlist, load: dict[str, Any]) -> None:
    name, upper, lower = f"load:{load['name']}", load["rail"], load.get("returns_to", COMMON)
    if load["kind"] == "current":
        net.add(name, "current", upper, lower, load["current"])
    elif load["kind"] == "led":
        inner = f"inside {load['name']}"
        net.add(name, "resistor", upper, inner, load["resistance"])
        net.add(name, "junction", inner, lower, LED_CURRENT, load["forward_voltage"], LED_SLOPE)
    else:
        net.add(name, "resistor", upper, lower, load["resistance"])
