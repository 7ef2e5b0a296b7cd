"""Readings given on the command line: all of them read, or every problem of every one told at once.

Why they are merged here: a point that is measured again is the same point, and what stood there before no longer counts.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

from benchtool.board import Board
from benchtool.casefile import file_name, parse_reading
from benchtool.catalogue.readings import READING_KINDS
from benchtool.errors import CaseError, Problem
from benchtool.observed import Check, Reading
from benchtool.report.layout import Line, Page, paragraph
from benchtool.words import Words, value_of

OPTION = "--reading"


def given_readings(texts: Sequence[str], board: Board) -> tuple[Reading, ...]:
    """The readings that the lines stand for on this board. CaseError with the problems of all lines."""
    readings: list[Reading] = []
    problems: list[Problem] = []
    for text in texts:
        try:
            readings.append(parse_reading(text, board, OPTION))
        except CaseError as refused:
            problems.extend(refused.problems)
    if problems:
        raise CaseError(OPTION, problems)
    return tuple(readings)


@dataclass(frozen=True, slots=True)
class Merged:
    """A case's readings with the given ones: how many of them are new, and which (old, new) took an older one's place."""

    readings: tuple[Reading, ...]
    new: int
    replaced: tuple[tuple[Reading, Reading], ...]


def merged(readings: Sequence[Reading], given: Sequence[Reading]) -> Merged:
    """The readings with those given, each in the place of an older one of the same point, or else behind all."""
    kept = list(readings)
    replaced = []
    for new in given:
        place = next((index for index, old in enumerate(kept) if _same_point(old, new)), None)
        if place is None:
            kept.append(new)
        elif kept[place].value != new.value:
            replaced.append((kept[place], new))
            kept[place] = new
    return Merged(tuple(kept), sum(reading not in readings for reading in kept), tuple(replaced))


def _same_point(old: Reading, new: Reading) -> bool:
    """Whether both read one thing in one condition; what is seen at a look adds to what was seen before."""
    several = READING_KINDS[new.what].several
    return _point(old) == _point(new) and (not several or old.value == new.value)


def _point(reading: Reading) -> Check:
    return replace(reading.check, on=tuple(sorted(reading.on or ())))


def replaced_lines(merge: Merged, board: Board, page: Page, *, saved: bool) -> list[Line]:
    """A line for every reading that took the place of another."""
    words = Words(board, short=page.narrow)
    lines = []
    for old, new in merge.replaced:
        before, after = value_of(old), value_of(new)
        what = f"Replaced {before} by {after}" if saved else f"{after} counts in place of {before}"
        lines.extend(paragraph(page, f"{what}: {words.check(new)}.", rest="  "))
    return lines


def saved_lines(merge: Merged, path: str, backup: str | None, page: Page) -> list[Line]:
    """What a save did to the file, and where the file before is."""
    name = file_name(path)
    if backup is None:
        return paragraph(page, f"Nothing to keep: {name} says so already.", rest="  ")
    readings = f"{merge.new} reading{'' if merge.new == 1 else 's'}"
    return paragraph(page, f"Kept {readings} in {name}; the file before is {backup}.", rest="  ")
