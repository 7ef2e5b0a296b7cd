"""What endangers the user and causes no complaint: each rule by hand.

Limits at the plug: IEC 60335-1 22.5, 34 V after one second, exempt up to 0.1 µF.
"""

from __future__ import annotations

import math
import re
from dataclasses import replace
from typing import Any

import pytest

from benchtool.board import UNKNOWN, Bleeder, Board
from benchtool.diagnosis.safety import Finding, safety_findings
from benchtool.observed import Reading
from tests.some_boards import CONTRACT, read

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


def test_a_bleeder_that_cannot_be_read_off_and_was_measured_is_judged_by_nothing() -> None:
    assert faults(with_bleeder(resistance=UNKNOWN), read("bleeder-resistance", 1e6)) == []
    assert "bleeder-open" in faults(with_bleeder(resistance=UNKNOWN), read("bleeder-resistance", "open"))


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
