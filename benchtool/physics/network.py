"""The rails and everything between them: what every branch draws at given rail voltages, and the step that balances it.

Both solvers stand on this: the mean values, and each step of the settled cycle. A rail's *surplus* is the current that flows
into it and finds no way out; Newton's method moves the rails until there is none.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from benchtool.physics import branches, laws
from benchtool.physics import constants as known
from benchtool.physics.laws import Array, Flags
from benchtool.physics.shape import TO_COMMON
from benchtool.physics.specimens import Specimens, Switch, take

COIL_WARM_KELVIN = 60.0
"""What 15 minutes on do to a coil inside a warm appliance: kelvin above the bench; value from memory."""


Matrix = tuple[tuple[Array | float, ...], ...]
"""Slopes [S] of every rail's surplus against every rail's voltage, each (n,); 0.0 where nothing stands."""


class Balance:
    """Surplus [A] of every rail and its slopes [S]: the straight part of the network first, then branch by branch; each (n,)."""

    def __init__(self, straight: Matrix, rails: Array, sources: Sequence[Array | float] = ()) -> None:
        """`straight` at `rails` (rails, n) [V], with `sources` [A] into each rail that no voltage changes."""
        self.slopes = [list(row) for row in straight]
        self.surplus: list[Array | float] = list(sources) or [0.0] * len(straight)
        for index, row in enumerate(straight):
            for other, slope in enumerate(row):
                if not isinstance(slope, float):
                    self.surplus[index] = self.surplus[index] + slope * rails[other]

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
    """Specimens in one switched state: `drawing` (loads, n) is true where a load is really connected.

    `straight`: everything that obeys Ohm's law between rails and common; the rest bends and is added at each voltage.
    """

    specimens: Specimens
    drawing: Flags
    load_resistance: Array
    straight: Matrix

    def part(self, index: NDArray[np.intp] | slice) -> Network:
        """The network of some of the specimens."""
        straight = tuple(
            tuple(slope if isinstance(slope, float) else slope[index] for slope in row) for row in self.straight
        )
        return Network(take(self.specimens, index), self.drawing[:, index], self.load_resistance[:, index], straight)


def network_of(specimens: Specimens, on: tuple[str, ...], warm: bool) -> Network:
    """The network with the switched loads `on` commanded on; `warm` heats the coils."""
    commanded = np.array(specimens.shape.commanded(on), dtype=bool)[:, None]
    drawing = (commanded & (specimens.switch != Switch.OPEN)) | (specimens.switch == Switch.STUCK)
    drawing = drawing & (specimens.load_open == 0.0)
    ratio = float(laws.copper_ratio(25.0 + COIL_WARM_KELVIN)) if warm else 1.0
    coils = np.array([load.kind == "coil" for load in specimens.shape.loads], dtype=bool)[:, None]
    resistance = specimens.load_resistance * np.where(coils, ratio, 1.0)
    return Network(specimens, drawing, resistance, _straight(specimens, drawing, resistance))


def _straight(specimens: Specimens, drawing: Flags, resistance: Array) -> Matrix:
    """Leaks, meter, shorts, feed resistors, and what is ohmic in the loads."""
    slopes: list[list[Array | float]] = [[0.0] * len(specimens.shape.rails) for _ in specimens.shape.rails]

    def ohmic(start: int, end: int, conductance: Array) -> None:
        for here, there in ((start, end), (end, start)):
            if here != TO_COMMON:
                slopes[here][here] = slopes[here][here] - conductance
                if there != TO_COMMON:
                    slopes[here][there] = slopes[here][there] + conductance

    for index, rail in enumerate(specimens.shape.rails):
        leaks = 1.0 / specimens.reservoir_leak[index] + 1.0 / specimens.board_leak[index] + 1.0 / known.METER_RESISTANCE
        ohmic(index, TO_COMMON, leaks)
        if index > 0 or not specimens.shape.zener_at_node:
            ohmic(index, rail.clamps_to, 1.0 / specimens.zener_short[index])
        if rail.fed_through == "resistor":
            ohmic(rail.parent, index, 1.0 / (specimens.feed[index] + specimens.rail_joint[index]))
    for index, load in enumerate(specimens.shape.loads):
        ohmic(load.rail, load.returns_to, load_conductance(specimens, drawing, resistance, index))
    return tuple(tuple(row) for row in slopes)


def with_diagonal(straight: Matrix, slopes: Array) -> Matrix:
    """`straight` with more slopes [S], (rails, n), of each rail against its own voltage."""
    return tuple(
        tuple(slope + slopes[index] if index == other else slope for other, slope in enumerate(row))
        for index, row in enumerate(straight)
    )


def across(rails: Array, start: int, end: int) -> Array:
    """Voltage [V] between two of the `rails` (rails, n) [V], or a rail and common; (n,)."""
    return rails[start] if end == TO_COMMON else np.asarray(rails[start] - rails[end])


def load_conductance(specimens: Specimens, drawing: Flags, resistance: Array, index: int) -> Array:
    """What is ohmic in load `index` [S], (n,): an excess, and all of a coil or resistor."""
    ohmic = specimens.shape.loads[index].kind in ("coil", "resistor")
    conductance = specimens.load_excess[index] + (1.0 / resistance[index] if ohmic else 0.0)
    return np.where(drawing[index], conductance, 0.0)


def load_curve(network: Network, index: int, voltage: Array, pulsed: float) -> branches.Branch | None:
    """What bends in load `index`: current [A] at `voltage` [V] across it and slope [S], (n,); None where nothing does.

    `pulsed`: share of the time that a gate pulse flows.
    """
    specimens, drawn = network.specimens, network.drawing[index]
    kind, sinks = specimens.shape.loads[index].kind, bool(specimens.load_current[index].any())
    if kind != "led" and not sinks:
        return None
    current, slope = np.zeros(specimens.count), np.zeros(specimens.count)
    if kind == "led":
        current, slope = branches.led(voltage, specimens.load_forward[index], network.load_resistance[index])
    if sinks:
        flows = pulsed if kind == "gate" else 1.0
        sink, sink_slope = branches.constant_current(voltage, specimens.load_current[index] * flows)
        current, slope = current + sink, slope + sink_slope
    return current * drawn, slope * drawn


def rail_zener(specimens: Specimens, index: int, rails: Array) -> branches.Branch:
    """Current [A] through the zener of rail `index` and its slope [S], the rails at `rails` (rails, n) [V]; a short across it
    is not in it. Not for a zener at the dropper node.
    """
    voltage = across(rails, index, specimens.shape.rails[index].clamps_to)
    return branches.zener(voltage, specimens.zener[index])


def add_regulators(balance: Balance, specimens: Specimens, rails: Array) -> None:
    """Every regulator, the rails at `rails` (rails, n) [V]."""
    for index, rail in enumerate(specimens.shape.rails):
        if rail.fed_through == "regulator":
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
    """What bends in the loads, the rails at `rails` (rails, n) [V]; `pulsed`: for each the share of the time its pulse flows."""
    for index, load in enumerate(network.specimens.shape.loads):
        curve = load_curve(network, index, across(rails, load.rail, load.returns_to), pulsed[index])
        if curve is not None:
            balance.branch(load.rail, load.returns_to, curve)


def load_figures(network: Network, rails: Array, pulsed: tuple[float, ...]) -> tuple[Array, Array]:
    """Voltage across every load [V] and its current [A] at mean `rails` (rails, n) [V], each (loads, n); `pulsed` as above."""
    specimens = network.specimens
    shape = len(specimens.shape.loads), specimens.count
    voltages, currents = np.zeros(shape), np.zeros(shape)
    for index, load in enumerate(specimens.shape.loads):
        voltages[index] = across(rails, load.rail, load.returns_to)
        ohmic = voltages[index] * load_conductance(specimens, network.drawing, network.load_resistance, index)
        curve = load_curve(network, index, voltages[index], pulsed[index])
        currents[index] = ohmic if curve is None else ohmic + curve[0]
    return voltages, currents
