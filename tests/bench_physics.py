"""What the solvers cost: specimens a second, against one circuit by the general-purpose integrator, and how time and memory grow.

Run by itself it prints all, up to a million specimens; as a test it asserts ratios within this one run only.
"""

from __future__ import annotations

import time
import tracemalloc
from collections.abc import Callable, Iterable

from benchtool.casefile import loads
from benchtool.physics import mean_value, waveform
from benchtool.physics.specimens import Specimens, population
from tests.compared import Circuit, stored
from tests.reference.circuits import to_case_text
from tests.reference.simulate import simulate

CIRCUIT: Circuit = stored("circuits.json")[0]
ON = tuple(CIRCUIT["on"])
BOARD = loads(to_case_text(CIRCUIT)).board
LOOSEST = 1e-3
"""Loosest tolerance of use to the integrator: ten times as loose its search for the steady state takes minutes."""
AT_LEAST = 2000
"""Specimens for the price of one circuit, with room for a slow machine: as figures some seventeen thousand were measured."""
COUNTED = 8192

Solver = Callable[[Specimens], object]
SOLVERS: dict[str, Solver] = {
    "FIGURES": lambda specimens: waveform.settle(specimens, ON, effort=waveform.FIGURES),
    "CROWD": lambda specimens: waveform.settle(specimens, ON, effort=waveform.CROWD),
    "means": lambda specimens: mean_value.means(specimens, ON),
}


def seconds(work: Callable[[], object]) -> float:
    """Seconds that `work` takes."""
    begun = time.perf_counter()
    work()
    return time.perf_counter() - begun


def seconds_each(solver: Solver, count: int) -> float:
    """Seconds a specimen, for `count` specimens of the circuit's board."""
    specimens = population(BOARD, count)
    return seconds(lambda: solver(specimens)) / count


def bytes_each(solver: Solver, count: int) -> float:
    """Bytes a specimen at the peak while `count` of them are solved, beside the specimens themselves."""
    specimens = population(BOARD, count)
    tracemalloc.start()
    solver(specimens)
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    return peak / count


def growth(counts: Iterable[int]) -> list[float]:
    """Seconds a specimen of a crowd, by their number; printed."""
    each = []
    for count in counts:
        each.append(seconds_each(SOLVERS["CROWD"], count))
        print(f"{count:>9} specimens of a crowd: {each[-1] * 1e6:7.1f} us each, {each[-1] * count:8.3f} s in all")
    return each


def test_many_specimens_for_the_price_of_one_circuit() -> None:
    for solver in SOLVERS.values():
        seconds_each(solver, 64)
    one = min(seconds(lambda: simulate(CIRCUIT, LOOSEST)) for _ in range(2))
    each = {name: seconds_each(solver, COUNTED) for name, solver in SOLVERS.items()}
    print(f"\none circuit by the integrator {one * 1e3:.0f} ms")
    for name, cost in each.items():
        print(f"{name:<8}{cost * 1e6:7.1f} us a specimen, {1.0 / cost:8.0f} a second, {one / cost:7.0f} for the price of one")
    assert one / each["FIGURES"] > AT_LEAST
    # What each was made for: a crowd is cheaper than figures, means are cheaper than any cycle.
    assert each["means"] < each["CROWD"] < each["FIGURES"]


def test_time_grows_no_faster_than_the_number() -> None:
    print()
    each = growth((100, 1000, 10_000, 100_000))
    assert each[-1] < 1.5 * min(each)


def test_memory_grows_no_faster_than_the_number() -> None:
    few, many = (bytes_each(SOLVERS["CROWD"], count) for count in (10_000, 100_000))
    print(f"\nat the peak {few:.0f} bytes a specimen for 10 000, {many:.0f} for 100 000")
    assert many < 1.1 * few


if __name__ == "__main__":
    test_many_specimens_for_the_price_of_one_circuit()
    print()
    growth((100, 1000, 10_000, 100_000, 1_000_000))
    test_memory_grows_no_faster_than_the_number()
