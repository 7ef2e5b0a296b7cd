"""How good the diagnosis is: boards with known faults, made and measured by the independent reference, diagnosed check by check.

`python -m tests.bench_diagnosis` prints all tables (minutes). The boards are those of `reference/bench_boards.json`, whose parts
are spread wider than the product assumes. Each starts from the mains and the first rail's readings, makes the check that is
proposed first until the first suspect has 90 % after at least one check, or 12 checks are made, or none is left that would
tell anything. What is not decided by then counts as wrong.
"""

from __future__ import annotations

import json
import shlex
import sys
import time
from collections import Counter, defaultdict
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace
from functools import cache
from itertools import pairwise
from pathlib import Path
from typing import Any

import numpy as np

from benchtool import assess
from benchtool.case import Case
from benchtool.casefile import loads, parse_reading
from benchtool.diagnosis.checks import next_checks
from benchtool.diagnosis.crowd import crowd_of
from benchtool.diagnosis.posterior import Posterior, posterior_of
from benchtool.diagnosis.safety import power_allowed, safety_findings, zener_open_of
from benchtool.observed import Check, Reading
from tests.bench_physics import CIRCUIT, LOOSEST, seconds
from tests.reference.simulate import simulate

STORED: dict[str, Any] = json.loads((Path(__file__).parent / "reference" / "bench_boards.json").read_text(encoding="utf-8"))
DECIDED, MOST_CHECKS = 0.9, 12
LATENT = ("bleeder-open", "bleeder-low")
"""Faults that cause no complaint: the supply does what it should, and the safety findings say the rest."""
BINS = (0.0, 0.2, 0.4, 0.6, 0.8, 0.9, 0.97, 1.0)
TEXTBOOK = (
    "fuse-resistance", "dropper-capacitance", "inrush-resistance", "path-resistance", "rectifier-test", "zener-test",
    "reservoir-capacitance", "reservoir-esr", "load-current", "coil-resistance", "switch-test", "reservoir-leakage",
    "bleeder-resistance",
)  # fmt: skip
"""The order of checks that books give; common practice, no source."""

Name = tuple[str, str | None]
"""A fault and where it sits."""


@dataclass(frozen=True)
class Bench:
    """One board of the reference: what is wrong with it, and what every check would show."""

    number: int
    draw: str
    case: Case
    truth: tuple[Name, ...]
    readings: dict[Check, Reading]

    @property
    def first(self) -> list[Reading]:
        """The mains and the first rail, its loads off and on."""
        rail, on = self.case.board.rails[0].name, self.case.board.switched_loads()
        wanted = [Check(what="mains-voltage"), Check(what="rail-voltage", rail=rail, on=())]
        wanted.append(Check(what="rail-voltage", rail=rail, on=on))
        return [self.readings[_key(check)] for check in dict.fromkeys(wanted) if _key(check) in self.readings]


@dataclass(frozen=True)
class Verdict:
    """The first suspect at some point: its faults, probability, and whether it is right."""

    board: Bench
    faults: tuple[Name, ...]
    probability: float
    right: bool
    checks: int
    decided: bool


def _key(check: Check) -> Check:
    return replace(check, on=None if check.on is None else tuple(sorted(check.on)), clamp=None, limit=None)


@cache
def boards() -> tuple[Bench, ...]:
    """Every board of the reference."""
    return tuple(_board(row) for row in STORED["boards"])


def _board(row: dict[str, Any]) -> Bench:
    case = loads(STORED["designs"][row["design"]])
    readings = [parse_reading(_typed(reading), case.board) for reading in row["readings"]]
    return Bench(row["number"], row["draw"], case, _truth(row["fault"]), {_key(each.check): each for each in readings})


def _typed(row: list[Any]) -> str:
    what, rail, load, on, lifted, value = row
    parts = [what]
    parts += [f"rail {shlex.quote(rail)}" if what == "look" else shlex.quote(rail)] if rail else []
    parts += [f"load {shlex.quote(load)}" if what == "look" else shlex.quote(load)] if load else []
    parts += ["on " + " ".join(shlex.quote(name) for name in on)] if on else []
    parts += ["lifted"] if lifted else []
    return " ".join([*parts, ", ".join(value) if isinstance(value, list) else value])


def _truth(fault: dict[str, Any]) -> tuple[Name, ...]:
    if fault["fault"] in (*LATENT, "no-fault"):
        return ()
    if "of" in fault:
        return tuple(_name(part) for part in fault["of"])
    second = fault.get("with")
    return (_name(fault), *((_name(second),) if second else ()))


def _name(fault: dict[str, Any]) -> Name:
    return fault["fault"], fault.get("rail") or fault.get("load")


def first_suspects(found: Posterior, count: int = 3) -> list[tuple[tuple[Name, ...], float]]:
    """The most probable hypotheses, as faults and places; `unexplained` by its name."""
    named: list[tuple[tuple[Name, ...], float]] = [((("unexplained", None),), found.unexplained)]
    for hypothesis, probability in zip(found.hypotheses, found.probabilities, strict=True):
        faults = tuple((each.fault.name, each.place.name or None) for each in hypothesis.faults)
        named.append((faults, float(probability)))
    return sorted(named, key=lambda item: -item[1])[:count]


def is_right(faults: tuple[Name, ...], truth: tuple[Name, ...]) -> bool:
    """Whether the suspect is what is wrong: of two faults too where the suspect is the first of them alone, or `unexplained`."""
    return set(faults) == set(truth) or (len(truth) == 2 and faults in (truth[:1], (("unexplained", None),)))


Order = Callable[[Bench, Posterior, Sequence[Reading]], Iterator[Check]]


def proposed(board: Bench, found: Posterior, taken: Sequence[Reading]) -> Iterator[Check]:
    """The checks that the product proposes."""
    safety = safety_findings(board.case.board, taken, zener_open_of(found))
    items = next_checks(found, [reading.check for reading in taken], power_allowed=power_allowed(safety))
    return (item.check for item in items)


def textbook(board: Bench, found: Posterior, taken: Sequence[Reading]) -> Iterator[Check]:
    """The checks in the order of the books, each place once, the dropper with a leg lifted."""
    done = {_key(reading.check) for reading in taken}
    for what in TEXTBOOK:
        for check in board.readings:
            lifted = what != "dropper-capacitance" or check.lifted
            if check.what == what and lifted and check not in done:
                yield check


def diagnosed(board: Bench, order: Order) -> Iterator[Verdict]:
    """The verdicts on a board, check after check, until it is decided or there is nothing left to do."""
    taken = list(board.first)
    for checks in range(MOST_CHECKS + 1):
        found = posterior_of(board.case.board, board.case.meter, taken)
        faults, probability = first_suspects(found)[0]
        decided = checks > 0 and probability >= DECIDED
        yield Verdict(board, faults, probability, is_right(faults, board.truth), checks, decided)
        if decided:
            return
        following = next((check for check in order(board, found, taken) if _key(check) in board.readings), None)
        if following is None:
            yield Verdict(board, faults, probability, is_right(faults, board.truth), checks, probability >= DECIDED)
            return
        taken.append(board.readings[_key(following)])


def table_of(verdicts: Sequence[Verdict]) -> Iterator[str]:
    """Share right and recall per fault at the end, wrong verdicts above 90 %."""
    right = sum(verdict.right and verdict.decided for verdict in verdicts)
    undecided = sum(not verdict.decided for verdict in verdicts)
    surely_wrong = sum(verdict.decided and not verdict.right for verdict in verdicts)
    checks = np.mean([verdict.checks for verdict in verdicts])
    yield (
        f"right {right}/{len(verdicts)} = {right / len(verdicts):.1%}, undecided {undecided}, wrong above 90 % {surely_wrong}, "
        f"checks a board {checks:.2f}"
    )
    by_fault: dict[str, list[Verdict]] = defaultdict(list)
    for verdict in verdicts:
        by_fault[" + ".join(name for name, _ in verdict.board.truth) or "no-fault"].append(verdict)
    for fault, mine in sorted(by_fault.items()):
        missed = Counter(
            " + ".join(f"{name}@{place}" if place else name for name, place in v.faults) + f" {v.probability:.2f}"
            for v in mine
            if not (v.right and v.decided)
        )
        yield f"  {fault:<44}{sum(v.right and v.decided for v in mine):>3}/{len(mine):<3} {'; '.join(missed)[:110]}"


def calibration(verdicts: Sequence[Verdict]) -> Iterator[str]:
    """How often a first suspect of a probability is right; the error is the mean distance, weighted by numbers."""
    error, total = 0.0, 0
    for low, high in pairwise(BINS):
        mine = [v for v in verdicts if low <= v.probability < high or (high == 1.0 and v.probability >= 1.0)]
        if mine:
            said, was = float(np.mean([v.probability for v in mine])), float(np.mean([v.right for v in mine]))
            error, total = error + abs(said - was) * len(mine), total + len(mine)
            yield f"  {low:.0%} to {high:.0%}: {len(mine):>4} verdicts, said {said:.1%}, were right {was:.1%}"
    yield f"  calibration error {error / max(total, 1):.3f}"


def all_read(chosen: Sequence[Bench]) -> tuple[float, float]:
    """Shares of the boards whose fault is first, and among the first three, with every reading given."""
    top = [first_suspects(posterior_of(b.case.board, b.case.meter, list(b.readings.values()))) for b in chosen]
    firsts = [is_right(found[0][0], board.truth) for board, found in zip(chosen, top, strict=True)]
    threes = [any(is_right(faults, board.truth) for faults, _ in found) for board, found in zip(chosen, top, strict=True)]
    return float(np.mean(firsts)), float(np.mean(threes))


def report(draw: str, limit: int | None = None, *, books: bool = True) -> None:
    """Prints the tables for one draw of boards."""
    chosen = [board for board in boards() if board.draw == draw][:limit]
    begun = time.perf_counter()
    for board in {board.case.board: None for board in chosen}:
        for _ in crowd_of(board).prepare():
            pass
    print(f"\n== {draw}: {len(chosen)} boards, prepared in {time.perf_counter() - begun:.0f} s")
    followed = [list(diagnosed(board, proposed)) for board in chosen]
    print("\n".join(table_of([steps[-1] for steps in followed])))
    every = [verdict for steps in followed for verdict in steps]
    print("every verdict on the way")
    print("\n".join(calibration(every)))
    print("first suspects between 20 and 90 % alone")
    print("\n".join(calibration([v for v in every if 0.2 <= v.probability < 0.9])))
    top, three = all_read(chosen)
    print(f"with every reading given: first {top:.1%}, among the first three {three:.1%}")
    if books:
        by_book = [list(diagnosed(board, textbook))[-1] for board in chosen]
        ours, theirs = (np.mean([v.checks for v in found]) for found in ([steps[-1] for steps in followed], by_book))
        print(f"by the books' order: {next(table_of(by_book))}")
        print(f"checks a board: {ours:.2f} against {theirs:.2f}, {ours / theirs:.2f} times")
    print(f"in {time.perf_counter() - begun:.0f} s")


def test_a_warm_assessment_costs_less_than_one_circuit_by_the_integrator() -> None:
    board = boards()[0]
    case = replace(board.case, readings=tuple(board.first))
    assess(case)
    one = min(seconds(lambda: simulate(CIRCUIT, LOOSEST)) for _ in range(2))
    again, more = seconds(lambda: assess(case)), replace(case, readings=(*case.readings, _static(board)))
    another = seconds(lambda: assess(more))
    weighed = seconds(lambda: posterior_of(case.board, case.meter, more.readings))
    print(f"\none circuit {one * 1e3:.0f} ms; assessed again {again * 1e3:.0f} ms, with another reading {another * 1e3:.0f} ms")
    print(f"weighed anew {weighed * 1e3:.1f} ms")
    assert another < one


def _static(board: Bench) -> Reading:
    """A reading that asks for no state of its own."""
    return next(reading for reading in board.readings.values() if reading.what == "inrush-resistance")


def test_most_of_a_few_boards_are_diagnosed_in_few_checks() -> None:
    # Every twentieth board drawn by the priors; all of them are told by `python -m tests.bench_diagnosis`.
    chosen = [board for board in boards() if board.draw == "priors"][::20]
    ends = [list(diagnosed(board, proposed))[-1] for board in chosen]
    assert sum(verdict.right and verdict.decided for verdict in ends) >= len(ends) - 1
    assert np.mean([verdict.checks for verdict in ends]) < MOST_CHECKS / 3


if __name__ == "__main__":
    most = int(sys.argv[1]) if len(sys.argv) > 1 else None
    for drawn in ("even", "priors"):
        report(drawn, most, books=most is None)
