"""What each fault does to specimens: parts changed from what they were, by a severity that runs evenly over 0 to 1.

Severities are those of the case format's section 4. Open parts conduct nothing; an open dropper or inrush resistor leaves the
bleeder, or nothing, feeding the board.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from benchtool.board import Board, nominal_voltage
from benchtool.physics import constants as known
from benchtool.physics.budget import dropper_tolerance, normal_load
from benchtool.physics.laws import Array
from benchtool.physics.specimens import Junction, Specimens, Switch


@dataclass(frozen=True, slots=True)
class Place:
    """Where on a board a fault sits: the index of a rail or a load, with its name; neither for a part there is one of."""

    rail: int | None = None
    load: int | None = None
    name: str = ""


@dataclass(frozen=True, slots=True)
class Scene:
    """What a strike needs to know: the board, its normal load [A], the place, and the severity (n,) evenly over 0 to 1.

    `other` is a second such coordinate, for faults that change two things independently.
    """

    board: Board
    normal_load: float
    place: Place
    severity: Array
    other: Array

    @property
    def index(self) -> int:
        """The row of the place's rail or load."""
        return self.place.rail if self.place.rail is not None else self.place.load or 0

    def between(self, low: float, high: float) -> Array:
        """Severity evenly from `low` to `high`."""
        return low + (high - low) * self.severity

    def by_decades(self, low: float, high: float) -> Array:
        """Severity evenly in the logarithm from `low` to `high`."""
        return np.asarray(low * (high / low) ** self.severity)


Strike = Callable[[Specimens, Scene], Specimens]


def scene_of(board: Board, place: Place, severity: Array, other: Array) -> Scene:
    """The scene of a fault at `place`."""
    return Scene(board, normal_load(board), place, severity, other)


def _row(specimens: Specimens, scene: Scene, field: str, values: Array | float) -> Specimens:
    """`field` with one rail's or load's row replaced."""
    array = np.array(getattr(specimens, field))
    array[scene.index] = values
    changed: dict[str, Any] = {field: array}
    return replace(specimens, **changed)


def _all(specimens: Specimens, value: float) -> Array:
    return np.full(specimens.count, value)


def dropper_lost(specimens: Specimens, scene: Scene) -> Specimens:
    """2 % to the tolerance band's edge of the mark, mostly 10 to 85 %."""
    return replace(specimens, capacitance=_mark(specimens, scene.board) * _left(scene))


def _left(scene: Scene) -> Array:
    """Share of a capacitor that is left; both ends are where another fault, or none, begins, so nothing lies beyond them."""
    edge = max(1.0 - dropper_tolerance(scene.board), 0.05)
    within = 1.0 - np.abs(1.0 - np.abs(scene.severity))
    return np.interp(within, [0.0, 0.05, 0.95, 1.0], [0.02, 0.10 * edge / 0.9, 0.85 * edge / 0.9, edge])


def _mark(specimens: Specimens, board: Board) -> Array:
    mark = board.dropper.capacitance
    return _all(specimens, mark) if isinstance(mark, float) else specimens.capacitance


def dropper_open(specimens: Specimens, scene: Scene) -> Specimens:
    """Under 2 % of the mark; a resistor dropper conducts nothing."""
    left = _mark(specimens, scene.board) * 0.02 * np.maximum(scene.severity, 0.0) ** 3
    return replace(specimens, capacitance=left, dropper_resistance=_all(specimens, np.inf))


def dropper_short(specimens: Specimens, scene: Scene) -> Specimens:
    """About half an ohm across the dropper."""
    return replace(specimens, dropper_short=_all(specimens, known.SHORTED_JUNCTION))


def _shunt(specimens: Specimens, scene: Scene) -> Array:
    mark = scene.board.dropper.shunt_capacitance
    return _all(specimens, mark) if isinstance(mark, float) else specimens.shunt


def shunt_lost(specimens: Specimens, scene: Scene) -> Specimens:
    """A divider's second capacitor at 2 % to the tolerance band's edge of its mark."""
    return replace(specimens, shunt=_shunt(specimens, scene) * _left(scene))


def shunt_open(specimens: Specimens, scene: Scene) -> Specimens:
    """Under 2 % of the mark."""
    return replace(specimens, shunt=_shunt(specimens, scene) * 0.02 * np.maximum(scene.severity, 0.0) ** 3)


def shunt_short(specimens: Specimens, scene: Scene) -> Specimens:
    """About half an ohm across the rectifier's input."""
    return replace(specimens, shunt_short=_all(specimens, known.SHORTED_JUNCTION))


def wrong_part(specimens: Specimens, scene: Scene) -> Specimens:
    """The value printed on the part found in place, within the dropper's tolerance."""
    fitted, mark = scene.board.dropper.fitted, scene.board.dropper.capacitance
    ratio = fitted / mark if fitted is not None and isinstance(mark, float) else 1.0
    return replace(specimens, capacitance=specimens.capacitance * ratio)


def fuse_open(specimens: Specimens, scene: Scene) -> Specimens:
    """No path through the fuse."""
    return replace(specimens, fuse=_all(specimens, np.inf))


def varistor_short(specimens: Specimens, scene: Scene) -> Specimens:
    """Shorted or leaky: 1 ohm to 10 kohm across the input; the mains cannot be held by what is left of the fuse."""
    return replace(specimens, varistor=scene.by_decades(1.0, 10e3))


def inrush_open(specimens: Specimens, scene: Scene) -> Specimens:
    """No path through the inrush resistor."""
    return replace(specimens, inrush=_all(specimens, np.inf))


def inrush_high(specimens: Specimens, scene: Scene) -> Specimens:
    """3 to 300 times its value."""
    return replace(specimens, inrush=specimens.inrush * scene.by_decades(3.0, 300.0))


def _junction(specimens: Specimens, scene: Scene, series: Junction, back: Junction) -> Specimens:
    either = np.where(scene.severity < 0.5, float(series), float(back))
    two = specimens.shape.rectifier == "half-wave"
    return replace(specimens, junction=either if two else _all(specimens, float(series)))


def diode_open(specimens: Specimens, scene: Scene) -> Specimens:
    """One junction open: of a half-wave rectifier the series or the return diode, evenly."""
    return _junction(specimens, scene, Junction.SERIES_OPEN, Junction.RETURN_OPEN)


def diode_short(specimens: Specimens, scene: Scene) -> Specimens:
    """One junction shorted: of a half-wave rectifier the series or the return diode, evenly."""
    return _junction(specimens, scene, Junction.SERIES_SHORT, Junction.RETURN_SHORT)


def zener_open(specimens: Specimens, scene: Scene) -> Specimens:
    """The zener conducts nothing."""
    return _row(specimens, scene, "zener", np.inf)


def zener_short(specimens: Specimens, scene: Scene) -> Specimens:
    """0.3 to 20 ohm."""
    return _row(specimens, scene, "zener_short", scene.by_decades(0.3, 20.0))


def zener_low(specimens: Specimens, scene: Scene) -> Specimens:
    """25 to 85 % of its voltage."""
    return _row(specimens, scene, "zener", specimens.zener[scene.index] * scene.between(0.25, 0.85))


def reservoir_dried(specimens: Specimens, scene: Scene) -> Specimens:
    """0.5 to 40 % of its capacitance, with 0.5 to 20 ohm more."""
    left, more = scene.by_decades(0.005, 0.40), 0.5 * (20.0 / 0.5) ** scene.other
    struck = _row(specimens, scene, "reservoir", specimens.reservoir[scene.index] * left)
    return _row(struck, scene, "esr", specimens.esr[scene.index] + more)


def _leak(scene: Scene) -> Array:
    """Ohms that draw 0.5 to 4 times the board's normal load from the rail's nominal voltage."""
    volts = nominal_voltage(scene.board, scene.board.rails[scene.index]) or 12.0
    return np.asarray(volts / (scene.by_decades(0.5, 4.0) * scene.normal_load))


def reservoir_leaky(specimens: Specimens, scene: Scene) -> Specimens:
    """Draws 0.5 to 4 times the board's normal load."""
    return _row(specimens, scene, "reservoir_leak", _leak(scene))


def board_leakage(specimens: Specimens, scene: Scene) -> Specimens:
    """A path over the board that draws 0.5 to 4 times the board's normal load."""
    return _row(specimens, scene, "board_leak", _leak(scene))


def feed_open(specimens: Specimens, scene: Scene) -> Specimens:
    """The feed conducts nothing."""
    return _row(specimens, scene, "feed", np.inf)


def feed_high(specimens: Specimens, scene: Scene) -> Specimens:
    """2 to 30 times its value."""
    return _row(specimens, scene, "feed", specimens.feed[scene.index] * scene.by_decades(2.0, 30.0))


def feed_short(specimens: Specimens, scene: Scene) -> Specimens:
    """Half an ohm in place of the resistor, or from a regulator's input to its output."""
    struck = _row(specimens, scene, "feed", known.SHORTED_JUNCTION)
    return _row(_row(struck, scene, "regulated", np.inf), scene, "dropout", 0.0)


def load_excess(specimens: Specimens, scene: Scene) -> Specimens:
    """Draws 0.5 to 4 times the board's normal load beyond its rating: a current load by its own law; of the others half as a
    resistor and half as a sink, as what has broken down in them may be either.
    """
    load, more = scene.board.loads[scene.index], scene.by_decades(0.5, 4.0) * scene.normal_load
    sinks = (load.kind == "current") | (scene.other < 0.5)
    specimens = _row(specimens, scene, "load_current", specimens.load_current[scene.index] + np.where(sinks, more, 0.0))
    if load.kind == "current":
        return specimens
    upper = nominal_voltage(scene.board, scene.board.rail(load.rail)) or 12.0
    lower = 0.0
    if load.returns_to != "common":
        lower = nominal_voltage(scene.board, scene.board.rail(load.returns_to)) or 0.0
    return _row(specimens, scene, "load_excess", np.where(sinks, 0.0, more / max(upper - lower, 1.0)))


def load_open(specimens: Specimens, scene: Scene) -> Specimens:
    """The load, or its coil, draws nothing."""
    return _row(specimens, scene, "load_open", 1.0)


def shorted_turns(specimens: Specimens, scene: Scene) -> Specimens:
    """15 to 65 % of the coil's resistance; a shorted damping diode counts with it."""
    return _row(specimens, scene, "load_resistance", specimens.load_resistance[scene.index] * scene.between(0.15, 0.65))


def switch_open(specimens: Specimens, scene: Scene) -> Specimens:
    """The load does not draw when it is commanded on."""
    return _row(specimens, scene, "switch", float(Switch.OPEN))


def switch_stuck(specimens: Specimens, scene: Scene) -> Specimens:
    """The load draws without being commanded on."""
    return _row(specimens, scene, "switch", float(Switch.STUCK))


def joints(board: Board) -> tuple[Place, ...]:
    """A joint may open in the mains path, or where a rail hangs on what feeds it by resistor or regulator."""
    fed = (Place(rail=i, name=rail.name) for i, rail in enumerate(board.rails) if rail.fed_through in ("resistor", "regulator"))
    return (Place(), *fed)


def joint_open(specimens: Specimens, scene: Scene) -> Specimens:
    """Nothing passes the joint."""
    if scene.place.rail is None:
        return replace(specimens, joint=_all(specimens, np.inf))
    return _row(specimens, scene, "rail_joint", np.inf)


def _mains(specimens: Specimens, scene: Scene, low: float, high: float) -> Specimens:
    share = scene.between(low, high) * scene.board.mains.voltage / specimens.mains
    return replace(specimens, mains=specimens.mains * share, crest=specimens.crest * share)


def mains_low(specimens: Specimens, scene: Scene) -> Specimens:
    """70 % of nominal up to the low end of its variation."""
    return _mains(specimens, scene, 0.70, 1.0 - scene.board.mains.variation)


def mains_high(specimens: Specimens, scene: Scene) -> Specimens:
    """From the high end of its variation to 120 % of nominal, or 5 % beyond that end."""
    top = 1.0 + scene.board.mains.variation
    return _mains(specimens, scene, top, max(1.20, top + 0.05))
