"""The board as frozen records: what is soldered where, as it is marked, in SI units.

Every field says beside its type what a case file accepts for it (`Quantity`, `Choice`, …). The file reader,
the file writer and the error sentences are made from these records, so a key is described here and nowhere else.
A part that is there but cannot be read has the value `UNKNOWN`; a part that is not there is `None`.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import Enum
from typing import Annotated

COMMON = "common"
RECTIFIER = "rectifier"


class Unknown(Enum):
    """The value of a part that is fitted but cannot be read: charred, worn off, never stated."""

    UNKNOWN = "unknown"


UNKNOWN = Unknown.UNKNOWN
Maybe = float | Unknown


@dataclass(frozen=True, slots=True)
class Quantity:
    """A number with a unit [SI `unit`], from `low` to `high`; `unknown` lets the word stand in its place."""

    unit: str
    low: float
    high: float
    unknown: bool = False


@dataclass(frozen=True, slots=True)
class Choice:
    """One of a few words."""

    words: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Text:
    """The user's own words, at most `limit` characters; a name may not be empty, only with `lines` more than one line."""

    limit: int = 500
    name: bool = False
    lines: bool = False


@dataclass(frozen=True, slots=True)
class Whole:
    """A whole number from `low` to `high`."""

    low: int
    high: int


@dataclass(frozen=True, slots=True)
class Flag:
    """true or false."""


@dataclass(frozen=True, slots=True)
class Moment:
    """A TOML date, or a TOML date with time of day."""

    time_of_day: bool


@dataclass(frozen=True, slots=True)
class Names:
    """A list of names or words."""


@dataclass(frozen=True, slots=True)
class Table:
    """A table of its own: one record."""

    record: type
    key: str


@dataclass(frozen=True, slots=True)
class Tables:
    """An array of tables: one record each, from `least` to `most` of them."""

    record: type
    key: str
    least: int = 0
    most: int = 100


Resistance = Quantity("ohm", 1e-3, 1e7, unknown=True)
Capacitance = Quantity("F", 1e-12, 1e-4, unknown=True)
LargeCapacitance = Quantity("F", 1e-12, 1.0, unknown=True)
KnownCapacitance = Quantity("F", 1e-12, 1e-4)
Voltage = Quantity("V", 0.1, 1000.0)
Power = Quantity("W", 1e-3, 1000.0)
Current = Quantity("A", 1e-6, 10.0, unknown=True)
Tolerance = Quantity("%", 0.0, 0.95)
Share = Quantity("%", 0.01, 1.0)


@dataclass(frozen=True, slots=True, kw_only=True)
class Mains:
    """The supply at the board's input: nominal RMS voltage [V], frequency [Hz], variation both ways [1]."""

    voltage: Annotated[float, Quantity("V", 10.0, 1000.0)]
    frequency: Annotated[float, Quantity("Hz", 10.0, 1000.0)]
    variation: Annotated[float, Quantity("%", 0.0, 0.5)] = 0.10


@dataclass(frozen=True, slots=True, kw_only=True)
class Fuse:
    """The fuse in the mains lead: rated current [A]."""

    rated_current: Annotated[float | None, Quantity("A", 1e-3, 100.0)] = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Varistor:
    """The surge arrester across the input: continuous AC voltage [V]."""

    voltage: Annotated[float | None, Voltage] = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Dropper:
    """The part that carries the mains current: a capacitor [F], a resistor [ohm] or a capacitive divider."""

    kind: Annotated[str, Choice(("capacitor", "resistor", "divider"))] = "capacitor"
    capacitance: Annotated[Maybe | None, Capacitance] = None
    resistance: Annotated[Maybe | None, Resistance] = None
    rated_power: Annotated[float | None, Power] = None
    shunt_capacitance: Annotated[Maybe | None, Capacitance] = None
    tolerance: Annotated[float | None, Tolerance] = None
    fitted: Annotated[float | None, KnownCapacitance] = None
    in_parallel: Annotated[int, Whole(1, 20)] = 1
    safety_class: Annotated[str | None, Choice(("X1", "X2", "X3", "Y1", "Y2", "none"))] = None
    rated_voltage: Annotated[float | None, Voltage] = None
    dielectric: Annotated[str | None, Choice(("polypropylene", "polyester", "paper"))] = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Inrush:
    """The resistor in series with the dropper that limits the switch-on surge [ohm, W]."""

    resistance: Annotated[Maybe, Resistance]
    tolerance: Annotated[float | None, Tolerance] = None
    rated_power: Annotated[float | None, Power] = None
    fusible: Annotated[bool, Flag()] = False


@dataclass(frozen=True, slots=True, kw_only=True)
class Bleeder:
    """The string of equal resistors across the dropper that empties it: each [ohm], rated voltage each [V]."""

    resistance: Annotated[Maybe, Resistance]
    in_series: Annotated[int, Whole(1, 20)] = 1
    tolerance: Annotated[float | None, Tolerance] = None
    rated_voltage: Annotated[float | None, Voltage] = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Zener:
    """The shunt regulator of a rail [V, W]; `clamps_to` common, or a lower rail when zeners are stacked."""

    voltage: Annotated[Maybe, Quantity("V", 1.0, 400.0, unknown=True)]
    tolerance: Annotated[float | None, Tolerance] = None
    rated_power: Annotated[float | None, Power] = None
    clamps_to: Annotated[str, Text(60, name=True)] = COMMON


@dataclass(frozen=True, slots=True, kw_only=True)
class Reservoir:
    """The electrolytic from a rail to common [F, V]."""

    capacitance: Annotated[Maybe, LargeCapacitance]
    tolerance: Annotated[float | None, Tolerance] = None
    rated_voltage: Annotated[float | None, Voltage] = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Rail:
    """One low-voltage rail: what feeds it and how, its zener and its reservoir."""

    name: Annotated[str, Text(60, name=True)]
    fed_by: Annotated[str, Text(60, name=True)]
    short: Annotated[str | None, Text(20, name=True)] = None
    fed_through: Annotated[str | None, Choice(("zener", "resistor", "regulator"))] = None
    feed_resistance: Annotated[Maybe | None, Resistance] = None
    feed_tolerance: Annotated[float | None, Tolerance] = None
    regulated_voltage: Annotated[float | None, Voltage] = None
    dropout: Annotated[float | None, Quantity("V", 0.0, 20.0)] = None
    ground_current: Annotated[float | None, Quantity("A", 0.0, 1.0)] = None
    zener: Annotated[Zener | None, Table(Zener, "zener")] = None
    reservoir: Annotated[Reservoir | None, Table(Reservoir, "reservoir")] = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Load:
    """What a rail runs: coil, resistor, LED, constant current or triac gate pulse."""

    name: Annotated[str, Text(60, name=True)]
    kind: Annotated[str, Choice(("current", "coil", "resistor", "led", "gate"))]
    rail: Annotated[str, Text(60, name=True)]
    short: Annotated[str | None, Text(20, name=True)] = None
    returns_to: Annotated[str, Text(60, name=True)] = COMMON
    switched: Annotated[bool, Flag()] = False
    current: Annotated[Maybe | None, Current] = None
    pulse: Annotated[float | None, Quantity("s", 1e-6, 0.02)] = None
    resistance: Annotated[Maybe | None, Resistance] = None
    power: Annotated[float | None, Power] = None
    nominal_voltage: Annotated[float | None, Voltage] = None
    forward_voltage: Annotated[float | None, Quantity("V", 0.5, 200.0)] = None
    tolerance: Annotated[float | None, Tolerance] = None
    pull_in: Annotated[float | None, Share] = None
    drop_out: Annotated[float | None, Share] = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Board:
    """One supply from plug pin to loads. Rails stand in the file's order, the first is the one the rectifier feeds."""

    mains: Mains
    rectifier: Annotated[str, Choice(("bridge", "half-wave", "half-wave-zener"))]
    dropper: Annotated[Dropper, Table(Dropper, "dropper")]
    rails: Annotated[tuple[Rail, ...], Tables(Rail, "rail", least=1, most=8)]
    loads: Annotated[tuple[Load, ...], Tables(Load, "load", most=40)] = ()
    name: Annotated[str, Text()] = ""
    made: Annotated[int | None, Whole(1900, 2200)] = None
    connected_by: Annotated[str, Choice(("plug", "fixed"))] = "plug"
    ambient: Annotated[float, Quantity("degC", -40.0, 125.0)] = 40.0
    fuse: Annotated[Fuse | None, Table(Fuse, "fuse")] = None
    varistor: Annotated[Varistor | None, Table(Varistor, "varistor")] = None
    inrush: Annotated[Inrush | None, Table(Inrush, "inrush")] = None
    bleeder: Annotated[Bleeder | None, Table(Bleeder, "bleeder")] = None

    def rail(self, name: str) -> Rail:
        """The rail of that name; `KeyError` where there is none."""
        return self.rails[self.rail_index(name)]

    def rail_index(self, name: str) -> int:
        """Its place in `rails`; `KeyError` where there is none."""
        for index, rail in enumerate(self.rails):
            if rail.name == name:
                return index
        raise KeyError(name)

    def switched_loads(self) -> tuple[str, ...]:
        """Names of the loads that an appliance function turns on and off, in the file's order."""
        return tuple(load.name for load in self.loads if load.switched)


HALF_WAVE_ZENER_LOSS = 0.7
"""The series diode behind a half-wave-zener's first zener [V]: the rail stands that much lower."""


def nominal_voltage(board: Board, rail: Rail) -> float | None:
    """The rail's nominal voltage to common [V], or None where its zeners are unknown or there are none.

    The sum of the zeners down to common (half-wave-zener: 0.7 V less), or the regulated voltage; the contract's section 1.
    """
    if rail.fed_through == "regulator":
        return rail.regulated_voltage
    if rail.zener is None or isinstance(rail.zener.voltage, Unknown):
        return None
    if rail.zener.clamps_to != COMMON:
        below = nominal_voltage(board, board.rail(rail.zener.clamps_to))
        return None if below is None else below + rail.zener.voltage
    loss = HALF_WAVE_ZENER_LOSS if board.rectifier == "half-wave-zener" and rail is board.rails[0] else 0.0
    return rail.zener.voltage - loss


DEFAULT_PULL_IN = 0.75
DEFAULT_DROP_OUT = 0.10
"""Guaranteed pull-in at most, drop-out at least, of the coil's nominal voltage: relay data sheets in the published values."""


def resistance_of(load: Load) -> Maybe | None:
    """The marked resistance of a coil, resistor or LED load [ohm], or from the printed coil power; None where not stated."""
    if load.resistance is None and load.power is not None and load.nominal_voltage is not None:
        return load.nominal_voltage**2 / load.power
    return load.resistance
