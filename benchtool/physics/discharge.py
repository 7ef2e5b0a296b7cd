"""What stays charged after unplugging, in the worst case, and how long it takes to leave: by itself, or through a tool.

Told in one place because it is what kills on an unplugged board: dropper, a divider's shunt and every reservoir, each with the
highest voltage it may be left at, the charge and the energy in it, and the seconds a discharge tool must be held on. Everything
is a bound from above: highest crest, capacitances and bleeder at the high end of their tolerance, nothing drawn by the loads.
None of it says that a part is empty: that is measured, on a DC range.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from benchtool.board import Board, Maybe, Rail, Unknown, nominal_voltage
from benchtool.physics import constants as known
from benchtool.physics import laws
from benchtool.physics.budget import dropper_tolerance
from benchtool.physics.stress import highest_crest

TIME_CONSTANTS = 5.0
"""Time constants to wait before the discharge by hand: 0.7 % of the crest is left. Common practice, no source."""
SHORTEST_BLEEDER = 1.0
"""A bleeder read under this counts as this [ohm]: no meter tells it from its leads."""
DISCHARGE_TOOL = 10e3
"""Resistance of the discharge tool where none is told [ohm]; 10 kΩ for 15 s (published values, cautions a bench needs)."""
SHORTEST_HOLD = 15.0
"""Seconds that the tool is held on at least (published values, cautions a bench needs)."""
HOLD_STEP = 5.0
"""The time to hold a tool on is told in whole steps of this [s], rounded up. Common practice, no source."""


@dataclass(frozen=True, slots=True)
class Discharge:
    """What the dropper keeps after unplugging, in the slowest corner: capacitance [F], bleeder [ohm], times [s].

    `charge` [C] and `energy` [J] are those at the highest crest `start` [V]. None where a value cannot be known; `bleeder` and
    the times are None as well where `has_bleeder` is false: none is fitted, or it was read open. `wait` is in whole
    `TIME_CONSTANTS` seconds. `left` [V] is what the pins still hold when the limit's time is over. `limited`: whether a limit at
    the plug applies at all (plug-connected and over 0.1 µF).
    """

    start: float
    capacitance: float | None
    bleeder: float | None
    to_limit: float | None
    left: float | None
    wait: float | None
    charge: float | None
    energy: float | None
    limited: bool
    has_bleeder: bool

    @property
    def slow(self) -> bool | None:
        """Whether the plug stays above its limit for too long; None where that cannot be known."""
        if not self.limited:
            return False
        if self.to_limit is not None:
            return self.to_limit > known.PLUG_LIMIT_SECONDS
        return None if self.has_bleeder else True


def discharge_of(board: Board, bleeder_read: float | None = None) -> Discharge:
    """The dropper's discharge through its bleeder: highest crest, dropper and bleeder at the high end of their tolerance.

    `bleeder_read` [ohm] is what the whole string was read as, infinite for open; it stands in the mark's place.
    """
    capacitance, bleeder = _highest_capacitance(board), _bleeder(board, bleeder_read)
    start = highest_crest(board)
    time, wait, left = None, None, None
    if capacitance is not None and bleeder is not None:
        time = float(laws.discharge_time(start, bleeder, capacitance, known.PLUG_LIMIT_VOLTS))
        left = float(laws.discharge_voltage(start, bleeder, capacitance, known.PLUG_LIMIT_SECONDS))
        wait = TIME_CONSTANTS * math.ceil(bleeder * capacitance)
    return Discharge(
        start=start,
        capacitance=capacitance,
        bleeder=bleeder,
        to_limit=time,
        left=left,
        wait=wait,
        charge=None if capacitance is None else capacitance * start,
        energy=None if capacitance is None else 0.5 * capacitance * start**2,
        limited=_limited(board),
        has_bleeder=board.bleeder is not None and bleeder_read != math.inf,
    )


@dataclass(frozen=True, slots=True)
class Held:
    """A capacitor left at `volts` [V]: charge [C], energy [J], and the seconds [s] a tool takes to bring it to `DEAD_VOLTS`.

    All but the volts None where the capacitance cannot be read.
    """

    volts: float
    charge: float | None
    energy: float | None
    seconds: float | None

    @property
    def hold(self) -> float | None:
        """How long to hold the tool on before measuring [s]: `seconds`, rounded up to whole `HOLD_STEP`."""
        return None if self.seconds is None else HOLD_STEP * max(math.ceil(self.seconds / HOLD_STEP), 1)


def held_at(volts: float, capacitance: float | None, through: float) -> Held:
    """What `capacitance` [F] holds at `volts` [V], and how long it takes to leave through the resistance `through` [ohm].

    Q = C·V, E = ½·C·V², t = RC·ln(V / 5 V): definitions.
    """
    if capacitance is None:
        return Held(volts, None, None, None)
    seconds = float(laws.discharge_time(volts, through, capacitance, known.DEAD_VOLTS))
    return Held(volts, capacitance * volts, 0.5 * capacitance * volts**2, seconds)


@dataclass(frozen=True, slots=True)
class Store:
    """One part to discharge by hand, named as in the case file: its capacitance [F] at the high end of its tolerance.

    `regulated`: what it holds while its rail is held; None for a film capacitor, and where nothing known holds the rail.
    `worst`: what it may hold where a zener has gone open, or, for a film capacitor, at the highest crest.
    """

    part: str
    capacitance: float | None
    regulated: Held | None
    worst: Held


def stores_of(board: Board, bleeder_read: float | None = None, tool: float = DISCHARGE_TOOL) -> tuple[Store, ...]:
    """Everything that may stay charged: the dropper, a divider's shunt, each reservoir in the rails' order.

    `tool` [ohm], above zero, is the discharge tool's resistance, held across one part after the other. The dropper's bleeder
    helps where it is known and whole; `bleeder_read` [ohm] as in `discharge_of`. An unknown one counts as open.
    """
    films = [] if board.dropper.kind == "resistor" else [_dropper(board, bleeder_read, tool)]
    if board.dropper.kind == "divider":
        films.append(_shunt(board, tool))
    return *films, *(_reservoir(board, rail, tool) for rail in board.rails if rail.reservoir is not None)


def hold_seconds(board: Board, bleeder_read: float | None = None) -> float:
    """How long to hold the default tool on each part before measuring [s], so that the slowest is under 5 V whatever zener has
    gone open; never under `SHORTEST_HOLD`. Parts whose capacitance cannot be known are not in it: the meter tells.
    """
    holds = [store.worst.hold for store in stores_of(board, bleeder_read)]
    return max([SHORTEST_HOLD, *(hold for hold in holds if hold is not None)])


def worst_voltage(board: Board, rail: Rail) -> float:
    """How high the reservoir of `rail` may be left [V] where one zener of the board is open and hardly a load draws.

    Up to the highest crest; a half-wave rectifier and its dropper pump to twice that. A half-wave-zener cannot pump, for its
    zener is the way back: what leaks across the dropper, its bleeder or a meter, still lifts the rail to the crest (published
    values). Behind a resistor a rail with a zener of its own stays under the rail that feeds it. A regulator counts as passing
    on whatever feeds it: fed from beyond its rating it may break through.
    """
    if rail.fed_through not in ("resistor", "regulator"):
        pumps = board.rectifier not in ("bridge", "half-wave-zener") and board.dropper.kind != "resistor"
        return highest_crest(board) * (2.0 if pumps else 1.0)
    feeding = board.rail(rail.fed_by)
    held = None if rail.zener is None else nominal_voltage(board, feeding)
    return worst_voltage(board, feeding) if held is None else held


def _dropper(board: Board, bleeder_read: float | None, tool: float) -> Store:
    capacitance, bleeder = _highest_capacitance(board), _bleeder(board, bleeder_read)
    through = tool if bleeder is None else 1.0 / (1.0 / tool + 1.0 / bleeder)
    return Store("dropper", capacitance, None, held_at(highest_crest(board), capacitance, through))


def _shunt(board: Board, tool: float) -> Store:
    """The whole crest, as a shorted dropper in front of an open rectifier leaves it."""
    capacitance = _at_high_end(board.dropper.shunt_capacitance, dropper_tolerance(board))
    return Store("shunt", capacitance, None, held_at(highest_crest(board), capacitance, tool))


def _reservoir(board: Board, rail: Rail, tool: float) -> Store:
    assert rail.reservoir is not None
    stated = rail.reservoir.tolerance
    capacitance = _at_high_end(rail.reservoir.capacitance, known.RESERVOIR_TOLERANCE if stated is None else stated)
    nominal = nominal_voltage(board, rail)
    regulated = None if nominal is None else held_at(nominal, capacitance, tool)
    return Store(f"reservoir:{rail.name}", capacitance, regulated, held_at(worst_voltage(board, rail), capacitance, tool))


def _limited(board: Board) -> bool:
    """The limit speaks of the rated capacitance; one that cannot be read may be over the exempt one."""
    marked = board.dropper.capacitance
    if board.connected_by == "fixed" or marked is None:
        return False
    return isinstance(marked, Unknown) or max(marked, board.dropper.fitted or 0.0) > known.PLUG_EXEMPT


def _highest_capacitance(board: Board) -> float | None:
    value = board.dropper.capacitance
    if board.dropper.kind == "resistor" or value is None or isinstance(value, Unknown):
        return None
    return _at_high_end(max(value, board.dropper.fitted or 0.0), dropper_tolerance(board))


def _at_high_end(value: Maybe | None, tolerance: float) -> float | None:
    return None if value is None or isinstance(value, Unknown) else value * (1.0 + tolerance)


def _bleeder(board: Board, read: float | None) -> float | None:
    if read is None or board.bleeder is None:
        return _highest_bleeder(board)
    return None if read == math.inf else max(read, SHORTEST_BLEEDER)


def _highest_bleeder(board: Board) -> float | None:
    bleeder = board.bleeder
    if bleeder is None or isinstance(bleeder.resistance, Unknown):
        return None
    tolerance = known.RESISTOR_TOLERANCE if bleeder.tolerance is None else bleeder.tolerance
    return bleeder.resistance * bleeder.in_series * (1.0 + tolerance)
