"""What the report tells a technician to do: the action under the headline, and the checks it shows next."""

from __future__ import annotations

from dataclasses import replace

import pytest

from benchtool.diagnosis.checks import NextCheck
from benchtool.diagnosis.disagreement import Disagreement
from benchtool.observed import Check, Reading
from benchtool.report.layout import Page
from benchtool.result import Assessment
from tests.test_report_text import flowed, sample, with_probabilities


def test_one_reading_that_fits_nothing_is_taken_again() -> None:
    assessment = with_probabilities(("unexplained", 0.71), ("no-fault", 0.29))
    told = "It fits no fault on the list: take it again, or check the values typed."
    assert told not in flowed(assessment, Page(80))
    suspects = tuple(replace(suspect, because=suspect.because[:1]) for suspect in assessment.suspects)
    assert told in flowed(replace(assessment, suspects=suspects), Page(80))


def test_readings_that_disagree_come_before_any_repair() -> None:
    assessment = with_probabilities(("inrush-high", 0.95), ("no-fault", 0.05))
    first, second = assessment.case.readings[:2]
    text = flowed(replace(assessment, disagreements=(Disagreement(first, second, None),)), Page(80))
    assert "MOST LIKELY inrush resistor: risen (95 %) The readings disagree: settle that first." in text
    assert "Put this right first" not in text


def with_readings(assessment: Assessment, *readings: Reading) -> Assessment:
    return replace(assessment, case=replace(assessment.case, readings=readings))


@pytest.mark.parametrize(("volts", "told"), [((22.0,), True), ((24.0,), False), ((0.0, 231.0), False), ((231.0, 0.0), True)])
def test_mains_that_were_not_there_are_said_first(volts: tuple[float, ...], told: bool) -> None:
    # Under a tenth of 230 V, by the last reading.
    readings = [Reading(what="mains-voltage", value=value) for value in volts]
    text = flowed(with_readings(with_probabilities(("inrush-open", 0.95)), *readings), Page(80))
    assert ("(95 %) No mains reached the board while reading: plug, fuse, transformer." in text) is told


@pytest.mark.parametrize(
    ("fault", "share", "told"),
    [("inrush-open", 0.95, True), ("inrush-open", 0.21, True), ("inrush-open", 0.19, False), ("inrush-high", 0.95, False)],
)
def test_a_blown_part_has_a_cause(fault: str, share: float, told: bool) -> None:
    """A blown fuse or fusible resistor has a cause: the published values, cautions a bench needs (common practice)."""
    rest = [(name, (1.0 - share) / 8.0) for name in ("no-fault", "diode-open", "diode-short", "dropper-open", "mains-low")]
    cause = "A blown fuse or fusible resistor has a cause: find the short first. Replace like for like."
    assert (cause in flowed(with_probabilities((fault, share), *rest), Page(80))) is told


@pytest.mark.parametrize("fault", ["dropper-capacitance-lost", "dropper-open"])
def test_the_replacement_of_a_dropper_is_named(fault: str) -> None:
    fit = "Fit 680 nF, class X2, its data sheet allowing series duty (what the board is marked with)."
    assert fit in flowed(with_probabilities((fault, 0.95)), Page(80))
    assert "Fit 680 nF" not in flowed(with_probabilities((fault, 0.6)), Page(80))  # not before the next check
    assert "Fit " not in flowed(with_probabilities(("inrush-high", 0.95)), Page(80))


def test_the_best_dead_check_is_always_among_those_shown() -> None:
    live = NextCheck(Check(what="rail-voltage", rail="relay rail", on=()), "live", 1.0, 6.0)
    dead = NextCheck(Check(what="inrush-resistance"), "dead", 0.1, 1.0)
    worse = NextCheck(Check(what="fuse-resistance"), "dead", 0.1, 1.0)
    assessment = sample("proofer-healthy")
    text = flowed(replace(assessment, next_checks=(live, live, live, dead, worse)), Page(80))
    assert text.count("(live, 6 min)") == 2
    assert "inrush resistor (dead, 1 min)" in text
    assert "fuse (dead" not in text
    assert "clip on with the power off, one hand" in text
    assert flowed(replace(assessment, next_checks=(live, live, live)), Page(80)).count("(live, 6 min)") == 3
