"""The one door to the verdict: `assess(case)` gives everything the tool can say about a case as plain data.

Command line and screens call this and grow no copy of it.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from functools import lru_cache

import numpy as np

from benchtool.board import Board
from benchtool.case import Case
from benchtool.catalogue.cautions import cautions
from benchtool.diagnosis.checks import next_checks
from benchtool.diagnosis.crowd import BOARDS_KEPT
from benchtool.diagnosis.disagreement import disagreements
from benchtool.diagnosis.effective import effective_of
from benchtool.diagnosis.evidence import Because, evidence_of, fails_to_run
from benchtool.diagnosis.posterior import Posterior, posterior_of
from benchtool.diagnosis.safety import bleeder_read, power_allowed, safety_findings, zener_open_of
from benchtool.observed import Reading
from benchtool.physics.bench import Bench
from benchtool.physics.budget import agreed, budget_of, regulating
from benchtool.physics.laws import Array
from benchtool.physics.settled import Settled
from benchtool.physics.specimens import as_marked, population
from benchtool.physics.stress import mains_power
from benchtool.result import Assessment, RailState, State, Suspect

BAND_DRAWN = 512
"""Healthy boards behind the bands of the states table."""
BAND = (2.5, 97.5)


def assess(case: Case) -> Assessment:
    """The verdict on `case`. A valid case always gets one, whatever was read on it."""
    board, readings = case.board, case.readings
    standing = cautions(board, bleeder_read=bleeder_read(readings))
    posterior = posterior_of(board, case.meter, readings)
    safety = safety_findings(board, readings, zener_open_of(posterior))
    found, taken = disagreements(posterior), [reading.check for reading in readings]
    disagreeing = [reading.check for item in found for reading in (item.first, item.second)]
    return Assessment(
        case=case,
        cautions=standing,
        safety=safety,
        states=states_of(board, readings),
        budget=budget_of(board),
        effective=effective_of(board, case.meter, readings),
        suspects=_suspects(posterior, case),
        disagreements=found,
        next_checks=next_checks(posterior, taken, power_allowed=power_allowed(safety), disagreeing=disagreeing),
    )


def states_of(board: Board, readings: Sequence[Reading]) -> tuple[State, ...]:
    """The board as marked: all switched loads off, all on, then every state a reading was taken in, each once."""
    marked, healthy = _yardsticks(board, BAND_DRAWN)
    return tuple(_state(board, on, marked, healthy) for on in _states_wanted(board, readings))


@lru_cache(maxsize=BOARDS_KEPT)
def _yardsticks(board: Board, count: int) -> tuple[Bench, Bench]:
    """The board as marked, and healthy ones, kept for the next reading."""
    return Bench(as_marked(board)), Bench(population(board, count))


def _states_wanted(board: Board, readings: Sequence[Reading]) -> Iterator[tuple[str, ...]]:
    wanted = [(), board.switched_loads(), *(reading.on for reading in readings if reading.on is not None)]
    seen: set[frozenset[str]] = set()
    for on in wanted:
        if frozenset(on) not in seen:
            seen.add(frozenset(on))
            yield on


def _state(board: Board, on: tuple[str, ...], marked: Bench, healthy: Bench) -> State:
    settled, band = marked.settled(on), healthy.settled(on)
    power = mains_power(settled)
    known = bool(settled.converged.all())

    def figure(values: Array) -> float | None:
        return agreed(values) if known else None

    return State(
        on=on,
        supply_current=figure(settled.supply_current),
        line_current=figure(settled.line_current),
        inrush_voltage=figure(power.inrush_voltage),
        inrush_power=figure(power.inrush_power),
        dropper_voltage=figure(settled.dropper_voltage),
        dropper_dc=figure(settled.dropper_dc),
        apparent_power=figure(power.apparent),
        real_power=figure(power.real),
        power_factor=figure(power.factor),
        rails=tuple(_rail_state(board, index, settled, band) for index in range(len(board.rails))),
    )


def _rail_state(board: Board, index: int, settled: Settled, band: Settled) -> RailState:
    low, high = _band(band.rail_voltage[index], band)
    ripple_low, ripple_high = _band(band.ripple_pp[index], band)
    known = bool(settled.converged.all())
    regulates = regulating(settled, index)
    same = regulates is not None and bool(np.all(regulates == regulates[0]))
    has_zener = settled.specimens.shape.rails[index].has_zener
    return RailState(
        name=board.rails[index].name,
        voltage=agreed(settled.rail_voltage[index]) if known else None,
        voltage_low=low,
        voltage_high=high,
        ripple_pp=agreed(settled.ripple_pp[index]) if known else None,
        ripple_pp_low=ripple_low,
        ripple_pp_high=ripple_high,
        ripple_rms=agreed(settled.ripple_rms[index]) if known else None,
        regulating=bool(regulates[0]) if regulates is not None and same else None,
        zener_current=agreed(settled.zener_current[index]) if has_zener else None,
        zener_power=agreed(settled.zener_power[index]) if has_zener else None,
    )


def _band(values: Array, healthy: Settled) -> tuple[float | None, float | None]:
    """The 95 % band of healthy boards' `values`; None where none of them settles."""
    solved = values[healthy.converged]
    if not solved.size:
        return None, None
    low, high = np.percentile(solved, BAND)
    return float(low), float(high)


def _suspects(posterior: Posterior, case: Case) -> tuple[Suspect, ...]:
    """Every hypothesis and `unexplained`, the most probable first; evidence in the order it was taken."""
    order = {reading: number for number, reading in enumerate(case.readings)}

    def taken_as(row: Because) -> int:
        return order[row.reading]

    fails, evidence = fails_to_run(posterior), evidence_of(posterior)
    suspects = [
        Suspect(
            hypothesis=hypothesis,
            probability=float(posterior.probabilities[index]),
            explains_complaint=bool(hypothesis.faults) and bool(fails[index]),
            because=tuple(sorted(evidence[index], key=taken_as)),
        )
        for index, hypothesis in enumerate(posterior.hypotheses)
    ]
    suspects.append(Suspect(None, posterior.unexplained, explains_complaint=False))
    return tuple(sorted(suspects, key=lambda suspect: -suspect.probability))
