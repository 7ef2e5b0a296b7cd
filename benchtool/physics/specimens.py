"""Specimens: many boards of one shape as arrays, so that all of them are solved in one pass.

A specimen is what really stands on the bench: its parts within (or, with a fault, outside) their tolerances and the mains it
is fed from. Per-board arrays have the shape (n,), per-rail arrays (rails, n), per-load arrays (loads, n). A part that is not
there conducts nothing: infinite resistance or zener voltage, zero capacitance; a series part that is not there has 0 ohm.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, fields, replace
from enum import IntEnum
from typing import Any

import numpy as np
from numpy.typing import NDArray

from benchtool.board import Board, Load, Maybe, Rail, Unknown, resistance_of
from benchtool.physics import constants as known
from benchtool.physics.laws import Array
from benchtool.physics.sequence import FIRST_PART, LAST_PART, coordinate
from benchtool.physics.shape import Shape, shape_of


class Junction(IntEnum):
    """State of the rectifier. In a bridge only SERIES_OPEN and SERIES_SHORT are used: all four junctions are alike."""

    GOOD = 0
    SERIES_OPEN = 1
    SERIES_SHORT = 2
    RETURN_OPEN = 3
    RETURN_SHORT = 4


class Switch(IntEnum):
    """State of the transistor that switches a load."""

    GOOD = 0
    OPEN = 1
    STUCK = 2


@dataclass(frozen=True, slots=True, kw_only=True)
class Specimens:
    """Boards of one `shape`; see the module for the arrays' shapes. Units: volts, amperes, ohms, farads, kelvin per watt."""

    shape: Shape
    frequency: float
    mains: Array
    crest: Array
    fuse: Array
    varistor: Array
    joint: Array
    inrush: Array
    capacitance: Array
    shunt: Array
    dropper_resistance: Array
    dropper_short: Array
    shunt_short: Array
    bleeder: Array
    junction: Array
    zener: Array
    zener_short: Array
    zener_kelvin_per_watt: Array
    reservoir: Array
    esr: Array
    reservoir_leak: Array
    board_leak: Array
    feed: Array
    regulated: Array
    dropout: Array
    ground_current: Array
    load_resistance: Array
    load_current: Array
    load_forward: Array
    load_excess: Array
    load_open: Array
    switch: Array
    pull_in: Array
    rail_joint: Array

    @property
    def count(self) -> int:
        """How many specimens."""
        return int(self.mains.shape[-1])

    @property
    def series_resistance(self) -> Array:
        """Everything in series with the dropper [ohm], shape (n,)."""
        return self.fuse + self.joint + self.inrush

    @property
    def parallel_resistance(self) -> Array:
        """Everything resistive across the dropper, a resistor dropper itself included [ohm], shape (n,)."""
        with np.errstate(divide="ignore"):
            return np.asarray(1.0 / (1.0 / self.bleeder + 1.0 / self.dropper_resistance + 1.0 / self.dropper_short))


def concatenate(parts: Sequence[Specimens]) -> Specimens:
    """Specimens of one shape, one after the other."""
    arrays: dict[str, Any] = {name: np.concatenate([getattr(part, name) for part in parts], axis=-1) for name in ARRAYS}
    return replace(parts[0], **arrays)


def take(specimens: Specimens, index: slice | NDArray[np.intp]) -> Specimens:
    """Some of the specimens."""
    return replace(specimens, **{name: getattr(specimens, name)[..., index] for name in ARRAYS})


ARRAYS = tuple(field.name for field in fields(Specimens) if field.name not in ("shape", "frequency"))

Near = Mapping[str, tuple[float, float]]
"""Parts, by name, of which it is known that they lie between two values [V, ohm, F or A]."""


class _Drawer:
    """Hands out one coordinate of the sequence a part, always in the same order; 0.5 everywhere for a nominal board.

    A part in `near` is drawn between those values only; `log_share` is the logarithm of the share of all boards that leaves.
    """

    def __init__(self, count: int, spread: bool, near: Near | None = None) -> None:
        self.count = count
        self.log_share = 0.0
        self._numbers = iter(range(FIRST_PART, LAST_PART))
        self._spread = spread
        self._near = near or {}

    def _next(self) -> Array:
        return coordinate(next(self._numbers), self.count)

    def even(self, low: float, high: float) -> Array:
        """Evenly from `low` to `high`; their middle for a nominal board."""
        return low + (high - low) * (self._next() if self._spread else np.full(self.count, 0.5))

    def part(self, name: str, value: Maybe, tolerance: float, unknown: tuple[float, float]) -> Array:
        """A marked value within its tolerance, or evenly in the logarithm over `unknown` where it cannot be read."""
        even = self._next()
        if isinstance(value, Unknown):
            low, high = self._narrowed(name, float(np.log(unknown[0])), float(np.log(unknown[1])), logarithmic=True)
            return np.asarray(np.exp(low + (high - low) * even))
        if not self._spread:
            return np.full(self.count, value)
        low, high = self._narrowed(name, value * (1.0 - tolerance), value * (1.0 + tolerance), logarithmic=False)
        return np.asarray(low + (high - low) * even)

    def _narrowed(self, name: str, low: float, high: float, *, logarithmic: bool) -> tuple[float, float]:
        """What is left of a range by what is known of the part; all of it where the two have nothing in common."""
        if name not in self._near:
            return low, high
        near = [float(np.log(max(end, 1e-18))) if logarithmic else end for end in self._near[name]]
        left = max(low, near[0]), min(high, near[1])
        if left[0] >= left[1]:
            return low, high
        self.log_share += float(np.log((left[1] - left[0]) / (high - low)))
        return left

    def constant(self, value: float) -> Array:
        """The same for all."""
        return np.full(self.count, value)


def as_marked(board: Board, count: int = 64) -> Specimens:
    """The board as marked: nominal values and mains, 25 °C, no self-heating; parts that cannot be read take a wide range.

    One specimen where everything is known, `count` of them where something is not.
    """
    sample = _build(board, _Drawer(count, spread=False), mains_spread=0.0, warm=False)
    alike = all(np.all(getattr(sample, name)[..., :1] == getattr(sample, name)) for name in ARRAYS)
    return take(sample, slice(0, 1)) if alike else sample


def population(board: Board, count: int, mains_spread: float | None = None) -> Specimens:
    """`count` healthy boards: parts evenly over their tolerances, zeners warm by themselves, mains ± `mains_spread` [1].

    Without `mains_spread` the mains' own variation is taken, as for the bands of the states table.
    """
    spread = board.mains.variation if mains_spread is None else mains_spread
    return _build(board, _Drawer(count, spread=True), spread, warm=True)


def population_near(board: Board, count: int, mains_spread: float, near: Near) -> tuple[Specimens, float]:
    """A `population` whose parts in `near` are drawn between those values, and the logarithm of its share [1] of all boards.

    Names are those of the case file: dropper, inrush, zener:RAIL, reservoir:RAIL, feed:RAIL, load:NAME.
    """
    draw = _Drawer(count, spread=True, near=near)
    return _build(board, draw, mains_spread, warm=True), draw.log_share


def _build(board: Board, draw: _Drawer, mains_spread: float, warm: bool) -> Specimens:
    mains = board.mains.voltage * (1.0 + mains_spread * (2.0 * draw.even(0.0, 1.0) - 1.0))
    crest = draw.even(*known.CREST_FACTOR) if warm else draw.constant(float(np.sqrt(2.0)))
    return Specimens(
        shape=shape_of(board),
        frequency=board.mains.frequency,
        mains=mains,
        crest=mains * crest,
        fuse=draw.constant(0.0),
        varistor=draw.constant(np.inf),
        joint=draw.constant(0.0),
        rail_joint=np.zeros((len(board.rails), draw.count)),
        **_mains_side(board, draw),
        **_rails(board, draw, warm),
        **_loads(board, draw),
    )


def _mains_side(board: Board, draw: _Drawer) -> dict[str, Array]:
    dropper, inrush, bleeder = board.dropper, board.inrush, board.bleeder
    tolerance = known.DROPPER_TOLERANCE if dropper.tolerance is None else dropper.tolerance
    capacitance, resistance = draw.constant(0.0), draw.constant(np.inf)
    if dropper.resistance is not None:
        tolerance = known.RESISTOR_TOLERANCE if dropper.tolerance is None else dropper.tolerance
        resistance = draw.part("dropper", dropper.resistance, tolerance, known.UNKNOWN_DROPPER_RESISTANCE)
    elif dropper.capacitance is not None:
        capacitance = draw.part("dropper", dropper.capacitance, tolerance, known.UNKNOWN_DROPPER)
    shunt = draw.constant(0.0)
    if dropper.shunt_capacitance is not None:
        shunt = draw.part("shunt", dropper.shunt_capacitance, tolerance, known.UNKNOWN_DROPPER)
    in_path = draw.constant(0.0)
    if inrush is not None:
        tolerance = _or(inrush.tolerance, known.RESISTOR_TOLERANCE)
        in_path = draw.part("inrush", inrush.resistance, tolerance, known.UNKNOWN_INRUSH)
    across = draw.constant(np.inf)
    if bleeder is not None:
        tolerance = _or(bleeder.tolerance, known.RESISTOR_TOLERANCE)
        one = draw.part("bleeder", bleeder.resistance, tolerance, known.UNKNOWN_BLEEDER)
        across = one * (1 if isinstance(bleeder.resistance, Unknown) else bleeder.in_series)
    return {
        "capacitance": capacitance,
        "shunt": shunt,
        "dropper_resistance": resistance,
        "dropper_short": draw.constant(np.inf),
        "shunt_short": draw.constant(np.inf),
        "inrush": in_path,
        "bleeder": across,
        "junction": draw.constant(float(Junction.GOOD)),
    }


RAIL_ROWS = (
    "zener", "zener_kelvin_per_watt", "reservoir", "esr", "feed", "regulated", "dropout", "ground_current",
)


def _rails(board: Board, draw: _Drawer, warm: bool) -> dict[str, Array]:
    rows: dict[str, list[Array]] = {name: [] for name in RAIL_ROWS}
    for rail in board.rails:
        rows["zener"].append(_zener(rail, draw))
        rows["zener_kelvin_per_watt"].append(draw.even(*known.ZENER_KELVIN_PER_WATT) if warm else draw.constant(0.0))
        capacitance = _reservoir(rail, draw)
        rows["reservoir"].append(capacitance)
        rows["esr"].append(_esr(capacitance, draw, warm))
        rows["feed"].append(_feed(rail, draw))
        rows["regulated"].append(draw.constant(np.inf if rail.regulated_voltage is None else rail.regulated_voltage))
        rows["dropout"].append(draw.constant(known.REGULATOR_DROPOUT if rail.dropout is None else rail.dropout))
        rows["ground_current"].append(draw.constant(rail.ground_current or 0.0))
    arrays = {name: np.array(values) for name, values in rows.items()}
    nothing = np.full((len(board.rails), draw.count), np.inf)
    return {**arrays, "zener_short": nothing, "reservoir_leak": nothing, "board_leak": nothing}


def _zener(rail: Rail, draw: _Drawer) -> Array:
    if rail.zener is None:
        return draw.constant(np.inf)
    tolerance = _or(rail.zener.tolerance, known.ZENER_TOLERANCE)
    return draw.part(f"zener:{rail.name}", rail.zener.voltage, tolerance, known.UNKNOWN_ZENER)


def _reservoir(rail: Rail, draw: _Drawer) -> Array:
    if rail.reservoir is None:
        return draw.constant(0.0)
    tolerance = _or(rail.reservoir.tolerance, known.RESERVOIR_TOLERANCE)
    return draw.part(f"reservoir:{rail.name}", rail.reservoir.capacitance, tolerance, known.UNKNOWN_RESERVOIR)


def _esr(capacitance: Array, draw: _Drawer, warm: bool) -> Array:
    low, high = np.log(known.ESR_HEALTHY)
    spread = np.exp(draw.even(low, high)) if warm else draw.constant(known.ESR_NOMINAL)
    with np.errstate(divide="ignore"):
        return np.maximum(spread / capacitance, known.ESR_LEAST)


def _feed(rail: Rail, draw: _Drawer) -> Array:
    if rail.fed_through == "regulator":
        return draw.constant(known.REGULATOR_RESISTANCE)
    if rail.feed_resistance is None:
        return draw.constant(np.inf)
    tolerance = _or(rail.feed_tolerance, known.RESISTOR_TOLERANCE)
    return draw.part(f"feed:{rail.name}", rail.feed_resistance, tolerance, known.UNKNOWN_FEED)


def _loads(board: Board, draw: _Drawer) -> dict[str, Array]:
    count, loads = draw.count, board.loads
    empty = np.empty((0, count))
    resistance = [_load_resistance(load, draw) for load in loads]
    current = [_load_current(load, draw) for load in loads]
    forward = [draw.constant(np.inf if load.forward_voltage is None else load.forward_voltage) for load in loads]
    pull_in = [draw.even(*known.TYPICAL_PULL_IN) for _ in loads]
    zeros = np.zeros((len(loads), count))
    return {
        "load_resistance": np.array(resistance) if loads else empty,
        "load_current": np.array(current) if loads else empty,
        "load_forward": np.array(forward) if loads else empty,
        "pull_in": np.array(pull_in) if loads else empty,
        "load_excess": zeros,
        "load_open": zeros,
        "switch": zeros,
    }


LOAD_TOLERANCE = {
    "coil": known.COIL_TOLERANCE,
    "resistor": known.RESISTOR_TOLERANCE,
    "led": known.RESISTOR_TOLERANCE,
    "current": known.CURRENT_TOLERANCE,
    "gate": known.CURRENT_TOLERANCE,
}


def load_tolerance(load: Load) -> float:
    """The load's stated tolerance, or the one assumed for its kind [1]."""
    return _or(load.tolerance, LOAD_TOLERANCE[load.kind])


def _load_resistance(load: Load, draw: _Drawer) -> Array:
    value = resistance_of(load)
    if value is None:
        return draw.constant(np.inf)
    return draw.part(f"load:{load.name}", value, load_tolerance(load), known.UNKNOWN_RESISTANCE)


def _load_current(load: Load, draw: _Drawer) -> Array:
    if load.current is None:
        return draw.constant(0.0)
    return draw.part(f"load:{load.name}", load.current, load_tolerance(load), known.UNKNOWN_CURRENT)


def _or(stated: float | None, assumed: float) -> float:
    return assumed if stated is None else stated
