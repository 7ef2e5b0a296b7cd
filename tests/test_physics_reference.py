"""Both solvers' mean rails against the independent time-domain reference, circuit by circuit.

`circuits.json` was fixed before the solver was run on it; `expected.json` holds what the reference measured
(`python -m tests.reference.run` makes it anew).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cache

import numpy as np
import pytest

from benchtool.physics import mean_value, waveform
from benchtool.physics.laws import Array
from benchtool.physics.specimens import Specimens
from tests.compared import Circuit, specimen_of, stored

CIRCUITS: list[Circuit] = stored("circuits.json")
EXPECTED: list[Circuit] = stored("expected.json")
SMOOTH = 0.06
"""Ripple over mean up to which a rail counts as smooth, by the reference."""


@dataclass(frozen=True)
class Solved:
    """One circuit by one of the solvers: rails (rails,) [V], their ripple where it is told, line current [A]."""

    rails: Array
    ripple: Array
    line_current: float


Solver = Callable[[Specimens, tuple[str, ...]], Solved]


def by_means(specimens: Specimens, on: tuple[str, ...]) -> Solved:
    found = mean_value.means(specimens, on)
    assert found.solved.all()
    return Solved(found.rails[:, 0], np.full(len(found.rails), np.nan), float(found.line_current[0]))


def by_cycle(specimens: Specimens, on: tuple[str, ...]) -> Solved:
    settled = waveform.settle(specimens, on)
    assert settled.converged.all()
    return Solved(settled.rail_voltage[:, 0], settled.ripple_pp[:, 0], float(settled.line_current[0]))


@cache
def solved(solver: Solver) -> list[Solved]:
    """Every circuit, by a solver."""
    return [solver(*specimen_of(circuit)) for circuit in CIRCUITS]


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


def rows(solver: Solver) -> list[Row]:
    """Every rail of every circuit, by a solver."""
    found = []
    for circuit, expected, each in zip(CIRCUITS, EXPECTED, solved(solver), strict=True):
        assert expected["settled"], circuit["name"]
        for index, rail in enumerate(expected["rails"]):
            volts, ripple = float(each.rails[index]), float(each.ripple[index])
            found.append(Row(circuit["name"], rail["name"], volts, rail["voltage_V"], ripple, rail["ripple_pp_V"]))
    return found


SOLVERS = pytest.mark.parametrize("solver", [by_means, by_cycle], ids=["means", "settled cycle"])


@SOLVERS
def test_mean_rail_voltages_within_two_percent_or_a_fifth_of_a_volt(solver: Solver) -> None:
    table = rows(solver)
    missed = [row for row in table if row.smooth and row.off > 1.0]
    assert not missed
    assert len({row.circuit for row in table if row.smooth}) == len(CIRCUITS) == 40


@SOLVERS
def test_line_current_within_three_percent(solver: Solver) -> None:
    for circuit, expected, each in zip(CIRCUITS, EXPECTED, solved(solver), strict=True):
        assert each.line_current == pytest.approx(expected["line_current_A"], rel=0.03), circuit["name"]


if __name__ == "__main__":
    print(f"{'circuit':<34}{'rail':<14}{'V means':>9}{'off':>6}{'V cycle':>9}{'off':>6}{'V ref':>9}{'ripple':>9}{'ref':>9}")
    for mean, cycle in zip(rows(by_means), rows(by_cycle), strict=True):
        print(
            f"{mean.circuit:<34}{mean.rail:<14}{mean.found:9.3f}{mean.off:6.2f}{cycle.found:9.3f}{cycle.off:6.2f}"
            f"{mean.reference:9.3f}{cycle.ripple:9.3f}{mean.reference_ripple:9.3f}{'' if mean.smooth else '  not smooth'}"
        )
