"""What the parts and the mains carry: powers, bleeder strings, stored charge and the time it takes to leave."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from benchtool.board import Board, Unknown
from benchtool.physics import constants as known
from benchtool.physics import laws
from benchtool.physics.budget import dropper_tolerance
from benchtool.physics.laws import Array
from benchtool.physics.settled import Settled


@dataclass(frozen=True, slots=True)
class MainsPower:
    """Each (n,): inrush resistor's voltage [V RMS] and power [W], apparent [VA] and real [W] power, power factor [1]."""

    inrush_voltage: Array
    inrush_power: Array
    apparent: Array
    real: Array
    factor: Array


def mains_power(settled: Settled) -> MainsPower:
    """Powers on the mains side; the dropper's dielectric loss, which the cycle leaves out, is added to the real power."""
    specimens = settled.specimens
    current = settled.line_current
    inrush = np.where(np.isfinite(specimens.inrush), specimens.inrush, 0.0)
    loss = 2.0 * np.pi * specimens.frequency * specimens.capacitance * known.DROPPER_LOSS_TANGENT
    real = settled.real_power + loss * settled.dropper_voltage**2
    apparent = specimens.mains * current
    factor = real / np.maximum(apparent, 1e-12)
    return MainsPower(current * inrush, current**2 * inrush, apparent, real, np.minimum(factor, 1.0))


def highest_crest(board: Board) -> float:
    """The crest of the highest mains the board may see [V]: √2 · nominal · (1 + variation)."""
    return float(np.sqrt(2.0)) * board.mains.voltage * (1.0 + board.mains.variation)


TIME_CONSTANTS = 5.0
"""Time constants to wait before the discharge by hand: 0.7 % of the crest is left. Common practice, no source."""
SHORTEST_BLEEDER = 1.0
"""A bleeder read under this counts as this [ohm]: no meter tells it from its leads."""


@dataclass(frozen=True, slots=True)
class Discharge:
    """What the dropper keeps after unplugging, in the slowest corner: capacitance [F], bleeder [ohm], times [s].

    None where a value cannot be known; `bleeder` and the times are None as well where `has_bleeder` is false: none is fitted,
    or it was read open. `wait` is in whole `TIME_CONSTANTS` seconds. `left` [V] is
    what the pins still hold when the limit's time is over. `limited`: whether a limit at the plug applies at all
    (plug-connected and over 0.1 µF).
    """

    start: float
    capacitance: float | None
    bleeder: float | None
    to_limit: float | None
    left: float | None
    wait: float | None
    energy: float | None
    limited: bool
    has_bleeder: bool

    @property
    def slow(self) -> bool | None:
        """Whether the plug stays above its limit for too long; None where that cannot be known."""
        if not self.limited:
            return False
        if self.to_limit is not None:
            return self.to_limit > known.PLUG_LIMIT_SECONDS
        return None if self.has_bleeder else True


def discharge_of(board: Board, bleeder_read: float | None = None) -> Discharge:
    """The dropper's discharge through its bleeder: highest crest, dropper and bleeder at the high end of their tolerance.

    `bleeder_read` [ohm] is what the whole string was read as, infinite for open; it stands in the mark's place.
    """
    capacitance, bleeder = _highest_capacitance(board), _bleeder(board, bleeder_read)
    start = highest_crest(board)
    time, wait, left = None, None, None
    if capacitance is not None and bleeder is not None:
        time = float(laws.discharge_time(start, bleeder, capacitance, known.PLUG_LIMIT_VOLTS))
        left = float(laws.discharge_voltage(start, bleeder, capacitance, known.PLUG_LIMIT_SECONDS))
        wait = TIME_CONSTANTS * float(np.ceil(bleeder * capacitance))
    return Discharge(
        start=start,
        capacitance=capacitance,
        bleeder=bleeder,
        to_limit=time,
        left=left,
        wait=wait,
        energy=None if capacitance is None else 0.5 * capacitance * start**2,
        limited=_limited(board),
        has_bleeder=board.bleeder is not None and bleeder_read != math.inf,
    )


def _limited(board: Board) -> bool:
    """The limit speaks of the rated capacitance; one that cannot be read may be over the exempt one."""
    marked = board.dropper.capacitance
    if board.connected_by == "fixed" or marked is None:
        return False
    return isinstance(marked, Unknown) or max(marked, board.dropper.fitted or 0.0) > known.PLUG_EXEMPT


def _highest_capacitance(board: Board) -> float | None:
    value = board.dropper.capacitance
    if board.dropper.kind == "resistor" or value is None or isinstance(value, Unknown):
        return None
    fitted = board.dropper.fitted or 0.0
    return max(value, fitted) * (1.0 + dropper_tolerance(board))


def _bleeder(board: Board, read: float | None) -> float | None:
    if read is None or board.bleeder is None:
        return _highest_bleeder(board)
    return None if read == math.inf else max(read, SHORTEST_BLEEDER)


def _highest_bleeder(board: Board) -> float | None:
    bleeder = board.bleeder
    if bleeder is None or isinstance(bleeder.resistance, Unknown):
        return None
    tolerance = known.RESISTOR_TOLERANCE if bleeder.tolerance is None else bleeder.tolerance
    return bleeder.resistance * bleeder.in_series * (1.0 + tolerance)


def bleeder_share(board: Board) -> float | None:
    """The highest voltage over one resistor of the bleeder string [V]: RMS of the highest mains, shared; None without one."""
    if board.bleeder is None:
        return None
    return laws.string_share(board.mains.voltage * (1.0 + board.mains.variation), board.bleeder.in_series)

