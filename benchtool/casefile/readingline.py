"""One typed line → a reading: `rail-voltage 'relay rail' on 'heater relay' 14.2 V`.

Why: at the bench a reading is said in one breath. The line is only put in the order of a `[[reading]]` table
here; what it may say is decided where the file's readings are read.
"""

from __future__ import annotations

import shlex
from collections.abc import Sequence

from benchtool.board import Board
from benchtool.case import Reading
from benchtool.casefile.readings import names_of, read_reading
from benchtool.casefile.schema import Findings, Place
from benchtool.catalogue.readings import READING_KINDS, ReadingKind
from benchtool.errors import CaseError, Problem, QuantityError
from benchtool.printable import quoted
from benchtool.quantities import parse

LONGEST = 500
"""Longest line that is taken for a reading [characters]."""
EXAMPLE = "dropper-capacitance lifted 182n, or rail-voltage 'relay rail' on 'heater relay' 14.2 V"
UNITS = {"clamp": "A", "limit": "V"}
FLAGS: dict[str, tuple[str, object]] = {
    "lifted": ("lifted", True),
    "warm": ("when", "warm"),
    "cold": ("when", "cold"),
}


def parse_reading(text: str, board: Board, name: str = "reading") -> Reading:
    """The reading a line stands for on this board: kind, rail or load, qualifiers, value.

    `name` stands before every problem. CaseError with all problems of the line.
    """
    place = Place((), quoted(text, 60))
    table = _arranged(_words(text, place, name), board)
    findings = Findings()
    reading = read_reading(table, place, board, findings)
    findings.raise_any(name, table)
    return reading


def _words(text: str, place: Place, name: str) -> list[str]:
    try:
        words = shlex.split(text) if len(text) <= LONGEST else []
    except ValueError:
        raise _not_a_reading(name, place, "a quotation mark without its partner") from None
    if not words:
        raise _not_a_reading(name, place, "more text than a reading has" if text.strip() else "nothing")
    return words


def _not_a_reading(name: str, place: Place, found: str) -> CaseError:
    return CaseError(name, [Problem(place.table, "", found, f"a reading, as {EXAMPLE}")])


def _arranged(words: list[str], board: Board) -> dict[str, object]:
    """The words of a line as the table of a reading: used up from the front, the value is what is left."""
    table: dict[str, object] = {"what": words.pop(0)}
    kind = READING_KINDS.get(str(table["what"]))
    if kind is None:
        return table
    for key in kind.needs:
        if name := _take_name(words, names_of(key, board), key):
            table[key] = name
    while words and _take_qualifier(words, kind, board, table):
        pass
    while words and words[-1] in FLAGS:
        key, value = FLAGS[words.pop()]
        table[key] = value
    if words:
        table["value"] = _value(kind, words)
    return table


def _value(kind: ReadingKind, words: list[str]) -> object:
    text = " ".join(words)
    return [word.strip() for word in text.split(",")] if kind.several else text


def _known_name(words: Sequence[str], names: Sequence[str]) -> tuple[str, int] | None:
    """The longest known name that the words begin with, and how many they are: such names need no quotes."""
    for count in range(len(words), 0, -1):
        name = " ".join(words[:count])
        if name in names:
            return name, count
    return None


def _take_name(words: list[str], names: Sequence[str], key: str) -> str | None:
    """A name from the front, the word `rail` or `load` before it allowed; a strange one is taken as it is."""
    if len(words) > 1 and words[0] == key and _known_name(words, names) is None:
        del words[0]
    name, count = _known_name(words, names) or (" ".join(words[:1]), 1)
    del words[:count]
    return name or None


def _take_qualifier(words: list[str], kind: ReadingKind, board: Board, table: dict[str, object]) -> bool:
    """Move one qualifier from the front of the words into the table; False where the value begins."""
    first = words[0]
    if first in FLAGS:
        key, table[key] = FLAGS[words.pop(0)]
    elif first == "on" and len(words) > 1:
        del words[0]
        table["on"] = [*_listed(table.get("on")), *_take_switched(words, board)]
    elif first in UNITS and len(words) > 1:
        del words[0]
        table[first] = _take_quantity(words, UNITS[first])
    elif first in ("rail", "load") and len(words) > 1:
        del words[0]
        table[first] = _take_name(words, names_of(first, board), first)
    else:
        return _take_place(words, kind, board, table)
    return True


def _listed(names: object) -> list[str]:
    return names if isinstance(names, list) else []


def _take_place(words: list[str], kind: ReadingKind, board: Board, table: dict[str, object]) -> bool:
    """The bare name of a rail or load, for a reading that may have one (`look`)."""
    for key in kind.may:
        known = _known_name(words[:-1], names_of(key, board)) if key in ("rail", "load") else None
        if known is not None and key not in table:
            table[key] = known[0]
            del words[: known[1]]
            return True
    return False


def _take_switched(words: list[str], board: Board) -> list[str]:
    """Names of loads after `on`, with or without commas between; never the last word, which is the value."""
    names: list[str] = []
    loads = names_of("load", board)
    while known := _known_name([word.removesuffix(",") for word in words[:-1]], loads):
        names.append(known[0])
        del words[: known[1]]
    return names or [words.pop(0)]


def _take_quantity(words: list[str], unit: str) -> str:
    """A quantity from the front, with or without a space before its unit."""
    pair = " ".join(words[:2])
    try:
        parse(pair, unit)
    except QuantityError:
        return words.pop(0)
    del words[:2]
    return pair
