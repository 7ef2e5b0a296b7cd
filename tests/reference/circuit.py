"""The netlist of a circuit: which two-terminal parts lie between which nodes, its fault put in first."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

from tests.reference.faults import apply_fault, faulty_values
from tests.reference.parts import (
    COMMON,
    DIODE_CURRENT,
    DIODE_SLOPE,
    DIODE_VOLTAGE,
    LEAD,
    LED_CURRENT,
    LED_SLOPE,
    LOAD_KNEE,
    OPEN,
    ZENER_CURRENT,
    ZENER_SLOPE,
    Circuit,
    by_name,
    esr_of,
    junctions,
    loads_drawing,
    nominal_voltage,
    other_line,
    zener_cathode,
)

__all__ = [
    "COMMON", "LOAD_KNEE", "OPEN", "Branch", "Circuit", "Netlist", "Regulator", "apply_fault", "by_name",
    "esr_of", "faulty_values", "junctions", "loads_drawing", "netlist", "nominal_voltage",
]  # fmt: skip


@dataclass
class Branch:
    """One two-terminal element: `law` is a key of `network.LAWS`, `values` its SI parameters."""

    name: str
    law: str
    plus: str
    minus: str
    values: tuple[float, ...]


@dataclass
class Regulator:
    """A series regulator from node `plus` to node `minus`: volts, dropout [V] and ground current [A]."""

    name: str
    plus: str
    minus: str
    values: tuple[float, float, float]


@dataclass
class Netlist:
    """All branches of a circuit, and between which nodes the mains drives its series resistance."""

    branches: list[Branch] = field(default_factory=list)
    regulators: list[Regulator] = field(default_factory=list)
    source: tuple[str, str, float] = ("", "", 0.0)  # node behind the series resistance, return node, ohm

    def add(self, name: str, law: str, plus: str, minus: str, *values: float) -> None:
        """Append one branch from node `plus` to node `minus`."""
        self.branches.append(Branch(name, law, plus, minus, values))

    def diode(self, name: str, anode: str, cathode: str) -> None:
        """Append a rectifier diode."""
        self.add(name, "junction", anode, cathode, DIODE_CURRENT, DIODE_VOLTAGE, DIODE_SLOPE)

    def without(self, removed: list[str]) -> None:
        """Take the named parts out."""
        self.branches = [branch for branch in self.branches if branch.name not in removed]
        self.regulators = [part for part in self.regulators if part.name not in removed]


def netlist(circuit: Circuit) -> Netlist:
    """Build the branches of a circuit; a `fault` entry is applied first.

    `supply` in the circuit, (rail, current limit [A], voltage limit [V]), is a bench supply: the mains plug
    is then out. `meter` [ohm] is put from every rail to common.
    """
    circuit = apply_fault(circuit)
    net = Netlist()
    _front_end(net, circuit)
    for rail in circuit["board"]["rail"]:
        _rail(net, circuit, rail)
    for load in loads_drawing(circuit):
        _load(net, load)
    for number, (plus, minus, ohms) in enumerate(circuit["shunts"]):
        net.add(f"shunt:{number}", "resistor", plus, minus, ohms)
    if "supply" in circuit:
        rail, amps, volts = circuit["supply"]
        net.add("supply", "supply", rail, COMMON, amps, volts)
    net.without(circuit["removed"])
    return net


def _front_end(net: Netlist, circuit: Circuit) -> None:
    """Mains, inrush, (dropper || bleeder), second capacitor, rectifier, other mains line."""
    board, back = circuit["board"], other_line(circuit)
    ohms = OPEN if "supply" in circuit else float(board.get("inrush", {}).get("resistance", LEAD))
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
    if "reservoir" in rail and f"reservoir:{name}" not in circuit["removed"]:
        net.add(f"esr:{name}", "resistor", name, f"inside {name}", esr_of(rail["reservoir"]))
        net.add(f"reservoir:{name}", "capacitor", f"inside {name}", COMMON, rail["reservoir"]["capacitance"])
    if rail.get("fed_through") == "resistor":
        net.add(f"feed:{name}", "resistor", rail["fed_by"], name, rail["feed_resistance"])
    if rail.get("fed_through") == "regulator":
        values = (rail["regulated_voltage"], rail["dropout"], rail["ground_current"])
        net.regulators.append(Regulator(f"feed:{name}", rail["fed_by"], name, values))
    if "zener" in rail:
        volts, lower = rail["zener"]["voltage"], rail["zener"].get("clamps_to", COMMON)
        upper = zener_cathode(circuit, rail)
        net.add(f"zener:{name}", "junction", upper, lower, ZENER_CURRENT, volts, ZENER_SLOPE)
        net.add(f"zener:{name}", "junction", lower, upper, DIODE_CURRENT, DIODE_VOLTAGE, DIODE_SLOPE)
    if "meter" in circuit:
        net.add(f"meter:{name}", "resistor", name, COMMON, circuit["meter"])


def _load(net: Netlist, load: dict[str, Any]) -> None:
    name, upper, lower = f"load:{load['name']}", load["rail"], load.get("returns_to", COMMON)
    if load["kind"] == "current":
        net.add(name, "current", upper, lower, load["current"])
    elif load["kind"] == "gate":
        net.add(name, "gate", upper, lower, load["current"], load["pulse"])
    elif load["kind"] == "led":
        inner = f"inside {load['name']}"
        net.add(name, "resistor", upper, inner, load["resistance"])
        net.add(name, "junction", inner, lower, LED_CURRENT, load["forward_voltage"], LED_SLOPE)
    else:
        net.add(name, "resistor", upper, lower, load["resistance"])
