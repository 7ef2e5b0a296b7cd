"""One mains cycle in equal steps, for all specimens of one junction state at once.

Each step is implicit: the dropper and every reservoir act as a resistance with what they already hold behind it (backward
Euler, which keeps the charge exactly). The resistance that this adds in series with a capacitor, half a step over C (less as far
as a resistance bypasses it), is taken out of the real one again as far as that reaches, so that a step's phase error does not
pass for a larger series resistance.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from benchtool.physics import constants as known
from benchtool.physics.branches import Branch
from benchtool.physics.laws import Array
from benchtool.physics.network import Balance, Network, across, add_loads, add_regulators, rail_zener, with_diagonal
from benchtool.physics.rectifier import Rectifier
from benchtool.physics.shape import TO_COMMON


@dataclass(frozen=True, slots=True)
class Pace:
    """How finely a cycle is stepped: `steps` a cycle, a multiple of four, so that crests and crossings fall on steps and the
    swing is kept exactly; at most `rounds` of Newton's method a step, which ends when no rail moves by more than `stands` [V]
    any more: the error left is its square over a knee.
    """

    steps: int
    rounds: int
    stands: float


DAMPED_FROM, DAMPING = 7, (0.4, 0.6, 1.0)
"""From this round on the shares of Newton's move that are taken, in turn: what still hops over a bend and back is caught so."""
DIP = 0.4
"""How far a rail may go under common, or further under, in one round [V]: before its diodes conduct."""
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

    def part(self, index: NDArray[np.intp]) -> Held:
        """What some of the specimens hold."""
        return Held(self.dropper[index], self.input[index], self.reservoirs[:, index], self.rails[:, index])


@dataclass(frozen=True, slots=True)
class Centre:
    """The means of the cycle before [V]: the rails (rails, n), the dropper (n,)."""

    rails: Array
    dropper: Array

    def part(self, index: NDArray[np.intp]) -> Centre:
        """The means of some of the specimens."""
        return Centre(self.rails[:, index], self.dropper[index])


class Measured:
    """Sums over one cycle's steps; see `Cycle.run`."""

    def __init__(self, centre: Centre) -> None:
        """`centre`: what the mean magnitudes are taken about."""
        shape, count = centre.rails.shape, centre.dropper.size
        self.centre = centre
        self.rail, self.rail_square, self.rail_magnitude = np.zeros(shape), np.zeros(shape), np.zeros(shape)
        self.highest, self.lowest = np.full(shape, -np.inf), np.full(shape, np.inf)
        self.zener, self.zener_power = np.zeros(shape), np.zeros(shape)
        self.supply, self.supply_slope = np.zeros(count), np.zeros(count)
        self.line, self.line_square, self.real = np.zeros(count), np.zeros(count), np.zeros(count)
        self.dropper, self.dropper_square, self.dropper_magnitude = np.zeros(count), np.zeros(count), np.zeros(count)
        self.moved = np.zeros(count)

    def add_rails(self, rails: Array) -> None:
        """One step's rail voltages [V], (rails, n)."""
        self.rail += rails
        self.rail_square += rails * rails
        self.rail_magnitude += np.abs(rails - self.centre.rails)
        np.maximum(self.highest, rails, out=self.highest)
        np.minimum(self.lowest, rails, out=self.lowest)

    def add_line(self, current: Array, mains: Array, dropper: Array) -> None:
        """One step's line current [A], mains and dropper voltage [V], each (n,)."""
        self.line += np.abs(current)
        self.line_square += current * current
        self.real += current * mains
        self.dropper += dropper
        self.dropper_square += dropper * dropper
        self.dropper_magnitude += np.abs(dropper - self.centre.dropper)


class Cycle:
    """Steps specimens of one junction state through mains cycles."""

    def __init__(self, network: Network, rectifier: Rectifier, pace: Pace) -> None:
        specimens = network.specimens
        self.network, self.specimens, self.rectifier = network, specimens, rectifier
        self.pace, self.steps = pace, pace.steps
        self.seconds = 1.0 / (specimens.frequency * pace.steps)
        self._dropper()
        self._reservoirs()

    def _dropper(self) -> None:
        specimens = self.specimens
        series = specimens.series_resistance
        connected = np.isfinite(series) & np.isfinite(specimens.rail_joint[0])
        series = np.where(connected, series, UNPLUGGED)
        fitted = specimens.capacitance > 0.0
        reactive = 2.0 * np.pi * specimens.frequency * np.maximum(specimens.capacitance, TINY) * specimens.parallel_resistance
        bypassed = np.minimum(reactive**-2.0, 1.0)
        adds = (1.0 - bypassed) / (1.0 + bypassed) ** 2
        half_step = np.where(fitted, 0.5 * self.seconds * adds / np.maximum(specimens.capacitance, TINY), 0.0)
        self.taken = taken = np.minimum(series, half_step)
        charge = specimens.capacitance / self.seconds
        self.behind = 1.0 / np.maximum(charge + 1.0 / specimens.parallel_resistance, 1e-15)
        self.keeps = charge * self.behind
        self.resistance = np.maximum(series - taken + self.behind, 1e-3)
        self.shunt = specimens.shunt / self.seconds
        across_input = self.shunt + 1.0 / specimens.shunt_short + self.rectifier.input_conductance
        self.source_resistance = 1.0 / (1.0 / self.resistance + across_input)
        self.divides, self.shunt_divides = self.source_resistance / self.resistance, self.source_resistance * self.shunt

    def _reservoirs(self) -> None:
        specimens = self.specimens
        fitted = specimens.reservoir > 0.0
        self.charge = np.where(fitted, self.seconds / np.maximum(specimens.reservoir, TINY), 0.0)
        inner = np.where(fitted, np.maximum(specimens.esr - 0.5 * self.charge, 0.0) + self.charge, 1.0)
        self.reservoir = np.where(fitted, 1.0 / inner, 0.0)
        self.straight = with_diagonal(self.network.straight, -self.reservoir)

    def part(self, index: NDArray[np.intp]) -> Cycle:
        """The cycle of some of the specimens."""
        network = self.network.part(index)
        return Cycle(network, self.rectifier.part(network.specimens, index), self.pace)

    def run(self, held: Held, centre: Centre) -> tuple[Held, Measured]:
        """One cycle from crest to crest, and what was measured on the way, its magnitudes about `centre`."""
        measured = Measured(centre)
        for step in range(1, self.steps + 1):
            held = self._step(step, held, measured)
        return held, measured

    def _step(self, step: int, held: Held, measured: Measured) -> Held:
        mains = self.specimens.crest * np.cos(2.0 * np.pi * step / self.steps)
        open_voltage = mains - self.keeps * held.dropper
        rectifier, resistance = self.rectifier, self.source_resistance
        voltage = self.divides * open_voltage + self.shunt_divides * held.input
        drive = rectifier.drive(voltage)
        rails, (current, slope), moved = self._balance(step, drive, held)
        through, node_zener, node_volts = rectifier.finish(drive, resistance, rails[0], current)
        signed = np.where(voltage < 0.0, -through, through) if rectifier.legs.full_wave else through
        input_voltage = voltage - signed * resistance
        line = (open_voltage - input_voltage) / self.resistance
        dropper = self.keeps * held.dropper + line * self.behind
        reservoirs = held.reservoirs + self.reservoir * (rails - held.reservoirs) * self.charge
        measured.add_rails(rails)
        measured.add_line(line, mains, dropper)
        measured.real -= self._lost_to_the_step(line, dropper - held.dropper, input_voltage - held.input)
        measured.supply += current
        measured.supply_slope += slope
        measured.moved = np.maximum(measured.moved, moved)
        self._zeners(measured, rails, node_zener, node_volts, through)
        if rectifier.zener is not None:
            measured.zener_power[0] += input_voltage**2 / self.specimens.zener_short[0]
        return Held(dropper, input_voltage, reservoirs, rails)

    def _lost_to_the_step(self, line: Array, dropper: Array, across_input: Array) -> Array:
        """Power [W] that the implicit step burns and the circuit does not, (n,): ½·C·ΔV² a step where a capacitor's voltage moves
        by `dropper` or `across_input` [V], less what the resistance taken out would have burnt at `line` [A].
        """
        lost = 0.5 * self.specimens.capacitance / self.seconds * dropper**2 + 0.5 * self.shunt * across_input**2
        return lost - self.taken * line**2

    def _balance(self, step: int, drive: Array, held: Held) -> tuple[Array, Branch, Array]:
        """The rails at the end of the step (rails, n) [V], what flowed into the first and its slope (n,) [A, S], and by how much
        the rails still moved in the last round (n,) [V].
        """
        rails, rectifier, pulsed = held.rails, self.rectifier, self._pulsed(step)
        sources = list(self.reservoir * held.reservoirs)
        moved, flowed, flowed_slope = np.zeros((3, self.specimens.count))
        moves = np.ones(self.specimens.count, dtype=bool)
        for number in range(self.pace.rounds):
            balance = Balance(self.straight, rails, sources)
            for index, rail in enumerate(self.specimens.shape.rails):
                if rail.has_zener and (index > 0 or rectifier.zener is None):
                    balance.branch(index, rail.clamps_to, rail_zener(self.specimens, index, rails))
            add_regulators(balance, self.specimens, rails)
            add_loads(balance, self.network, rails, pulsed)
            current, slope = rectifier.into_rail(drive, self.source_resistance, rails[0])
            balance.inject(0, current, slope)
            move = self._landing(rails, balance.step(), balance)
            if rectifier.zener is not None:
                target = rectifier.landing(drive, self.source_resistance, rails[0], move[0], current, balance.slopes[0][0])
                move[0] = target - rails[0]
            if number >= DAMPED_FROM:
                move = move * DAMPING[number % len(DAMPING)]
            move = move * moves  # one that stands stays, whatever company it is in
            rails = rails + move
            moved = np.where(moves, np.abs(move).max(axis=0), moved)
            flowed = np.where(moves, current + slope * move[0], flowed)
            flowed_slope = np.where(moves, slope, flowed_slope)
            moves = moves & (moved >= self.pace.stands)
            if not moves.any():
                break
        return rails, (flowed, flowed_slope), moved

    def _landing(self, rails: Array, move: Array, balance: Balance) -> Array:
        """`move` [V] cut short of where exponentials would throw it back: under common, and over a zener's knee, where it lands
        at the voltage at which the zener takes what is left there.
        """
        move = np.maximum(move, np.minimum(-rails, 0.0) - DIP)
        for index, rail in enumerate(self.specimens.shape.rails):
            knee = self.specimens.zener[index]
            if not rail.has_zener or (index == 0 and self.rectifier.zener is not None):
                continue
            foot_move = 0.0 if rail.clamps_to == TO_COMMON else move[rail.clamps_to]
            voltage = across(rails, index, rail.clamps_to)
            beyond = voltage + move[index] - foot_move - knee
            crosses = (beyond > known.ZENER_SLOPE) & (voltage < knee)
            if crosses.any():
                left = np.where(crosses, -balance.slopes[index][index] * beyond, known.ZENER_CURRENT)
                lands = known.ZENER_SLOPE * np.log(np.maximum(left, TINY) / known.ZENER_CURRENT)
                move[index] = np.where(crosses, move[index] - np.maximum(beyond - lands, 0.0), move[index])
        return move

    def _pulsed(self, step: int) -> tuple[float, ...]:
        """For each load, the share of this step that its gate pulse flows: it starts where the mains cross zero."""
        since = ((step - 1) - self.steps / 4.0) % (self.steps / 2.0)
        steps = [load.pulse / self.seconds for load in self.specimens.shape.loads]
        return tuple(float(np.clip(length - since, 0.0, 1.0)) for length in steps)

    def _zeners(self, measured: Measured, rails: Array, node: Array, node_volts: Array, through: Array) -> None:
        specimens = self.specimens
        for index, rail in enumerate(specimens.shape.rails):
            if index == 0 and self.rectifier.zener is not None:
                measured.zener[0] += node
                back = np.where(through < 0.0, -through * known.DIODE_DROP, 0.0)
                measured.zener_power[0] += node * np.maximum(node_volts, 0.0) + back
                continue
            if rail.has_zener:
                voltage = across(rails, index, rail.clamps_to)
                current, _ = rail_zener(specimens, index, rails)
                measured.zener[index] += np.maximum(current, 0.0)
                measured.zener_power[index] += np.abs((current + voltage / specimens.zener_short[index]) * voltage)


def first_guess(cycle: Cycle, rails: Array) -> Held:
    """At a crest, with the rails at their means (rails, n) [V]: the dropper holds what the rail leaves of the crest."""
    specimens = cycle.specimens
    left = np.maximum(specimens.crest - rails[0] - 1.4, 0.0)
    share = np.where(specimens.shunt > 0.0, specimens.shunt / np.maximum(specimens.capacitance + specimens.shunt, TINY), 1.0)
    blocked = np.where(cycle.rectifier.blocks, specimens.crest - rails[0], left * share)
    holds = (specimens.capacitance > 0.0) & (cycle.resistance < UNPLUGGED / 2.0)
    return Held(np.where(holds, blocked, 0.0), rails[0].copy(), rails.copy(), rails.copy())


