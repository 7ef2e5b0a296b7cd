"""What endangers the user and causes no complaint: bleeder, discharge, string voltage, class of the dropper.

These findings have probabilities of their own, do not compete with the suspects, and are said first.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from benchtool.board import Board, Unknown
from benchtool.observed import Reading
from benchtool.physics import constants as known
from benchtool.physics import laws
from benchtool.physics.stress import Discharge, bleeder_share, discharge_of
from benchtool.quantities import show, show_up

ROUNDING = 1e-9
"""Share by which figures of equal size may differ from being computed."""
SENTENCES = {
    "bleeder-open": "The bleeder is open or raised: {stored_V} may stay in the dropper for hours. Discharge by hand and measure.",
    "bleeder-low": "The bleeder is low: it runs hot and loads the dropper. Replace it with its marked value.",
    "no-bleeder": "No bleeder is stated: {stored_V} may stay in the dropper for hours. Discharge by hand and measure.",
    "slow-discharge": "The plug pins fall to {limit_V} only after {seconds} by this supply alone; the limit is {limit_s} "
    "(IEC 60335-1 22.5), and then they still hold {left_V}. Discharge by hand and measure.",
    "bleeder-overvoltage": "Each resistor of the bleeder string stands {each_V} against a rating of {rated_V}: it may fail open.",
    "no-safety-class": "The dropper has no safety class: across or in the mains it must have one (IEC 60384-14).",
    "dropper-overvoltage": "The dropper is rated {rated_V} AC and may see {highest_V}.",
}
"""A sentence for every finding; the figures are named as in `Finding.figures`."""
EXTRAS = {"read_ohm": "It was read as {read_ohm}."}
UNITS = {"V": "V", "s": "s", "ohm": "ohm", "seconds": "s"}


def _figure(key: str, value: float, ascii: bool) -> str:
    unit = UNITS[key.rsplit("_", 1)[-1]]
    return show_up(value, unit, ascii=ascii) if key == "seconds" else show(value, unit, ascii=ascii)


RAISED = 1.5
"""A bleeder over this many times its mark counts as raised."""


@dataclass(frozen=True, slots=True)
class Finding:
    """One safety finding: fault or rule, its probability, and the figures of its sentence [SI]."""

    fault: str
    probability: float
    figures: dict[str, float]

    def sentence(self, *, ascii: bool = False) -> str:
        """The finding in words, with what to measure. Times are rounded up."""
        shown = {key: _figure(key, value, ascii) for key, value in self.figures.items()}
        parts = [SENTENCES[self.fault], *(EXTRAS[key] for key in shown if key in EXTRAS)]
        return " ".join(parts).format(**shown)


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
