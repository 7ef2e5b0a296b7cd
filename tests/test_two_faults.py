"""Two faults at once, readings that nothing accounts for, and what is said of readings that do not go together.

The boards are those of the case format and of the tests; what is read on them follows from it by the sums beside each.
"""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise

import pytest

from benchtool import assess
from benchtool.board import Board
from benchtool.diagnosis.checks import in_full, next_checks, taken_better
from benchtool.diagnosis.disagreement import Disagreement, disagreements
from benchtool.diagnosis.posterior import posterior_of
from benchtool.observed import Check, Meter, Reading
from benchtool.result import Suspect
from tests.some_boards import CONTRACT, draw_few, read

METER = Meter()
ON = ("heater relay",)
LOW_RAIL = read("rail-voltage", 14.2, rail="relay rail", on=ON)
"""What a dropper of 181 nF (163 to 209 nF) gives; the case format, section 2."""
READ_HIGH = read("dropper-capacitance", 304e-9, lifted=True)


def first(board: Board, *readings: Reading) -> Suspect:
    return assess(replace(CONTRACT, board=board, readings=readings)).suspects[0]


def faults(suspect: Suspect) -> list[tuple[str, str]]:
    assert suspect.hypothesis is not None
    return [(struck.fault.name, struck.place.name) for struck in suspect.hypothesis.faults]


# --- two faults


def test_a_pair_of_the_trade_is_one_suspect_the_cause_first(monkeypatch: pytest.MonkeyPatch) -> None:
    # A shorted dropper blows its inrush resistor (published values, priors: named pairs).
    draw_few(monkeypatch, 96)
    both = first(CONTRACT.board, read("inrush-resistance", "open"), read("dropper-capacitance", "short", lifted=True))
    assert faults(both) == [("dropper-short", ""), ("inrush-open", "")]
    plain = both.as_dict()
    assert (plain["fault"], plain["with"]) == ("dropper-short", {"fault": "inrush-open", "rail": None, "load": None})


TWO = (
    read("inrush-resistance", 4.7e3),
    read("path-resistance", 4.7e3),
    read("coil-resistance", "open", load="heater relay"),
    read("load-responds", "no", load="heater relay"),
)
"""A raised inrush resistor (× 47) and an open coil: no cause and effect, and no name for it in the trade."""


def test_two_faults_without_a_name_are_named_when_the_readings_call_for_both(monkeypatch: pytest.MonkeyPatch) -> None:
    draw_few(monkeypatch, 96)
    both = first(CONTRACT.board, *TWO)
    assert sorted(faults(both)) == [("coil-open", "heater relay"), ("inrush-high", "")]


def test_such_a_pair_has_the_product_of_its_chances_times_two(monkeypatch: pytest.MonkeyPatch) -> None:
    # "Any other pair: the product of the two chances, times two" (published values, priors): 2 · 8 ‰ · 8 ‰ = 0.128 ‰.
    draw_few(monkeypatch, 96)
    found = posterior_of(CONTRACT.board, METER, TWO)
    (pair,) = [h for h in found.hypotheses if sorted(s.fault.name for s in h.faults) == ["coil-open", "inrush-high"]]
    assert pair.weight == pytest.approx(0.128)


def test_a_second_fault_is_not_claimed_where_one_accounts_for_all(monkeypatch: pytest.MonkeyPatch) -> None:
    draw_few(monkeypatch, 96)
    found = posterior_of(CONTRACT.board, METER, TWO[:1])
    assert len(found.hypotheses) == len(posterior_of(CONTRACT.board, METER, ()).hypotheses)
    assert faults(first(CONTRACT.board, TWO[0])) == [("inrush-high", "")]


# --- the culprit, and what is worn but carries the load


def test_a_worn_dropper_that_still_carries_the_load_is_no_culprit() -> None:
    # 600 nF of 680 is worn; the rail lets go under 366 nF (the case format, section 2), so the relay has all it needs.
    worn = (read("dropper-capacitance", 600e-9, lifted=True), read("rail-voltage", 23.2, rail="relay rail", on=ON))
    spent = (read("dropper-capacitance", 182e-9, lifted=True), LOW_RAIL)
    by_name = {
        suspect.fault: suspect.explains_complaint
        for suspect in assess(replace(CONTRACT, readings=worn)).suspects
        if suspect.hypothesis is not None and len(suspect.hypothesis.faults) == 1
    }
    assert by_name["dropper-capacitance-lost"] is False
    assert first(CONTRACT.board, *spent).explains_complaint is True


# --- unexplained, and readings that disagree


def test_readings_that_nothing_accounts_for_end_as_unexplained() -> None:
    # 304 nF would hold the rail at some 20 V; 14.2 V means 181 nF (the case format). No fault gives both.
    found = assess(replace(CONTRACT, readings=(LOW_RAIL, READ_HIGH)))
    assert found.suspects[0].hypothesis is None
    assert len(found.disagreements) == 1


def test_of_two_readings_that_disagree_the_one_against_all_others_is_the_likelier_mistake() -> None:
    # 181 nF by the rail, by the current in the inrush resistor and by the voltage that the lower rail has left: three to one.
    # Line current by 181/680 of the 48.2 mA as marked: 12.8 mA through 100 ohm.
    agreeing = (LOW_RAIL, read("inrush-voltage", 1.29, on=ON), read("line-current", 12.9e-3, on=ON))
    found = [item for item in _disagreements(*agreeing, READ_HIGH) if READ_HIGH in (item.first, item.second)]
    assert found
    assert all(item.doubtful == READ_HIGH for item in found)


def _disagreements(*readings: Reading) -> tuple[Disagreement, ...]:
    return disagreements(posterior_of(CONTRACT.board, METER, readings))


def test_a_reading_that_disagrees_comes_back_where_it_can_be_taken_better() -> None:
    # In place a meter that ramps reads a dropper high across its bleeder (published values, meters); with a leg lifted it does
    # not.
    assert taken_better(Check(what="dropper-capacitance"), CONTRACT.board) == Check(what="dropper-capacitance", lifted=True)
    assert taken_better(Check(what="dropper-capacitance", lifted=True), CONTRACT.board) is None
    live = Check(what="rail-voltage", rail="relay rail", on=ON)
    assert taken_better(live, CONTRACT.board) == replace(live, when="warm")
    found = assess(replace(CONTRACT, readings=(LOW_RAIL, READ_HIGH)))
    again = [item.check for item in found.next_checks if item.check.what == "rail-voltage" and item.check.when == "warm"]
    assert again == [replace(live, when="warm")]


# --- what a check would show, and what would be decided by it


def test_a_bench_supply_at_the_rail_is_foretold_healthy_and_for_the_suspects() -> None:
    # 20 mA into the upper rail of a healthy board run through its zeners, 18 V on top of 5.1 V ± 5 %; 16 mA of it stand 60 mV ·
    # ln(16/5) over the mark in each (case format, section 4). A leaky rail takes half the board's load at least: it reads lower.
    readings = (read("rail-voltage", 9.0, rail="relay rail"), read("rail-voltage", 4.9, rail="logic rail"))
    found = posterior_of(CONTRACT.board, METER, readings)
    items = next_checks(found, [each.check for each in readings])
    injection = next(item for item in items if item.check.what == "rail-injection" and item.check.rail == "relay rail")
    ranges = {each.hypothesis.label: each.expected for each in in_full(found, injection).foretold}
    assert len(ranges) > 2
    healthy = ranges.pop("no fault in this supply")
    assert healthy.low is not None
    assert healthy.low == pytest.approx(23.1 * 0.95 + 0.1, abs=0.7)
    assert healthy.high == pytest.approx(23.1 * 1.05 + 0.1, abs=0.7)
    assert any(other.high is not None and other.high < healthy.low for other in ranges.values()), "nothing is split by it"


def test_what_is_read_decides_at_thresholds_that_part_the_suspects() -> None:
    found = assess(replace(CONTRACT, readings=(read("rail-voltage", 17.0, rail="relay rail", on=ON),)))
    decisive = [item for item in found.next_checks if len(item.turns) > 1]
    assert decisive
    for item in decisive:
        assert sum(turn.chance for turn in item.turns) == pytest.approx(1.0, abs=0.05)
        numbers = [turn for turn in item.turns if turn.word is None]
        ends = [(turn.low or float("-inf"), turn.high or float("inf")) for turn in numbers]
        assert all(low < high for low, high in ends)
        assert all(one[1] <= other[0] for one, other in pairwise(ends)), "ranges that overlap decide nothing"


def test_the_order_of_the_readings_changes_nothing() -> None:
    readings = (LOW_RAIL, read("dropper-capacitance", 182e-9, lifted=True), read("inrush-resistance", 100.0))
    one, other = (posterior_of(CONTRACT.board, METER, order) for order in (readings, readings[::-1]))
    assert one.probabilities.tolist() == other.probabilities.tolist()


def test_an_injection_is_a_reading_that_parts_what_feeds_the_rail_from_what_is_behind_it() -> None:
    # Both boards starve at 10 V with the relay on. Fed 20 mA on the bench, the relay off, one holds its zeners' 23 V: what feeds
    # it is at fault. On the other the rail stays low: something behind it takes the 20 mA (published values, near-identical
    # readings).
    starved = read("rail-voltage", 10.0, rail="relay rail", on=ON)
    before_the_rail = {"dropper-capacitance-lost", "inrush-high", "diode-short", "dropper-open", "wrong-part", "mains-low"}

    def share(volts: float) -> float:
        found = posterior_of(CONTRACT.board, METER, (starved, read("rail-injection", volts, rail="relay rail")))
        names = [hypothesis.name for hypothesis in found.hypotheses]
        return sum(float(p) for p, name in zip(found.probabilities, names, strict=True) if name in before_the_rail)

    assert share(23.3) > 0.9
    assert share(5.0) < 0.1


def test_safety_findings_stand_apart_and_change_no_probability() -> None:
    readings = (LOW_RAIL, read("bleeder-resistance", "open"))
    found, without = assess(replace(CONTRACT, readings=readings)), assess(replace(CONTRACT, readings=readings[:1]))
    assert "bleeder-open" in {finding.fault for finding in found.safety}
    assert [suspect.probability for suspect in found.suspects] == [suspect.probability for suspect in without.suspects]
    assert "bleeder-open" not in {suspect.fault for suspect in found.suspects}
