"""Powers on the mains side against sums of every part's heat; volts and watts of dropper and bleeder against the circuit."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.integrate import quad

from benchtool.board import UNKNOWN, Bleeder, Board, Dropper
from benchtool.physics.settled import Settled
from benchtool.physics.specimens import as_marked
from benchtool.physics.stress import Stress, bleeder_share, highest_crest, mains_power, mains_stress
from benchtool.physics.waveform import settle
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
    # By the means; what the ripple adds, volts and amperes rising together, is less than a thousandth on 4.7 mF.
    np.testing.assert_allclose(settled.zener_power[:, 0], volts * settled.zener_current[:, 0], rtol=1e-3)


def test_zener_at_the_node_burns_in_both_half_waves() -> None:
    # Reverse at its own voltage, forward at a diode's drop with everything the rectifier carries: charge balance. The diode's
    # drop is not 0.7 V at every current: within 5 % of 0.7 W an ampere, half a percent of the whole.
    settled = settled_of(BOARDS["half-wave-zener"])
    own = (settled.rail_voltage[0, 0] + 0.7) * settled.zener_current[0, 0]
    forward = 0.7 * (settled.supply_current[0] + settled.zener_current[0, 0])
    assert settled.zener_power[0, 0] == pytest.approx(own + forward, rel=0.005)


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
    assert (power.inrush_voltage[0], power.inrush_power[0], power.factor[0]) == (0.0, 0.0, 0.0)
    # A microwatt or less is a solver's way of writing nothing.
    assert power.apparent[0] < 1e-6
    assert power.real[0] < 1e-6


# At the highest mains ------------------------------------------------------------------------------------------------------


def test_highest_crest() -> None:
    # 230 V +10 % is 253 V (IEC 60038), its crest √2 times that.
    assert highest_crest(board()) == pytest.approx(np.sqrt(2.0) * 253.0)


@pytest.mark.parametrize(("in_series", "volts"), [(1, 264.0), (2, 132.0), (3, 88.0)])
def test_bleeder_share_at_the_highest_mains(in_series: int, volts: float) -> None:
    # Equal resistors share equally; 240 V +10 %.
    assert bleeder_share(board(volts=240.0, bleeder=470e3, in_series=in_series)) == pytest.approx(volts)


def test_no_bleeder_no_share() -> None:
    assert bleeder_share(board()) is None


def stress_on(made: Board, part: str) -> Stress:
    return next(each for each in mains_stress(made) if each.part == part)


def test_bleeder_string_across_240_v() -> None:
    # Row 18: chip resistors of the common size hold about 200 V each; across 240 V mains a bleeder takes two in series.
    def string(in_series: int) -> Stress:
        fitted = Bleeder(resistance=470e3, in_series=in_series, tolerance=0.05, rated_voltage=200.0)
        return stress_on(replace(board(volts=240.0), bleeder=fitted), "bleeder")

    assert string(1).ratio == pytest.approx(264.0 / 200.0)
    assert string(2).ratio == pytest.approx(132.0 / 200.0)


@pytest.mark.parametrize("in_series", [1, 3])
def test_bleeder_power_is_the_mean_of_volts_times_amperes(in_series: int) -> None:
    # 240 V +10 %, each resistor 5 % under its mark: the mean over a cycle of 50 Hz, integrated.
    low = 470e3 * 0.95

    def power(seconds: float) -> float:
        return float((np.sqrt(2.0) * 264.0 / in_series * np.sin(100.0 * np.pi * seconds)) ** 2 / low)

    found = stress_on(board(volts=240.0, bleeder=470e3, in_series=in_series), "bleeder").watts
    assert found == pytest.approx(quad(power, 0.0, 0.02)[0] / 0.02)


def test_bleeder_power_at_a_stated_tolerance() -> None:
    # 253 V squared over 1 Mohm less 1 %.
    assert stress_on(board(bleeder=1e6, tolerance=0.01), "bleeder").watts == pytest.approx(253.0**2 / 0.99e6)


def test_a_dropper_stands_the_highest_mains_against_its_mark() -> None:
    # 230 V +10 % is 253 V (IEC 60038); 310 V and 250 V AC as parts are marked.
    marked = stress_on(board(dropper=Dropper(capacitance=470e-9, rated_voltage=310.0)), "dropper")
    assert marked.volts == pytest.approx(253.0)
    assert marked.ratio == pytest.approx(253.0 / 310.0)
    beyond = stress_on(board(dropper=Dropper(capacitance=470e-9, rated_voltage=250.0)), "dropper")
    assert beyond.ratio is not None
    assert beyond.ratio > 1.0
    assert stress_on(board(), "dropper").ratio is None


def test_a_divider_s_shunt_takes_its_share() -> None:
    # By impedances: 1 µF and 10 µF without tolerance at 50 Hz; and 10 % each the wrong way.
    def share(dropper: float, shunt: float) -> float:
        impedances = [1.0 / (100j * np.pi * dropper), 1.0 / (100j * np.pi * shunt)]
        return float(abs(impedances[1] / sum(impedances)))

    exact = Dropper(kind="divider", capacitance=1e-6, shunt_capacitance=10e-6, tolerance=0.0)
    assert stress_on(board(dropper=exact), "shunt").volts == pytest.approx(253.0 * share(1e-6, 10e-6))
    spread = replace(exact, tolerance=0.1)
    assert stress_on(board(dropper=spread), "shunt").volts == pytest.approx(253.0 * share(1.1e-6, 9e-6))
    # A larger part than marked, found in place, leaves the shunt more.
    assert stress_on(board(dropper=replace(exact, fitted=2e-6)), "shunt").volts == pytest.approx(253.0 * share(2e-6, 10e-6))


def test_what_cannot_be_read_takes_all_the_volts_and_has_no_watts() -> None:
    charred = Dropper(kind="divider", capacitance=1e-6, shunt_capacitance=UNKNOWN)
    assert stress_on(board(dropper=charred), "shunt").volts == pytest.approx(253.0)
    faded = stress_on(replace(board(), bleeder=Bleeder(resistance=UNKNOWN, rated_voltage=200.0)), "bleeder")
    assert faded.watts is None
    assert faded.ratio == pytest.approx(253.0 / 200.0)


def test_only_parts_that_are_there_are_told() -> None:
    assert [each.part for each in mains_stress(board())] == ["dropper"]
    divider = Dropper(kind="divider", capacitance=1e-6, shunt_capacitance=10e-6)
    assert [each.part for each in mains_stress(board(dropper=divider, bleeder=1e6))] == ["dropper", "shunt", "bleeder"]
