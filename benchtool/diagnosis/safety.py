"""What endangers the user: an open zener, the bleeder, discharge, string voltage, class of the dropper.

These findings have probabilities of their own, do not compete with the suspects, and are said first. An open zener is a suspect
as well: here it stands because the board must not be powered to find out.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

from benchtool.board import Board, Rail, Unknown, nominal_voltage
from benchtool.diagnosis.posterior import Posterior
from benchtool.observed import Reading
from benchtool.physics import constants as known
from benchtool.physics.discharge import Discharge, discharge_of, worst_voltage
from benchtool.physics.stress import bleeder_share
from benchtool.quantities import show, show_up

ROUNDING = 1e-9
"""Share by which figures of equal size may differ from being computed."""
SENTENCES = {
    "zener-open": "The {where} zener may be open: DO NOT POWER the board. The rail may climb to {climbs_V} and reservoirs burst; "
    "if it was powered: eye protection, meter and leads for 1000 V. Discharge the dropper and every reservoir, measure.",
    "bleeder-open": "The bleeder is open or raised: {stored_V} stays in the dropper too long, for hours where it is open. "
    "Discharge by hand and measure.",
    "bleeder-low": "The bleeder is low: it runs hot and loads the dropper. Replace it with its marked value.",
    "no-bleeder": "No bleeder is stated: {stored_V} may stay in the dropper for hours. Discharge by hand and measure.",
    "slow-discharge": "The plug pins fall to {limit_V} only after {seconds} by this supply alone; the limit is {limit_s} "
    "(IEC 60335-1 22.5), when they still hold {left_V}. Discharge by hand and measure.",
    "bleeder-overvoltage": "Each resistor of the bleeder string stands {each_V} against a rating of {rated_V}: it may fail open.",
    "no-safety-class": "The dropper has no safety class: across or in the mains it must have one (IEC 60384-14).",
    "dropper-overvoltage": "The dropper is rated {rated_V} AC and may see {highest_V}.",
}
"""A sentence for every finding; the figures are named as in `Finding.figures`, {where} is `Finding.where`."""
EXTRAS = {"read_ohm": "It was read as {read_ohm}."}
UNITS = {"V": "V", "s": "s", "ohm": "ohm", "seconds": "s"}
ROUNDED_UP = {"seconds": 2, "stored_V": 3, "climbs_V": 3}
"""Figures that are never told smaller than they are, with their digits."""
RAISED = 1.5
"""A bleeder over this many times its mark counts as raised."""
SUSPECTED_FROM = 0.05
"""Probability from which an open zener keeps the board from being powered."""
NO_CHANCES: Mapping[str, float] = {}
RUNS_AWAY = 1.3
"""Times its zener's voltage to common from which a rail is no longer held by it; common practice, no source."""
WHOLE_ZENER = 1.15
"""Times its mark that a whole zener may stand at, hot and at the end of its tolerance (published values: 5 % and 0.09 %/K)."""


def _figure(key: str, value: float, ascii: bool) -> str:
    unit = UNITS[key.rsplit("_", 1)[-1]]
    if key in ROUNDED_UP:
        return show_up(value, unit, digits=ROUNDED_UP[key], ascii=ascii)
    return show(value, unit, ascii=ascii)


@dataclass(frozen=True, slots=True)
class Finding:
    """One safety finding: fault or rule, its probability, the figures of its sentence [SI], and the rail where it is one's."""

    fault: str
    probability: float
    figures: dict[str, float]
    where: str = ""

    def sentence(self, *, ascii: bool = False) -> str:
        """The finding in words, with what to measure. Times are rounded up."""
        shown = {key: _figure(key, value, ascii) for key, value in self.figures.items()}
        parts = [SENTENCES[self.fault], *(EXTRAS[key] for key in shown if key in EXTRAS)]
        return " ".join(parts).format(**shown, where=self.where)


def safety_findings(
    board: Board, readings: Sequence[Reading], zener_open: Mapping[str, float] = NO_CHANCES
) -> tuple[Finding, ...]:
    """Every finding on `board`: what forbids to power it first, then the most probable.

    `zener_open`: the probability that a rail's zener is open, by the rail's name; see `zener_open_of`.
    """
    discharge = discharge_of(board, bleeder_read(readings))
    bleeder = _bleeder(board, discharge, readings)
    slow = [] if any(finding.fault == "bleeder-open" for finding in bleeder) else _discharge(board, discharge)
    others = [*bleeder, *slow, *_string(board), *_class(board)]
    found = [*_zeners(board, readings, zener_open), *sorted(others, key=lambda finding: -finding.probability)]
    return tuple(found)


def power_allowed(findings: Sequence[Finding]) -> bool:
    """Whether the findings leave it open to power the board, through an isolating transformer."""
    return all(finding.fault != "zener-open" for finding in findings)


def bleeder_read(readings: Sequence[Reading]) -> float | None:
    """What the bleeder was last read as [ohm], infinite for open; None where it was not read."""
    read = [reading.value for reading in readings if reading.what == "bleeder-resistance"]
    if not read:
        return None
    return read[-1] if isinstance(read[-1], float) else math.inf


def zener_open_of(posterior: Posterior) -> dict[str, float]:
    """The probability that each rail's zener is open, alone or with another fault, by the rail's name."""
    chances: dict[str, float] = {}
    for hypothesis, probability in zip(posterior.hypotheses, posterior.probabilities, strict=True):
        for struck in hypothesis.faults:
            if struck.fault.name == "zener-open":
                chances[struck.place.name] = chances.get(struck.place.name, 0.0) + float(probability)
    return chances


def _zeners(board: Board, readings: Sequence[Reading], chances: Mapping[str, float]) -> Iterator[Finding]:
    for rail in board.rails:
        sure = rail.zener is not None and _shows_open(board, rail, readings)
        probability = 1.0 if sure else min(chances.get(rail.name, 0.0), 1.0)
        if probability >= SUSPECTED_FROM:
            yield Finding("zener-open", probability, {"climbs_V": worst_voltage(board, rail)}, rail.name)


def _shows_open(board: Board, rail: Rail, readings: Sequence[Reading]) -> bool:
    """Whether the rail's zener was last tested open, or the rail ever stood higher than a whole one lets it."""
    here = [reading for reading in readings if reading.rail == rail.name]
    tested = [reading.value for reading in here if reading.what == "zener-test"]
    volts = [reading.value for reading in here if reading.what == "rail-voltage" and isinstance(reading.value, float)]
    return tested[-1:] == ["open"] or max(volts, default=0.0) > _held_to(board, rail)


def _held_to(board: Board, rail: Rail) -> float:
    """Volts above which the rail's zener does not hold it, or its reservoir is beyond its rating [V]."""
    nominal, rated = nominal_voltage(board, rail), rail.reservoir.rated_voltage if rail.reservoir is not None else None
    held = math.inf if nominal is None else RUNS_AWAY * nominal
    if rated is None:
        return held
    return min(held, max(rated, WHOLE_ZENER * (nominal or 0.0)))


def _bleeder(board: Board, discharge: Discharge, readings: Sequence[Reading]) -> list[Finding]:
    value = bleeder_read(readings)
    if board.bleeder is None or value is None:
        return []
    figures = {"stored_V": discharge.start}
    if value == math.inf:
        return [Finding("bleeder-open", 1.0, figures)]
    if isinstance(board.bleeder.resistance, Unknown):
        return []
    ratio = value / (board.bleeder.resistance * board.bleeder.in_series)
    if ratio > RAISED:
        return [Finding("bleeder-open", 1.0, {**figures, "read_ohm": value})]
    return [Finding("bleeder-low", 1.0, {**figures, "read_ohm": value})] if ratio < 1.0 / RAISED else []


def _discharge(board: Board, discharge: Discharge) -> list[Finding]:
    if not discharge.slow:
        return []
    figures = {"stored_V": discharge.start, "limit_V": known.PLUG_LIMIT_VOLTS, "limit_s": known.PLUG_LIMIT_SECONDS}
    if board.bleeder is None:
        return [Finding("no-bleeder", 1.0, figures)]
    if discharge.to_limit is None or discharge.left is None:
        return []
    return [Finding("slow-discharge", 1.0, {**figures, "seconds": discharge.to_limit, "left_V": discharge.left})]


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
    highest = board.mains.voltage * (1.0 + board.mains.variation)
    if rated is not None and rated < highest * (1.0 - ROUNDING):
        found.append(Finding("dropper-overvoltage", 1.0, {"rated_V": rated, "highest_V": highest}))
    return found
