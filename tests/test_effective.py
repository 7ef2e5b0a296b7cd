"""What the dropper acts as: against the supply formula on paper, and what must hold for every reading.

The formula is the bridge identity of TI SBVS343A §8.2.1: I = 4·f·C·(crest − V − 2·Vf).
"""

from __future__ import annotations

import math
from dataclasses import replace

import pytest

from benchtool import casefile
from benchtool.board import UNKNOWN
from benchtool.diagnosis import effective
from benchtool.diagnosis.effective import Effective, effective_of
from benchtool.observed import Meter, Reading
from tests.some_boards import CONTRACT, FULL, read

METER = Meter()
PLAIN = casefile.loads("""
format = 1
mains = { voltage = "230 V", frequency = "50 Hz" }
[board]
rectifier = "bridge"
dropper = { capacitance = "470 nF" }
[[board.rail]]
name = "rail"
fed_by = "rectifier"
zener = { voltage = "24 V" }
reservoir = { capacitance = "470 uF" }
[[board.load]]
name = "heater"
kind = "resistor"
rail = "rail"
resistance = "1 kohm"
tolerance = "1 %"
""").board
ON = ("heater relay",)


def solved(*readings: Reading) -> Effective:
    return effective_of(CONTRACT.board, METER, readings)


@pytest.mark.parametrize("volts", [6.0, 10.0, 15.0, 20.0])
def test_a_starved_rail_tells_the_dropper_by_the_bridge_formula(volts: float) -> None:
    current = volts / 1000.0
    by_hand = current / (4.0 * 50.0 * (math.sqrt(2.0) * 230.0 - volts - 2.0 * 0.68))  # 0.66 V at 10 mA (1N4007, from memory)
    found = effective_of(PLAIN, METER, (read("rail-voltage", volts, rail="rail"),))
    assert found.capacitance == pytest.approx(by_hand, rel=0.005)
    assert found.current == pytest.approx(current, rel=0.005)
    assert found.capacitance_low is not None
    assert found.capacitance_high is not None
    assert found.capacitance_low < by_hand < found.capacitance_high
    # mains ± 4 %, crest factor 1.36 to 1.42, meter, and the load's 1 %: no more than that may widen it
    assert found.capacitance_high / found.capacitance_low < 1.04 / 0.96 * 1.42 / 1.36 * 1.06


def test_the_crest_factor_leans_towards_a_bigger_dropper() -> None:
    """Nominal is a √2 crest, real crests are 1.36 to 1.42: the band reaches further up than down."""
    found = effective_of(PLAIN, METER, (read("rail-voltage", 10.0, rail="rail"),))
    assert found.capacitance is not None
    assert found.capacitance_low is not None
    assert found.capacitance_high is not None
    assert found.capacitance_high - found.capacitance > found.capacitance - found.capacitance_low


# --- only a bound where the rail regulates


def check_bound(found: Effective) -> None:
    assert found.capacitance is None
    assert found.capacitance_high is None
    assert found.current is None
    assert found.current_high is None
    assert found.capacitance_low is not None
    assert found.current_low is not None


def test_regulating_rails_give_a_lower_bound_only() -> None:
    """Source: the case format, section 2, `effective`. Demand 22.2 mA and dropout 366 nF: section 2, budget."""
    found = solved(read("rail-voltage", 24.3, rail="relay rail"), read("rail-voltage", 23.3, rail="relay rail", on=ON))
    check_bound(found)
    assert found.capacitance_low == pytest.approx(366e-9, rel=0.15)
    assert found.capacitance_low is not None
    assert found.capacitance_low < 366e-9
    assert found.current_low == pytest.approx(0.0222, rel=0.15)
    assert [reading.on for reading in found.readings] == [ON]


def test_the_heavier_state_gives_the_better_bound() -> None:
    off, on = solved(read("rail-voltage", 24.3, rail="relay rail")), solved(read("rail-voltage", 23.3, rail="relay rail", on=ON))
    check_bound(off)
    assert off.capacitance_low is not None
    assert on.capacitance_low is not None
    assert off.capacitance_low < on.capacitance_low


@pytest.mark.parametrize(
    "readings",
    [
        (),
        (read("rail-voltage", 5.1, rail="logic rail"),),
        (read("dropper-capacitance", 182e-9, lifted=True),),
        (read("load-responds", "no", load="heater relay"),),
        (read("rail-voltage", 300.0, rail="relay rail"),),  # above what a sound zener allows: it tells nothing of the dropper
    ],
    ids=["none", "other rail", "dropper itself", "word", "too high"],
)
def test_readings_that_tell_nothing_of_the_supply(readings: tuple[Reading, ...]) -> None:
    assert solved(*readings) == Effective()


# --- properties

VOLTS = tuple(2.0 + 0.75 * step for step in range(30))


def test_a_lower_rail_never_means_a_bigger_dropper(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(effective, "DRAWN", 64)
    found = [solved(read("rail-voltage", volts, rail="relay rail", on=ON)) for volts in VOLTS]
    for figure in ("capacitance", "capacitance_low", "capacitance_high", "current", "current_low", "current_high"):
        values = [value for each in found if (value := getattr(each, figure)) is not None]
        assert len(values) > 20
        assert values == sorted(values), figure
    lows = [each.capacitance_low for each in found]
    assert None not in lows


def test_a_lower_line_current_never_means_a_bigger_dropper(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(effective, "DRAWN", 32)
    volts = [0.8 + 0.4 * step for step in range(10)]
    found = [solved(read("inrush-voltage", value, on=ON)) for value in volts]
    for figure in ("capacitance", "capacitance_low", "capacitance_high"):
        values = [value for each in found if (value := getattr(each, figure)) is not None]
        assert len(values) > 6
        assert values == sorted(values), figure


def test_the_line_current_tells_the_dropper() -> None:
    """The case format, section 2: 4.82 V across 100 ohm, loads off, is the board as marked, 680 nF."""
    found = solved(read("inrush-voltage", 4.82))
    assert found.capacitance == pytest.approx(680e-9, rel=0.02)
    assert found.capacitance_low is not None
    assert found.capacitance_high is not None
    assert found.capacitance_low < 680e-9 < found.capacitance_high


def test_the_figure_lies_within_its_bounds() -> None:
    for volts in (6.0, 10.0, 14.2, 18.0, 21.0):
        found = solved(read("rail-voltage", volts, rail="relay rail", on=ON))
        assert found.capacitance is not None
        assert found.capacitance_low is not None
        assert found.capacitance_high is not None
        assert found.capacitance_low < found.capacitance < found.capacitance_high


def test_the_tightest_reading_is_the_one_that_counts() -> None:
    rough = read("inrush-voltage", 1.35, on=ON)
    sharp = read("rail-voltage", 14.2, rail="relay rail", on=ON)
    both, alone = solved(rough, sharp), (solved(rough), solved(sharp))
    assert both.spread == min(one.spread for one in alone)
    assert both == solved(sharp, rough)


def width(found: Effective) -> float:
    assert found.capacitance_low is not None
    assert found.capacitance_high is not None
    return found.capacitance_high / found.capacitance_low


def test_a_mains_reading_narrows_the_band() -> None:
    low_rail = read("rail-voltage", 14.2, rail="relay rail", on=ON)
    unread, mains_read = solved(low_rail), solved(low_rail, read("mains-voltage", 230.0))
    assert width(mains_read) < width(unread)


def test_lower_mains_mean_a_bigger_dropper() -> None:
    low_rail = read("rail-voltage", 10.0, rail="rail")
    figures = [
        effective_of(PLAIN, METER, (low_rail, read("mains-voltage", mains))).capacitance_low for mains in (250.0, 230.0, 210.0)
    ]
    assert None not in figures
    assert figures == sorted(figure for figure in figures if figure is not None)


def test_an_unknown_load_leaves_the_figure_open() -> None:
    loads = tuple(replace(load, current=UNKNOWN) if load.kind == "current" else load for load in FULL.board.loads)
    found = effective_of(replace(FULL.board, loads=loads), METER, (read("rail-voltage", 9.0, rail="upper"),))
    assert found.capacitance is None
    assert found.current is None


def test_a_resistor_dropper_acts_as_a_current_only() -> None:
    board = replace(PLAIN, dropper=replace(PLAIN.dropper, kind="resistor", capacitance=None, resistance=15e3))
    found = effective_of(board, METER, (read("rail-voltage", 8.0, rail="rail"),))
    assert (found.capacitance, found.capacitance_low, found.capacitance_high) == (None, None, None)
    assert found.current == pytest.approx(0.008, rel=0.005)
