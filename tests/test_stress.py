"""Powers, stored charge and bleeder strings: against sums of every part's heat, and the standards' discharge limits."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest

from benchtool.board import UNKNOWN, Bleeder, Board, Dropper
from benchtool.physics import constants as known
from benchtool.physics.mean_value import settle
from benchtool.physics.settled import Settled
from benchtool.physics.specimens import as_marked
from benchtool.physics.stress import bleeder_share, discharge_of, highest_crest, mains_power
from tests.small_boards import board, coil, draws, rail, three_rails

LOADS = (coil(810.0), draws(0.0035, "logic"))
THREE = board(capacitance=680e-9, inrush=100.0, bleeder=470e3, in_series=2, rails=three_rails(), loads=LOADS)


def one_rail(rectifier: str) -> Board:
    return board(rectifier, 470e-9, (rail(zener=15.0),), (draws(0.004),), inrush=470.0, bleeder=1e6)


def settled_of(made: Board, on: tuple[str, ...] = ()) -> Settled:
    settled = settle(as_marked(made), on)
    assert settled.converged.all()
    return settled


def heat_of_rails(made: Board, settled: Settled) -> float:
    """What zeners, loads and the feed resistor turn into heat [W], each as volts across it times amperes through it."""
    volts = {"common": 0.0} | {rail.name: float(settled.rail_voltage[index, 0]) for index, rail in enumerate(made.rails)}
    heat = 0.0
    for index, each in enumerate(made.rails):
        if each.zener is not None and made.rectifier != "half-wave-zener":
            heat += (volts[each.name] - volts[each.zener.clamps_to]) * float(settled.zener_current[index, 0])
        if isinstance(each.feed_resistance, float):
            heat += (volts[each.fed_by] - volts[each.name]) ** 2 / each.feed_resistance
    for index, load in enumerate(made.loads):
        heat += (volts[load.rail] - volts[load.returns_to]) * float(settled.load_current[index, 0])
    return heat


def heat_before_the_rails(made: Board, settled: Settled) -> float:
    """Inrush resistor and dropper with its bleeder [W]."""
    marked = as_marked(made)
    inrush = float(settled.line_current[0]) ** 2 * float(marked.inrush[0])
    across = float(settled.dropper_voltage[0]) ** 2 + float(settled.dropper_dc[0]) ** 2
    # Loss tangent of X2 polypropylene, typically 6e-4 (KEMET R.46 sheet): a small share of the reactive power.
    film = 6e-4 * 2.0 * np.pi * 50.0 * float(marked.capacitance[0]) * float(settled.dropper_voltage[0]) ** 2
    return float(inrush + across / marked.bleeder[0] + film)


def heat_of_rectifier(made: Board, settled: Settled) -> float:
    """Two junctions of 0.7 V: in turn pairs of a bridge, or series and return diode of a half-wave [W]. At a zener that stands
    at the node: itself both ways, and the series diode."""
    supply, zener = float(settled.supply_current[0]), float(settled.zener_current[0, 0])
    if made.rectifier != "half-wave-zener":
        return 2.0 * 0.7 * supply
    return 0.7 * supply + (float(settled.rail_voltage[0, 0]) + 0.7) * zener + 0.7 * (supply + zener)


BOARDS = {
    "bridge, three rails": THREE,
    "bridge": one_rail("bridge"),
    "half-wave": one_rail("half-wave"),
    "half-wave-zener": one_rail("half-wave-zener"),
}


@pytest.mark.parametrize("made", BOARDS.values(), ids=BOARDS.keys())
@pytest.mark.parametrize("on", [(), ("relay",)], ids=["off", "on"])
def test_real_power_is_the_sum_of_every_part_s_heat(made: Board, on: tuple[str, ...]) -> None:
    settled = settled_of(made, on)
    heat = heat_of_rails(made, settled) + heat_before_the_rails(made, settled) + heat_of_rectifier(made, settled)
    assert float(mains_power(settled).real[0]) == pytest.approx(heat, rel=0.005)


def test_zener_power_is_volts_times_amperes() -> None:
    settled = settled_of(THREE)
    volts = settled.rail_voltage[:, 0] - np.array([settled.rail_voltage[1, 0], 0.0, 0.0])
    np.testing.assert_allclose(settled.zener_power[:, 0], volts * settled.zener_current[:, 0], rtol=1e-6)


def test_zener_at_the_node_burns_in_both_half_waves() -> None:
    # Reverse at its own voltage, forward at a diode's drop with everything the rectifier carries: charge balance.
    settled = settled_of(BOARDS["half-wave-zener"])
    own = (settled.rail_voltage[0, 0] + 0.7) * settled.zener_current[0, 0]
    forward = 0.7 * (settled.supply_current[0] + settled.zener_current[0, 0])
    assert settled.zener_power[0, 0] == pytest.approx(own + forward, rel=1e-6)


@pytest.mark.parametrize("made", BOARDS.values(), ids=BOARDS.keys())
def test_powers_hang_together(made: Board) -> None:
    settled = settled_of(made)
    power = mains_power(settled)
    inrush = float(as_marked(made).inrush[0])
    assert power.inrush_voltage[0] == pytest.approx(settled.line_current[0] * inrush)
    assert power.inrush_power[0] == pytest.approx(power.inrush_voltage[0] ** 2 / inrush)
    assert power.apparent[0] == pytest.approx(230.0 * settled.line_current[0])
    assert power.factor[0] == pytest.approx(power.real[0] / power.apparent[0])
    assert 0.0 < power.factor[0] < 0.5  # a capacitor dropper's current leads by nearly a quarter cycle


def test_a_resistor_dropper_is_nearly_a_resistive_load() -> None:
    made = board(dropper=Dropper(kind="resistor", resistance=14.5e3), rails=(rail(zener=5.1),))
    assert 0.98 < float(mains_power(settled_of(made)).factor[0]) <= 1.0


def test_an_open_path_takes_nothing() -> None:
    opened = replace(as_marked(BOARDS["bridge"]), inrush=np.array([np.inf]))
    power = mains_power(settle(opened, ()))
    for figure in (power.inrush_voltage, power.inrush_power, power.apparent, power.real, power.factor):
        assert figure[0] == 0.0


# Discharge -----------------------------------------------------------------------------------------------------------------


def test_highest_crest() -> None:
    # 230 V +10 % is 253 V (IEC 60038), its crest √2 times that.
    assert highest_crest(board()) == pytest.approx(np.sqrt(2.0) * 253.0)


def test_the_slowest_corner_is_told() -> None:
    # Dropper and bleeder each at the high end, mains at its highest, by V0·exp(-t/RC): 0.517 µF, 1.05 MΩ, 357.8 V.
    found = discharge_of(board(bleeder=0.5e6, in_series=2))
    assert found.start == pytest.approx(357.8, abs=0.1)
    assert found.capacitance == pytest.approx(0.517e-6)
    assert found.bleeder == pytest.approx(1.05e6)
    assert found.to_limit is not None
    assert found.start * np.exp(-found.to_limit / (0.517e-6 * 1.05e6)) == pytest.approx(34.0)


def test_a_larger_part_found_in_place_counts() -> None:
    assert discharge_of(board(dropper=Dropper(capacitance=0.33e-6, fitted=0.47e-6))).capacitance == pytest.approx(0.517e-6)
    assert discharge_of(board(dropper=Dropper(capacitance=0.47e-6, fitted=0.33e-6))).capacitance == pytest.approx(0.517e-6)


def test_without_a_bleeder_there_is_no_time_to_tell_and_the_plug_stays_live() -> None:
    found = discharge_of(board())
    assert (found.bleeder, found.to_limit, found.wait) == (None, None, None)
    assert found.slow is True
    assert found.energy is not None


def test_the_wait_is_at_least_five_time_constants() -> None:
    # After five time constants 0.7 % is left: 2.4 V of 358 V, under what counts as dead.
    found = discharge_of(board(bleeder=2.2e6, in_series=2))
    assert found.wait is not None
    assert found.wait >= 5.0 * 0.517e-6 * 4.62e6
    assert found.start * np.exp(-found.wait / (0.517e-6 * 4.62e6)) < known.DEAD_VOLTS


EXEMPT: dict[str, Callable[[], Board]] = {
    # IEC 60335-1 22.5: pins of a plug; exempt up to 0.1 µF.
    "fixed": lambda: board(connected_by="fixed"),
    "0.1 µF": lambda: board(capacitance=0.1e-6, tolerance=0.0),
    "resistor": lambda: board(dropper=Dropper(kind="resistor", resistance=10e3)),
}


@pytest.mark.parametrize("made", EXEMPT.values(), ids=EXEMPT.keys())
def test_no_limit_applies(made: Callable[[], Board]) -> None:
    found = discharge_of(made())
    assert found.limited is False
    assert found.slow is False


def test_the_exemption_speaks_of_the_rated_capacitance() -> None:
    # IEC 60335-1 22.5 (that it is the rated value: value from memory): the tolerance does not lift 0.1 µF over it.
    assert discharge_of(board(capacitance=0.1e-6, tolerance=0.1)).limited is False
    assert discharge_of(board(capacitance=0.12e-6, tolerance=0.1)).limited is True


def test_what_cannot_be_read_is_not_judged() -> None:
    charred = discharge_of(board(dropper=Dropper(capacitance=UNKNOWN), bleeder=1e6))
    assert charred.limited is True
    assert (charred.capacitance, charred.to_limit, charred.energy, charred.slow) == (None, None, None, None)
    string = discharge_of(replace(board(), bleeder=Bleeder(resistance=UNKNOWN)))
    assert (string.bleeder, string.to_limit) == (None, None)


def test_a_bleeder_that_was_read_stands_in_the_marks_place() -> None:
    # By hand: 0.517 µF · 2 Mohm = 1.034 s, rounded up to whole seconds and five of them; read open, nothing empties it.
    fitted = board(bleeder=0.5e6, in_series=2)
    found = discharge_of(fitted, 2e6)
    assert found.bleeder == 2e6
    assert found.to_limit == pytest.approx(0.517e-6 * 2e6 * np.log(np.sqrt(2.0) * 253.0 / 34.0))
    assert found.wait == 10.0
    opened = discharge_of(fitted, np.inf)
    assert (opened.bleeder, opened.to_limit, opened.left, opened.wait) == (None, None, None, None)
    assert opened.slow is True
    assert opened.has_bleeder is False
    assert discharge_of(fitted, 0.0).to_limit == pytest.approx(0.0, abs=1e-5)


def test_a_bleeder_that_cannot_be_read_is_neither_slow_nor_quick() -> None:
    # It is there: "None where that cannot be known", as `Discharge.slow` says itself.
    assert discharge_of(replace(board(), bleeder=Bleeder(resistance=UNKNOWN))).slow is None


@pytest.mark.parametrize(("in_series", "volts"), [(1, 264.0), (2, 132.0), (3, 88.0)])
def test_bleeder_share_at_the_highest_mains(in_series: int, volts: float) -> None:
    # Equal resistors share equally; 240 V +10 %.
    assert bleeder_share(board(volts=240.0, bleeder=470e3, in_series=in_series)) == pytest.approx(volts)


def test_no_bleeder_no_share() -> None:
    assert bleeder_share(board()) is None
