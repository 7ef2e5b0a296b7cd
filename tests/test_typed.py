"""The line to type for a check: what `words.typed` says is what `parse_reading` takes."""

from __future__ import annotations

from dataclasses import replace

import pytest

from benchtool.board import Board
from benchtool.casefile import parse_reading
from benchtool.catalogue.readings import READING_KINDS
from benchtool.diagnosis.checks import candidates
from benchtool.observed import Check, Reading
from benchtool.words import BLANK, typed
from tests.some_boards import every_board

SI = {"V": 7.0, "nF": 7e-9, "uF": 7e-6, "mA": 7e-3, "ohm": 7.0}


def renamed(board: Board, names: dict[str, str]) -> Board:
    """The board with other names for its rails and loads."""
    rails = tuple(
        replace(rail, name=names.get(rail.name, rail.name), fed_by=names.get(rail.fed_by, rail.fed_by)) for rail in board.rails
    )
    loads = tuple(
        replace(load, name=names.get(load.name, load.name), rail=names.get(load.rail, load.rail)) for load in board.loads
    )
    return replace(board, rails=rails, loads=loads)


ODD = {"upper": "24 V", "lower": "on", "controller": "driver's \"chip\"", "relay": "7 V lamp,", "heater": "warm", "lamp": "rail"}
BOARDS = {**every_board(), "odd names": renamed(every_board()["full"], ODD)}


@pytest.mark.parametrize("name", BOARDS)
def test_every_line_with_a_value_put_in_is_the_reading_of_its_check(name: str) -> None:
    board = BOARDS[name]
    for check in candidates(board, ()):
        line = typed(check)
        kind = READING_KINDS[check.what]
        if kind.unit is None:
            word = kind.words[-1]
            line = f"{line.removesuffix('|'.join(kind.words))}{word}"
            value: float | str | tuple[str, ...] = (word,) if kind.several else word
        else:
            line, value = line.replace(BLANK, "7"), SI[line.split()[-1]]
        assert parse_reading(line, board) == Reading(
            what=check.what, rail=check.rail, load=check.load, on=check.on, when=check.when, lifted=check.lifted, value=value
        ), line


@pytest.mark.parametrize(
    ("check", "line"),
    [
        (
            Check(what="rail-voltage", rail="relay rail", on=("heater relay",)),
            "rail-voltage 'relay rail' on 'heater relay' … V",
        ),
        (Check(what="rail-voltage", rail="relay rail", on=(), when="warm"), "rail-voltage 'relay rail' warm … V"),
        (Check(what="dropper-capacitance", lifted=True), "dropper-capacitance lifted … nF"),
        (Check(what="reservoir-capacitance", rail="relay rail"), "reservoir-capacitance 'relay rail' … uF"),
        (Check(what="rectifier-test"), "rectifier-test good|open|short"),
        (
            Check(what="rail-injection", rail="logic rail", on=(), clamp=0.02, limit=6.0),
            "rail-injection 'logic rail' clamp 20 mA limit 6 V … V",
        ),
        (Check(what="tap-test"), "tap-test no change|cuts out|comes back"),
    ],
)
def test_lines(check: Check, line: str) -> None:
    assert typed(check) == line


def test_a_look_names_what_its_place_is() -> None:
    assert typed(Check(what="look", rail="relay rail")).startswith("look rail 'relay rail' nothing seen|")
