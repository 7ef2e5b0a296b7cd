"""Specimens: a board as marked, and a population of healthy ones that stays within what is printed on the parts."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from scipy.stats import kstest

from benchtool.board import UNKNOWN, Bleeder, Board, Dropper, Load, Reservoir, Zener
from benchtool.physics.specimens import ARRAYS, Specimens, as_marked, concatenate, load_tolerance, population, take
from tests.made_cases import boards
from tests.small_boards import board, coil, draws, rail, three_rails

COUNT = 512
LED = Load(name="lamp", kind="led", rail="rail", forward_voltage=2.0, resistance=1e3)
LOADS = (coil(810.0), draws(0.0035, "logic"), LED)
CROWDED = board(capacitance=680e-9, inrush=100.0, bleeder=470e3, in_series=2, rails=three_rails(), loads=LOADS)


def test_as_marked_is_one_specimen_of_the_marked_values() -> None:
    marked = as_marked(CROWDED)
    assert marked.count == 1
    assert marked.mains[0] == 230.0
    assert marked.crest[0] == pytest.approx(np.sqrt(2.0) * 230.0)
    assert marked.capacitance[0] == 680e-9
    assert marked.inrush[0] == 100.0
    assert marked.bleeder[0] == 940e3  # two of 470 kΩ in series
    np.testing.assert_allclose(marked.zener[:, 0], [18.0, 5.1, 3.3])
    np.testing.assert_allclose(marked.load_resistance[[0, 2], 0], [810.0, 1e3])
    assert marked.load_current[1, 0] == 0.0035
    assert marked.load_forward[2, 0] == 2.0
    assert not marked.zener_kelvin_per_watt.any()  # as marked: 25 °C without self-heating


def test_parts_that_are_not_there_conduct_nothing() -> None:
    bare = as_marked(board(rails=(rail(zener=None, reservoir=None),)))
    assert np.isinf(bare.zener[0, 0])
    assert bare.reservoir[0, 0] == 0.0
    assert np.isinf(bare.bleeder[0])
    assert bare.inrush[0] == 0.0
    assert bare.series_resistance[0] == 0.0
    assert np.isinf(bare.parallel_resistance[0])
    assert as_marked(board()).load_resistance.shape == (0, 1)


def test_resistor_dropper_has_no_capacitance_and_stands_in_parallel_with_its_bleeder() -> None:
    made = as_marked(board(dropper=Dropper(kind="resistor", resistance=10e3), bleeder=10e3))
    assert made.capacitance[0] == 0.0
    assert made.parallel_resistance[0] == pytest.approx(5e3)  # two equal resistors side by side


def test_coil_power_is_turned_into_ohms() -> None:
    # 0.40 W at 24 V: 1440 ohm (Hongfa HF115F-I sheet).
    relay = replace(coil(1.0), resistance=None, power=0.4, nominal_voltage=24.0)
    assert as_marked(board(loads=(relay,))).load_resistance[0, 0] == pytest.approx(1440.0)


@pytest.mark.parametrize(("farads", "ohms"), [(220e-6, 6e-5 / 220e-6), (10e-3, 0.02)])
def test_nominal_esr(farads: float, ohms: float) -> None:
    # The case format's section 4: 6e-5/C, at least 0.02 ohm.
    assert as_marked(board(rails=(rail(reservoir=farads),))).esr[0, 0] == pytest.approx(ohms)


def test_nominal_esr_of_an_ordinary_part_lies_under_its_data_sheet_limit() -> None:
    # ESR = tan δ/(2πfC), tan δ 0.12 at 35 V and 120 Hz is the limit of a sound part (Panasonic NHG).
    limit = 0.12 / (2.0 * np.pi * 120.0 * 220e-6)
    assert 0.1 * limit < as_marked(board(rails=(rail(reservoir=220e-6),))).esr[0, 0] < limit


# Populations ---------------------------------------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def healthy() -> Specimens:
    return population(CROWDED, COUNT)


def marked_and_spread(healthy: Specimens) -> list[tuple[str, np.ndarray, float, float]]:
    """What every part is drawn as, its mark and its tolerance: those of the case format's section 4, nothing being stated."""
    return [
        ("dropper", healthy.capacitance, 680e-9, 0.10),
        ("inrush", healthy.inrush, 100.0, 0.05),
        ("bleeder", healthy.bleeder, 940e3, 0.05),
        ("upper zener", healthy.zener[0], 18.0, 0.05),
        ("lower zener", healthy.zener[1], 5.1, 0.05),
        ("reservoir", healthy.reservoir[0], 4.7e-3, 0.20),
        ("feed", healthy.feed[2], 150.0, 0.05),
        ("coil", healthy.load_resistance[0], 810.0, 0.10),
        ("controller", healthy.load_current[1], 0.0035, 0.20),
        ("LED resistor", healthy.load_resistance[2], 1e3, 0.05),
        ("mains", healthy.mains, 230.0, 0.10),
    ]


def test_healthy_parts_spread_evenly_over_their_tolerance(healthy: Specimens) -> None:
    for name, drawn, mark, tolerance in marked_and_spread(healthy):
        evenly = ((drawn / mark - 1.0) / tolerance + 1.0) / 2.0
        assert evenly.min() >= -1e-9, name
        assert evenly.max() <= 1.0 + 1e-9, name
        assert kstest(evenly, "uniform").statistic < 0.04, name  # chance would stand at 0.04 half of the time


def test_parts_of_one_board_do_not_move_together(healthy: Specimens) -> None:
    drawn = np.array([drawn for _, drawn, _, _ in marked_and_spread(healthy)])
    together = np.corrcoef(drawn) - np.eye(len(drawn))
    assert np.abs(together).max() < 4.0 / np.sqrt(COUNT)


def test_healthy_spreads_of_what_is_not_marked(healthy: Specimens) -> None:
    # The case format's section 4: crest factor 1.36 to 1.42, 50 to 130 K/W, ESR 1.5e-5/C to 2e-4/C but at least 0.02 ohm,
    # coils pull in at 55 to 72 % of nominal.
    crest = healthy.crest / healthy.mains
    assert 1.36 <= crest.min() < 1.365
    assert 1.415 < crest.max() <= 1.42
    assert 50.0 <= healthy.zener_kelvin_per_watt.min() < healthy.zener_kelvin_per_watt.max() <= 130.0
    product = healthy.esr * healthy.reservoir
    assert product.max() <= 2e-4
    assert np.all((product >= 1.5e-5) | (healthy.esr >= 0.02))
    assert healthy.esr.min() >= 0.02
    assert 0.55 <= healthy.pull_in.min() < healthy.pull_in.max() <= 0.72


def test_stated_tolerances_come_before_assumed_ones() -> None:
    sure = Bleeder(resistance=470e3, tolerance=0.0)
    tight = replace(CROWDED, dropper=Dropper(capacitance=680e-9, tolerance=0.01), bleeder=sure)
    drawn = population(tight, COUNT)
    assert abs(drawn.capacitance / 680e-9 - 1.0).max() <= 0.01
    np.testing.assert_allclose(drawn.bleeder, 470e3)
    assert load_tolerance(replace(coil(810.0), tolerance=0.03)) == 0.03


@pytest.mark.parametrize("spread", [0.0, 0.04])
def test_mains_spread_can_be_told(spread: float) -> None:
    off = abs(population(CROWDED, COUNT, spread).mains / 230.0 - 1.0)
    assert spread * 0.95 <= off.max() <= spread + 1e-12


def test_the_same_board_gives_the_same_specimens() -> None:
    first, second = population(CROWDED, 32), population(CROWDED, 32)
    assert all(np.array_equal(getattr(first, name), getattr(second, name)) for name in ARRAYS)


def test_one_rail_more_leaves_the_mains_side_as_it_was(healthy: Specimens) -> None:
    # Coordinates are dealt in the file's order, so that a part keeps its draw when something is added behind it.
    fewer = population(replace(CROWDED, loads=CROWDED.loads[:1]), COUNT)
    np.testing.assert_array_equal(fewer.capacitance, healthy.capacitance)
    np.testing.assert_array_equal(fewer.zener, healthy.zener)


# Parts that cannot be read -------------------------------------------------------------------------------------------------


def test_unreadable_parts_take_a_wide_range_even_on_a_board_as_marked() -> None:
    charred = replace(
        board(bleeder=1e6, rails=(replace(rail(), zener=Zener(voltage=UNKNOWN), reservoir=Reservoir(capacitance=UNKNOWN)),)),
        dropper=Dropper(capacitance=UNKNOWN),
        loads=(replace(draws(0.01), current=UNKNOWN),),
    )
    marked = as_marked(charred)
    assert marked.count == 64
    for drawn in (marked.capacitance, marked.zener[0], marked.reservoir[0], marked.load_current[0]):
        assert drawn.max() / drawn.min() > 10.0
        assert drawn.min() > 0.0
    assert np.all(marked.bleeder == 1e6)  # what can be read stays as it is


def test_unreadable_bleeder_is_the_whole_string() -> None:
    marked = as_marked(replace(board(), bleeder=Bleeder(resistance=UNKNOWN, in_series=3)))
    assert 100e3 <= marked.bleeder.min() <= marked.bleeder.max() <= 2.2e6


# Taking apart and putting together -----------------------------------------------------------------------------------------


def test_take_and_concatenate_are_each_other_s_inverse(healthy: Specimens) -> None:
    again = concatenate([take(healthy, slice(0, 100)), take(healthy, slice(100, None))])
    assert again.count == healthy.count
    assert all(np.array_equal(getattr(again, name), getattr(healthy, name)) for name in ARRAYS)
    picked = take(healthy, np.array([5, 3]))
    np.testing.assert_array_equal(picked.capacitance, healthy.capacitance[[5, 3]])
    np.testing.assert_array_equal(picked.zener, healthy.zener[:, [5, 3]])


@settings(max_examples=50, deadline=None)
@given(boards())
def test_every_board_a_file_accepts_can_be_drawn(made: Board) -> None:
    for drawn in (as_marked(made), population(made, 16)):
        assert all(getattr(drawn, name).shape[-1] == drawn.count for name in ARRAYS)
        assert not any(np.isnan(getattr(drawn, name)).any() for name in ARRAYS)
        assert len(drawn.zener) == len(made.rails)
        assert len(drawn.load_open) == len(made.loads)
