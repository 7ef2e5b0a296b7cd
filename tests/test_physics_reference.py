"""Both solvers' mean rails against the independent time-domain reference, circuit by circuit.

`circuits.json` was fixed before the solver was run on it; `expected.json` holds what the reference measured
(`python -m tests.reference.run` makes it anew).
"""

from __future__ import annotations

import json
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from benchtool.casefile import loads
from benchtool.physics import mean_value, waveform
from benchtool.physics.specimens import Junction, Specimens, as_marked
from tests.reference.circuits import to_case_text

HERE = Path(__file__).parent / "reference"
CIRCUITS: list[dict[str, Any]] = json.loads((HERE / "circuits.json").read_text(encoding="utf-8"))
EXPECTED: list[dict[str, Any]] = json.loads((HERE / "expected.json").read_text(encoding="utf-8"))

SMOOTH = 0.06
"""Ripple over mean up to which a rail counts as smooth, by the reference."""


@dataclass(frozen=True)
class Row:
    """One rail of one circuit: volts by the product and by the reference."""

    circuit: str
    rail: str
    found: float
    reference: float
    ripple: float
    reference_ripple: float

    @property
    def off(self) -> float:
        """By how much the product is off, as a share of what is allowed: 2 % or 0.2 V."""
        return abs(self.found - self.reference) / max(0.02 * abs(self.reference), 0.2)

    @property
    def smooth(self) -> bool:
        """Whether the reference calls this rail smooth."""
        return self.reference_ripple <= SMOOTH * abs(self.reference)


def specimen_of(circuit: dict[str, Any]) -> Specimens:
    """The circuit as the product's specimen, with the fault that four of the circuits carry put into its parts."""
    board = loads(to_case_text(circuit)).board
    specimens, fault = as_marked(board), circuit.get("fault")
    if fault is None:
        return specimens
    if fault["fault"] == "diode-short":
        return replace(specimens, junction=np.full(1, float(Junction.SERIES_SHORT)))
    changes = {
        "feed-high": lambda part: {"feed": fault["resistance"]},
        "zener-short": lambda part: {"zener_short": fault["resistance"]},
        "reservoir-dried": lambda part: {
            "reservoir": part("reservoir") * fault["factor"],
            "esr": part("esr") + fault["extra_esr"],
        },
    }
    index = board.rail_index(fault["rail"])
    arrays: dict[str, Any] = {}
    for name, value in changes[fault["fault"]](lambda name: getattr(specimens, name)[index]).items():
        arrays[name] = np.array(getattr(specimens, name))
        arrays[name][index] = value
    return replace(specimens, **arrays)


def rows(settle: Any) -> list[Row]:
    """Every rail of every circuit, by the solver `settle`."""
    found = []
    for circuit, expected in zip(CIRCUITS, EXPECTED, strict=True):
        assert expected["settled"], circuit["name"]
        settled = settle(specimen_of(circuit), tuple(circuit["on"]))
        assert settled.converged.all(), circuit["name"]
        for index, rail in enumerate(expected["rails"]):
            volts, ripple = float(settled.rail_voltage[index, 0]), float(settled.ripple_pp[index, 0])
            found.append(Row(circuit["name"], rail["name"], volts, rail["voltage_V"], ripple, rail["ripple_pp_V"]))
    return found


SOLVERS = pytest.mark.parametrize("solver", [mean_value, waveform], ids=["means", "settled cycle"])


@SOLVERS
def test_mean_rail_voltages_within_two_percent_or_a_fifth_of_a_volt(solver: Any) -> None:
    table = rows(solver.settle)
    missed = [row for row in table if row.smooth and row.off > 1.0]
    assert not missed
    assert len({row.circuit for row in table if row.smooth}) == len(CIRCUITS) == 40


@SOLVERS
def test_line_current_within_three_percent(solver: Any) -> None:
    for circuit, expected in zip(CIRCUITS, EXPECTED, strict=True):
        settled = solver.settle(specimen_of(circuit), tuple(circuit["on"]))
        assert float(settled.line_current[0]) == pytest.approx(expected["line_current_A"], rel=0.03), circuit["name"]


if __name__ == "__main__":
    print(f"{'circuit':<34}{'rail':<14}{'V means':>9}{'off':>6}{'V cycle':>9}{'off':>6}{'V ref':>9}{'ripple':>9}{'ref':>9}")
    for mean, cycle in zip(rows(mean_value.settle), rows(waveform.settle), strict=True):
        print(
            f"{mean.circuit:<34}{mean.rail:<14}{mean.found:9.3f}{mean.off:6.2f}{cycle.found:9.3f}{cycle.off:6.2f}"
            f"{mean.reference:9.3f}{cycle.ripple:9.3f}{mean.reference_ripple:9.3f}{'' if mean.smooth else '  not smooth'}"
        )
