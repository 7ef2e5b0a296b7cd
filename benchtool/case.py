"""A case: one board on the bench, what was read on it, and what was done. Frozen; a change makes a new case."""

from __future__ import annotations

import datetime
from dataclasses import dataclass, field
from typing import Annotated

from benchtool.board import Board, Choice, Flag, Moment, Names, Quantity, Table, Tables, Text, Whole

ReadingValue = float | str | tuple[str, ...]
"""A number in the reading's SI unit, one of its words, or (`look`) several of them."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Reading:
    """One reading: what was read (a name of the readings catalogue), where, in which condition, and the value.

    `on` names the switched loads that are commanded on while reading; None for a reading that knows no such state.
    `clamp` [A] and `limit` [V] belong to rail-injection.
    """

    what: Annotated[str, Text(60, name=True)]
    value: ReadingValue
    rail: Annotated[str | None, Text(60, name=True)] = None
    load: Annotated[str | None, Text(60, name=True)] = None
    on: Annotated[tuple[str, ...] | None, Names()] = None
    when: Annotated[str, Choice(("cold", "warm"))] = "cold"
    lifted: Annotated[bool, Flag()] = False
    clamp: Annotated[float | None, Quantity("A", 1e-5, 1.0)] = None
    limit: Annotated[float | None, Quantity("V", 0.1, 1000.0)] = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Ticket:
    """The job ticket; every key optional."""

    number: Annotated[str | None, Text()] = None
    appliance: Annotated[str | None, Text()] = None
    complaint: Annotated[str | None, Text()] = None
    technician: Annotated[str | None, Text()] = None
    received: Annotated[datetime.date | None, Moment(time_of_day=False)] = None
    closed: Annotated[datetime.date | None, Moment(time_of_day=False)] = None
    minutes: Annotated[int | None, Whole(0, 100_000)] = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Safe:
    """How work was made safe. The work state itself is never restored from a file."""

    transformer: Annotated[str | None, Text()] = None
    discharge_tool: Annotated[str | None, Text()] = None
    last_voltage: Annotated[float | None, Quantity("V", 0.0, 2000.0)] = None
    last_time: Annotated[datetime.datetime | None, Moment(time_of_day=True)] = None


@dataclass(frozen=True, slots=True)
class Accuracy:
    """A meter's two-sigma limit: share of the reading [1] and floor [`unit`], adding as root sum of squares."""

    relative: float
    floor: float


@dataclass(frozen=True, slots=True)
class AccuracyOf:
    """A file's "percent + floor" for one range of the meter, the floor in `unit`."""

    unit: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Meter:
    """Accuracy of the instruments; the defaults of the case format."""

    dc_voltage: Annotated[Accuracy, AccuracyOf("V")] = Accuracy(0.005, 0.020)
    ac_voltage: Annotated[Accuracy, AccuracyOf("V")] = Accuracy(0.01, 0.3)
    ac_low_voltage: Annotated[Accuracy, AccuracyOf("V")] = Accuracy(0.015, 0.010)
    ripple: Annotated[Accuracy, AccuracyOf("V")] = Accuracy(0.05, 0.020)
    capacitance: Annotated[Accuracy, AccuracyOf("F")] = Accuracy(0.02, 0.2e-9)
    resistance: Annotated[Accuracy, AccuracyOf("ohm")] = Accuracy(0.009, 0.2)
    ac_current: Annotated[Accuracy, AccuracyOf("A")] = Accuracy(0.015, 50e-6)
    dc_current: Annotated[Accuracy, AccuracyOf("A")] = Accuracy(0.01, 20e-6)


@dataclass(frozen=True, slots=True, kw_only=True)
class Replaced:
    """A part that was replaced: its name, what was fitted, a remark."""

    part: Annotated[str, Text(80, name=True)]
    fitted: Annotated[str | None, Text()] = None
    note: Annotated[str | None, Text()] = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Repair:
    """What was done, and the readings after it."""

    replaced: Annotated[tuple[Replaced, ...], Tables(Replaced, "replaced")] = ()
    overrides: Annotated[tuple[str, ...], Names()] = ()
    note: Annotated[str, Text(10_000, lines=True)] = ""
    readings: tuple[Reading, ...] = ()


@dataclass(frozen=True, kw_only=True)
class Case:
    """One case file. `text` is the file as it was read, so that a save keeps its comments, order and spelling."""

    board: Board
    ticket: Ticket = Ticket()
    safe: Safe = Safe()
    meter: Meter = Meter()
    readings: tuple[Reading, ...] = ()
    repair: Repair = Repair()
    text: str | None = field(default=None, compare=False, repr=False)
