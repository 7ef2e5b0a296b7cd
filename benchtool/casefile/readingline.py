"""One typed line → a reading: `rail-voltage 'relay rail' on 'heater relay' 14.2 V`.

Why: at the bench a reading is said in one breath. The line is only put in the order of a `[[reading]]` table
here; what it may say is decided where the file's readings are read.
"""

from __future__ import annotations

import shlex
from collections.abc import Sequence

from benchtool.board import Board
from benchtool.case import Reading
from benchtool.casefile.readings import names_of, read_reading, suiting, word_of
from benchtool.casefile.schema import Findings, Place
from benchtool.catalogue.readings import READING_KINDS, READINGS, ReadingKind
from benchtool.errors import CaseError, Problem, QuantityError
from benchtool.printable import names_listed, quoted
from benchtool.quantities import parse

LONGEST = 3000
"""Longest line that is taken for a reading [characters]: forty loads may be on, each with a name of sixty."""
EXAMPLE = "dropper-capacitance lifted 182n, or rail-voltage 'relay rail' on 'heater relay' 14.2 V"
MOST_WORDS = 30
"""Most words of a name, which has at most sixty characters."""
UNITS = {"clamp": "A", "limit": "V"}
READ_IN = tuple(dict.fromkeys(kind.unit for kind in READINGS if kind.unit is not None))
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
    _ask_where(table, place, board, findings)
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
    """The words of a line as the table of a reading: what, where, then qualifiers around the value."""
    what, *words = words
    kind = READING_KINDS.get(what)
    if kind is None:
        return {"what": what}
    place: dict[str, object] = {"what": what}
    for key in kind.needs:
        if name := _take_place_needed(words, kind, key, board):
            place[key] = name
    return {**place, **_qualified(words, kind, board)}


def _ask_where(table: dict[str, object], place: Place, board: Board, findings: Findings) -> None:
    """A problem where a line leaves open which of several rails or loads it means."""
    kind = READING_KINDS.get(str(table["what"]))
    for key in kind.needs if kind is not None else ():
        if kind is not None and key not in table:
            suits = suiting(kind, key, board)
            which = f"say which {key} first: {names_listed(suits)}"
            none = f"other readings: no {key} of this board suits {kind.name}"
            findings.add(place, key, "nothing", which if suits else none)


def _take_place_needed(words: list[str], kind: ReadingKind, key: str, board: Board) -> str | None:
    """The rail or load from the front of the words; one left out is taken where only one suits, else None.

    A strange name reaches as far as leaves a value behind it.
    """
    names = names_of(key, board)
    if len(words) > 1 and words[0] == key and _known_name(words, names) is None:
        del words[0]
    if _known_name(words, names) is not None:
        return _take_name(words, names, key)
    starts = range(min(len(words), MOST_WORDS))
    count = next((start for start in starts if _is_value(words[start:], kind, board)), 1 if words else 0)
    if count == 0:
        suits = suiting(kind, key, board)
        return suits[0] if len(suits) == 1 else None
    name = " ".join(words[:count])
    del words[:count]
    return name


def _is_value(words: list[str], kind: ReadingKind, board: Board) -> bool:
    """Whether the words are a value with its qualifiers: a word of the kind, or a quantity in whatever unit."""
    value = str(_qualified([*words], kind, board).get("value", ""))
    return word_of(kind, value) is not None or any(_is_quantity(value, unit) for unit in READ_IN)


def _is_quantity(text: str, unit: str) -> bool:
    try:
        parse(text, unit, bare=True)
    except QuantityError:
        return False
    return True


def _qualified(words: list[str], kind: ReadingKind, board: Board) -> dict[str, object]:
    """Qualifiers before and behind the value, and the value, which is what is left."""
    table: dict[str, object] = {}
    while words and _take_qualifier(words, kind, board, table):
        pass
    while words and _take_behind(words, board, table):
        pass
    if words:
        table["value"] = _value(kind, words)
    return table


def _take_behind(words: list[str], board: Board, table: dict[str, object]) -> bool:
    """Move a flag, or `on` with its loads, from behind the value into the table; False where there is none."""
    if words[-1] in FLAGS:
        key, table[key] = FLAGS[words.pop()]
    elif "on" in words[1:-1]:
        start = words.index("on", 1)
        table["on"] = [*_listed(table.get("on")), *_loads_in(words[start + 1 :], board)]
        del words[start:]
    else:
        return False
    return True


def _loads_in(words: list[str], board: Board) -> list[str]:
    """Names of loads that fill the words to their end; what is none of them is one strange name."""
    names: list[str] = []
    while words and (known := _known_load(words, board)):
        names.append(known[0])
        del words[: known[1]]
    return [*names, " ".join(words)] if words else names


def _value(kind: ReadingKind, words: list[str]) -> object:
    text = " ".join(words)
    return [word.strip() for word in text.split(",")] if kind.several else text


def _known_name(words: Sequence[str], names: Sequence[str]) -> tuple[str, int] | None:
    """The longest known name that the words begin with, and how many they are: such names need no quotes."""
    for count in range(min(len(words), MOST_WORDS), 0, -1):
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
    while known := _known_load(words[:-1], board):
        names.append(known[0])
        del words[: known[1]]
    return names or [words.pop(0)]


def _known_load(words: Sequence[str], board: Board) -> tuple[str, int] | None:
    """A load's name that the words begin with, a comma behind it or not, and how many words it is."""
    names = names_of("load", board)
    return _known_name(words, names) or _known_name([word.removesuffix(",") for word in words], names)


def _take_quantity(words: list[str], unit: str) -> str:
    """A quantity from the front, with or without a space before its unit."""
    pair = " ".join(words[:2])
    try:
        parse(pair, unit)
    except QuantityError:
        return words.pop(0)
    del words[:2]
    return pair
