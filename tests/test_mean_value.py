"""The means: Kirchhoff's current law added up anew at every rail, extreme boards, faults, and what limits say.

The currents are written here from the case format's section 4, branch by branch, and not taken from the product's branches.
What the means leave out, ripple and all that follows from it, is judged on the settled cycle (`test_waveform.py`).
"""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from scipy.optimize import brentq

from benchtool.board import Board, Dropper, Load
from benchtool.physics.laws import Array
from benchtool.physics.mean_value import Means, demand_at, mean_pulses, means
from benchtool.physics.network import load_figures
from benchtool.physics.specimens import Junction, Specimens, Switch, as_marked, concatenate, population, take
from tests.made_cases import boards
from tests.small_boards import board, coil, draws, rail, stacked, three_rails

CREST = np.sqrt(2.0) * 230.0
LED = Load(name="lamp", kind="led", rail="rail", returns_to="logic", forward_voltage=2.0, resistance=1500.0)
HEATER = Load(name="sensor", kind="resistor", rail="logic", resistance=2200.0)
RADIO = draws(0.002, "radio", name="receiver")
LOADS = (coil(810.0, returns_to="logic"), draws(0.0035, "logic"), LED, HEATER, RADIO)
CROWDED = board(capacitance=680e-9, inrush=100.0, rails=three_rails(), loads=LOADS)
METER = 10e6
"""A voltmeter of 10 MΩ stands on each rail, as a reading is taken."""


def changed(specimens: Specimens, **parts: Any) -> Specimens:
    """Specimens with some parts replaced, each by one figure for all."""
    arrays = {name: np.full_like(getattr(specimens, name), value) for name, value in parts.items()}
    return replace(specimens, **arrays)


def means_of(made: Board | Specimens, on: tuple[str, ...] = (), *, warm: bool = False) -> Means:
    found = means(as_marked(made) if isinstance(made, Board) else made, on, warm=warm)
    assert found.solved.all()
    return found


def loads_of(found: Means) -> tuple[Array, Array]:
    """Volts across every load and its amperes."""
    return load_figures(found.network, found.rails, mean_pulses(found.network.specimens))


# Kirchhoff -----------------------------------------------------------------------------------------------------------------


def zener(volts: float, marked: float) -> float:
    """5 mA at the mark, e-fold in 60 mV; its forward conduction plays no part here."""
    return 0.005 * float(np.exp((volts - marked) / 0.060))


def led(volts: float) -> float:
    """2.0 V at 6 mA, e-fold in 50 mV, behind 1.5 kΩ: the current at which both drops add up."""
    return float(brentq(lambda amperes: 2.0 + 0.05 * np.log(amperes / 0.006) + 1500.0 * amperes - volts, 1e-30, 1.0, xtol=1e-18))


@pytest.mark.parametrize("on", [(), ("relay",)], ids=["off", "on"])
def test_currents_into_every_rail_add_up_to_nothing(on: tuple[str, ...]) -> None:
    # Within 1 µA: the law's term for large series resistances moves 0.3 µA here.
    upper, logic, radio = (float(volts) for volts in means_of(CROWDED, on).rails[:, 0])
    supply = 4.0 * 50.0 * 680e-9 * (CREST / np.hypot(1.0, 2.0 * np.pi * 50.0 * 100.0 * 680e-9) - upper - 1.4)
    relay = (upper - logic) / 810.0 if on else 0.0
    down = zener(upper - logic, 18.0) + led(upper - logic) + relay
    feed = (logic - radio) / 150.0
    controller, receiver = 0.0035 * np.tanh(logic / 0.5), 0.002 * np.tanh(radio / 0.5)
    assert supply - down - upper / METER == pytest.approx(0.0, abs=1e-6)
    assert down - zener(logic, 5.1) - controller - logic / 2200.0 - feed - logic / METER == pytest.approx(0.0, abs=1e-6)
    assert feed - zener(radio, 3.3) - receiver - radio / METER == pytest.approx(0.0, abs=1e-6)


def test_what_is_told_of_loads_and_zeners_follows_from_the_rails() -> None:
    found = means_of(CROWDED, ("relay",))
    upper, logic, radio = found.rails[:, 0]
    voltage, current = loads_of(found)
    np.testing.assert_allclose(voltage[:, 0], [upper - logic, logic, upper - logic, logic, radio])
    controller, receiver = 0.0035 * np.tanh(logic / 0.5), 0.002 * np.tanh(radio / 0.5)
    wanted = [(upper - logic) / 810.0, controller, led(upper - logic), logic / 2200.0, receiver]
    np.testing.assert_allclose(current[:, 0], wanted, rtol=1e-6)
    np.testing.assert_allclose(
        found.zener_current[:, 0], [zener(upper - logic, 18.0), zener(logic, 5.1), zener(radio, 3.3)], rtol=1e-6
    )


def test_many_specimens_are_solved_as_each_alone() -> None:
    together = population(CROWDED, 32)
    found, alone = means_of(together, ("relay",)), means_of(take(together, np.array([7])), ("relay",))
    np.testing.assert_allclose(alone.rails[:, 0], found.rails[:, 7], rtol=1e-6)
    np.testing.assert_allclose(alone.line_current[0], found.line_current[7], rtol=1e-6)


def test_demand_is_what_the_supply_delivers() -> None:
    # Held at the voltage it settles to, the first rail takes just what the rectifier gave it there.
    found = means_of(CROWDED, ("relay",))
    held = demand_at(as_marked(CROWDED), ("relay",), False, found.rails[0])
    np.testing.assert_allclose(held, found.supply_current, rtol=1e-4)


# Extremes ------------------------------------------------------------------------------------------------------------------

EXTREMES: dict[str, dict[str, Any]] = {
    "dropper 1 pF": {"capacitance": 1e-12},
    "dropper 100 µF": {"capacitance": 100e-6},
    "inrush 1 mΩ": {"inrush": 1e-3},
    "inrush 10 MΩ": {"inrush": 10e6},
    "bleeder 1 mΩ": {"bleeder": 1e-3},
    "resistor 1 mΩ": {"dropper": Dropper(kind="resistor", resistance=1e-3), "inrush": 1e-3},
    "resistor 10 MΩ": {"dropper": Dropper(kind="resistor", resistance=10e6)},
    "no load": {"loads": ()},
    "no zener": {"rails": (rail(zener=None),)},
    "no zener, no load": {"rails": (rail(zener=None),), "loads": ()},
    "no reservoir": {"rails": (rail(reservoir=None),)},
    "next to no reservoir": {"rails": (rail(reservoir=1e-12),)},
    "bleeder only": {"capacitance": 1e-12, "bleeder": 1e6},
    "load 10 A": {"loads": (draws(10.0),)},
    "coil 1 mΩ": {"loads": (replace(coil(1e-3), switched=False),)},
    "zener over the crest": {"rails": (rail(zener=400.0),), "volts": 10.0},
    "10 V, 10 Hz": {"volts": 10.0, "hertz": 10.0},
    "1000 V, 1 kHz, 100 µF": {"volts": 1000.0, "hertz": 1000.0, "capacitance": 100e-6},
    "stacked, 100 µF": {"rails": stacked(18.0, 5.1), "capacitance": 100e-6},
    "three rails, 1 pF": {"rails": three_rails(), "capacitance": 1e-12},
}


def assert_numbers(found: Means) -> None:
    """Every figure is a number."""
    for figure in (found.rails, found.zener_current, found.line_current, found.supply_current, *loads_of(found)):
        assert np.isfinite(figure).all()


@pytest.mark.parametrize("rectifier", ["bridge", "half-wave", "half-wave-zener"])
@pytest.mark.parametrize("extreme", EXTREMES.values(), ids=EXTREMES.keys())
def test_extreme_boards_are_solved(rectifier: str, extreme: dict[str, Any]) -> None:
    # No warning either: the settings of pytest make each an error.
    usual: dict[str, Any] = {"loads": (draws(0.004),), "inrush": 100.0}
    made = board(rectifier, **{**usual, **extreme})
    assert_numbers(means_of(made))
    assert_numbers(means_of(population(made, 16)))


@settings(max_examples=150, deadline=None)
@given(boards())
def test_every_board_a_file_accepts_gives_numbers(made: Board) -> None:
    assert_numbers(means(as_marked(made), ()))
    assert_numbers(means(as_marked(made), made.switched_loads(), warm=True))


# Limits and faults ---------------------------------------------------------------------------------------------------------

DEAD = 0.02
"""A dead rail stands at nothing to within what the default voltmeter resolves [V] (its floor in the case format)."""
ONE = board(inrush=100.0, bleeder=1e6, loads=(draws(0.005),))


@pytest.mark.parametrize("rectifier", ["bridge", "half-wave", "half-wave-zener"])
def test_without_mains_nothing_stands_anywhere(rectifier: str) -> None:
    dead = means_of(changed(as_marked(board(rectifier, inrush=100.0, loads=(draws(0.005),))), crest=0.0, mains=0.0))
    np.testing.assert_allclose(dead.rails, 0.0, atol=DEAD)
    np.testing.assert_allclose(dead.line_current, 0.0, atol=1e-9)


@pytest.mark.parametrize("part", ["fuse", "inrush", "joint"])
def test_a_dead_population_without_a_bleeder_is_solved(part: str) -> None:
    # The commonest dead board: nothing comes in, and a controller of a few milliamperes has emptied the rail.
    assert_numbers(means_of(changed(population(board(inrush=100.0, loads=(draws(0.005),)), 64), **{part: np.inf})))


def test_an_open_dropper_leaves_the_bleeder_feeding_the_board() -> None:
    # 1 MΩ from 325 V crest into a rail near zero: 2/π of 0.32 mA, by the mean of a rectified sine.
    fed = means_of(changed(as_marked(ONE), capacitance=0.0))
    assert 0.0 < fed.rails[0, 0] < 1.0
    drop = fed.rails[0, 0] + 1.4
    assert fed.supply_current[0] == pytest.approx(2.0 / np.pi * CREST / 1e6 - drop / 1e6, rel=0.005)
    # Without a bleeder, nothing at all.
    bare = means_of(changed(as_marked(ONE), capacitance=0.0, bleeder=np.inf))
    assert bare.rails[0, 0] == pytest.approx(0.0, abs=DEAD)
    assert bare.line_current[0] == pytest.approx(0.0, abs=1e-9)


@pytest.mark.parametrize("part", ["fuse", "inrush", "joint"])
def test_an_open_series_part_leaves_nothing(part: str) -> None:
    opened = means_of(changed(as_marked(ONE), **{part: np.inf}))
    assert_numbers(opened)
    assert opened.rails[0, 0] == pytest.approx(0.0, abs=DEAD)
    assert opened.supply_current[0] == opened.line_current[0] == 0.0


def test_light_load_without_its_zener_climbs_towards_the_crest_of_a_bridge() -> None:
    # Nothing but a meter's 10 MΩ to hold it (time-step simulation: 272 V reported in one 230 V case with a load).
    made = changed(as_marked(board(inrush=100.0)), zener=np.inf)
    assert 0.98 * CREST < means_of(made).rails[0, 0] < CREST


def test_light_load_without_its_zener_climbs_towards_twice_the_crest_of_a_half_wave() -> None:
    # Two diodes and a dropper are a pump (time-step simulation: 668 V nearly unloaded at 240 V mains, crest 339.4 V).
    made = changed(as_marked(board("half-wave", inrush=100.0, volts=240.0)), zener=np.inf)
    assert 660.0 < means_of(made).rails[0, 0] < 2.0 * 339.4


def test_an_open_zener_at_the_node_leaves_no_return_path() -> None:
    found = means_of(changed(as_marked(board("half-wave-zener", inrush=100.0, loads=(draws(0.005),))), zener=np.inf))
    assert found.rails[0, 0] == pytest.approx(0.0, abs=0.01)
    assert found.supply_current[0] == pytest.approx(0.0, abs=1e-6)


def test_an_open_bridge_diode_is_not_half_the_current_but_none() -> None:
    # The dropper blocks; only its bleeder feeds on (time-step simulation).
    assert means_of(changed(as_marked(ONE), junction=float(Junction.SERIES_OPEN))).rails[0, 0] < 1.0
    bare = means_of(changed(as_marked(ONE), junction=float(Junction.SERIES_OPEN), bleeder=np.inf))
    assert bare.supply_current[0] == pytest.approx(0.0, abs=1e-9)


def test_a_shorted_bridge_diode_halves_the_current() -> None:
    # Time-step simulation: half the current.
    good, short = means_of(ONE), means_of(changed(as_marked(ONE), junction=float(Junction.SERIES_SHORT)))
    assert short.supply_current[0] / good.supply_current[0] == pytest.approx(0.5, rel=0.05)


@pytest.mark.parametrize("state", [Junction.SERIES_SHORT, Junction.RETURN_SHORT])
def test_a_shorted_half_wave_diode_leaves_the_rail_at_nothing(state: Junction) -> None:
    # Series diode: the rail is discharged again through it. Return diode: everything goes back there (time-step simulation).
    made = board("half-wave", inrush=100.0, loads=(draws(0.005),))
    assert means_of(changed(as_marked(made), junction=float(state))).rails[0, 0] == pytest.approx(0.0, abs=0.05)


def test_a_shorted_zener_takes_everything() -> None:
    found = means_of(changed(as_marked(ONE), zener_short=1.0))
    assert found.rails[0, 0] == pytest.approx(found.supply_current[0] * 1.0, rel=0.01)


def test_more_load_never_lifts_the_rail() -> None:
    marked = as_marked(ONE)
    amperes = np.linspace(0.0, 0.06, 25)
    volts = means_of(concatenate([replace(marked, load_current=np.array([[each]])) for each in amperes])).rails[0]
    assert np.all(np.diff(volts) < 0.0)
    # Within what 0.47 µF delivers the zener holds the rail; beyond it the rail is gone.
    assert abs(volts[amperes < 0.025] - 24.0).max() < 0.2
    assert volts[amperes > 0.035].max() < 1.5


# Switches, warmth ----------------------------------------------------------------------------------------------------------

RELAY = board(capacitance=680e-9, loads=(coil(1440.0),))


def relay_current(found: Means) -> float:
    return float(loads_of(found)[1][0, 0])


def test_on_is_what_is_commanded() -> None:
    # A stuck switch draws unnamed, an open one is named without drawing; neither drops anything.
    off, on = means_of(RELAY), means_of(RELAY, ("relay",))
    stuck = means_of(changed(as_marked(RELAY), switch=float(Switch.STUCK)))
    opened = means_of(changed(as_marked(RELAY), switch=float(Switch.OPEN)), ("relay",))
    assert relay_current(off) == relay_current(opened) == 0.0
    assert relay_current(stuck) == pytest.approx(relay_current(on))
    assert relay_current(on) == pytest.approx(on.rails[0, 0] / 1440.0)


def test_a_warm_coil_draws_less_by_the_copper_rule() -> None:
    # Copper gains 0.39 % a kelvin; inside a warm appliance a coil after 15 minutes is some tens of kelvin warmer.
    cold, warm = means_of(RELAY, ("relay",)), means_of(RELAY, ("relay",), warm=True)
    assert 1.1 < relay_current(cold) / relay_current(warm) < 1.35


def test_zeners_warm_themselves_in_a_population_and_not_on_a_board_as_marked() -> None:
    # 24 V at about 38 mA and 50 to 130 K/W: 45 to 120 K at 0.09 % a kelvin, so 1 to 2.6 V more than cold.
    marked = as_marked(board(capacitance=680e-9))
    cold = means_of(marked)
    np.testing.assert_array_equal(cold.network.specimens.zener_kelvin_per_watt, 0.0)
    assert population(board(), 8).zener_kelvin_per_watt.min() >= 50.0
    watts = cold.zener_current[0, 0] * cold.rails[0, 0]
    warm = means_of(changed(marked, zener_kelvin_per_watt=90.0))
    assert warm.rails[0, 0] - cold.rails[0, 0] == pytest.approx(24.0 * 9e-4 * 90.0 * watts, rel=0.12)


def test_a_zener_of_five_volts_hardly_moves_with_warmth() -> None:
    # 5.1 V: the temperature coefficient is nil there.
    marked = as_marked(board(capacitance=680e-9, rails=(rail(zener=5.1),)))
    warm = means_of(changed(marked, zener_kelvin_per_watt=130.0))
    assert warm.rails[0, 0] == pytest.approx(means_of(marked).rails[0, 0], abs=1e-3)
