"""What endangers the user and causes no complaint: each rule by hand.

Limits at the plug: IEC 60335-1 22.5, 34 V after one second, exempt up to 0.1 µF.
"""

from __future__ import annotations

import math
import re
from dataclasses import replace
from typing import Any

import pytest

from benchtool import assess
from benchtool.board import UNKNOWN, Bleeder, Board, Dropper, Reservoir, Zener
from benchtool.catalogue.cautions import cautions
from benchtool.diagnosis.posterior import posterior_of
from benchtool.diagnosis.safety import Finding, bleeder_read, power_allowed, safety_findings, zener_open_of
from benchtool.observed import Meter, Reading
from tests.some_boards import CONTRACT, FULL, draw_few, read

BOARD = CONTRACT.board
BLEEDER = 940e3
"""The contract's string: two of 470 kohm."""


def faults(board: Board, *readings: Reading) -> list[str]:
    return sorted(finding.fault for finding in safety_findings(board, readings))


def finding(board: Board, fault: str, *readings: Reading) -> Finding:
    return next(each for each in safety_findings(board, readings) if each.fault == fault)


def with_dropper(**changes: Any) -> Board:
    return replace(BOARD, dropper=replace(BOARD.dropper, fitted=None, **changes))


def with_bleeder(**changes: Any) -> Board:
    assert BOARD.bleeder is not None
    return replace(BOARD, bleeder=replace(BOARD.bleeder, **changes))


# --- discharge


def test_the_contract_board_takes_1_74_seconds() -> None:
    """The case format, section 2, fit: 1.74 s. By hand: 748 nF · 987 kohm · ln(357.8 V / 34 V)."""
    figures = finding(BOARD, "slow-discharge").figures
    assert figures["seconds"] == pytest.approx(1.74, abs=0.005)
    assert figures["seconds"] == pytest.approx(748e-9 * 987e3 * math.log(253.0 * 2.0**0.5 / 34.0), rel=1e-9)
    assert (figures["limit_V"], figures["limit_s"]) == (34.0, 1.0)
    assert faults(BOARD) == ["slow-discharge"]


def test_times_are_rounded_up_in_the_sentence() -> None:
    told = re.search(r"only after ([0-9.]+) s", finding(BOARD, "slow-discharge").sentence())
    assert told is not None
    assert 748e-9 * 987e3 * math.log(253.0 * 2.0**0.5 / 34.0) <= float(told[1]) <= 1.9


@pytest.mark.parametrize(
    ("capacitance", "megohm", "fails"),
    [(0.47e-6, 1.0, True), (0.33e-6, 1.0, False), (0.47e-6, 2.0, True)],  # published values, checks 9 to 11
)
def test_published_worked_values_of_the_plug_limit(capacitance: float, megohm: float, fails: bool) -> None:
    """Crest 325.3 V: no variation of the mains and no tolerances."""
    board = replace(
        with_dropper(capacitance=capacitance, tolerance=0.0), mains=replace(BOARD.mains, variation=0.0),
        bleeder=Bleeder(resistance=megohm * 1e6, in_series=1, tolerance=0.0),
    )
    assert faults(board) == (["slow-discharge"] if fails else [])


def test_the_fitted_part_counts_where_it_is_the_bigger_one() -> None:
    bigger = replace(BOARD, dropper=replace(BOARD.dropper, fitted=1e-6))
    ratio = finding(bigger, "slow-discharge").figures["seconds"] / finding(BOARD, "slow-discharge").figures["seconds"]
    assert ratio == pytest.approx(1000.0 / 680.0)


def test_a_plug_without_a_bleeder_is_a_finding_above_a_tenth_of_a_microfarad() -> None:
    assert faults(replace(with_dropper(capacitance=0.22e-6), bleeder=None)) == ["no-bleeder"]
    assert faults(replace(with_dropper(capacitance=0.12e-6), bleeder=None)) == ["no-bleeder"]


@pytest.mark.parametrize("bleeder", [None, BOARD.bleeder], ids=["bare", "with bleeder"])
def test_a_tenth_of_a_microfarad_is_exempt(bleeder: Any) -> None:
    """The limit speaks of the rated capacitance (IEC 60335-1 22.5; value from memory): 0.1 µF marked, whatever its tolerance."""
    slow = None if bleeder is None else replace(bleeder, resistance=5e6)
    assert faults(replace(with_dropper(capacitance=0.1e-6, tolerance=0.0), bleeder=slow)) == []
    assert faults(replace(with_dropper(capacitance=0.1e-6), bleeder=slow)) == []


def test_a_fixed_appliance_has_no_pins() -> None:
    assert faults(replace(BOARD, connected_by="fixed")) == []
    assert faults(replace(BOARD, connected_by="fixed", bleeder=None)) == []


def test_a_dropper_that_cannot_be_read_and_no_bleeder_is_a_finding() -> None:
    """Its charge cannot be known, so that it must be taken to be there."""
    assert "no-bleeder" in faults(replace(with_dropper(capacitance=UNKNOWN), bleeder=None))


def test_a_resistor_dropper_stores_nothing() -> None:
    board = with_dropper(kind="resistor", capacitance=None, resistance=10e3, safety_class=None, rated_voltage=None)
    assert faults(replace(board, bleeder=None)) == []


# --- the bleeder as it was read


@pytest.mark.parametrize(
    ("value", "fault"),
    [
        ("open", "bleeder-open"),
        (1.6 * BLEEDER, "bleeder-open"),  # over 1.5 × its mark: the case format, table of faults
        (1.4 * BLEEDER, None),
        (BLEEDER, None),
        (0.9 * BLEEDER, None),
        (0.3 * BLEEDER, "bleeder-low"),
        (0.0, "bleeder-low"),
    ],
)
def test_a_bleeder_that_was_read(value: float | str, fault: str | None) -> None:
    found = [name for name in faults(BOARD, read("bleeder-resistance", value)) if name.startswith("bleeder")]
    assert found == ([] if fault is None else [fault])


def test_the_last_of_two_bleeder_readings_counts() -> None:
    assert "bleeder-open" not in faults(BOARD, read("bleeder-resistance", "open"), read("bleeder-resistance", BLEEDER))


def test_an_open_bleeder_is_certain_and_said_first() -> None:
    first = safety_findings(BOARD, (read("bleeder-resistance", "open"),))[0]
    assert (first.fault, first.probability) == ("bleeder-open", 1.0)
    assert "358 V" in first.sentence()  # 253 V · √2 = 357.8 V
    assert "measure" in first.sentence()


def test_a_bleeder_that_cannot_be_read_off_and_was_measured_is_judged_by_its_number_alone() -> None:
    """By hand: 748 nF through 1 Mohm takes 1.76 s from 357.8 V to 34 V, through 400 kohm 0.70 s."""
    assert faults(with_bleeder(resistance=UNKNOWN), read("bleeder-resistance", 1e6)) == ["slow-discharge"]
    assert faults(with_bleeder(resistance=UNKNOWN), read("bleeder-resistance", 400e3)) == []
    assert "bleeder-open" in faults(with_bleeder(resistance=UNKNOWN), read("bleeder-resistance", "open"))


def test_the_number_that_was_read_sets_the_time() -> None:
    """748 nF · 1.2 Mohm · ln(357.8 V / 34 V), the slowest dropper with the bleeder as it is."""
    figures = finding(BOARD, "slow-discharge", read("bleeder-resistance", 1.2e6)).figures
    assert figures["seconds"] == pytest.approx(748e-9 * 1.2e6 * math.log(253.0 * 2.0**0.5 / 34.0), rel=1e-9)


@pytest.mark.parametrize("value", ["open", 1.6 * BLEEDER])
def test_no_time_stands_beside_an_open_bleeder(value: float | str) -> None:
    assert faults(BOARD, read("bleeder-resistance", value)) == ["bleeder-open"]


def test_the_cautions_know_the_bleeder_that_was_read() -> None:
    """748 nF · 987 kohm as marked: 1.74 s, told as 1.8 s; through 1.2 Mohm as read 2.12 s, told as 2.2 s."""
    assert "falls to 34 V in up to 1.8 s if its bleeder is whole." in cautions(BOARD)[1]
    read_as = cautions(BOARD, bleeder_read=1.2e6)[1]
    assert "falls to 34 V in up to 2.2 s through its bleeder as read." in read_as
    assert "whole" not in read_as
    opened = cautions(BOARD, bleeder_read=math.inf)[1]
    assert "358 V for hours; nothing known empties it." in opened
    assert "wait" not in opened
    assert bleeder_read((read("bleeder-resistance", 1e6), read("bleeder-resistance", "open"))) == math.inf
    assert bleeder_read(()) is None


@pytest.mark.parametrize("ascii", [False, True])
def test_the_discharge_is_told_in_full(ascii: bool) -> None:
    """Resistor, time, range and proving of the meter: the published values, cautions a bench needs (common practice)."""
    told = cautions(BOARD, ascii=ascii)[1]
    assert f"10 k{'ohm' if ascii else 'Ω'} 5 W, held on each for 15 s" in told
    for words in ("DC range", "AC range reads a charge as zero", "before and after"):
        assert words in told


# --- an open zener: the board is not powered

RAIL = "relay rail"
"""18 V on top of 5.1 V: 23.1 V to common."""


def suspected(board: Board, chances: dict[str, float], *readings: Reading) -> list[Finding]:
    return [each for each in safety_findings(board, readings, chances) if each.fault == "zener-open"]


@pytest.mark.parametrize(("chance", "told"), [(0.049, False), (0.05, True), (0.4, True)])
def test_an_open_zener_is_told_from_five_percent(chance: float, told: bool) -> None:
    found = suspected(BOARD, {RAIL: chance})
    assert [(each.where, each.probability) for each in found] == ([(RAIL, chance)] if told else [])
    assert power_allowed(found) is not told


@pytest.mark.parametrize(
    ("reading", "told"),
    [
        (read("zener-test", "open", rail=RAIL), True),
        (read("zener-test", 18.1, rail=RAIL), False),
        (read("rail-voltage", 1.31 * 23.1, rail=RAIL), True),
        (read("rail-voltage", 1.25 * 23.1, rail=RAIL), False),
        (read("rail-injection", 1.31 * 23.1, rail=RAIL), False),  # what the bench supply was set to
    ],
)
def test_a_reading_that_shows_it_makes_it_sure(reading: Reading, told: bool) -> None:
    bare = replace(BOARD, rails=tuple(replace(rail, reservoir=None) for rail in BOARD.rails))
    assert [each.probability for each in suspected(bare, {}, reading)] == ([1.0] if told else [])


@pytest.mark.parametrize(("rated", "told"), [(25.0, True), (35.0, False)])
def test_a_rail_above_its_reservoirs_rating_makes_it_sure(rated: float, told: bool) -> None:
    """27 V is 1.17 times 23.1 V: above what a whole zener stands at (5 %, and 0.09 %/K for 100 K)."""
    rails = tuple(replace(rail, reservoir=Reservoir(capacitance=220e-6, rated_voltage=rated)) for rail in BOARD.rails)
    found = suspected(replace(BOARD, rails=rails), {}, read("rail-voltage", 27.0, rail=RAIL))
    assert bool(found) is told
    assert not suspected(replace(BOARD, rails=rails), {}, read("rail-voltage", 25.4, rail=RAIL))


@pytest.mark.parametrize(("rectifier", "volts"), [("bridge", "358 V"), ("half-wave", "716 V")])
def test_it_forbids_to_power_the_board_and_says_how_high_the_rail_climbs(rectifier: str, volts: str) -> None:
    """√2 · 253 V = 357.8 V, twice that on a half-wave board (SAFETY.md; published values, cautions a bench needs)."""
    (found,) = suspected(replace(BOARD, rectifier=rectifier), {RAIL: 0.3})
    told = found.sentence()
    for words in ("The relay rail zener", "DO NOT POWER", volts, "eye protection", "1000 V", "Discharge"):
        assert words in told
    assert safety_findings(BOARD, (read("bleeder-resistance", "open"),), {RAIL: 0.3})[0].fault == "zener-open"


def test_a_rail_behind_a_resistor_climbs_no_higher_than_the_one_that_feeds_it() -> None:
    (found,) = suspected(FULL.board, {"lower": 0.3})
    assert found.figures == {"climbs_V": 24.0}
    upper, lower = FULL.board.rails
    (found,) = suspected(replace(FULL.board, rails=(replace(upper, zener=None), lower)), {"lower": 0.3})
    assert found.figures["climbs_V"] == pytest.approx(253.0 * 2.0**0.5)


def test_the_posterior_is_summed_over_every_hypothesis_with_an_open_zener(monkeypatch: pytest.MonkeyPatch) -> None:
    draw_few(monkeypatch, 32)
    posterior = posterior_of(FULL.board, Meter(), ())
    names = [[struck.fault.name for struck in hypothesis.faults] for hypothesis in posterior.hypotheses]
    wanted = sum(p for p, of in zip(posterior.probabilities, names, strict=True) if "zener-open" in of)
    chances = zener_open_of(posterior)
    assert set(chances) == {"upper", "lower"}
    assert sum(chances.values()) == pytest.approx(wanted)


def test_nobody_is_sent_to_live_work_and_a_rail_out_of_hand_does_not_run(monkeypatch: pytest.MonkeyPatch) -> None:
    draw_few(monkeypatch, 64)
    found = assess(replace(FULL, readings=(read("zener-test", "open", rail="upper"),)))
    assert found.safety[0].fault == "zener-open"
    assert found.next_checks
    assert {check.condition for check in found.next_checks} == {"dead"}
    assert next(suspect for suspect in found.suspects if suspect.fault == "zener-open").explains_complaint
    healthy = assess(replace(FULL, readings=(read("zener-test", 24.0, rail="upper"),)))
    assert "live" in {check.condition for check in healthy.next_checks}


# --- ratings and class


@pytest.mark.parametrize(
    ("in_series", "rated", "over"),
    [
        (2, 200.0, False), (1, 200.0, True), (1, 250.0, True), (1, 350.0, False), (2, 126.0, True), (2, 127.0, False),
        (1, None, False),
    ],
)
def test_each_resistor_of_the_string_carries_its_share(in_series: int, rated: float | None, over: bool) -> None:
    """230 V + 10 % = 253 V over one resistor, 126.5 V over each of two. A 1206 chip stands 200 V (Vishay CRCW)."""
    board = replace(with_bleeder(in_series=in_series, rated_voltage=rated), connected_by="fixed")
    assert faults(board) == (["bleeder-overvoltage"] if over else [])
    if over:
        assert finding(board, "bleeder-overvoltage").figures == {"each_V": pytest.approx(253.0 / in_series), "rated_V": rated}


def test_a_dropper_known_to_have_no_safety_class_is_a_finding() -> None:
    fixed = replace(with_dropper(safety_class="none"), connected_by="fixed")
    assert faults(fixed) == ["no-safety-class"]
    assert faults(replace(with_dropper(safety_class=None), connected_by="fixed")) == []  # not stated is not none
    for kind in ("X1", "X2", "Y2"):
        assert faults(replace(with_dropper(safety_class=kind), connected_by="fixed")) == []


@pytest.mark.parametrize(("rated", "under"), [(250.0, True), (252.9, True), (253.0, False), (275.0, False), (310.0, False)])
def test_a_dropper_rated_under_the_highest_mains_is_a_finding(rated: float, under: bool) -> None:
    """230 V + 10 % = 253 V (IEC 60038)."""
    board = replace(with_dropper(rated_voltage=rated), connected_by="fixed")
    assert faults(board) == (["dropper-overvoltage"] if under else [])


def test_every_sentence_is_whole() -> None:
    board = replace(with_dropper(safety_class="none", rated_voltage=200.0), bleeder=with_bleeder(rated_voltage=50.0).bleeder)
    for value in ("open", 1.9e6, 1e5):
        for each in safety_findings(board, (read("bleeder-resistance", value),)):
            for ascii in (False, True):
                assert "{" not in each.sentence(ascii=ascii)
            assert each.sentence(ascii=True).isascii()
            assert 0.0 <= each.probability <= 1.0


def test_a_large_reservoir_that_an_open_zener_let_climb_is_held_longer() -> None:
    # 470 uF + 20 % at twice 358 V (half-wave): 10 kohm · 564 uF · ln(716/5) = 28 s, told in whole 5 s.
    rails = (replace(BOARD.rails[0], reservoir=Reservoir(capacitance=470e-6), zener=Zener(voltage=12.0), fed_through=None),)
    pumping = replace(BOARD, rectifier="half-wave", rails=rails, loads=())
    assert "held on each for 30 s" in cautions(pumping)[1]


def test_a_fixed_appliance_is_not_told_to_be_unplugged() -> None:
    told = cautions(replace(BOARD, connected_by="fixed"))[1]
    assert "plug" not in told.lower()
    assert "breaker, lock it off, prove it dead" in told
    assert "mains terminals must be under 5 V" in told


def test_a_resistor_in_the_dropper_s_place_holds_nothing_but_is_hot() -> None:
    told = cautions(replace(BOARD, dropper=Dropper(kind="resistor", resistance=4.7e3)))[1]
    assert "discharge every reservoir (the dropper is a resistor and hot: let it cool)" in told
