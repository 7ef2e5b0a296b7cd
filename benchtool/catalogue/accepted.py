"""Which readings a board allows, and between which bounds a file takes their numbers.

Why apart from the file reader: the diagnosis spreads its "unexplained" evenly over the same bounds and
proposes only readings that the same rules admit. Wide on purpose: 600 V on a rail can be true, and kills.
"""

from __future__ import annotations

from collections.abc import Callable

from benchtool.board import Board, Load, Rail
from benchtool.catalogue.readings import ReadingKind
from benchtool.physics.stress import highest_crest

RAIL_OVER_CREST = 2.2
"""A half-wave board with an open zener pumps its rail to twice the crest; the case format's section 4."""
DROPPER_OVER_CREST = 2.0
AC_OVER_NOMINAL = 1.6

BOUND_BY_CREST = {
    "rail-voltage": RAIL_OVER_CREST,
    "rail-ripple": RAIL_OVER_CREST,
    "rail-ripple-rms": RAIL_OVER_CREST,
    "rail-injection": RAIL_OVER_CREST,
    "dropper-dc-voltage": DROPPER_OVER_CREST,
}
BOUND_BY_NOMINAL = {
    "dropper-voltage": AC_OVER_NOMINAL,
    "inrush-voltage": AC_OVER_NOMINAL,
    "mains-voltage": AC_OVER_NOMINAL,
}


def accepted(kind: ReadingKind, board: Board) -> tuple[float, float]:
    """Lowest and highest number that a file may hold for this reading [kind.unit].

    KeyError for a kind that has neither a bound of its own nor one set by the board: those read words only.
    Source: the case format's section 4, "What a file accepts".
    """
    if kind.high is not None:
        return kind.low, kind.high
    if kind.name in BOUND_BY_CREST:
        return kind.low, BOUND_BY_CREST[kind.name] * highest_crest(board)
    return kind.low, BOUND_BY_NOMINAL[kind.name] * board.mains.voltage


UNREAD = ""
"""What stands in a record for a word of the file that was refused: nothing that hangs on it is judged."""


def _without(part: str, table: str | None = None) -> str:
    return f"this board has no {part}; [board.{table or part}] would add one"


def _bare(part: str) -> str:
    return f"this rail has no {part}; {part} = {{ ... }} in its table would add one"


BOARD_HAS: dict[str, tuple[Callable[[Board], bool], str]] = {
    "inrush-voltage": (lambda board: board.inrush is not None, _without("inrush resistor", "inrush")),
    "inrush-resistance": (lambda board: board.inrush is not None, _without("inrush resistor", "inrush")),
    "fuse-resistance": (lambda board: board.fuse is not None, _without("fuse")),
    "varistor-resistance": (lambda board: board.varistor is not None, _without("varistor")),
    "bleeder-resistance": (lambda board: board.bleeder is not None, _without("bleeder")),
    "shunt-capacitance": (
        lambda board: board.dropper.kind in ("divider", UNREAD),
        'this board\'s dropper is no divider; kind = "divider" in [board.dropper] would say it is',
    ),
    "dropper-capacitance": (
        lambda board: board.dropper.kind != "resistor",
        "this board's dropper is a resistor, not a capacitor",
    ),
}
RAIL_HAS: dict[str, tuple[Callable[[Rail], bool], str]] = {
    "feed-resistance": (
        lambda rail: rail.fed_through in ("resistor", UNREAD),
        "this rail is not fed through a resistor",
    ),
    "zener-test": (lambda rail: rail.zener is not None, _bare("zener")),
    "reservoir-capacitance": (lambda rail: rail.reservoir is not None, _bare("reservoir")),
    "reservoir-esr": (lambda rail: rail.reservoir is not None, _bare("reservoir")),
    "reservoir-leakage": (lambda rail: rail.reservoir is not None, _bare("reservoir")),
}
LOAD_HAS: dict[str, tuple[Callable[[Load], bool], str]] = {
    "coil-resistance": (
        lambda load: load.kind in ("coil", UNREAD),
        'this load is no coil; kind = "coil" in its table would say it is',
    ),
    "switch-test": (lambda load: load.switched, "this load is not switched; switched = true in its table would say it is"),
}


def lacking(
    kind: ReadingKind, board: Board, rail: Rail | None = None, load: Load | None = None
) -> str | None:
    """Why this reading cannot be taken on the board, rail or load, and what would change it; None where it can be taken."""
    if kind.name in BOARD_HAS:
        holds, need = BOARD_HAS[kind.name]
        return None if holds(board) else need
    if rail is not None and kind.name in RAIL_HAS:
        fits_rail, need = RAIL_HAS[kind.name]
        return None if fits_rail(rail) else need
    if load is not None and kind.name in LOAD_HAS:
        fits_load, need = LOAD_HAS[kind.name]
        return None if fits_load(load) else need
    return None
