"""One mains cycle in equal steps, for all specimens of one junction state at once.

Each step is implicit: the dropper and every reservoir act as a resistance with what they already hold behind it (backward
Euler, which keeps the charge exactly). The resistance that this adds in series with a capacitor, half a step over C, is taken out
of the real one again as far as that reaches, so that a step's phase error does not pass for a larger series resistance.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from benchtool.physics import constants as known
from benchtool.physics.branches import Branch
from benchtool.physics.laws import Array
from benchtool.physics.network import Balance, Network, across, add_loads, add_rails, rail_zener
from benchtool.physics.rectifier import Rectifier

DAMPING = (1.0, 1.0, 1.0, 1.0, 1.0, 0.6, 1.0, 0.4, 0.6, 1.0, 0.3, 0.6, 1.0)
"""Share of Newton's move that each round of a step takes: a rail that hops over a bend and back is caught by the lesser ones."""
STANDS = 1e-3
"""Newton's method ends a step when no rail moves by more than this any more [V]: the error left is its square over a knee."""
UNPLUGGED = 1e12
"""Resistance of an open path [ohm]."""
TINY = 1e-18


@dataclass(frozen=True, slots=True)
class Held:
    """What is carried from step to step [V]: over the dropper and the rectifier's input (n,); reservoirs and rails (rails, n)."""

    dropper: Array
    input: Array
    reservoirs: Array
    rails: Array


class Measured:
    """Sums over one cycle's steps; see `Cycle.run`."""

    def __init__(self, rails: int, count: int) -> None:
        shape = (rails, count)
        self.rail, self.rail_square = np.zeros(shape), np.zeros(shape)
        self.highest, self.lowest = np.full(shape, -np.inf), np.full(shape, np.inf)
        self.zener, self.zener_power = np.zeros(shape), np.zeros(shape)
        self.supply, self.supply_slope = np.zeros(count), np.zeros(count)
        self.line, self.line_square, self.real = np.zeros(count), np.zeros(count), np.zeros(count)
        self.dropper, self.dropper_square = np.zeros(count), np.zeros(count)
        self.moved = np.zeros(count)

    def add_rails(self, rails: Array) -> None:
        """One step's rail voltages [V], (rails, n)."""
        self.rail += rails
        self.rail_square += rails * rails
        np.maximum(self.highest, rails, out=self.highest)
        np.minimum(self.lowest, rails, out=self.lowest)

    def add_line(self, current: Array, mains: Array, dropper: Array) -> None:
        """One step's line current [A], mains and dropper voltage [V], each (n,)."""
        self.line += np.abs(current)
        self.line_square += current * current
        self.real += current * mains
        self.dropper += dropper
        self.dropper_square += dropper * dropper


class Cycle:
    """Steps specimens of one junction state through mains cycles."""

    def __init__(self, network: Network, steps: int) -> None:
        """`steps` a cycle, a multiple of four: crests and crossings fall on steps, so the swing is kept exactly."""
        specimens = network.specimens
        self.network, self.specimens, self.steps = network, specimens, steps
        self.seconds = 1.0 / (specimens.frequency * steps)
        self._dropper()
        self._reservoirs()

    def _dropper(self) -> None:
        specimens = self.specimens
        series = specimens.series_resistance
        connected = np.isfinite(series) & np.isfinite(specimens.rail_joint[0])
        series = np.where(connected, series, UNPLUGGED)
        fitted = specimens.capacitance > 0.0
        half_step = np.where(fitted, 0.5 * self.seconds / np.maximum(specimens.capacitance, TINY), 0.0)
        taken = np.minimum(series, half_step)
        self.added = half_step - taken
        charge = specimens.capacitance / self.seconds
        self.behind = 1.0 / np.maximum(charge + 1.0 / specimens.parallel_resistance, 1e-15)
        self.keeps = charge * self.behind
        self.resistance = np.maximum(series - taken + self.behind, 1e-3)
        self.shunt = specimens.shunt / self.seconds
        self.shunt_short = 1.0 / specimens.shunt_short

    def _reservoirs(self) -> None:
        specimens = self.specimens
        fitted = specimens.reservoir > 0.0
        self.charge = np.where(fitted, self.seconds / np.maximum(specimens.reservoir, TINY), 0.0)
        inner = np.where(fitted, np.maximum(specimens.esr - 0.5 * self.charge, 0.0) + self.charge, 1.0)
        self.reservoir = np.where(fitted, 1.0 / inner, 0.0)

    def run(self, held: Held, rectifier: Rectifier) -> tuple[Held, Measured]:
        """One cycle from crest to crest, and what was measured on the way."""
        measured = Measured(len(held.rails), self.specimens.count)
        for step in range(1, self.steps + 1):
            held = self._step(step, held, rectifier, measured)
        return held, measured

    def _step(self, step: int, held: Held, rectifier: Rectifier, measured: Measured) -> Held:
        mains = self.specimens.crest * np.cos(2.0 * np.pi * step / self.steps)
        open_voltage = mains - self.keeps * held.dropper
        across_input = self.shunt + self.shunt_short + rectifier.input_conductance
        resistance = 1.0 / (1.0 / self.resistance + across_input)
        voltage = (open_voltage / self.resistance + self.shunt * held.input) * resistance
        drive = rectifier.drive(voltage)
        rails, (current, slope), moved = self._balance(step, drive, resistance, held, rectifier)
        through, node_zener, node_volts = rectifier.finish(drive, resistance, rails[0], current)
        signed = np.where(voltage < 0.0, -through, through) if rectifier.legs.full_wave else through
        input_voltage = voltage - signed * resistance
        line = (open_voltage - input_voltage) / self.resistance
        dropper = self.keeps * held.dropper + line * self.behind
        reservoirs = held.reservoirs + self.reservoir * (rails - held.reservoirs) * self.charge
        measured.add_rails(rails)
        measured.add_line(line, mains, dropper)
        measured.supply += current
        measured.supply_slope += slope
        measured.moved = np.maximum(measured.moved, moved)
        self._zeners(measured, rails, rectifier, node_zener, node_volts, through)
        return Held(dropper, input_voltage, reservoirs, rails)

    def _balance(
        self, step: int, drive: Array, resistance: Array, held: Held, rectifier: Rectifier
    ) -> tuple[Array, Branch, Array]:
        """The rails at the end of the step (rails, n) [V], what flowed into the first and its slope (n,) [A, S], and by how much
        the rails still moved in the last round (n,) [V].
        """
        rails, pulsed = held.rails, self._pulsed(step)
        for share in DAMPING:
            balance = Balance(len(rails))
            for index, rail in enumerate(self.specimens.shape.rails):
                conductance = self.reservoir[index]
                balance.inject(index, conductance * (held.reservoirs[index] - rails[index]), -conductance)
                if index > 0 or rectifier.zener is None:
                    balance.branch(index, rail.clamps_to, rail_zener(self.specimens, index, rails))
            add_rails(balance, self.network, rails)
            add_loads(balance, self.network, rails, pulsed)
            current, slope = rectifier.into_rail(drive, resistance, rails[0])
            balance.inject(0, current, slope)
            move = balance.step()
            rails = rails + share * move
            moved = np.abs(move).max(axis=0)
            if np.all(moved < STANDS):
                break
        return rails, (current + slope * share * move[0], slope), moved

    def _pulsed(self, step: int) -> tuple[float, ...]:
        """For each load, the share of this step that its gate pulse flows: it starts where the mains cross zero."""
        since = ((step - 1) - self.steps / 4.0) % (self.steps / 2.0)
        steps = [load.pulse / self.seconds for load in self.specimens.shape.loads]
        return tuple(float(np.clip(length - since, 0.0, 1.0)) for length in steps)

    def _zeners(
        self, measured: Measured, rails: Array, rectifier: Rectifier, node: Array, node_volts: Array, through: Array
    ) -> None:
        specimens = self.specimens
        for index, rail in enumerate(specimens.shape.rails):
            if index == 0 and rectifier.zener is not None:
                measured.zener[0] += node
                back = np.where(through < 0.0, -through * known.DIODE_DROP, 0.0)
                measured.zener_power[0] += node * np.maximum(node_volts, 0.0) + back
                continue
            voltage = across(rails, index, rail.clamps_to)
            current, _ = rail_zener(specimens, index, rails)
            measured.zener[index] += np.maximum(current - voltage / specimens.zener_short[index], 0.0)
            measured.zener_power[index] += np.abs(current * voltage)


def first_guess(cycle: Cycle, rails: Array, rectifier: Rectifier) -> Held:
    """At a crest, with the rails at their means (rails, n) [V]: the dropper holds what the rail leaves of the crest."""
    specimens = cycle.specimens
    left = np.maximum(specimens.crest - rails[0] - 1.4, 0.0)
    share = np.where(specimens.shunt > 0.0, specimens.shunt / np.maximum(specimens.capacitance + specimens.shunt, TINY), 1.0)
    blocked = np.where(rectifier.blocks, specimens.crest - rails[0], left * share)
    holds = (specimens.capacitance > 0.0) & (cycle.resistance < UNPLUGGED / 2.0)
    return Held(np.where(holds, blocked, 0.0), rails[0].copy(), rails.copy(), rails.copy())


