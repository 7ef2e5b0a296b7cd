"""The rails and everything between them: what every branch draws at given rail voltages, and the step that balances it.

Both solvers stand on this: the mean values, and each step of the settled cycle. A rail's *surplus* is the current that flows
into it and finds no way out; Newton's method moves the rails until there is none.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from benchtool.physics import branches, laws
from benchtool.physics import constants as known
from benchtool.physics.laws import Array
from benchtool.physics.shape import TO_COMMON
from benchtool.physics.specimens import Specimens, Switch, take

COIL_WARM_KELVIN = 60.0
"""What 15 minutes on do to a coil inside a warm appliance: kelvin above the bench; value from memory."""


class Balance:
    """Surplus [A] of every rail and its slopes [S], added up branch by branch; each entry (n,), 0.0 where nothing stands."""

    def __init__(self, rails: int) -> None:
        self.surplus: list[Array | float] = [0.0] * rails
        self.slopes: list[list[Array | float]] = [[0.0] * rails for _ in range(rails)]

    def inject(self, rail: int, current: Array, slope: Array) -> None:
        """A source's `current` [A] into `rail`, with its slope against that rail's voltage [S], each (n,)."""
        self.surplus[rail] = self.surplus[rail] + current
        self.slopes[rail][rail] = self.slopes[rail][rail] + slope

    def branch(self, start: int, end: int, branch: branches.Branch) -> None:
        """A branch's current [A] and slope [S], each (n,), from rail `start` to rail `end` or common."""
        current, slope = branch
        self.inject(start, -current, -slope)
        if end != TO_COMMON:
            self.inject(end, current, -slope)
            self.slopes[start][end] = self.slopes[start][end] + slope
            self.slopes[end][start] = self.slopes[end][start] + slope

    def transfer(self, start: int, end: int, current: Array, by_start: Array, by_end: Array) -> None:
        """Current [A] from rail `start` to rail `end` with its slopes against either rail's voltage [S], each (n,)."""
        self.inject(start, -current, -by_start)
        self.inject(end, current, by_end)
        self.slopes[start][end] = self.slopes[start][end] - by_end
        self.slopes[end][start] = self.slopes[end][start] + by_start

    def step(self) -> Array:
        """By how much every rail has to move [V], (rails, n): Newton's step, by elimination."""
        return _solved(self.slopes, [-surplus for surplus in self.surplus])

    def relaxed(self, per_cycle: Array, drift: Array) -> Array:
        """How far rails still go that drifted by `drift` [V] in the cycle before, (rails, n).

        `per_cycle` [S]: reservoir times frequency. With m the slopes over it a rail goes on by drift / (e^m − 1), here to the
        second order: drift / (m + m²/2).
        """
        rails = range(len(self.surplus))
        first = _solved(self.slopes, [-per_cycle[rail] * drift[rail] for rail in rails])
        damped = [[0.5 * slope for slope in row] for row in self.slopes]
        for rail in rails:
            damped[rail][rail] = damped[rail][rail] - per_cycle[rail]
        return _solved(damped, [-per_cycle[rail] * first[rail] for rail in rails])


def _solved(given: list[list[Array | float]], right: list[Array | float]) -> Array:
    """The rows' linear equations, by elimination; (rails, n). Entries that stand for nothing are plain zeros and skipped."""
    count, slopes, right = len(right), [row.copy() for row in given], right.copy()
    for pivot in range(count):
        for row in range(pivot + 1, count):
            if isinstance(slopes[row][pivot], float):
                continue
            factor = slopes[row][pivot] / slopes[pivot][pivot]
            for column in range(pivot + 1, count):
                slopes[row][column] = slopes[row][column] - factor * slopes[pivot][column]
            right[row] = right[row] - factor * right[pivot]
    for row in reversed(range(count)):
        for column in range(row + 1, count):
            right[row] = right[row] - slopes[row][column] * right[column]
        right[row] = right[row] / slopes[row][row]
    return np.array(right)


@dataclass(frozen=True, slots=True)
class Network:
    """Specimens in one switched state: `drawing` (loads, n) is true where a load is really connected."""

    specimens: Specimens
    drawing: NDArray[np.bool_]
    load_resistance: Array

    def part(self, index: NDArray[np.intp] | slice) -> Network:
        """The network of some of the specimens."""
        return Network(take(self.specimens, index), self.drawing[:, index], self.load_resistance[:, index])


def network_of(specimens: Specimens, on: tuple[str, ...], warm: bool) -> Network:
    """The network with the switched loads `on` commanded on; `warm` heats the coils."""
    commanded = np.array(specimens.shape.commanded(on), dtype=bool)[:, None]
    drawing = (commanded & (specimens.switch != Switch.OPEN)) | (specimens.switch == Switch.STUCK)
    ratio = float(laws.copper_ratio(25.0 + COIL_WARM_KELVIN)) if warm else 1.0
    coils = np.array([load.kind == "coil" for load in specimens.shape.loads], dtype=bool)[:, None]
    return Network(specimens, drawing & (specimens.load_open == 0.0), specimens.load_resistance * np.where(coils, ratio, 1.0))


def across(rails: Array, start: int, end: int) -> Array:
    """Voltage [V] between two of the `rails` (rails, n) [V], or a rail and common; (n,)."""
    return rails[start] if end == TO_COMMON else np.asarray(rails[start] - rails[end])


def load_branch(network: Network, index: int, voltage: Array, pulsed: float = 1.0) -> branches.Branch:
    """What load `index` draws [A] at `voltage` [V] across it, and the slope [S]; `pulsed`: share of the time its pulse flows."""
    specimens, kind = network.specimens, network.specimens.shape.loads[index].kind
    resistance = network.load_resistance[index]
    if kind == "current":
        current, slope = branches.constant_current(voltage, specimens.load_current[index])
    elif kind == "gate":
        current, slope = branches.constant_current(voltage, specimens.load_current[index] * pulsed)
    elif kind == "led":
        current, slope = branches.led(voltage, specimens.load_forward[index], resistance)
    else:
        current, slope = branches.resistor(voltage, resistance)
    drawn = network.drawing[index]
    excess = specimens.load_excess[index]
    return np.where(drawn, current + voltage * excess, 0.0), np.where(drawn, slope + excess, 0.0)


def rail_zener(specimens: Specimens, index: int, rails: Array) -> branches.Branch:
    """Current [A] through the zener of rail `index` and its slope [S], the rails at `rails` (rails, n) [V]; not at the node."""
    voltage = across(rails, index, specimens.shape.rails[index].clamps_to)
    return branches.zener(voltage, specimens.zener[index], specimens.zener_short[index])


def add_rails(balance: Balance, network: Network, rails: Array) -> None:
    """Leaks, meter and feeds of every rail, the rails at `rails` (rails, n) [V]."""
    specimens = network.specimens
    for index, rail in enumerate(specimens.shape.rails):
        leak = 1.0 / specimens.reservoir_leak[index] + 1.0 / specimens.board_leak[index] + 1.0 / known.METER_RESISTANCE
        balance.inject(index, -rails[index] * leak, -leak)
        if rail.fed_through == "resistor":
            through = specimens.feed[index] + specimens.rail_joint[index]
            balance.branch(rail.parent, index, branches.resistor(across(rails, rail.parent, index), through))
        elif rail.fed_through == "regulator":
            _add_regulator(balance, specimens, rail.parent, index, rails)


def _add_regulator(balance: Balance, specimens: Specimens, parent: int, index: int, rails: Array) -> None:
    """The lesser of its voltage and its input less the dropout, behind a little resistance, and never backwards."""
    conductance = 1.0 / (specimens.feed[index] + specimens.rail_joint[index])
    room = rails[parent] - specimens.dropout[index]
    short_of = room < specimens.regulated[index]
    current = (np.where(short_of, room, specimens.regulated[index]) - rails[index]) * conductance
    flows = current > 0.0
    slope = np.where(flows, conductance, 0.0)
    balance.transfer(parent, index, np.where(flows, current, 0.0), np.where(short_of, slope, 0.0), -slope)
    own, own_slope = branches.constant_current(rails[parent], specimens.ground_current[index])
    balance.inject(parent, -own, -own_slope)


def add_loads(balance: Balance, network: Network, rails: Array, pulsed: tuple[float, ...]) -> None:
    """Every load, the rails at `rails` (rails, n) [V]; `pulsed` tells for each the share of the time that a gate pulse flows."""
    for index, load in enumerate(network.specimens.shape.loads):
        voltage = across(rails, load.rail, load.returns_to)
        balance.branch(load.rail, load.returns_to, load_branch(network, index, voltage, pulsed[index]))


def load_figures(network: Network, rails: Array, pulsed: tuple[float, ...]) -> tuple[Array, Array]:
    """Voltage across every load [V] and its current [A] at mean `rails` (rails, n) [V], each (loads, n); `pulsed` as above."""
    loads = network.specimens.shape.loads
    shape = len(loads), network.specimens.count
    voltages = np.array([across(rails, load.rail, load.returns_to) for load in loads]).reshape(shape)
    currents = [load_branch(network, index, voltages[index], pulsed[index])[0] for index in range(len(loads))]
    return voltages, np.array(currents).reshape(shape)
