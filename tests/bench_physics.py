"""What the solvers cost: specimens a second, against one circuit by the general-purpose integrator, and how the time grows.

Run by itself it prints all; as a test it asserts ratios within this one run only.
"""

from __future__ import annotations

import json
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

from benchtool.casefile import loads
from benchtool.physics import mean_value, waveform
from benchtool.physics.specimens import population
from tests.reference.circuits import to_case_text
from tests.reference.simulate import simulate

CIRCUIT: dict[str, Any] = json.loads((Path(__file__).parent / "reference" / "circuits.json").read_text(encoding="utf-8"))[0]
LOOSEST = 1e-3
"""Loosest tolerance of use to the integrator: ten times as loose its search for the steady state takes minutes."""
AT_LEAST = 2000
"""Specimens for the price of one circuit, with room for a slow machine: some ten thousand were measured."""


def seconds(work: Callable[[], object]) -> float:
    """Seconds that `work` takes."""
    begun = time.perf_counter()
    work()
    return time.perf_counter() - begun


def settle_seconds(solver: Any, count: int) -> float:
    """Seconds for `count` specimens of the circuit's board by a solver's `settle`."""
    specimens, on = population(loads(to_case_text(CIRCUIT)).board, count), tuple(CIRCUIT["on"])
    return seconds(lambda: solver.settle(specimens, on))


def test_many_specimens_for_the_price_of_one_circuit() -> None:
    settle_seconds(waveform, 64)
    one = min(seconds(lambda: simulate(CIRCUIT, LOOSEST)) for _ in range(2))
    cycle, means = settle_seconds(waveform, 16384) / 16384, settle_seconds(mean_value, 16384) / 16384
    print(f"\none circuit by the integrator {one * 1e3:.0f} ms")
    print(f"a specimen by its cycle {cycle * 1e6:.1f} us, by its means {means * 1e6:.1f} us")
    print(f"for the price of one: {one / cycle:.0f} by their cycle, {one / means:.0f} by their means")
    assert one / cycle > AT_LEAST


def test_time_grows_no_faster_than_the_number() -> None:
    counts = (100, 1000, 10_000, 100_000)
    each = [settle_seconds(waveform, count) / count for count in counts]
    print("\n" + "  ".join(f"{count}: {one * 1e6:.1f} us" for count, one in zip(counts, each, strict=True)))
    assert each[-1] < 1.5 * min(each)
