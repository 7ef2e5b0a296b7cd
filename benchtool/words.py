"""What the records of a verdict are called in words, for people: readings, states, percentages, ranges.

Why apart: the report, the screens and the paper say the same thing in the same words.
"""

from __future__ import annotations

import shlex
from collections.abc import Iterator
from dataclasses import dataclass

from benchtool.board import Board
from benchtool.catalogue.readings import READING_KINDS, ReadingKind
from benchtool.diagnosis.disagreement import Disagreement
from benchtool.diagnosis.evidence import Expected
from benchtool.diagnosis.outcomes import Decides
from benchtool.observed import Check, Reading
from benchtool.quantities import exact, show, show_range

CANNOT_TELL = "cannot tell"
BLANK = "…"
"""Stands for the number that a meter will show."""
READ_AS = {"F": "nF", "A": "mA"}
RESERVOIR_READ_AS = "uF"
"""The units that meters show where it is not the plain one."""
LISTED_STATES = 2
"""Loads named in a state; more of them are counted."""


def percent(probability: float) -> str:
    """A probability [1] in whole percent; what is not certain is never 0 or 100."""
    if probability >= 0.995:
        return "over 99 %"
    if probability < 0.005:
        return "under 1 %"
    return f"{int(probability * 100.0 + 0.5)} %"


def milliamps(current: float, places: int = 1) -> str:
    """A current [A] as a bare number of milliamperes."""
    return f"{current * 1e3:.{places}f}"


@dataclass(frozen=True, slots=True)
class Words:
    """The words for one board; `short`: its short names, for narrow pages."""

    board: Board
    short: bool = False

    def rail(self, name: str) -> str:
        """A rail's name."""
        rail = self.board.rail(name)
        return rail.short if self.short and rail.short is not None else name

    def load(self, name: str) -> str:
        """A load's name."""
        found = next(load for load in self.board.loads if load.name == name)
        return found.short if self.short and found.short is not None else name

    def state(self, on: tuple[str, ...] | None) -> str:
        """Which switched loads are on: "heater relay on", "all off"; nothing where the board switches none."""
        switched = self.board.switched_loads()
        if on is None or not switched:
            return ""
        if not on:
            return "all off"
        if len(on) > 1 and set(on) == set(switched):
            return "all on"
        if len(on) > LISTED_STATES:
            return f"{len(on)} loads on"
        return f"{' and '.join(self.load(name) for name in on)} on"

    def check(self, check: Check) -> str:
        """A check in words: "relay rail, heater relay on"."""
        kind = READING_KINDS[check.what]
        rail = "" if check.rail is None else self.rail(check.rail)
        load = "" if check.load is None else self.load(check.load)
        label = kind.label.format(rail=rail, load=load)
        where = [name for name in (rail, load) if name] if kind.name == "look" else []
        return ", ".join([label, *where, *self._conditions(check)])

    def disagreement(self, item: Disagreement) -> str:
        """What the one reading would mean for the other: "relay rail, relay on: 14.2 V would mean …"."""
        first = f"{self.check(item.first)}: {value_of(item.first)}"
        second, read = self.check(item.second), value_of(item.second)
        unit = READING_KINDS[item.second.what].unit
        if item.implied is None or unit is None:
            told = f"{first}. {second}: {read}. No single fault goes with both."
        else:
            told = f"{first} would mean {show_range(*item.implied, unit)} for {second}, which reads {read}."
        if item.doubtful is None:
            return f"{told} Either may be the mistake."
        return f"{told} The likelier mistake: {self.check(item.doubtful)}."

    def _conditions(self, check: Check) -> Iterator[str]:
        if state := self.state(check.on):
            yield state
        if check.lifted:
            yield "one leg lifted"
        elif check.what == "dropper-capacitance" and self.board.bleeder is not None:
            yield "across the bleeder"
        if check.when == "warm":
            yield "warm"
        if check.clamp is not None:
            yield f"up to {show(check.clamp, 'A')}"
        if check.limit is not None:
            yield f"up to {show(check.limit, 'V')}"


def value_of(reading: Reading) -> str:
    """What was read: "14.14 V", "open"."""
    unit = READING_KINDS[reading.what].unit
    if isinstance(reading.value, float) and unit is not None:
        return show(reading.value, unit, digits=4)
    return ", ".join(reading.value) if isinstance(reading.value, tuple) else str(reading.value)


def typed(check: Check) -> str:
    """What to type once the check is made: "rail-voltage 'relay rail' on 'heater relay' … V", "rectifier-test good|open|…"."""
    return " ".join([check.what, *_typed_qualifiers(check), typed_value(READING_KINDS[check.what])])


def _typed_qualifiers(check: Check) -> Iterator[str]:
    kind = READING_KINDS[check.what]
    for key, name in (("rail", check.rail), ("load", check.load)):
        if name is not None:
            yield _in_quotes(name) if key in kind.needs else f"{key} {_in_quotes(name)}"
    if check.on:
        yield f"on {' '.join(_in_quotes(name) for name in check.on)}"
    if check.lifted:
        yield "lifted"
    if check.when == "warm":
        yield "warm"
    if check.clamp is not None:
        yield f"clamp {exact(check.clamp, 'A')}"
    if check.limit is not None:
        yield f"limit {exact(check.limit, 'V')}"


def _in_quotes(name: str) -> str:
    """A name as one word of a typed line; one word too where it could be typed without, so that all look alike."""
    return shlex.quote(name) if "'" in name else f"'{name}'"


def typed_value(kind: ReadingKind) -> str:
    """How a reading of this kind is typed: "… nF", or the words to choose from."""
    if kind.unit is None:
        return "|".join(kind.words)
    return f"{BLANK} {RESERVOIR_READ_AS if kind.name == 'reservoir-capacitance' else READ_AS.get(kind.unit, kind.unit)}"


def read_text(reading: Reading) -> str:
    """What was read with its condition: "182 nF, lifted"."""
    remarks = [word for word, said in (("lifted", reading.lifted), ("warm", reading.when == "warm")) if said]
    return ", ".join([value_of(reading), *remarks])


def expected_text(expected: Expected, what: str) -> str:
    """What should be read, both ends with their unit: "612 nF to 748 nF", "open", "yes or no"."""
    unit = READING_KINDS[what].unit
    if expected.low is None or expected.high is None or unit is None:
        return " or ".join(expected.words)
    return show_range(expected.low, expected.high, unit)


def expectation(expected: Expected, what: str) -> str:
    """What should be read: "612 to 748 nF", "under 0.6 Ω" where a meter cannot tell the low end from nothing, "yes or no"."""
    kind = READING_KINDS[what]
    if expected.low is None or expected.high is None or kind.unit is None:
        return " or ".join(expected.words)
    if expected.low <= 0.0 <= kind.low:
        return f"under {show(expected.high, kind.unit)}"
    return show_range(expected.low, expected.high, kind.unit, compact=True)


def outcome(decides: Decides, what: str) -> str:
    """What may be read: "under 0.62 Ω", "612 to 748 nF", "open"."""
    unit = READING_KINDS[what].unit
    if decides.word is not None or unit is None:
        return decides.word or ""
    if decides.low is None and decides.high is None:
        return "any number"
    if decides.low is None:
        return f"under {show(decides.high, unit)}"
    if decides.high is None:
        return f"over {show(decides.low, unit)}"
    return show_range(decides.low, decides.high, unit, compact=True)


def band(low: float | None, high: float | None, unit: str, digits: int = 3) -> str:
    """A range [unit], or that it cannot be told."""
    return CANNOT_TELL if low is None or high is None else show_range(low, high, unit, digits=digits, compact=True)


def judged(reading: Reading, healthy: Expected) -> str:
    """How a reading stands to a healthy board: low, ok, high, or bad where words differ; nothing for a look."""
    if reading.what == "look":
        return ""
    if healthy.low is None or healthy.high is None:
        return "ok" if reading.value in healthy.words else "bad"
    if not isinstance(reading.value, float):
        return "bad"
    if reading.value < healthy.low:
        return "low"
    return "high" if reading.value > healthy.high else "ok"
