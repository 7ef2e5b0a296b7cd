"""The settled state by mean values: Kirchhoff's current law at every rail, solved by Newton's method for all specimens at once.

Right while the rails are smooth; a waveform solver can take its place behind the same `settle`. Where the rail is not smooth
the mean is corrected for the reservoir's sag by an estimate, and the ripple is such an estimate too (`ripple.py`).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from benchtool.physics import branches, laws
from benchtool.physics import constants as known
from benchtool.physics.laws import Array
from benchtool.physics.ripple import ripple_estimate, sagged
from benchtool.physics.settled import Settled
from benchtool.physics.shape import TO_COMMON
from benchtool.physics.specimens import Specimens, Switch, take
from benchtool.physics.supply import feed_of, mains_side, supply_current

MOST_STEPS = 80
MUCH_WORSE = 10.0
"""Steep laws overshoot by orders of magnitude; a little worse on the way round a bend is none of that."""
STEPS_TOGETHER = 3
CUTS = 7
BALANCED = 1e-8
"""A specimen is solved when every rail's currents add up to less than this [A],"""
STANDS = 1e-7
"""or when no rail moves by more than this any more [V]: a rail may sit on a kink, as at the crest."""
WARMING_STEPS = 4
COIL_WARM_KELVIN = 60.0
"""What 15 minutes on do to a coil inside a warm appliance: kelvin above the bench; value from memory."""


class Balance:
    """Currents into every rail and their slopes, added up branch by branch; arrays (rails, n) and (n, rails, rails)."""

    def __init__(self, rails: int, count: int) -> None:
        self.surplus = np.zeros((rails, count))
        self.slopes = np.zeros((count, rails, rails))

    def inject(self, rail: int, current: Array, slope: Array) -> None:
        """A source's `current` [A] into `rail`, with its slope against that rail's voltage [S], each (n,)."""
        self.surplus[rail] += current
        self.slopes[:, rail, rail] += slope

    def branch(self, start: int, end: int, branch: branches.Branch) -> None:
        """A branch's current [A] and slope [S], each (n,), from rail `start` to rail `end` or common."""
        current, slope = branch
        self.inject(start, -current, -slope)
        if end != TO_COMMON:
            self.inject(end, current, -slope)
            self.slopes[:, start, end] += slope
            self.slopes[:, end, start] += slope


@dataclass(frozen=True, slots=True)
class Network:
    """Specimens in one switched state: `drawing` (loads, n) is true where a load is really connected."""

    specimens: Specimens
    drawing: Array
    load_resistance: Array


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


def load_branch(network: Network, index: int, voltage: Array) -> branches.Branch:
    """What load `index` draws at `voltage` [V] across it."""
    specimens, kind = network.specimens, network.specimens.shape.loads[index].kind
    resistance = network.load_resistance[index]
    if kind == "current":
        current, slope = branches.constant_current(voltage, specimens.load_current[index])
    elif kind == "led":
        current, slope = branches.led(voltage, specimens.load_forward[index], resistance)
    else:
        current, slope = branches.resistor(voltage, resistance)
    drawn = network.drawing[index]
    excess = specimens.load_excess[index]
    return np.where(drawn, current + voltage * excess, 0.0), np.where(drawn, slope + excess, 0.0)


def zener_branch(specimens: Specimens, index: int, rails: Array) -> branches.Branch:
    """Mean current [A] through the zener of rail `index` and its slope [S], with the rails at `rails` (rails, n) [V].

    At the dropper node it stands a diode higher and conducts half the time.
    """
    rail = specimens.shape.rails[index]
    voltage = across(rails, index, rail.clamps_to)
    marked, short = specimens.zener[index], specimens.zener_short[index]
    if index == 0 and specimens.shape.zener_at_node:
        current, slope = branches.junction(voltage + known.DIODE_DROP, marked, known.ZENER_CURRENT, known.ZENER_SLOPE)
        return 0.5 * current, 0.5 * slope
    return branches.zener(voltage, marked, short)


def _add_network(balance: Balance, network: Network, rails: Array) -> None:
    specimens = network.specimens
    for index, rail in enumerate(specimens.shape.rails):
        balance.branch(index, rail.clamps_to, zener_branch(specimens, index, rails))
        leak = 1.0 / specimens.reservoir_leak[index] + 1.0 / specimens.board_leak[index] + 1.0 / known.METER_RESISTANCE
        balance.inject(index, -rails[index] * leak, -leak)
        if rail.fed_through == "resistor":
            through = specimens.feed[index] + specimens.rail_joint[index]
            balance.branch(rail.parent, index, branches.resistor(across(rails, rail.parent, index), through))
    for index, load in enumerate(specimens.shape.loads):
        voltage = across(rails, load.rail, load.returns_to)
        balance.branch(load.rail, load.returns_to, load_branch(network, index, voltage))


Evaluate = Callable[[Array], Balance]


def _newton(evaluate: Evaluate, start: Array, steps: int) -> tuple[Array, Array]:
    """Rails (rails, n) at which every rail's surplus is nil, and which specimens got there within `steps` (n,).

    Where a full step makes the surplus much worse it is cut to a quarter for that specimen: the laws are steep, but monotone.
    """
    rails, balance = start, evaluate(start)
    error = np.abs(balance.surplus).max(axis=0)
    moved = np.full_like(error, np.inf)
    for _ in range(steps):
        if np.all((error <= BALANCED) | (moved <= STANDS)):
            break
        step = np.linalg.solve(balance.slopes, -balance.surplus.T[..., None])[..., 0].T
        step = np.maximum(step, -rails)  # nothing here pulls a rail under common
        for _ in range(CUTS):
            trial = evaluate(rails + step)
            trial_error = np.abs(trial.surplus).max(axis=0)
            worse = (trial_error > MUCH_WORSE * error) & (trial_error > BALANCED)
            if not worse.any():
                break
            step = np.where(worse, 0.25 * step, step)
        moved = np.abs(step).max(axis=0)
        rails, balance, error = rails + step, trial, trial_error
    return rails, (error <= BALANCED) | (moved <= STANDS)


Source = Callable[[Specimens, Balance, Array], None]
"""Adds what feeds the network to a balance: the mains through the rectifier, or a fixed rail."""


def _solve(network: Network, source: Source, start: Array) -> tuple[Array, Array]:
    """Newton's method on all specimens; after every few steps only those not yet balanced go on."""
    rails, solved = start.copy(), np.zeros(network.specimens.count, dtype=bool)
    for _ in range(MOST_STEPS // STEPS_TOGETHER):
        rest = np.flatnonzero(~solved)
        if not rest.size:
            break
        part = _part(network, rest)

        def evaluate(trial: Array, part: Network = part) -> Balance:
            balance = Balance(len(trial), part.specimens.count)
            source(part.specimens, balance, trial)
            _add_network(balance, part, trial)
            return balance

        rails[:, rest], solved[rest] = _newton(evaluate, rails[:, rest], STEPS_TOGETHER)
    return rails, solved


def _part(network: Network, index: NDArray[np.intp]) -> Network:
    if len(index) == network.specimens.count:
        return network
    return Network(take(network.specimens, index), network.drawing[:, index], network.load_resistance[:, index])


def _mains(specimens: Specimens, balance: Balance, rails: Array) -> None:
    balance.inject(0, *supply_current(feed_of(specimens), rails[0]))


def _start(specimens: Specimens) -> Array:
    """A first guess: zeners a little over their mark, rails without one at half the crest."""
    rails = np.empty_like(specimens.zener)
    for index, rail in reversed(list(enumerate(specimens.shape.rails))):
        foot = 0.0 if rail.clamps_to == TO_COMMON else rails[rail.clamps_to]
        rails[index] = np.where(np.isfinite(specimens.zener[index]), specimens.zener[index] + 0.1 + foot, specimens.crest / 2.0)
    return rails


STIFF = 1e3
"""Conductance that holds a rail at a given voltage [S]."""


def demand_at(specimens: Specimens, on: tuple[str, ...], warm: bool, first_rail: Array) -> Array:
    """Mean current [A] that must flow into the first rail to hold it at `first_rail` [V]; (n,). NaN where not solved."""
    held = replace(specimens, crest=first_rail)

    def source(part: Specimens, balance: Balance, rails: Array) -> None:
        balance.inject(0, STIFF * (part.crest - rails[0]), np.full(part.count, -STIFF))

    start = _start(specimens)
    start[0] = first_rail
    rails, solved = _solve(network_of(held, on, warm), source, start)
    return np.where(solved, STIFF * (first_rail - rails[0]), np.nan)


def settle(specimens: Specimens, on: tuple[str, ...], *, warm: bool = False) -> Settled:
    """The settled state of every specimen with the switched loads `on` commanded on; `warm` after 15 minutes on."""
    network = network_of(specimens, on, warm)
    rails, converged = _solve(network, _mains, _start(specimens))
    for _ in range(WARMING_STEPS if np.any(specimens.zener_kelvin_per_watt) else 0):
        _, power = _zeners(network.specimens, rails)
        network = replace(network, specimens=_warmed(specimens, power))
        rails, converged = _solve(network, _mains, rails)
    return _settled(network, specimens, rails, converged)


def _warmed(specimens: Specimens, power: Array) -> Specimens:
    """The zeners as `power` [W] in each leaves them, (rails, n)."""
    rise = np.clip(specimens.zener_kelvin_per_watt * power, 0.0, 150.0)
    share = laws.zener_temperature_share(np.where(np.isfinite(specimens.zener), specimens.zener, 5.1))
    return replace(specimens, zener=specimens.zener * (1.0 + share * rise))


def _zeners(specimens: Specimens, rails: Array) -> tuple[Array, Array]:
    """Mean reverse current [A] of every rail's zener, what a short carries left out, and its power [W]; each (rails, n)."""
    current, power = np.zeros_like(rails), np.zeros_like(rails)
    for index, rail in enumerate(specimens.shape.rails):
        voltage = across(rails, index, rail.clamps_to)
        through, _ = zener_branch(specimens, index, rails)
        at_node = index == 0 and specimens.shape.zener_at_node
        shorted = 0.0 if at_node else voltage / specimens.zener_short[index]
        current[index] = np.maximum(through - shorted, 0.0)
        power[index] = np.abs(through * (voltage + (known.DIODE_DROP if at_node else 0.0)))
    return current, power


def _settled(network: Network, cold: Specimens, rails: Array, converged: Array) -> Settled:
    specimens, shape = network.specimens, network.specimens.shape
    feed = feed_of(cold)
    supply, _ = supply_current(feed, rails[0])
    zener_current, zener_power = _zeners(specimens, rails)
    if shape.zener_at_node:
        zener_power[0] += supply * known.DIODE_DROP
    voltages = np.array([across(rails, load.rail, load.returns_to) for load in shape.loads])
    voltages = voltages.reshape(len(shape.loads), specimens.count)
    currents = [load_branch(network, index, voltages[index])[0] for index in range(len(shape.loads))]
    side = mains_side(feed, rails[0])
    ripple = ripple_estimate(specimens, rails, supply, zener_current)
    return Settled(
        specimens=cold,
        rail_voltage=sagged(specimens, rails, ripple, zener_current),
        ripple_pp=ripple,
        zener_current=zener_current,
        zener_power=zener_power,
        supply_current=supply - zener_current[0] if shape.zener_at_node else supply,
        line_current=side.line_current,
        dropper_voltage=side.dropper_voltage,
        dropper_dc=side.dropper_dc,
        load_voltage=voltages,
        load_current=np.array(currents).reshape(len(shape.loads), specimens.count),
        converged=converged,
    )
