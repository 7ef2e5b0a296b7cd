"""What a solver hands back: the settled state of every specimen. Readings, budget and diagnosis know this and no solver."""

from __future__ import annotations

from dataclasses import dataclass

from benchtool.physics.laws import Array, Flags
from benchtool.physics.specimens import Specimens


@dataclass(frozen=True, slots=True, kw_only=True)
class Settled:
    """Means over a mains cycle in one switched state. (n,) unless a first axis is named.

    rail_voltage (rails, n) [V]; ripple_pp, ripple_rms (rails, n) [V] at the rail's terminals, ESR included; zener_current
    (rails, n) [A], mean reverse; zener_power (rails, n) [W]; supply_current [A] out of the rectifier into the first rail;
    line_current [A RMS]; real_power [W]; dropper_voltage [V RMS] without its DC; dropper_dc [V], magnitude; load_voltage,
    load_current (loads, n) [V, A]; line_average, dropper_average, ripple_average: line_current, dropper_voltage and ripple_rms
    as an average-responding meter shows them; converged: whether this specimen's cycle repeats.
    """

    specimens: Specimens
    rail_voltage: Array
    ripple_pp: Array
    ripple_rms: Array
    zener_current: Array
    zener_power: Array
    supply_current: Array
    line_current: Array
    real_power: Array
    dropper_voltage: Array
    dropper_dc: Array
    line_average: Array
    dropper_average: Array
    ripple_average: Array
    load_voltage: Array
    load_current: Array
    converged: Flags
