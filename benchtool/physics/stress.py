"""What the parts on the mains side carry: powers while the board runs, and volts and watts of dropper and bleeder at worst.

Against these figures a replacement is chosen and a bleeder string is judged; what they are compared with is printed on the
part. What stays in the parts after unplugging stands in `discharge`, the moment of switching on in `surge`.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from benchtool.board import Bleeder, Board, Unknown
from benchtool.physics import constants as known
from benchtool.physics import laws
from benchtool.physics.budget import dropper_tolerance
from benchtool.physics.laws import Array
from benchtool.physics.settled import Settled

LEAST_APPARENT = 1e-6
"""Apparent power under which nothing flows and there is no power factor [VA]: a solver's remnant on an open path."""


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
    factor = np.where(apparent > LEAST_APPARENT, real / np.maximum(apparent, LEAST_APPARENT), 0.0)
    return MainsPower(current * inrush, current**2 * inrush, apparent, real, np.minimum(factor, 1.0))


def highest_mains(board: Board) -> float:
    """The highest mains the board may see [V RMS]: nominal · (1 + variation)."""
    return board.mains.voltage * (1.0 + board.mains.variation)


def highest_crest(board: Board) -> float:
    """The crest of the highest mains the board may see [V]: √2 · nominal · (1 + variation)."""
    return float(np.sqrt(2.0)) * highest_mains(board)


@dataclass(frozen=True, slots=True)
class Stress:
    """One part, named as in the case file, at the highest mains: volts [V RMS] and watts [W] on each piece of it.

    `rated` [V RMS] is what the case states for it, None where it states nothing; `watts` None for a capacitor, and where the
    resistance cannot be read.
    """

    part: str
    volts: float
    rated: float | None
    watts: float | None

    @property
    def ratio(self) -> float | None:
        """Volts as a share of the rated ones [1]: over 1 is beyond the rating; None where no rating is stated."""
        return None if self.rated is None else self.volts / self.rated


def mains_stress(board: Board) -> tuple[Stress, ...]:
    """The dropper, a divider's shunt and one resistor of the bleeder string, as far as they are there, at the highest mains."""
    whole = highest_mains(board)
    found = [Stress("dropper", whole, board.dropper.rated_voltage, None)]
    if board.dropper.kind == "divider":
        found.append(Stress("shunt", whole * _divided(board), None, None))
    if board.bleeder is not None:
        found.append(_bleeder(board.bleeder, whole))
    return tuple(found)


def bleeder_share(board: Board) -> float | None:
    """The highest voltage over one resistor of the bleeder string [V]: RMS of the highest mains, shared; None without one."""
    return None if board.bleeder is None else _bleeder(board.bleeder, highest_mains(board)).volts


def _bleeder(bleeder: Bleeder, whole: float) -> Stress:
    """Each resistor with its share of the whole mains over it; the power V²/R at the low end of its tolerance."""
    share = laws.string_share(whole, bleeder.in_series)
    if isinstance(bleeder.resistance, Unknown):
        return Stress("bleeder", share, bleeder.rated_voltage, None)
    tolerance = known.RESISTOR_TOLERANCE if bleeder.tolerance is None else bleeder.tolerance
    return Stress("bleeder", share, bleeder.rated_voltage, share**2 / (bleeder.resistance * (1.0 - tolerance)))


def _divided(board: Board) -> float:
    """Share of the mains over a divider's shunt that no rectifier holds down, dropper high and shunt low in tolerance.

    All of it where one of the two cannot be read: a bound from above. Capacitive divider, Kirchhoff.
    """
    dropper, shunt = board.dropper.capacitance, board.dropper.shunt_capacitance
    if dropper is None or shunt is None or isinstance(dropper, Unknown) or isinstance(shunt, Unknown):
        return 1.0
    tolerance = dropper_tolerance(board)
    high, low = max(dropper, board.dropper.fitted or 0.0) * (1.0 + tolerance), shunt * (1.0 - tolerance)
    return high / (high + low)
