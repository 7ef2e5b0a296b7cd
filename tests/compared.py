"""Circuits of the reference as specimens of the product, and the product's figures beside the reference's.

The circuits' part values come from the reference, faults folded in (`faulty_values`); what is no value of a part, an open or a
shorted junction, an open path, is put into the specimen here. `python -m tests.compared` prints the table, and with `crowd` that
of the crowd's coarser steps.
"""

from __future__ import annotations

import json
import sys
from collections.abc import Iterator
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np

from benchtool.casefile import loads
from benchtool.physics.settled import Settled
from benchtool.physics.specimens import Junction, Specimens, as_marked
from benchtool.physics.waveform import CROWD, FIGURES, Effort, settle
from tests.reference.circuits import to_case_text
from tests.reference.faults import faulty_values

HERE = Path(__file__).parent / "reference"
Circuit = dict[str, Any]

ALLOWED = {
    "rail mean": (0.01, 0.1),
    "ripple pp": (0.05, 0.02),
    "ripple rms": (0.05, 0.02),
    "zener power": (0.05, 0.010),
    "line current": (0.01, 5e-5),
    "supply current": (0.01, 5e-5),
    "dropper AC": (0.01, 0.3),
    "dropper DC": (0.02, 0.5),
    "real power": (0.02, 0.010),
}
"""Share and floor of each figure [V, W, A] within which the two must agree. The floors of currents are the default meter's."""


@dataclass(frozen=True)
class Row:
    """One figure of one circuit, by the product and by the reference."""

    circuit: str
    shape: str
    fault: str
    figure: str
    found: float
    reference: float

    @property
    def off(self) -> float:
        """By how much it is off, as a share of what is allowed; not solved counts as beyond everything."""
        share, floor = ALLOWED[self.figure]
        off = abs(self.found - self.reference) / max(share * abs(self.reference), floor)
        return off if np.isfinite(off) else 1e9


def stored(name: str) -> Any:
    """A JSON file of the reference."""
    return json.loads((HERE / name).read_text(encoding="utf-8"))


def specimen_of(circuit: Circuit) -> tuple[Specimens, tuple[str, ...]]:
    """The circuit as a specimen of the product, and the loads that are on."""
    values = faulty_values(circuit)
    board = values["board"]
    paths_open = board.get("inrush", {}).get("resistance", 0.0) > 1e8
    if paths_open:
        board["inrush"]["resistance"] = 100.0
    read = loads(to_case_text(values)).board
    specimens = as_marked(read)
    if paths_open:
        specimens = replace(specimens, inrush=np.full(1, np.inf))
    for rail in board["rail"]:
        if "esr" in rail.get("reservoir", {}):
            specimens = _set(specimens, "esr", read.rail_index(rail["name"]), rail["reservoir"]["esr"])
    for part in values["removed"]:
        specimens = _removed(specimens, part, read.rail_index)
    for start, end, ohms in values["shunts"]:
        specimens = _shunted(specimens, start, end, ohms, read.rail_index)
    return specimens, tuple(values["on"])


def _set(specimens: Specimens, name: str, index: int, value: float) -> Specimens:
    array = np.array(getattr(specimens, name))
    array[index] = value
    changed: dict[str, Any] = {name: array}
    return replace(specimens, **changed)


def _removed(specimens: Specimens, part: str, index: Any) -> Specimens:
    kind, _, rail = part.partition(":")
    if kind == "zener":
        return _set(specimens, "zener", index(rail), np.inf)
    if kind == "feed":
        return _set(specimens, "feed", index(rail), np.inf)
    state = Junction.RETURN_OPEN if part == "return" else Junction.SERIES_OPEN
    return replace(specimens, junction=np.full(1, float(state)))


def _shunted(specimens: Specimens, start: str, end: str, ohms: float, index: Any) -> Specimens:
    bridge = specimens.shape.rectifier == "bridge"
    if "dropped" in (start, end) or "return" in (start, end):
        if end == "common" and start == "dropped" and specimens.shape.zener_at_node:
            return _set(specimens, "zener_short", 0, ohms)
        if (start, end) in (("dropped", "return"), ("dropped", "common")):
            return replace(specimens, shunt_short=np.full(1, ohms))
        series = bridge or start == "dropped"
        return replace(specimens, junction=np.full(1, float(Junction.SERIES_SHORT if series else Junction.RETURN_SHORT)))
    return _set(specimens, "zener_short", index(start), ohms)


def rows(circuits: list[Circuit], expected: list[dict[str, Any]], effort: Effort = FIGURES) -> list[Row]:
    """Every figure of every circuit."""
    return [row for circuit, there in zip(circuits, expected, strict=True) for row in _rows(circuit, there, effort)]


def _rows(circuit: Circuit, there: dict[str, Any], effort: Effort) -> Iterator[Row]:
    assert there["settled"], circuit["name"]
    specimens, on = specimen_of(circuit)
    settled = settle(specimens, on, effort=effort)
    board = circuit["board"]
    shape = f"{board['rectifier']}, {board['dropper']['kind']}"
    fault = (circuit.get("fault") or {"fault": "no-fault"})["fault"]
    removed = faulty_values(circuit)["removed"]
    for figure, found, reference in _figures(settled, there, removed):
        solved = found if settled.converged[0] else float("nan")
        yield Row(circuit["name"], shape, fault, figure, solved, reference)


def _figures(settled: Settled, there: dict[str, Any], removed: list[str]) -> Iterator[tuple[str, float, float]]:
    for index, rail in enumerate(there["rails"]):
        yield "rail mean", float(settled.rail_voltage[index, 0]), rail["voltage_V"]
        yield "ripple pp", float(settled.ripple_pp[index, 0]), rail["ripple_pp_V"]
        yield "ripple rms", float(settled.ripple_rms[index, 0]), rail["ripple_rms_V"]
        # The reference nets a shorted zener as a plain resistor and so reports no power of a zener there.
        if rail["zener_power_W"] is not None and f"zener:{rail['name']}" not in removed:
            yield "zener power", float(settled.zener_power[index, 0]), rail["zener_power_W"]
    yield "line current", float(settled.line_current[0]), there["line_current_A"]
    yield "supply current", float(settled.supply_current[0]), there["supply_current_A"]
    yield "dropper AC", float(settled.dropper_voltage[0]), there["dropper_voltage_V"]
    yield "dropper DC", float(settled.dropper_dc[0]), abs(there["dropper_dc_V"])
    yield "real power", float(settled.real_power[0]), there["real_power_W"]


def table(found: list[Row], by: str) -> Iterator[str]:
    """Lines: for each value of `by` and each figure, rows, share within what is allowed, worst as a share of it."""
    yield f"{by:<42}{'figure':<16}{'rows':>5}{'within':>9}{'worst':>8}  at"
    for key in sorted({getattr(row, by) for row in found}):
        for figure in ALLOWED if by != "figure" else (key,):
            mine = [row for row in found if getattr(row, by) == key and row.figure == figure]
            if mine:
                worst = max(mine, key=lambda row: row.off)
                within = sum(row.off <= 1.0 for row in mine) / len(mine)
                yield f"{key:<42}{figure:<16}{len(mine):>5}{within:>9.1%}{worst.off:>8.2f}  {worst.circuit[:60]}"


if __name__ == "__main__":
    wanted = CROWD if sys.argv[1:] == ["crowd"] else FIGURES
    compared = rows(stored("circuits.json"), stored("expected.json"), wanted)
    compared += rows(stored("wide_circuits.json"), stored("wide_expected.json"), wanted)
    print("\n".join([*table(compared, "figure"), "", *table(compared, "shape"), "", *table(compared, "fault")]))
