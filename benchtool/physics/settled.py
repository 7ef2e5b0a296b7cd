"""What a solver hands back: the settled state of every specimen. Readings, budget and diagnosis know this and no solver."""

from __future__ import annotations

from dataclasses import dataclass

from benchtool.physics.laws import Array
from benchtool.physics.specimens import Specimens


@dataclass(frozen=True, slots=True, kw_only=True)
class Settled:
    """Means over a mains cycle in one switched state. (n,) unless a first axis is named.

    rail_voltage (rails, n) [V]; ripple_pp (rails, n) [V]; zener_current (rails, n) [A], mean reverse; zener_power (rails, n)
    [W]; supply_current [A] out of the rectifier into the first rail; line_current [A RMS]; dropper_voltage [V RMS];
    dropper_dc [V]; load_voltage, load_current (loads, n) [V, A]; converged: whether this specimen's balance was met.
    """

    specimens: Specimens
    rail_voltage: Array
    ripple_pp: Array
    zener_current: Array
    zener_power: Array
    supply_current: Array
    line_current: Array
    dropper_voltage: Array
    dropper_dc: Array
    load_voltage: Array
    load_current: Array
    converged: Array

    @property
    def rectified_current(self) -> Array:
        """Mean current that the rectifier carries [A], a zener at the dropper node included, (n,)."""
        at_node = self.specimens.shape.zener_at_node
        return self.supply_current + self.zener_current[0] if at_node else self.supply_current
