"""One value of a case file ↔ Python: read it, write it, say in words what is allowed.

Why apart from the tables: the same rules (`Quantity`, `Choice`, …) serve the file, a change typed on the
command line and a field of a screen, and a new rule is added here and nowhere else.
"""

from __future__ import annotations

import datetime
import math
from collections.abc import Callable
from functools import singledispatch

from benchtool.board import (
    UNKNOWN,
    Choice,
    Flag,
    Moment,
    Names,
    Quantity,
    Table,
    Tables,
    Text,
    Unknown,
    Whole,
)
from benchtool.errors import QuantityError
from benchtool.observed import Accuracy, AccuracyOf
from benchtool.printable import is_printable, listed, names_listed, shown
from benchtool.quantities import exact, parse, parse_accuracy, round_up

Rule = Quantity | Choice | Text | Whole | Flag | Moment | Names | Table | Tables | AccuracyOf

EXAMPLES = {
    "V": "12 V", "A": "3.5 mA", "F": "680 nF", "ohm": "2k2", "W": "1.3 W",
    "Hz": "50 Hz", "s": "250 us", "%": "10 %", "degC": "40 degC",
}  # fmt: skip
UNKNOWN_WORD = UNKNOWN.value
BOUND_FIGURES = 3
MOST_NAMES = 100
"""Longest list of names or words that a file may hold."""


@singledispatch
def describe(rule: object) -> str:
    """What the rule allows, in words that end a sentence."""
    raise TypeError(f"no description of {rule!r}")


@singledispatch
def read(rule: object, value: object) -> object:
    """The Python value of a TOML value; QuantityError where the rule does not allow it."""
    raise TypeError(f"no reader for {rule!r}")


@singledispatch
def write(rule: object, value: object) -> object:
    """The TOML value that `read` turns back into the same Python value; words and dates stay as they are."""
    return value


def stand_in(rule: Rule) -> object:
    """What takes the place of a value that was refused, so that the rest of the file can still be checked."""
    return STAND_INS[type(rule)]


STAND_INS: dict[type, object] = {
    Quantity: math.nan,
    Choice: "",
    Text: "",
    Whole: 0,
    Flag: True,
    Moment: None,
    Names: (),
    Tables: (),
    AccuracyOf: Accuracy(math.nan, math.nan),
}
"""No comparison holds for NaN and no name is empty, so a stand-in raises no second problem."""


def refuse_unless(allowed: bool, rule: Rule, value: object) -> None:
    """QuantityError with the value and the rule's description, unless `allowed`."""
    if not allowed:
        raise QuantityError(shown(value), describe(rule))


def quantity_text(value: float, unit: str) -> str:
    """The value [unit] as text that reads back bit-equal; a value that is not finite as Python writes it."""
    return exact(value, unit) if math.isfinite(value) else str(value)


def bounds_text(low: float, high: float, unit: str) -> str:
    """`1 pF to 100 uF`: both ends [unit]; computed ends in three figures, rounded so that what is said is taken."""
    return f"{exact(round_up(low, BOUND_FIGURES), unit)} to {exact(-round_up(-high, BOUND_FIGURES), unit)}"


def in_quotes(unit: str, example: str | None = None) -> str:
    """How a quantity [unit] is written in a file."""
    return f'text in quotes with the unit, as "{example or EXAMPLES[unit]}"'


def spelled(value: object, unit: str, takes: Callable[[str], object]) -> str | None:
    """A bare number with the unit it lacks; None for what is no number, or would be refused by `takes` in that form too."""
    if isinstance(value, bool) or not isinstance(value, (int, float)):
        return None
    text = f"{shown(value)} {unit}"
    try:
        takes(text)
    except QuantityError:
        return None
    return text


def _bounds(rule: Quantity) -> str:
    word = f', or "{UNKNOWN_WORD}"' if rule.unknown else ""
    return f"{bounds_text(rule.low, rule.high, rule.unit)}{word}"


@describe.register
def _(rule: Quantity) -> str:
    return f"{in_quotes(rule.unit)}, {_bounds(rule)}"


@read.register
def _(rule: Quantity, value: object) -> float | Unknown:
    if rule.unknown and value == UNKNOWN_WORD:
        return UNKNOWN
    if not isinstance(value, str):
        example = spelled(value, rule.unit, lambda text: read(rule, text))
        raise QuantityError(shown(value), in_quotes(rule.unit, example) if example else describe(rule))
    number = parse(value, rule.unit)
    if not rule.low <= number <= rule.high:
        raise QuantityError(shown(value), _bounds(rule))
    return number


@write.register
def _(rule: Quantity, value: object) -> object:
    return quantity_text(value, rule.unit) if isinstance(value, (int, float)) else UNKNOWN_WORD


@describe.register
def _(rule: Choice) -> str:
    return names_listed(rule.words)


@read.register
def _(rule: Choice, value: object) -> object:
    refuse_unless(value in rule.words, rule, value)
    return value


@describe.register
def _(rule: Text) -> str:
    lines = "printable text" if rule.lines else "one line of printable text"
    return f"{lines} in quotes, {'1 to' if rule.name else 'at most'} {rule.limit} characters"


@read.register
def _(rule: Text, value: object) -> str:
    if not isinstance(value, str):
        raise QuantityError(shown(value), describe(rule))
    line = value.replace("\n", " ").replace("\t", " ") if rule.lines else value
    refuse_unless(is_printable(line) and len(value) <= rule.limit, rule, value)
    refuse_unless(not rule.name or value.strip() != "", rule, value)
    return value


@describe.register
def _(rule: Whole) -> str:
    return f"a whole number without quotes, {listed(dict.fromkeys((str(rule.low), str(rule.high))), 'to')}"


@read.register
def _(rule: Whole, value: object) -> int:
    if isinstance(value, bool) or not isinstance(value, int):
        raise QuantityError(shown(value), describe(rule))
    refuse_unless(rule.low <= value <= rule.high, rule, value)
    return value


@describe.register
def _(rule: Flag) -> str:
    return "true or false, without quotes"


@read.register
def _(rule: Flag, value: object) -> bool:
    if not isinstance(value, bool):
        raise QuantityError(shown(value), describe(rule))
    return value


@describe.register
def _(rule: Moment) -> str:
    example = "2026-10-14T14:07:00" if rule.time_of_day else "2026-10-14"
    return f"a {'local date and time' if rule.time_of_day else 'date'} without quotes, as {example}"


@read.register
def _(rule: Moment, value: object) -> datetime.date:
    if not isinstance(value, datetime.date):
        raise QuantityError(shown(value), describe(rule))
    refuse_unless(isinstance(value, datetime.datetime) == rule.time_of_day, rule, value)
    refuse_unless(getattr(value, "tzinfo", None) is None, rule, value)
    return value


@describe.register
def _(rule: Names) -> str:
    return 'a list of names, as ["first name", "second name"]'


@read.register
def _(rule: Names, value: object) -> tuple[str, ...]:
    if not isinstance(value, list) or len(value) > MOST_NAMES:
        raise QuantityError(shown(value), describe(rule))
    return tuple(_one_name(name) for name in value)


def _one_name(value: object) -> str:
    name = Text(name=True)
    if not isinstance(value, str) or not is_printable(value) or not value.strip():
        raise QuantityError(f"{shown(value)} in the list", describe(name))
    return value


@write.register
def _(rule: Names, value: object) -> object:
    return list(value) if isinstance(value, tuple) else value


@describe.register
def _(rule: AccuracyOf) -> str:
    example = f"1 % + {quantity_text(0.02, rule.unit)}"
    return f'percent + floor in quotes, the floor above zero, as "{example}"'


@read.register
def _(rule: AccuracyOf, value: object) -> Accuracy:
    if not isinstance(value, str):
        raise QuantityError(shown(value), describe(rule))
    relative, floor = parse_accuracy(value, rule.unit)
    refuse_unless(relative <= 1.0 and floor > 0.0, rule, value)
    return Accuracy(relative, floor)


@write.register
def _(rule: AccuracyOf, value: object) -> object:
    if not isinstance(value, Accuracy):
        return value
    return f"{quantity_text(value.relative, '%')} + {quantity_text(value.floor, rule.unit)}"


@describe.register
def _(rule: Table) -> str:
    return "a table"


@describe.register
def _(rule: Tables) -> str:
    return f"{rule.least} to {rule.most} tables"
