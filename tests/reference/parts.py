"""What a board is to the reference: a plain dictionary of SI floats, and what can be looked up in it.

The dictionary mirrors the case file (`mains`, `board`, `on`) so that one set of circuits can be read by the
product and by this simulator, yet nothing of the product is needed to build the network. Constants are
those of section 4 of the case format.
"""

from __future__ import annotations

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
METER = 10e6  # ohm, a voltmeter on its DC range
COMMON = "common"


def by_name(items: list[dict[str, Any]], name: str) -> dict[str, Any]:
    """Return the rail or load called `name`; KeyError if there is none."""
    for item in items:
        if item["name"] == name:
            return item
    raise KeyError(name)


def nominal_voltage(circuit: Circuit, rail: str) -> float:
    """Return a rail's nominal voltage over common [V]; KeyError for a rail that has none.

    That is the regulated voltage, or the sum of the zeners down to common, on a half-wave-zener board 0.7 V
    less for the first rail (case format, section 1).
    """
    board = circuit["board"]
    found = by_name(board["rail"], rail)
    if "regulated_voltage" in found:
        return float(found["regulated_voltage"])
    zener = found["zener"]
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
    }[circuit["board"]["rectifier"]]  # fmt: skip


def other_line(circuit: Circuit) -> str:
    """Return the node of the mains line that has no dropper."""
    return "return" if circuit["board"]["rectifier"] == "bridge" else COMMON


def zener_cathode(circuit: Circuit, rail: dict[str, Any]) -> str:
    """Return the node at the upper end of the rail's zener."""
    board = circuit["board"]
    early = board["rectifier"] == "half-wave-zener" and rail["name"] == board["rail"][0]["name"]
    return "dropped" if early else str(rail["name"])
