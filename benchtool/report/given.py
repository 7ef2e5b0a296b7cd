"""Readings given on the command line: all of them read, or every problem of every one told at once."""

from __future__ import annotations

from collections.abc import Sequence

from benchtool.board import Board
from benchtool.casefile import parse_reading
from benchtool.errors import CaseError, Problem
from benchtool.observed import Reading

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
