"""A case: one board on the bench, what was read on it, and what was done. Frozen; a change makes a new case."""

from __future__ import annotations

import datetime
from dataclasses import dataclass, field
from typing import Annotated

from benchtool.board import Board, Moment, Names, Quantity, Tables, Text, Whole
from benchtool.observed import Accuracy, AccuracyOf, Meter, Reading, ReadingValue

__all__ = ["Accuracy", "AccuracyOf", "Case", "Meter", "Reading", "ReadingValue", "Repair", "Replaced", "Safe", "Ticket"]

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
