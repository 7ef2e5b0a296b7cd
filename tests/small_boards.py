"""Small boards for the tests of the physics: one rail, two stacked rails, three rails, built from a handful of figures."""

from __future__ import annotations

from benchtool.board import RECTIFIER, Bleeder, Board, Dropper, Inrush, Load, Mains, Rail, Reservoir, Zener


def rail(
    name: str = "rail",
    zener: float | None = 24.0,
    *,
    clamps_to: str = "common",
    fed_by: str = RECTIFIER,
    through: str | None = None,
    feed: float | None = None,
    reservoir: float | None = 4.7e-3,
) -> Rail:
    """A rail; its reservoir [F] is big enough for next to no ripple unless told otherwise."""
    return Rail(
        name=name,
        fed_by=fed_by,
        fed_through=through,
        feed_resistance=feed,
        zener=None if zener is None else Zener(voltage=zener, clamps_to=clamps_to),
        reservoir=None if reservoir is None else Reservoir(capacitance=reservoir),
    )


def coil(resistance: float, on_rail: str = "rail", returns_to: str = "common", switched: bool = True) -> Load:
    """A relay coil [ohm]."""
    return Load(name="relay", kind="coil", rail=on_rail, returns_to=returns_to, switched=switched, resistance=resistance)


def draws(current: float, on_rail: str = "rail", returns_to: str = "common", name: str = "controller") -> Load:
    """A load of constant current [A]."""
    return Load(name=name, kind="current", rail=on_rail, returns_to=returns_to, current=current)


def board(
    rectifier: str = "bridge",
    capacitance: float = 0.47e-6,
    rails: tuple[Rail, ...] | None = None,
    loads: tuple[Load, ...] = (),
    *,
    volts: float = 230.0,
    hertz: float = 50.0,
    variation: float = 0.10,
    inrush: float | None = None,
    bleeder: float | None = None,
    in_series: int = 1,
    tolerance: float | None = None,
    dropper: Dropper | None = None,
    connected_by: str = "plug",
) -> Board:
    """A board; `tolerance` is that of dropper, inrush resistor and bleeder alike."""
    return Board(
        mains=Mains(voltage=volts, frequency=hertz, variation=variation),
        rectifier=rectifier,
        dropper=dropper or Dropper(capacitance=capacitance, tolerance=tolerance),
        inrush=None if inrush is None else Inrush(resistance=inrush, tolerance=tolerance),
        bleeder=None if bleeder is None else Bleeder(resistance=bleeder, in_series=in_series, tolerance=tolerance),
        rails=rails or (rail(),),
        loads=loads,
        connected_by=connected_by,
    )


def stacked(upper: float, lower: float) -> tuple[Rail, ...]:
    """A rail whose zener [V] stands on a lower rail's zener [V]."""
    return rail("rail", upper, clamps_to="logic"), rail("logic", lower, fed_by="rail", through="zener")


def three_rails() -> tuple[Rail, ...]:
    """18 V stacked on 5.1 V, and a 3.3 V rail fed from the lower of them through 150 ohm."""
    return *stacked(18.0, 5.1), rail("radio", 3.3, fed_by="logic", through="resistor", feed=150.0)
