"""Remakes expected.json: what the reference finds for every circuit of circuits.json.

It is kept as a file, with this generator beside it, so that the product's tests need not wait for the
integrator. Every eighth circuit is run again with a quarter of the tolerance; `error` is the greatest
relative change of a figure.
"""

from __future__ import annotations

import json
import sys
import time
from pathlib import Path
from typing import Any

from tests.reference.circuits import CIRCUITS
from tests.reference.simulate import TOLERANCE, Figures, simulate

EXPECTED = Path(__file__).with_name("expected.json")
SMALL = 1e-3  # V, A, W: changes of figures below this are taken relative to it


def flat(figures: Figures) -> dict[str, float]:
    """Return all figures by name, those of the rails with the rail's name before."""
    values = {key: value for key, value in figures.items() if key.endswith(("_A", "_V", "_W", "_VA"))}
    for rail in figures["rails"]:
        named = {f"{rail['name']} {key}": value for key, value in rail.items()}
        values |= {key: value for key, value in named.items() if key.endswith(("_A", "_V", "_W"))}
    return values


def change(first: Figures, second: Figures) -> float:
    """Return the greatest relative change of a figure between two runs."""
    one, two = flat(first), flat(second)
    return max(abs(two[key] - one[key]) / max(abs(one[key]), SMALL) for key in one)


def figures_of(number: int, circuit: dict[str, Any]) -> Figures:
    """Return a circuit's figures, for every eighth with an `error` estimate."""
    figures = simulate(circuit)
    error = change(figures, simulate(circuit, TOLERANCE / 4.0)) if number % 8 == 0 else None
    return {"name": circuit["name"], **figures, "error": error}


def main() -> None:
    """Run all circuits and write expected.json."""
    results = []
    for number, circuit in enumerate(json.loads(CIRCUITS.read_text(encoding="utf-8"))):
        begun = time.perf_counter()
        results.append(figures_of(number, circuit))
        seconds = time.perf_counter() - begun
        rails = ", ".join(f"{rail['voltage_V']:.3f} V" for rail in results[-1]["rails"])
        sys.stdout.write(f"{circuit['name']}: {rails}; settled {results[-1]['settled']}, {seconds:.1f} s\n")
    EXPECTED.write_text(json.dumps(results, indent=1) + "\n", encoding="utf-8")


if __name__ == "__main__":
    main()
