"""The verdict as plain data: frozen records, and the machine-readable form that the case format fixes."""

from __future__ import annotations

from dataclasses import dataclass

from benchtool.case import Case
from benchtool.catalogue.faults import UNEXPLAINED
from benchtool.diagnosis.checks import NextCheck
from benchtool.diagnosis.disagreement import Disagreement
from benchtool.diagnosis.effective import Effective
from benchtool.diagnosis.evidence import Because
from benchtool.diagnosis.hypotheses import Hypothesis, Struck
from benchtool.diagnosis.safety import Finding
from benchtool.observed import Check
from benchtool.physics.budget import Budget
from benchtool.words import Words, expected_text, read_text

FORMAT = 1

Plain = dict[str, object]


@dataclass(frozen=True, slots=True)
class RailState:
    """One rail in one state, as marked [V, A, W]; low and high: the 95 % band of healthy boards. None: cannot be known."""

    name: str
    voltage: float | None
    voltage_low: float | None
    voltage_high: float | None
    ripple_pp: float | None
    ripple_pp_low: float | None
    ripple_pp_high: float | None
    ripple_rms: float | None
    regulating: bool | None
    zener_current: float | None
    zener_power: float | None

    def as_dict(self) -> Plain:
        """With units in the keys."""
        return {
            "name": self.name,
            "voltage_V": self.voltage,
            "voltage_low_V": self.voltage_low,
            "voltage_high_V": self.voltage_high,
            "ripple_pp_V": self.ripple_pp,
            "ripple_pp_low_V": self.ripple_pp_low,
            "ripple_pp_high_V": self.ripple_pp_high,
            "ripple_rms_V": self.ripple_rms,
            "regulating": self.regulating,
            "zener_current_A": self.zener_current,
            "zener_power_W": self.zener_power,
        }


@dataclass(frozen=True, slots=True)
class State:
    """The board as marked in one switched state [A, V, W, VA]."""

    on: tuple[str, ...]
    supply_current: float | None
    line_current: float | None
    inrush_voltage: float | None
    inrush_power: float | None
    dropper_voltage: float | None
    dropper_dc: float | None
    apparent_power: float | None
    real_power: float | None
    power_factor: float | None
    rails: tuple[RailState, ...]

    def as_dict(self) -> Plain:
        """With units in the keys."""
        return {
            "on": list(self.on),
            "supply_current_A": self.supply_current,
            "line_current_A": self.line_current,
            "inrush_voltage_V": self.inrush_voltage,
            "dropper_voltage_V": self.dropper_voltage,
            "dropper_dc_V": self.dropper_dc,
            "inrush_power_W": self.inrush_power,
            "apparent_power_VA": self.apparent_power,
            "real_power_W": self.real_power,
            "power_factor": self.power_factor,
            "rails": [rail.as_dict() for rail in self.rails],
        }


@dataclass(frozen=True, slots=True)
class Suspect:
    """Something that may be wrong, how likely, and why; without a hypothesis it is `unexplained`."""

    hypothesis: Hypothesis | None
    probability: float
    explains_complaint: bool
    because: tuple[Because, ...] = ()

    @property
    def fault(self) -> str:
        """The fault's name; `unexplained` where no fault accounts for the readings."""
        return UNEXPLAINED if self.hypothesis is None else self.hypothesis.name

    @property
    def label(self) -> str:
        """The suspect in words."""
        return "unexplained: a reading in doubt, or several faults" if self.hypothesis is None else self.hypothesis.label

    def as_dict(self) -> Plain:
        """With the other fault of a pair in `with`."""
        faults = self.hypothesis.faults if self.hypothesis is not None else ()
        return {
            "part": faults[0].fault.part_at(faults[0].place) if faults else None,
            **_named(self.hypothesis),
            "probability": self.probability,
            "explains_complaint": self.explains_complaint,
            "because": [_because(row) for row in self.because],
        }


def _named(hypothesis: Hypothesis | None) -> Plain:
    """A hypothesis as its fault and place, the other fault of a pair in `with`."""
    faults = hypothesis.faults if hypothesis is not None else ()
    alone = {"fault": UNEXPLAINED if hypothesis is None else hypothesis.name, "rail": None, "load": None}
    return {**(_struck(faults[0]) if faults else alone), "with": _struck(faults[1]) if len(faults) > 1 else None}


def _struck(struck: Struck) -> Plain:
    place = struck.place
    return {
        "fault": struck.fault.name,
        "rail": place.name if place.rail is not None else None,
        "load": place.name if place.load is not None else None,
    }


def _because(row: Because) -> Plain:
    reading = row.reading
    return {
        "what": reading.what,
        "rail": reading.rail,
        "load": reading.load,
        "on": None if reading.on is None else list(reading.on),
        "read": read_text(reading),
        "read_low": None if row.read is None else row.read[0],
        "read_high": None if row.read is None else row.read[1],
        "expected_if_this": expected_text(row.if_this, reading.what),
        "expected_if_healthy": expected_text(row.if_healthy, reading.what),
        "weight": row.weight,
    }


@dataclass(frozen=True, slots=True, kw_only=True)
class Assessment:
    """Everything said about one case."""

    case: Case
    cautions: tuple[str, ...]
    safety: tuple[Finding, ...]
    states: tuple[State, ...] = ()
    budget: Budget | None = None
    effective: Effective | None = None
    suspects: tuple[Suspect, ...] = ()
    disagreements: tuple[Disagreement, ...] = ()
    next_checks: tuple[NextCheck, ...] = ()

    def as_dict(self) -> Plain:
        """The machine-readable result: SI units named in the keys, numbers not rounded, None where nothing can be known."""
        return {
            "format": FORMAT,
            "case": self.case.ticket.number,
            "states": [state.as_dict() for state in self.states],
            "budget": None if self.budget is None else _budget(self.budget),
            "effective": None if self.effective is None else _effective(self.effective),
            "suspects": [suspect.as_dict() for suspect in self.suspects],
            "disagreements": [_disagreement(item, Words(self.case.board)) for item in self.disagreements],
            "next_checks": [_next_check(item) for item in self.next_checks],
            "safety": [_finding(finding) for finding in self.safety],
            "cautions": list(self.cautions),
        }


def _budget(budget: Budget) -> Plain:
    return {
        "on": list(budget.on),
        "available_A": budget.available,
        "available_low_A": budget.available_low,
        "available_high_A": budget.available_high,
        "demand_A": budget.demand,
        "margin_A": budget.margin,
        "dropout_capacitance_F": budget.dropout_capacitance,
        "rule_of_thumb_A": budget.rule_of_thumb,
    }


def _effective(effective: Effective) -> Plain:
    return {
        "capacitance_F": effective.capacitance,
        "capacitance_low_F": effective.capacitance_low,
        "capacitance_high_F": effective.capacitance_high,
        "current_A": effective.current,
        "current_low_A": effective.current_low,
        "current_high_A": effective.current_high,
        "from": [_check(reading) for reading in effective.readings],
    }


def _check(check: Check) -> Plain:
    plain: Plain = {"what": check.what}
    if check.rail is not None:
        plain["rail"] = check.rail
    if check.load is not None:
        plain["load"] = check.load
    if check.on is not None:
        plain["on"] = list(check.on)
    return plain


def _next_check(item: NextCheck) -> Plain:
    check = item.check
    return {
        "what": check.what,
        "rail": check.rail,
        "load": check.load,
        "on": None if check.on is None else list(check.on),
        "lifted": check.lifted if check.what == "dropper-capacitance" else None,
        "when": None if item.condition == "dead" else check.when,
        "clamp_A": check.clamp,
        "limit_V": check.limit,
        "condition": item.condition,
        "gain_bits": item.gain,
        "minutes": item.minutes,
        "foretold": [
            {**_named(each.hypothesis), "expected": expected_text(each.expected, check.what)} for each in item.foretold
        ],
        "turns": [
            {**_named(turn.hypothesis), "word": turn.word, "low": turn.low, "high": turn.high, "chance": turn.chance,
             "probability": turn.probability}
            for turn in item.turns
        ],
    }


def _disagreement(item: Disagreement, words: Words) -> Plain:
    return {
        "first": {**_check(item.first), "read": read_text(item.first)},
        "second": {**_check(item.second), "read": read_text(item.second)},
        "first_implies_for_second": None if item.implied is None else list(item.implied),
        "likelier_mistake": None if item.doubtful is None else "first" if item.doubtful is item.first else "second",
        "sentence": words.disagreement(item),
    }


def _finding(finding: Finding) -> Plain:
    return {"fault": finding.fault, "probability": finding.probability, "sentence": finding.sentence()}
