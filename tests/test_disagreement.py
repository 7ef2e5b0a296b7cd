"""Readings that do not go together. The case of the case format's section 1: 304 nF in the meter, 14.2 V on the rail."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from benchtool.diagnosis.disagreement import Disagreement, disagreements, weighted_range
from benchtool.diagnosis.posterior import posterior_of
from benchtool.observed import Meter, Reading
from tests.some_boards import CONTRACT, FULL, read

ON = ("heater relay",)
LOW_RAIL = read("rail-voltage", 14.2, rail="relay rail", on=ON)


def found_on_contract(*readings: Reading) -> tuple[Disagreement, ...]:
    return disagreements(posterior_of(CONTRACT.board, Meter(), readings))


def test_304_nf_does_not_go_with_14_2_volts() -> None:
    """14.2 V are what a dropper of 181 nF (163 to 209 nF) gives: the case format, section 2, `effective`."""
    (found,) = found_on_contract(LOW_RAIL, read("dropper-capacitance", 304e-9, lifted=True))
    assert {found.first.what, found.second.what} == {"rail-voltage", "dropper-capacitance"}
    assert found.implied is not None
    low, high = found.implied
    assert isinstance(found.second.value, float)
    assert not low <= found.second.value <= high, "what was read cannot be what was implied, where the two disagree"


def test_182_nf_goes_with_14_2_volts() -> None:
    assert found_on_contract(LOW_RAIL, read("dropper-capacitance", 182e-9, lifted=True)) == ()


CONSISTENT: tuple[tuple[Reading, ...], ...] = (
    (),
    (LOW_RAIL,),
    (read("rail-voltage", 24.3, rail="relay rail"), read("rail-voltage", 23.3, rail="relay rail", on=ON)),
    (read("dropper-capacitance", 680e-9, lifted=True), read("inrush-resistance", 100.0), read("inrush-voltage", 4.82)),
    (read("fuse-resistance", "open"), read("rail-voltage", 0.0, rail="relay rail"), read("line-current", 0.0)),
    # two figures that one dried reservoir has: within what the fault does (0.5 to 40 %, 0.5 to 20 ohm more)
    (read("reservoir-esr", 9.6, rail="relay rail"), read("reservoir-capacitance", 11.5e-6, rail="relay rail")),
    (read("reservoir-esr", 3.0, rail="logic rail"), read("reservoir-capacitance", 20e-6, rail="logic rail")),
)


@pytest.mark.parametrize("readings", CONSISTENT, ids=range(len(CONSISTENT)))
def test_consistent_readings_do_not_disagree(readings: tuple[Reading, ...]) -> None:
    assert found_on_contract(*readings) == ()


APART = (
    read("reservoir-esr", 9.6, rail="upper"),
    read("reservoir-capacitance", 11.5e-6, rail="upper"),
    read("dropper-capacitance", 300e-9, lifted=True),
    read("rail-voltage", 24.5, rail="upper", on=("relay", "heater", "lamp")),
    read("coil-resistance", 2300.0, load="relay"),
)


def test_a_reading_within_what_the_other_implies_does_not_disagree_with_it() -> None:
    """Else the sentence contradicts itself: "9.6 ohm would mean 1.2 to 73 uF where 11.5 uF was read"."""
    for found in disagreements(posterior_of(FULL.board, Meter(), APART)):
        if found.implied is not None and isinstance(found.second.value, float):
            low, high = found.implied
            assert not low <= found.second.value <= high, found


def test_the_order_does_not_matter() -> None:
    two = (LOW_RAIL, read("dropper-capacitance", 304e-9, lifted=True))
    pairs = [{(each.first.what, each.second.what) for each in found_on_contract(*order)} for order in (two, two[::-1])]
    assert [{frozenset(pair) for pair in each} for each in pairs] == [{frozenset({"rail-voltage", "dropper-capacitance"})}] * 2


def test_the_same_reading_twice_does_not_disagree_with_itself() -> None:
    assert found_on_contract(LOW_RAIL, LOW_RAIL) == ()


def test_two_values_of_one_reading_disagree() -> None:
    one = read("dropper-capacitance", 182e-9, lifted=True)
    other = replace(one, value=304e-9)
    assert [(found.first, found.second) for found in found_on_contract(one, other)] == [(one, other)]


# --- the weighted range


def test_the_range_of_even_weights_is_that_of_the_values() -> None:
    values = np.linspace(0.0, 100.0, 1001)
    assert weighted_range(values, np.ones(1001)) == pytest.approx((2.5, 97.5), abs=0.2)
    assert weighted_range(values[::-1], np.ones(1001)) == pytest.approx((2.5, 97.5), abs=0.2)


def test_the_range_follows_the_weight() -> None:
    values = np.array([1.0, 2.0, 3.0, np.nan])
    assert weighted_range(values, np.array([0.0, 1.0, 0.0, 0.5])) == (2.0, 2.0)
    assert weighted_range(values, np.array([0.0, 0.4, 0.0, 0.6])) is None  # mostly no number
    assert weighted_range(values, np.zeros(4)) is None
