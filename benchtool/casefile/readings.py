"""The readings of a case file: each kind knows its own qualifiers, words, unit and bounds.

Why apart from the plain tables: what a reading may say hangs on its kind and on the board it was taken from.
The command line's `--reading` comes through here too, so that both refuse the same things in the same words.
"""

from __future__ import annotations

import difflib
import math
from collections.abc import Sequence
from dataclasses import replace

from benchtool.board import Board
from benchtool.case import Reading, ReadingValue
from benchtool.casefile.check import exists
from benchtool.casefile.schema import Findings, Place, Toml, entries_of, read_record, to_toml
from benchtool.casefile.values import bounds_text, in_quotes, quantity_text, spelled
from benchtool.catalogue.accepted import accepted, lacking
from benchtool.catalogue.readings import READING_KINDS, ReadingKind
from benchtool.errors import QuantityError
from benchtool.printable import listed, names_listed, quoted, shown
from benchtool.quantities import parse

MOST_READINGS = 500
QUALIFIERS = ("rail", "load", "on", "lifted", "clamp", "limit")
"""Keys of a reading that only some kinds know; `when` belongs to all."""
OVERLOAD = ("ol", "0l")
"""What ohmmeters show of an open circuit, dots aside. On other ranges the same letters say something else."""
LEAST_LIKE = 0.5
"""How like a known name a wrong one must be for a hint: `12V` is half like `12 V rail`."""


def read_readings(value: object, place: Place, board: Board, findings: Findings) -> tuple[Reading, ...]:
    """The readings under `[[reading]]` or `[[repair.reading]]`."""
    entries = entries_of(value, place, "reading", findings, most=MOST_READINGS)
    return tuple(read_reading(entry, where, board, findings) for entry, where in entries)


def read_reading(data: Toml, place: Place, board: Board, findings: Findings) -> Reading:
    """One reading from its table; what is wrong with it is noted in `findings`."""
    kind = READING_KINDS.get(str(data.get("what")))
    value = _read_value(kind, data, place, board, findings)
    reading = read_record(Reading, data, place, findings, also=("value",), value=value)
    if kind is None:
        findings.add(place, "what", quoted(reading.what), _kinds_like(reading.what))
        return reading
    _check_qualifiers(kind, data, place, board, findings)
    _check_names(reading, place, board, findings)
    _check_board_has_it(kind, reading, place, board, findings)
    return replace(reading, on=reading.on or ()) if "on" in kind.may else reading


def _kinds_like(what: str) -> str:
    meant = difflib.get_close_matches(what, READING_KINDS, n=1)
    hint = f"{meant[0]} (probably meant); all kinds: " if meant else ""
    return hint + listed(READING_KINDS)


def _check_qualifiers(kind: ReadingKind, data: Toml, place: Place, board: Board, findings: Findings) -> None:
    for key in QUALIFIERS:
        if key in kind.needs and key not in data:
            findings.add(place, key, "nothing", f"{names_listed(names_of(key, board))} (required)")
        if key in data and key not in (*kind.needs, *kind.may):
            findings.add(place, key, shown(data[key]), f"no such key with {kind.name}")


def names_of(key: str, board: Board) -> tuple[str, ...]:
    """Names that the qualifier `rail` or `load` may have on this board."""
    return tuple(part.name for part in (board.rails if key == "rail" else board.loads))


def _check_names(reading: Reading, place: Place, board: Board, findings: Findings) -> None:
    for key, name in (("rail", reading.rail), ("load", reading.load)):
        if name is not None and not exists(name, names_of(key, board)):
            findings.add(place, key, quoted(name), _names_like(name, names_of(key, board)))
    on = reading.on or ()
    strange = [name for name in on if not exists(name, board.switched_loads())]
    if strange:
        findings.add(place, "on", quoted(strange[0]), f"switched loads: {_names_like(strange[0], board.switched_loads())}")
    if len(set(on)) < len(on):
        findings.add(place, "on", "a name twice", "each name once")


def _names_like(name: str, names: Sequence[str]) -> str:
    """All names that may stand there, first the one that was probably meant."""
    folded = {known.casefold(): known for known in names}
    meant = difflib.get_close_matches(name.casefold(), folded, n=1, cutoff=LEAST_LIKE)
    if not meant:
        return names_listed(names)
    likely = folded[meant[0]]
    others = [known for known in names if known != likely]
    return listed([f"{quoted(likely, 60)} (probably meant)", *(quoted(other, 60) for other in others)])


def suiting(kind: ReadingKind, key: str, board: Board) -> tuple[str, ...]:
    """Names of the rails or loads, whichever `key` says, where this reading can be taken."""
    if key == "rail":
        return tuple(rail.name for rail in board.rails if lacking(kind, board, rail=rail) is None)
    return tuple(load.name for load in board.loads if lacking(kind, board, load=load) is None)


def _check_board_has_it(
    kind: ReadingKind, reading: Reading, place: Place, board: Board, findings: Findings
) -> None:
    rail = next((rail for rail in board.rails if rail.name == reading.rail), None)
    load = next((load for load in board.loads if load.name == reading.load), None)
    need = lacking(kind, board, rail, load)
    if need is not None:
        key = next(iter(kind.needs), "what")
        others = names_listed(suiting(kind, key, board)) if key != "what" and suiting(kind, key, board) else "other readings"
        findings.add(place, key, quoted(getattr(reading, key)), f"{others}: {need}")


def _read_value(
    kind: ReadingKind | None, data: Toml, place: Place, board: Board, findings: Findings
) -> ReadingValue:
    """The value; NaN where it is missing or refused, or where nobody knows what was read."""
    if kind is None:
        return math.nan
    if "value" not in data:
        findings.add(place, "value", "nothing", f"{_allowed(kind)} (required)")
        return math.nan
    try:
        return read_value(kind, data["value"], board)
    except QuantityError as refusal:
        findings.add(place, "value", refusal.found, refusal.allowed)
        return math.nan


def read_value(kind: ReadingKind, value: object, board: Board) -> ReadingValue:
    """A reading's value: one of its words, several of them, or a number [kind.unit]; else QuantityError."""
    if kind.several:
        return _several_words(kind, value)
    if not isinstance(value, str):
        example = None if kind.unit is None else spelled(value, kind.unit, lambda text: read_value(kind, text, board))
        raise QuantityError(shown(value), _allowed(kind, example))
    word = word_of(kind, value)
    if word is not None:
        return word
    if kind.unit is None:
        raise QuantityError(shown(value), _allowed(kind))
    return _number(kind, kind.unit, value, board)


def word_of(kind: ReadingKind, text: str) -> str | None:
    """The word of this kind that the text is, an ohmmeter's overload sign taken as `open`; None where it is none."""
    plain = _plain(text)
    if kind.unit == "ohm" and "open" in kind.words and plain.replace(".", "") in OVERLOAD:
        return "open"
    return plain if plain in kind.words else None


def _plain(word: str) -> str:
    return " ".join(word.split()).casefold()


def _number(kind: ReadingKind, unit: str, value: str, board: Board) -> float:
    try:
        number = parse(value, unit, bare=True)
    except QuantityError as refusal:
        raise QuantityError(refusal.found, refusal.allowed.rstrip(".") + _or_words(kind)) from None
    low, high = accepted(kind, board)
    if number < low or number > high:
        raise QuantityError(shown(value), bounds_text(low, high, unit) + _or_words(kind) + _if_swapped(kind, number))
    return number


def _if_swapped(kind: ReadingKind, number: float) -> str:
    """A hint where a DC meter shows less than nothing."""
    return "; leads swapped?" if number < 0.0 and (kind.meter or "").startswith("dc_") else ""


def _several_words(kind: ReadingKind, value: object) -> tuple[str, ...]:
    listing = value if isinstance(value, list) else [value]
    words = tuple(_plain(word) if isinstance(word, str) else "" for word in listing)
    strange = [item for item, word in zip(listing, words, strict=True) if word not in kind.words]
    if strange or not words:
        raise QuantityError(shown(strange[0]) if strange else "an empty list", _allowed_words(kind))
    if len(set(words)) < len(words):
        raise QuantityError("a word twice", "each word once")
    if "nothing seen" in words and len(words) > 1:
        raise QuantityError('"nothing seen" beside something seen', "either of the two")
    return words


def _allowed_words(kind: ReadingKind) -> str:
    return f"{'one or several of ' if kind.several else ''}{names_listed(kind.words)}"


def _or_words(kind: ReadingKind) -> str:
    return f"; or {names_listed(kind.words)}" if kind.words else ""


def _allowed(kind: ReadingKind, example: str | None = None) -> str:
    return _allowed_words(kind) if kind.unit is None else in_quotes(kind.unit, example) + _or_words(kind)


def reading_to_toml(reading: Reading) -> dict[str, object]:
    """The table of a reading, the value last."""
    return {**to_toml(reading), "value": _written(reading)}


def _written(reading: Reading) -> object:
    match reading.value:
        case str() as word:
            return word
        case tuple() as words:
            return list(words)
        case number:
            kind = READING_KINDS.get(reading.what)
            return quantity_text(number, kind.unit) if kind and kind.unit else str(number)
