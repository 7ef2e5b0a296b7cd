"""The current budget of the board as marked: what the supply can deliver, what the loads need, where the rail lets go."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import lru_cache

import numpy as np

from benchtool.board import Board, nominal_voltage
from benchtool.physics import constants as known
from benchtool.physics import laws
from benchtool.physics.laws import Array, Flags
from benchtool.physics.mean_value import Means, mean_pulses, means
from benchtool.physics.settled import Settled
from benchtool.physics.shape import TO_COMMON, Shape
from benchtool.physics.specimens import Specimens, as_marked
from benchtool.physics.supply import feed_of, half_swing, supply_current

AGREES = 0.02
"""Figures of a board with unknown parts that differ by less than this share over all they may be count as known."""


@dataclass(frozen=True, slots=True)
class Budget:
    """Currents [A] and capacitance [F] with every switched load on; None where it cannot be known. See the case format.

    rule_of_thumb is the half-wave figure application notes print, None for other shapes.
    """

    on: tuple[str, ...]
    available: float | None
    available_low: float | None
    available_high: float | None
    demand: float | None
    dropout_capacitance: float | None
    rule_of_thumb: float | None

    @property
    def margin(self) -> float | None:
        """What is left over [A]."""
        return None if self.available is None or self.demand is None else self.available - self.demand


def agreed(figures: Array) -> float | None:
    """The one figure (n,) stands for, or None where its specimens differ by what cannot be read on the board."""
    low, high = float(np.min(figures)), float(np.max(figures))
    if not np.isfinite(low) or not np.isfinite(high) or high - low > AGREES * max(abs(low), abs(high)):
        return None
    return float(np.mean(figures))


@lru_cache(maxsize=8)
def budget_of(board: Board) -> Budget:
    """The budget of `board` as marked."""
    marked, on = as_marked(board), board.switched_loads()
    first = nominal_voltage(board, board.rails[0])
    tolerance = dropper_tolerance(board)
    low, high = 1.0 - board.mains.variation, 1.0 + board.mains.variation
    return Budget(
        on=on,
        available=_available(marked, first),
        available_low=_available(_corner(marked, low, 1.0 - tolerance), first),
        available_high=_available(_corner(marked, high, 1.0 + tolerance), first),
        demand=demand(board, marked),
        dropout_capacitance=_dropout(marked, on),
        rule_of_thumb=_rule_of_thumb(board, marked),
    )


def dropper_tolerance(board: Board) -> float:
    """The dropper's tolerance, stated or assumed [1]."""
    assumed = known.RESISTOR_TOLERANCE if board.dropper.kind == "resistor" else known.DROPPER_TOLERANCE
    return assumed if board.dropper.tolerance is None else board.dropper.tolerance


def _corner(specimens: Specimens, mains: float, dropper: float) -> Specimens:
    return replace(
        specimens,
        mains=specimens.mains * mains,
        crest=specimens.crest * mains,
        capacitance=specimens.capacitance * dropper,
        dropper_resistance=specimens.dropper_resistance * (2.0 - dropper),
    )


def _available(specimens: Specimens, first: float | None) -> float | None:
    if first is None:
        return None
    current, _ = supply_current(feed_of(specimens), np.full(specimens.count, first))
    return agreed(current)


def _rule_of_thumb(board: Board, marked: Specimens) -> float | None:
    zener = board.rails[0].zener
    if board.rectifier == "bridge" or board.dropper.kind != "capacitor" or zener is None:
        return None
    mains, series = board.mains, marked.series_resistance
    return agreed(
        laws.rule_of_thumb_current(mains.voltage, mains.frequency, marked.capacitance, series, marked.zener[0])
    )


def demand(board: Board, specimens: Specimens) -> float | None:
    """Current that must flow into the first rail so that all rails regulate with every switched load on [A].

    From the lowest rail up: what a rail must get is what its own loads and the rails it feeds take, less what loads above
    return into it; a zener hands down only what is still missing below. None where a rail has no nominal voltage.
    """
    volts = [nominal_voltage(board, rail) for rail in board.rails]
    known_volts = [volt for volt in volts if volt is not None]
    if len(known_volts) < len(volts):
        return None
    rails = np.array(known_volts)[:, None] * np.ones(specimens.count)
    return agreed(_needs(specimens, rails, 0))


def _needs(specimens: Specimens, rails: Array, index: int) -> Array:
    shape = specimens.shape
    need = np.zeros(specimens.count)
    for number, load in enumerate(shape.loads):
        if index in (load.rail, load.returns_to):
            foot = 0.0 if load.returns_to == TO_COMMON else rails[load.returns_to]
            drawn = _marked_draw(specimens, number, rails[load.rail] - foot)
            need = need + (drawn if load.rail == index else -drawn)
    for child, rail in enumerate(shape.rails):
        if rail.parent != index or child == 0:
            continue
        if rail.fed_through == "zener":
            need = need + np.maximum(_needs(specimens, rails, child), 0.0)
        elif rail.fed_through == "regulator":
            need = need + _needs(specimens, rails, child) + specimens.ground_current[child]
        else:
            need = need + (rails[index] - rails[child]) / specimens.feed[child]
    return need


def _marked_draw(specimens: Specimens, number: int, voltage: Array) -> Array:
    kind = specimens.shape.loads[number].kind
    if kind == "current":
        return np.asarray(specimens.load_current[number])
    if kind == "gate":
        return np.asarray(specimens.load_current[number] * mean_pulses(specimens)[number])
    over = specimens.load_forward[number] if kind == "led" else 0.0
    return np.asarray(np.maximum(voltage - over, 0.0) / specimens.load_resistance[number])


@lru_cache(maxsize=8)
def normal_load(board: Board) -> float:
    """The board's normal load [A], for faults whose size is told in it: the demand, or 10 mA where it cannot be known."""
    figure = demand(board, as_marked(board))
    return 0.01 if figure is None or figure <= 0.0 else figure


Shows = Callable[[Means], Array]
BISECTIONS = 22
"""Halvings of the search for a dropper: five figures of it."""


def capacitance_giving(specimens: Specimens, on: tuple[str, ...], warm: bool, shows: Shows, target: Array) -> Array:
    """The dropper [F] at which each specimen's `shows` reaches `target`, (n,); nil where it does without, NaN where 10 of its own
    are not enough.

    Bisection in the logarithm: everything asked for here rises with the dropper. Zeners stay cold: at the edge of regulation
    they carry next to nothing.
    """
    cold = replace(specimens, zener_kelvin_per_watt=np.zeros_like(specimens.zener_kelvin_per_watt))
    lowest, highest = np.log(specimens.capacitance * 1e-4), np.log(specimens.capacitance * 10.0)
    low, high = lowest, highest
    for _ in range(BISECTIONS):
        middle = 0.5 * (low + high)
        reached = shows(means(replace(cold, capacitance=np.exp(middle)), on, warm=warm)) >= target
        low, high = np.where(reached, low, middle), np.where(reached, middle, high)
    found = np.where(low > lowest, np.exp(0.5 * (low + high)), 0.0)
    return np.where(high < highest, found, np.nan)


def dropout_capacitance(specimens: Specimens, on: tuple[str, ...], *, warm: bool = False) -> Array:
    """The dropper [F] at which the first rail leaves regulation, (n,): a zener between it and common falls to 0.1 mA."""
    target = np.full(specimens.count, known.REGULATES_FROM)
    return capacitance_giving(specimens, on, warm, lambda found: chain_current(found.zener_current, specimens.shape, 0), target)


def chain_current(zener_current: Array, shape: Shape, index: int) -> Array:
    """The least of the mean currents [A] (rails, n) through the zeners that hold rail `index` over common, (n,)."""
    least: Array = zener_current[index]
    while shape.rails[index].clamps_to != TO_COMMON:
        index = shape.rails[index].clamps_to
        least = np.asarray(np.minimum(least, zener_current[index]))
    return least


def _dropout(marked: Specimens, on: tuple[str, ...]) -> float | None:
    if marked.shape.dropper != "capacitor" or not marked.shape.rails[0].has_zener:
        return None
    return agreed(dropout_capacitance(marked, on))


def back_solved_capacitance(specimens: Specimens, current: Array, first_rail: Array) -> Array:
    """The dropper [F] that delivers the mean `current` [A] into the first rail at `first_rail` [V], (n,)."""
    feed = feed_of(specimens)
    full = current / np.where(feed.share > 0.0, feed.share, np.nan)
    found = laws.capacitance_for(full, feed.crest, specimens.frequency, feed.series, half_swing(specimens, first_rail))
    return np.asarray(np.where(specimens.shunt > 0.0, np.nan, found))


def regulating(settled: Settled, index: int) -> Flags | None:
    """Whether rail `index` regulates: every zener between it and common carries 0.1 mA, or a regulator's input stands above its
    dropout; None for a rail with neither. Bool (n,).
    """
    specimens = settled.specimens
    rail = specimens.shape.rails[index]
    if rail.fed_through == "regulator":
        room = settled.rail_voltage[rail.parent] - specimens.dropout[index]
        return np.asarray(room >= specimens.regulated[index])
    if not rail.has_zener:
        return None
    return np.asarray(chain_current(settled.zener_current, specimens.shape, index) >= known.REGULATES_FROM)
