"""The rectifier for one step of the mains cycle: what it passes on into the first rail, in every state of its junctions.

It is fed by an open-circuit voltage behind a resistance (mains, dropper and whatever stands across its input, as `cycle.py`
leaves them for this step). Its own diodes drop what they dropped at the current of the step before, by their exponential law:
against the crest of the mains that is exact enough, and it leaves the rail's equation linear but for the zeners.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from benchtool.physics import branches
from benchtool.physics import constants as known
from benchtool.physics.branches import Branch
from benchtool.physics.laws import Array
from benchtool.physics.specimens import Junction, Specimens

NODE_ROUNDS = 4
LEAST_CURRENT = 1e-6
"""Current below which a diode's drop is not followed any further [A]."""


@dataclass(frozen=True, slots=True)
class Legs:
    """How current gets through: `full_wave` folds both half cycles onto the rail; `diodes` stand before it, None: no way;
    `returns`: the other half cycle has its way back; `node_shorted`: a shorted return diode across the input.
    """

    full_wave: bool
    diodes: int | None
    returns: bool
    node_shorted: bool = False


BRIDGE: dict[Junction, Legs] = {
    Junction.GOOD: Legs(full_wave=True, diodes=2, returns=False),
    Junction.SERIES_OPEN: Legs(full_wave=False, diodes=2, returns=False),
    Junction.SERIES_SHORT: Legs(full_wave=False, diodes=1, returns=True),
}
"""All four junctions are alike; one shorted makes a half-wave rectifier of it."""
HALF_WAVE: dict[Junction, Legs] = {
    Junction.GOOD: Legs(full_wave=False, diodes=1, returns=True),
    Junction.SERIES_OPEN: Legs(full_wave=False, diodes=None, returns=True),
    Junction.SERIES_SHORT: Legs(full_wave=False, diodes=0, returns=True),
    Junction.RETURN_OPEN: Legs(full_wave=False, diodes=1, returns=False),
    Junction.RETURN_SHORT: Legs(full_wave=False, diodes=1, returns=True, node_shorted=True),
}
LEGS = {"bridge": BRIDGE, "half-wave": HALF_WAVE, "half-wave-zener": HALF_WAVE}
"""By the board's rectifier, then by junction state; a half-wave-zener's way back is its zener."""


@dataclass(frozen=True, slots=True)
class Node:
    """The dropper node [V], and what its zener and the series diode carry there: current [A] and slope [S]; each (n,)."""

    volts: Array
    zener: Branch
    diode: Branch


class Rectifier:
    """The rectifier of specimens that share one junction state."""

    def __init__(self, specimens: Specimens) -> None:
        self.legs = LEGS[specimens.shape.rectifier][Junction(int(specimens.junction[0]))]
        at_node = specimens.shape.zener_at_node
        self.zener = specimens.zener[0] if at_node and self.legs.diodes != 0 else None
        self.drop = np.full(specimens.count, known.DIODE_DROP)
        self._returns = np.isfinite(specimens.zener[0]) if at_node else np.full(specimens.count, self.legs.returns)
        self.blocks = ~self._returns & (not self.legs.full_wave) & (self.legs.diodes is not None)
        shorted = 1.0 / known.SHORTED_JUNCTION if self.legs.node_shorted else 0.0
        self.input_conductance = shorted + (1.0 / specimens.zener_short[0] if at_node else np.zeros(specimens.count))

    def part(self, specimens: Specimens, index: NDArray[np.intp]) -> Rectifier:
        """The rectifier of those of its `specimens` that stand at `index`, its diodes' drops kept."""
        part = Rectifier(specimens)
        part.drop = self.drop[index]
        return part

    def drive(self, voltage: Array) -> Array:
        """The open-circuit voltage [V] as the rail sees it."""
        return np.abs(voltage) if self.legs.full_wave else voltage

    def into_rail(self, drive: Array, resistance: Array, rail: Array) -> Branch:
        """Current into the first rail standing at `rail` [V], and its slope against that (negative) [A, S]."""
        if self.legs.diodes is None:
            return np.zeros_like(rail), np.zeros_like(rail)
        if self.legs.diodes == 0:
            return self._tied(drive, resistance, rail)
        if self.zener is not None:
            node = self._node(drive, resistance, rail)
            through = node.diode[1] / (1.0 / resistance + node.zener[1] + node.diode[1])
            return node.diode[0], -through * (1.0 / resistance + node.zener[1])
        current = (drive - rail - self.legs.diodes * self.drop) / resistance
        conducts = current > 0.0
        return np.where(conducts, current, 0.0), np.where(conducts, -1.0 / resistance, 0.0)

    @staticmethod
    def _tied(drive: Array, resistance: Array, rail: Array) -> Branch:
        """A shorted series diode ties the rail to the input, both ways; the return diode catches it under common."""
        resistance = resistance + known.SHORTED_JUNCTION
        caught, steep = branches.junction(-rail, known.DIODE_DROP, known.DIODE_CURRENT, known.DIODE_SLOPE)
        return (drive - rail) / resistance + caught, -1.0 / resistance - steep

    def landing(
        self, drive: Array, resistance: Array, rail: Array, move: Array, current: Array, slope: Array | float
    ) -> Array:
        """Where a first rail at `rail` [V] goes that Newton's method would `move` [V] across the zener's knee at the node, from
        `current` [A] into it and the `slope` [S] of its surplus: to the voltage at which the diode passes what is wanted there.
        """
        assert self.zener is not None
        target, knee = rail + move, self.zener - known.DIODE_DROP
        crosses = (np.abs(target - knee) > known.ZENER_SLOPE) & ((target > knee) == (rail < knee))
        if not crosses.any():
            return target
        wanted = np.where(crosses, current + slope * (target - knee), 0.0)
        left = (drive - self.zener) / resistance - wanted
        lands = known.ZENER_SLOPE * np.log(np.maximum(left, LEAST_CURRENT) / known.ZENER_CURRENT)
        lands = knee + lands - known.DIODE_SLOPE * np.log(np.maximum(wanted, LEAST_CURRENT) / known.DIODE_CURRENT)
        return np.where(crosses, np.clip(lands, np.minimum(rail, target), np.maximum(rail, target)), target)

    def finish(self, drive: Array, resistance: Array, rail: Array, current: Array) -> tuple[Array, Array, Array]:
        """Once the step is solved: current through the input [A], signed like the drive; the node zener's reverse current [A]
        and its voltage [V] (nil without one).
        """
        nothing = np.zeros_like(rail)
        if self.legs.diodes == 0:
            return (drive - rail) / (resistance + known.SHORTED_JUNCTION), nothing, nothing
        back = np.where(self._returns & (drive < -self.drop), (drive + known.DIODE_DROP) / resistance, 0.0)
        if self.zener is None:
            self._follow(current)
            return current + back, nothing, nothing
        node = self._node(drive, resistance, rail)
        passed = node.diode[0] if self.legs.diodes is not None else nothing
        return passed + node.zener[0] + back, node.zener[0], np.where(back < 0.0, -known.DIODE_DROP, node.volts)

    def _node(self, drive: Array, resistance: Array, rail: Array) -> Node:
        """The dropper node between the zener and the series diode, solved for its voltage by Newton's method from above.

        Either alone would stand higher for all of the current, so the lower of the two is a start that is never too low.
        """
        assert self.zener is not None
        diode_foot = rail if self.legs.diodes is not None else np.full_like(rail, np.inf)
        lowest = np.minimum(self.zener, diode_foot)
        whole = np.maximum(drive - lowest, 0.0) / resistance + LEAST_CURRENT
        by_zener = self.zener + known.ZENER_SLOPE * np.log(whole / known.ZENER_CURRENT)
        by_diode = diode_foot + known.DIODE_DROP + known.DIODE_SLOPE * np.log(whole / known.DIODE_CURRENT)
        volts = np.minimum(np.minimum(by_zener, by_diode), drive)
        for _ in range(NODE_ROUNDS):
            zener = branches.junction(volts, self.zener, known.ZENER_CURRENT, known.ZENER_SLOPE)
            diode = branches.junction(volts - diode_foot, known.DIODE_DROP, known.DIODE_CURRENT, known.DIODE_SLOPE)
            surplus = (drive - volts) / resistance - zener[0] - diode[0]
            volts = volts + surplus / (1.0 / resistance + zener[1] + diode[1])
        return Node(volts, zener, diode)

    def _follow(self, current: Array) -> None:
        """The diodes' drop at the current of this step, for the next one; kept while they rest."""
        seen = np.maximum(current, LEAST_CURRENT)
        drop = known.DIODE_DROP + known.DIODE_SLOPE * np.log(seen / known.DIODE_CURRENT)
        self.drop = np.where(current > LEAST_CURRENT, drop, self.drop)
