"""The means over a mains cycle: Kirchhoff's current law at every rail, solved by Newton's method for all specimens at once.

Right while the rails are smooth, and quick: the settled cycle (`waveform.py`) starts from here, and the searches for a dropper
and for a demand, which ask for nothing but means, end here.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from benchtool.physics import branches, laws
from benchtool.physics import constants as known
from benchtool.physics.branches import Branch
from benchtool.physics.laws import Array, Flags
from benchtool.physics.network import (
    Balance,
    Network,
    across,
    add_loads,
    add_regulators,
    network_of,
    rail_zener,
)
from benchtool.physics.shape import TO_COMMON
from benchtool.physics.specimens import Specimens
from benchtool.physics.supply import feed_of, line_current, supply_current

MOST_STEPS = 80
CUTS = 7
MUCH_WORSE = 10.0
"""Steep laws overshoot by orders of magnitude; a little worse on the way round a bend is none of that."""
STEPS_TOGETHER = 3
BALANCED = 1e-8
"""A specimen is solved when every rail's currents add up to less than this [A],"""
STANDS = 1e-7
"""or when no rail moves by more than this any more [V]: a rail may sit on a kink, as at the crest."""
WARMING_STEPS = 4
STIFF = 1e3
"""Conductance that holds a rail at a given voltage [S]."""

Source = Callable[[Specimens, Balance, Array], None]
"""Adds what feeds the network to a balance: the mains through the rectifier, a fixed rail, a bench supply."""


@dataclass(frozen=True, slots=True)
class Means:
    """The network with its zeners as warm as they leave themselves, its rails (rails, n) [V], and which are solved (n,)."""

    network: Network
    rails: Array
    solved: Flags

    @property
    def zener_current(self) -> Array:
        """Mean reverse current of every rail's zener [A], what a short carries left out; (rails, n)."""
        return _zeners(self.network.specimens, self.rails)[0]

    @property
    def line_current(self) -> Array:
        """Current in the mains lead [A RMS], (n,)."""
        return line_current(feed_of(self.network.specimens), self.rails[0])

    @property
    def supply_current(self) -> Array:
        """Mean current out of the rectifier into the first rail [A], (n,)."""
        current, _ = supply_current(feed_of(self.network.specimens), self.rails[0])
        at_node = self.network.specimens.shape.zener_at_node
        return current - self.zener_current[0] if at_node else current


def means(specimens: Specimens, on: tuple[str, ...], *, warm: bool = False) -> Means:
    """The settled means with the switched loads `on` commanded on; `warm` after 15 minutes on."""
    network = network_of(specimens, on, warm)
    rails, solved = _solve(network, _mains, _start(specimens))
    for _ in range(WARMING_STEPS if np.any(specimens.zener_kelvin_per_watt) else 0):
        network = replace(network, specimens=_warmed(specimens, _zeners(network.specimens, rails)[1]))
        rails, solved = _solve(network, _mains, rails)
    return Means(network, rails, solved)


def mean_zener(specimens: Specimens, index: int, rails: Array) -> Branch:
    """Mean current [A] through the zener of rail `index` and its slope [S], the rails at `rails` (rails, n) [V].

    At the dropper node it stands a diode higher and conducts half the time.
    """
    if index > 0 or not specimens.shape.zener_at_node:
        return rail_zener(specimens, index, rails)
    node = rails[0] + known.DIODE_DROP
    current, slope = branches.junction(node, specimens.zener[0], known.ZENER_CURRENT, known.ZENER_SLOPE)
    return 0.5 * current, 0.5 * slope


def balance_at(network: Network, rails: Array, pulsed: tuple[float, ...]) -> Balance:
    """Everything but the source, at `rails` (rails, n) [V]; `pulsed` as in `add_loads`."""
    balance, specimens = Balance(network.straight, rails), network.specimens
    for index, rail in enumerate(specimens.shape.rails):
        if rail.has_zener:
            balance.branch(index, rail.clamps_to, mean_zener(specimens, index, rails))
    add_regulators(balance, specimens, rails)
    add_loads(balance, network, rails, pulsed)
    return balance


def mean_pulses(specimens: Specimens) -> tuple[float, ...]:
    """For each load, the share of a cycle that its gate pulses flow, two of them a cycle."""
    return tuple(min(2.0 * specimens.frequency * load.pulse, 1.0) for load in specimens.shape.loads)


def _mains(specimens: Specimens, balance: Balance, rails: Array) -> None:
    balance.inject(0, *supply_current(feed_of(specimens), rails[0]))


def _solve(
    network: Network, source: Source, start: Array, pulsed: tuple[float, ...] | None = None
) -> tuple[Array, Flags]:
    """Newton's method on all specimens; after every few steps only those not yet balanced go on."""
    rails, solved = start.copy(), np.zeros(network.specimens.count, dtype=bool)
    pulses = mean_pulses(network.specimens) if pulsed is None else pulsed
    for _ in range(MOST_STEPS // STEPS_TOGETHER):
        rest = np.flatnonzero(~solved)
        if not rest.size:
            break
        part = network if rest.size == solved.size else network.part(rest)

        def evaluate(trial: Array, part: Network = part) -> Balance:
            balance = balance_at(part, trial, pulses)
            source(part.specimens, balance, trial)
            return balance

        rails[:, rest], solved[rest] = _newton(evaluate, rails[:, rest])
    return rails, solved


def _newton(evaluate: Callable[[Array], Balance], start: Array) -> tuple[Array, Flags]:
    """Rails (rails, n) at which every rail's surplus is nil, and which specimens got there within a few steps (n,).

    Where a full step makes the surplus much worse it is cut to a quarter for that specimen: the laws are steep, but monotone.
    """
    rails, balance = start, evaluate(start)
    error = np.abs(np.array(balance.surplus)).max(axis=0)
    moved = np.full_like(error, np.inf)
    for _ in range(STEPS_TOGETHER):
        if np.all((error <= BALANCED) | (moved <= STANDS)):
            break
        step = np.maximum(balance.step(), -rails)  # nothing here pulls a rail under common
        for _ in range(CUTS):
            trial = evaluate(rails + step)
            trial_error = np.abs(np.array(trial.surplus)).max(axis=0)
            worse = (trial_error > MUCH_WORSE * error) & (trial_error > BALANCED)
            if not worse.any():
                break
            step = np.where(worse, 0.25 * step, step)
        moved = np.abs(step).max(axis=0)
        rails, balance, error = rails + step, trial, trial_error
    return rails, (error <= BALANCED) | (moved <= STANDS)


def _start(specimens: Specimens) -> Array:
    """A first guess: zeners a little over their mark, a regulator at its voltage, other rails at half the crest."""
    rails = np.empty_like(specimens.zener)
    for index, rail in reversed(list(enumerate(specimens.shape.rails))):
        foot = 0.0 if rail.clamps_to == TO_COMMON else rails[rail.clamps_to]
        other = specimens.regulated[index] if rail.fed_through == "regulator" else specimens.crest / 2.0
        zener = specimens.zener[index]
        other = np.where(np.isfinite(other), other, specimens.crest / 2.0)
        rails[index] = np.where(np.isfinite(zener), zener + 0.1 + foot, other)
    return rails


def demand_at(specimens: Specimens, on: tuple[str, ...], warm: bool, first_rail: Array) -> Array:
    """Mean current [A] that must flow into the first rail to hold it at `first_rail` [V]; (n,). NaN where not solved."""
    held = replace(specimens, crest=first_rail)

    def source(part: Specimens, balance: Balance, rails: Array) -> None:
        balance.inject(0, STIFF * (part.crest - rails[0]), np.full(part.count, -STIFF))

    start = _start(specimens)
    start[0] = first_rail
    rails, solved = _solve(network_of(held, on, warm), source, start)
    return np.where(solved, STIFF * (first_rail - rails[0]), np.nan)


def injected(specimens: Specimens, on: tuple[str, ...], rail: int, clamp: float, limit: float) -> tuple[Array, Flags]:
    """Volts [V] on `rail` fed by a bench supply of current limit `clamp` [A] and voltage limit `limit` [V], the board unplugged.

    (n,), with the flags of what is solved. Zeners stay cold, and gates rest, as there are no mains to fire them by; at the
    dropper node the series diode keeps current from the zener.
    """

    def source(part: Specimens, balance: Balance, rails: Array) -> None:
        wanted = STIFF * (limit - rails[rail])
        limited = wanted > clamp
        balance.inject(rail, np.where(limited, clamp, wanted), np.where(limited, 0.0, -STIFF))

    bare = specimens
    if specimens.shape.zener_at_node:
        zener, short = specimens.zener.copy(), specimens.zener_short.copy()
        zener[0], short[0] = np.inf, np.inf
        bare = replace(specimens, zener=zener, zener_short=short)
    start = np.zeros_like(bare.zener)
    start[rail] = limit
    resting = (0.0,) * len(bare.shape.loads)
    rails, solved = _solve(network_of(bare, on, warm=False), source, start, resting)
    return rails[rail], solved


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
        through, _ = mean_zener(specimens, index, rails)
        at_node = index == 0 and specimens.shape.zener_at_node
        shorted = 0.0 if at_node else voltage / specimens.zener_short[index]
        current[index] = np.maximum(through, 0.0)
        power[index] = np.abs((through + shorted) * (voltage + (known.DIODE_DROP if at_node else 0.0)))
    return current, power
