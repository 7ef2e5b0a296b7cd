"""What endangers the user and causes no complaint: bleeder, discharge, string voltage, class of the dropper.

These findings have probabilities of their own, do not compete with the suspects, and are said first.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from benchtool.board import Board, Unknown
from benchtool.catalogue.faults import LATENT_BLEEDER
from benchtool.observed import Reading
from benchtool.physics import constants as known
from benchtool.physics import laws
from benchtool.physics.stress import Discharge, bleeder_share, discharge_of, highest_crest

RAISED = 1.5
"""A bleeder over this many times its mark counts as raised."""
SAID_FROM = 0.05
"""Probability from which a bleeder fault is said; below it the standing caution is enough."""


@dataclass(frozen=True, slots=True)
class Finding:
    """One safety finding: fault or rule, its probability, and the figures of its sentence [SI]."""

    fault: str
    probability: float
    figures: dict[str, float]


def safety_findings(board: Board, readings: Sequence[Reading]) -> tuple[Finding, ...]:
    """Every finding on `board`, the worst first."""
    discharge = discharge_of(board)
    found = [*_bleeder(board, discharge, readings), *_discharge(board, discharge), *_string(board), *_class(board)]
    return tuple(sorted(found, key=lambda finding: -finding.probability))


def _bleeder(board: Board, discharge: Discharge, readings: Sequence[Reading]) -> list[Finding]:
    read = [reading.value for reading in readings if reading.what == "bleeder-resistance"]
    if board.bleeder is None or not read:
        return []
    value = read[-1]
    figures = {"stored_V": discharge.start}
    if value == "open":
        return [Finding("bleeder-open", 1.0, figures)]
    if not isinstance(value, float) or isinstance(board.bleeder.resistance, Unknown):
        return []
    ratio = value / (board.bleeder.resistance * board.bleeder.in_series)
    if discharge.capacitance is not None:
        figures["seconds"] = float(
            laws.discharge_time(discharge.start, value, discharge.capacitance, known.PLUG_LIMIT_VOLTS)
        )
    if ratio > RAISED:
        return [Finding("bleeder-open", 1.0, {**figures, "read_ohm": value})]
    return [Finding("bleeder-low", 1.0, {**figures, "read_ohm": value})] if ratio < 1.0 / RAISED else []


def bleeder_fault_chance(board: Board, readings: Sequence[Reading]) -> float:
    """Chance that the bleeder is open or raised [1]: as latent as on other boards until it is read; 0 without one."""
    if board.bleeder is None:
        return 0.0
    if any(reading.what == "bleeder-resistance" for reading in readings):
        return 0.0
    return LATENT_BLEEDER


def _discharge(board: Board, discharge: Discharge) -> list[Finding]:
    if not discharge.slow:
        return []
    figures = {"stored_V": discharge.start, "limit_V": known.PLUG_LIMIT_VOLTS, "limit_s": known.PLUG_LIMIT_SECONDS}
    if board.bleeder is None:
        return [Finding("no-bleeder", 1.0, figures)]
    if discharge.to_limit is None:
        return []
    return [Finding("slow-discharge", 1.0, {**figures, "seconds": discharge.to_limit})]


def _string(board: Board) -> list[Finding]:
    share, bleeder = bleeder_share(board), board.bleeder
    if share is None or bleeder is None or bleeder.rated_voltage is None or share <= bleeder.rated_voltage:
        return []
    return [Finding("bleeder-overvoltage", 1.0, {"each_V": share, "rated_V": bleeder.rated_voltage})]


def _class(board: Board) -> list[Finding]:
    if board.dropper.kind == "resistor":
        return []
    found = []
    if board.dropper.safety_class == "none":
        found.append(Finding("no-safety-class", 1.0, {}))
    rated = board.dropper.rated_voltage
    highest = highest_crest(board) / float(np.sqrt(2.0))
    if rated is not None and rated < highest:
        found.append(Finding("dropper-overvoltage", 1.0, {"rated_V": rated, "highest_V": highest}))
    return found
