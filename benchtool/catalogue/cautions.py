"""The cautions that stand on every output, with this board's own volts and seconds in them.

Common practice; they defer to local codes and licensed practice. No sentence here, or anywhere, promises that something may be
touched: they say what to measure and the limit it must be under.
"""

from __future__ import annotations

from benchtool.board import Board
from benchtool.physics import constants as known
from benchtool.physics.discharge import Discharge, discharge_of, hold_seconds
from benchtool.quantities import show, show_up

DEFERS = "Local codes and licensed practice come first."


def cautions(board: Board, *, bleeder_read: float | None = None, ascii: bool = False) -> tuple[str, ...]:
    """The standing cautions for `board`, isolation first, then discharge. Times are rounded up.

    `bleeder_read` [ohm]: the bleeder as it was read, infinite for open, None where it was not.
    """
    discharge = discharge_of(board, bleeder_read)
    bleeder = "if its bleeder is whole" if bleeder_read is None else "through its bleeder as read"
    mains = show(board.mains.voltage * (1.0 + board.mains.variation), "V", ascii=ascii)
    hold = show_up(hold_seconds(board, bleeder_read), "s", ascii=ascii)
    dead = show(known.DEAD_VOLTS, "V", ascii=ascii)
    return (
        f"NOT ISOLATED: every point of this board, common included, can be at {mains} to earth. Power it on the bench only "
        "through an isolating transformer, with no earthed instrument on it; isolated is not shock-free, two points still kill.",
        f"STORED CHARGE: {_stored(discharge, bleeder, ascii)} {_off(board)}, {_wait(discharge, ascii)}discharge {_stores(board)} "
        f"through 10 k{'ohm' if ascii else 'Ω'} 5 W, held on each for {hold}, then measure: each of them and the {_ends(board)} "
        f"must be under {dead} on a DC range, an AC range reads a charge as zero. Prove the meter before and after.",
        DEFERS,
    )


def _off(board: Board) -> str:
    """How the mains are taken off: a fixed appliance has no plug to pull."""
    return "Unplug" if board.connected_by == "plug" else "Switch off at the breaker, lock it off, prove it dead, disconnect"


def _ends(board: Board) -> str:
    return "plug pins" if board.connected_by == "plug" else "mains terminals"


def _stores(board: Board) -> str:
    """What to discharge; a resistor in the dropper's place holds nothing, but is hot."""
    if board.dropper.kind == "resistor":
        return "every reservoir (the dropper is a resistor and hot: let it cool)"
    return "the dropper and every reservoir"


def _stored(discharge: Discharge, bleeder: str, ascii: bool) -> str:
    if discharge.capacitance is None and discharge.energy is None and not discharge.limited:
        return "reservoirs stay charged once off the mains."
    volts = show_up(discharge.start, "V", digits=3, ascii=ascii)
    if discharge.to_limit is None:
        return f"the dropper may hold {volts} for hours; nothing known empties it."
    limit = show(known.PLUG_LIMIT_VOLTS, "V", ascii=ascii)
    seconds = show_up(discharge.to_limit, "s", ascii=ascii)
    falls = f"by this supply alone it falls to {limit} in up to {seconds} {bleeder}"
    return f"the dropper may hold {volts} once off the mains; {falls}."


def _wait(discharge: Discharge, ascii: bool) -> str:
    return "" if discharge.wait is None else f"wait {show_up(discharge.wait, 's', digits=3, ascii=ascii)}, "
