"""Remakes wide_expected.json: what the reference finds for every circuit of wide_circuits.json.

Beside the figures of a steady cycle each has what a bench supply shows on every rail with a nominal
voltage, at 20 mA and at 5 mA, up to 1.2 times that voltage. Every eighth circuit is run again with a
quarter of the tolerance; `error` is the greatest relative change of a figure.
"""

from __future__ import annotations

import json
import sys
import time
from pathlib import Path
from typing import Any

from tests.reference.bench_supply import inject
from tests.reference.circuit import Circuit, nominal_voltage
from tests.reference.run import change
from tests.reference.simulate import TOLERANCE, Figures, simulate
from tests.reference.wide_circuits import WIDE

WIDE_EXPECTED = Path(__file__).with_name("wide_expected.json")
CLAMPS = (20e-3, 5e-3)  # A
LIMIT = 1.2  # of the nominal voltage
AGAIN = 8  # every so many circuits are run with a finer tolerance


def injections(circuit: Circuit) -> list[dict[str, Any]]:
    """Return what the bench supply shows on each rail [V], with its current limit [A] and voltage limit [V]."""
    found = []
    for rail in circuit["board"]["rail"]:
        limit = LIMIT * nominal_voltage(circuit, rail["name"])
        for clamp in CLAMPS:
            volts = inject(circuit, rail["name"], clamp, limit)
            found.append({"rail": rail["name"], "clamp_A": clamp, "limit_V": limit, "voltage_V": volts})
    return found


def figures_of(number: int, circuit: Circuit) -> Figures:
    """Return a circuit's figures, for every eighth with an `error` estimate."""
    figures = simulate(circuit)
    error = change(figures, simulate(circuit, TOLERANCE / 4.0)) if number % AGAIN == 0 else None
    return {"name": circuit["name"], **figures, "error": error, "injection": injections(circuit)}


def main() -> None:
    """Run all circuits and write wide_expected.json."""
    results = []
    for number, circuit in enumerate(json.loads(WIDE.read_text(encoding="utf-8"))):
        begun = time.perf_counter()
        results.append(figures_of(number, circuit))
        figures, seconds = results[-1], time.perf_counter() - begun
        rails = ", ".join(f"{rail['voltage_V']:.3f}" for rail in figures["rails"])
        sys.stdout.write(
            f"{circuit['name']}: {rails} V; settled {figures['settled']}, {figures['cycles']} cycles, missing "
            f"{figures['remaining']:.0e}, balance {figures['balance'] - 1.0:.0e}, {seconds:.1f} s\n"
        )
        sys.stdout.flush()
    WIDE_EXPECTED.write_text(json.dumps(results, indent=1) + "\n", encoding="utf-8")


if __name__ == "__main__":
    main()
