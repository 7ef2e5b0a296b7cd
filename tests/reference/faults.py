"""Turns a fault of the case format into changed parts, so that a faulty board is a board like any other.

A circuit may hold `fault`; `apply_fault` puts it into values, `removed` parts, `shunts` and `stuck`
switches. A pair is a fault with a second one in its `with`. `faulty_values` goes further and folds all that
it can into values of parts, for a reader that knows only parts.
"""

from __future__ import annotations

import copy
from collections.abc import Callable
from typing import Any

from tests.reference.parts import (
    COMMON,
    OPEN,
    SHORT,
    Circuit,
    by_name,
    esr_of,
    junctions,
    nominal_voltage,
    other_line,
    zener_cathode,
)

Fault = dict[str, Any]
SHORTED_ZENER = 20.0  # ohm, the most that a shorted zener has (case format, section 4)
Act = Callable[[Circuit, Fault], None]


def _remove(part: str) -> Act:
    def act(circuit: Circuit, fault: Fault) -> None:
        circuit["removed"].append(part.format(**fault))

    return act


def _diode_open(circuit: Circuit, fault: Fault) -> None:
    circuit["removed"].append(fault["junction"])


def _diode_short(circuit: Circuit, fault: Fault) -> None:
    ends = junctions(circuit)[fault["junction"]]
    circuit["shunts"].append([*ends, float(fault.get("resistance", SHORT))])


def _dropper_value(circuit: Circuit, fault: Fault) -> None:
    circuit["board"]["dropper"]["capacitance"] = float(fault["capacitance"])


def _instead(circuit: Circuit, kind: str, key: str, value: float) -> None:
    """Put another kind of dropper in place; a divider's second capacitor stays."""
    dropper = circuit["board"]["dropper"]
    shunt = {name: dropper[name] for name in ("shunt_capacitance",) if name in dropper}
    circuit["board"]["dropper"] = {"kind": kind, key: value} | shunt


def _dropper_open(circuit: Circuit, fault: Fault) -> None:
    kind = "divider" if circuit["board"]["dropper"]["kind"] == "divider" else "capacitor"
    _instead(circuit, kind, "capacitance", float(fault.get("capacitance", 1e-12)))


def _dropper_short(circuit: Circuit, fault: Fault) -> None:
    _instead(circuit, "resistor", "resistance", float(fault.get("resistance", SHORT)))


def _shunt_lost(circuit: Circuit, fault: Fault) -> None:
    circuit["board"]["dropper"]["shunt_capacitance"] = float(fault["capacitance"])


def _shunt_short(circuit: Circuit, fault: Fault) -> None:
    circuit["shunts"].append(["dropped", other_line(circuit), float(fault.get("resistance", SHORT))])


def _inrush(circuit: Circuit, fault: Fault) -> None:
    circuit["board"]["inrush"] = {"resistance": float(fault.get("resistance", OPEN))}


def _bleeder_low(circuit: Circuit, fault: Fault) -> None:
    circuit["board"]["bleeder"] = {"resistance": float(fault["resistance"])}


def _zener_short(circuit: Circuit, fault: Fault) -> None:
    circuit["removed"].append(f"zener:{fault['rail']}")
    rail = by_name(circuit["board"]["rail"], fault["rail"])
    ends = (zener_cathode(circuit, rail), rail["zener"].get("clamps_to", COMMON))
    circuit["shunts"].append([*ends, float(fault["resistance"])])


def _zener_low(circuit: Circuit, fault: Fault) -> None:
    by_name(circuit["board"]["rail"], fault["rail"])["zener"]["voltage"] = float(fault["voltage"])


def _dried(circuit: Circuit, fault: Fault) -> None:
    reservoir = by_name(circuit["board"]["rail"], fault["rail"])["reservoir"]
    reservoir["esr"] = esr_of(reservoir) + float(fault["extra_esr"])
    reservoir["capacitance"] *= float(fault["factor"])


def _leak(circuit: Circuit, fault: Fault) -> None:
    ohms = nominal_voltage(circuit, fault["rail"]) / float(fault["current"])
    circuit["shunts"].append([fault["rail"], COMMON, ohms])


def _feed_value(circuit: Circuit, fault: Fault) -> None:
    """Change the feed resistor; a regulator becomes a resistor (shorted from input to output)."""
    rail = by_name(circuit["board"]["rail"], fault["rail"])
    for key in ("regulated_voltage", "dropout", "ground_current"):
        rail.pop(key, None)
    rail |= {"fed_through": "resistor", "feed_resistance": float(fault.get("resistance", SHORT))}


def _excess(circuit: Circuit, fault: Fault) -> None:
    """Let a load draw so many amperes more; one that is no current load gets a second beside it."""
    load, amps = by_name(circuit["board"]["load"], fault["load"]), float(fault["current"])
    if load["kind"] == "current":
        load["current"] += amps
        return
    extra: dict[str, Any] = {key: load[key] for key in ("rail", "returns_to", "switched") if key in load}
    extra |= {"name": f"{load['name']} excess", "kind": "current", "current": amps}
    circuit["board"]["load"].append(extra)
    if load["name"] in circuit.get("on", []):
        circuit["on"].append(extra["name"])


def _shorted_turns(circuit: Circuit, fault: Fault) -> None:
    by_name(circuit["board"]["load"], fault["load"])["resistance"] = float(fault["resistance"])


def _stuck(circuit: Circuit, fault: Fault) -> None:
    circuit["stuck"].append(fault["load"])


def _joint(circuit: Circuit, fault: Fault) -> None:
    """Open the mains path, or with `rail` the joint between that rail's reservoir and the rest."""
    if "rail" in fault:
        circuit["removed"].append(f"reservoir:{fault['rail']}")
    else:
        _inrush(circuit, {})


def _mains(circuit: Circuit, fault: Fault) -> None:
    circuit["mains"]["voltage"] = float(fault["voltage"])


def _nothing(circuit: Circuit, fault: Fault) -> None:
    """A healthy board; or a varistor, which stands before the inrush resistor and spares the rails."""


FAULTS: dict[str, Act] = {
    "no-fault": _nothing,
    "dropper-capacitance-lost": _dropper_value,
    "wrong-part": _dropper_value,
    "dropper-open": _dropper_open,
    "dropper-short": _dropper_short,
    "shunt-capacitor-lost": _shunt_lost,
    "shunt-capacitor-open": _remove("shunt"),
    "shunt-capacitor-short": _shunt_short,
    "fuse-open": _inrush,
    "varistor-short": _nothing,
    "inrush-open": _inrush,
    "inrush-high": _inrush,
    "bleeder-open": _remove("bleeder"),
    "bleeder-low": _bleeder_low,
    "diode-open": _diode_open,
    "diode-short": _diode_short,
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


def apply_fault(circuit: Circuit, fault: Fault | None = None) -> Circuit:
    """Return a copy of `circuit` with `fault` (default: its own `fault` entry) put in as changed parts.

    Severities are SI: `capacitance` [F], `resistance` [ohm], `voltage` [V], `current` [A], `factor` and
    `extra_esr` [ohm] for a dried reservoir, `junction` (a key of `junctions`) for a diode, `rail`, `load`;
    `with` is the second fault of a pair. A leak is a resistor that takes `current` at the rail's nominal
    voltage. KeyError for an unknown fault or a missing severity.
    """
    result = copy.deepcopy(circuit)
    own = result.pop("fault", None)
    for key in ("removed", "shunts", "stuck"):
        result.setdefault(key, [])
    found: Fault | None = fault or own
    while found is not None:
        FAULTS[found["fault"]](result, found)
        found = found.get("with")
    return result


# ---- as values of parts --------------------------------------------------------------------------


def faulty_values(circuit: Circuit) -> Circuit:
    """Return a copy whose part values hold its fault as far as values can.

    Folded: every changed value; an open bleeder, load or reservoir, left out; a divider without its second
    capacitor, now a plain capacitor; a leak, now an unswitched load of kind resistor; a stuck switch, now
    a load that is not switched.  What is no value of a part stays: `removed` names open diodes, feeds and
    zeners, `shunts` holds shorted diodes, zeners and second capacitors as [node, node, ohm] (`parts` names
    the nodes); both are empty where all could be folded.  Two values are none a case file accepts: an open
    mains path is an inrush resistor of `parts.OPEN`, a dried reservoir has its resistance as `esr`.
    """
    result = apply_fault(circuit)
    board = result["board"]
    board["load"] = [
        load | ({"switched": False} if load["name"] in result["stuck"] else {})
        for load in board.get("load", [])
    ]
    result["removed"] = [part for part in result["removed"] if not _left_out(board, part)]
    leaks = [shunt for shunt in result["shunts"] if _is_leak(result, shunt)]
    result["shunts"] = [shunt for shunt in result["shunts"] if shunt not in leaks]
    for number, (rail, _, ohms) in enumerate(leaks, 1):
        leak = {"name": f"leak {number}", "kind": "resistor", "rail": rail, "switched": False}
        board["load"].append(leak | {"resistance": ohms})
    switched = {load["name"] for load in board["load"] if load.get("switched", False)}
    result["on"] = [name for name in result.get("on", []) if name in switched]
    del result["stuck"]
    return result


def _left_out(board: dict[str, Any], part: str) -> bool:
    """Take a part out of the board's tables; False where the tables have to keep it."""
    kind, _, name = part.partition(":")
    if kind == "load":
        board["load"] = [load for load in board["load"] if load["name"] != name]
    elif kind == "bleeder":
        board.pop("bleeder", None)
    elif kind == "shunt":
        del board["dropper"]["shunt_capacitance"]
        board["dropper"]["kind"] = "capacitor"
    elif kind == "reservoir":
        del by_name(board["rail"], name)["reservoir"]
    return kind in ("load", "bleeder", "shunt", "reservoir")


def _is_leak(circuit: Circuit, shunt: list[Any]) -> bool:
    """Whether a shunt lies from a rail to common and does not stand for a shorted zener."""
    rails = {rail["name"] for rail in circuit["board"]["rail"]}
    zeners = {part.removeprefix("zener:") for part in circuit["removed"]}
    return shunt[1] == COMMON and shunt[0] in rails and (shunt[0] not in zeners or shunt[2] > SHORTED_ZENER)
