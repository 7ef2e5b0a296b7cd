"""What is observed on a bench: a check that can be made, the reading it gave, and how well the instruments read."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated

from benchtool.board import Choice, Flag, Names, Quantity, Text

ReadingValue = float | str | tuple[str, ...]
"""A number in the reading's SI unit, one of its words, or (`look`) several of them."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Check:
    """Something that can be read: what (a name of the readings catalogue), where, and in which condition.

    `on` names the switched loads that are commanded on while reading; None for a check that knows no such state.
    `clamp` [A] and `limit` [V] belong to rail-injection.
    """

    what: Annotated[str, Text(60, name=True)]
    rail: Annotated[str | None, Text(60, name=True)] = None
    load: Annotated[str | None, Text(60, name=True)] = None
    on: Annotated[tuple[str, ...] | None, Names()] = None
    when: Annotated[str, Choice(("cold", "warm"))] = "cold"
    lifted: Annotated[bool, Flag()] = False
    clamp: Annotated[float | None, Quantity("A", 1e-5, 1.0)] = None
    limit: Annotated[float | None, Quantity("V", 0.1, 1000.0)] = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Reading(Check):
    """A check with the value it gave."""

    value: ReadingValue

    @property
    def check(self) -> Check:
        """The check without its value."""
        return Check(
            what=self.what, rail=self.rail, load=self.load, on=self.on, when=self.when, lifted=self.lifted,
            clamp=self.clamp, limit=self.limit,
        )


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
    """Accuracy of the instruments, the defaults of the case format; `ac_response`: what its AC ranges respond to, the true RMS or
    the mean magnitude, which is scaled to read a sine right.
    """

    dc_voltage: Annotated[Accuracy, AccuracyOf("V")] = Accuracy(0.005, 0.020)
    ac_voltage: Annotated[Accuracy, AccuracyOf("V")] = Accuracy(0.01, 0.3)
    ac_low_voltage: Annotated[Accuracy, AccuracyOf("V")] = Accuracy(0.015, 0.010)
    ripple: Annotated[Accuracy, AccuracyOf("V")] = Accuracy(0.05, 0.020)
    capacitance: Annotated[Accuracy, AccuracyOf("F")] = Accuracy(0.02, 0.2e-9)
    resistance: Annotated[Accuracy, AccuracyOf("ohm")] = Accuracy(0.009, 0.2)
    ac_current: Annotated[Accuracy, AccuracyOf("A")] = Accuracy(0.015, 50e-6)
    dc_current: Annotated[Accuracy, AccuracyOf("A")] = Accuracy(0.01, 20e-6)
    ac_response: Annotated[str, Choice(("true-rms", "average"))] = "true-rms"
