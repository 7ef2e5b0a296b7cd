"""The plain report on every sample case: what must stand in it, what must never, and that it fits its width."""

from __future__ import annotations

import json
import re
import tomllib
from dataclasses import replace
from itertools import pairwise
from pathlib import Path

import pytest

from benchtool.board import Load, Rail
from benchtool.case import Case
from benchtool.casefile import loads
from benchtool.diagnosis.effective import Effective
from benchtool.diagnosis.evidence import Because, Expected
from benchtool.observed import Check, Reading
from benchtool.physics import constants as known
from benchtool.physics.budget import Budget
from benchtool.report.bar import budget_lines
from benchtool.report.evidence import says
from benchtool.report.layout import Line, Page, cells, paragraph, table
from benchtool.report.template import TEMPLATE
from benchtool.report.text import report_lines
from benchtool.result import Assessment
from benchtool.words import Words, expectation, judged, percent
from tests.assessed import SAMPLES, assessed_once, assessed_sample, sample_path

WIDTHS = (80, 40, 32)
PAGES = [Page(width, ascii) for width in WIDTHS for ascii in (False, True)]
UNITS = r"(?:[GMkmµun]?(?:V|A|F|Ω|ohm|W|s)|%|min)(?![A-Za-z0-9])"
PROMISES = re.compile(r"safe to|may be touched|can be touched|touch it|harmless|no danger|without danger|risk-free", re.I)

every_sample = pytest.mark.parametrize("sample", SAMPLES, ids=lambda path: path.stem)
every_page = pytest.mark.parametrize("page", PAGES, ids=lambda page: f"{page.width}{'-ascii' if page.ascii else ''}")


def lines_of(assessment: Assessment, page: Page) -> list[str]:
    return [line.text for line in report_lines(assessment, page)]


def flowed(assessment: Assessment, page: Page) -> str:
    """The report as one run of words, so that a search does not depend on where lines break."""
    return " ".join(" ".join(lines_of(assessment, page)).split())


def sample(name: str) -> Assessment:
    return assessed_sample(sample_path(name))


@every_page
@every_sample
def test_every_line_fits_and_no_value_is_parted_from_its_unit(sample: Path, page: Page) -> None:
    lines = lines_of(assessed_sample(sample), page)
    assert max(map(cells, lines)) <= page.width
    for line, following in pairwise(lines):
        parted = re.search(r"[0-9]$", line) and re.match(rf"\s*{UNITS}", following)
        assert not parted, (line, following)
    if page.ascii:
        "".join(lines).encode("ascii")


@every_page
@every_sample
def test_cautions_come_first_whole_and_nothing_is_promised(sample: Path, page: Page) -> None:
    lines, assessment = lines_of(assessed_sample(sample), page), assessed_sample(sample)
    assert lines[0].startswith("NOT ISOLATED: every point")
    assert any(line.startswith("STORED CHARGE: ") for line in lines)
    assert any("isolat" in line for line in lines)
    assert any("discharg" in line for line in lines)
    text = " ".join(" ".join(lines).split())
    assert not PROMISES.search(text)
    assert text.startswith(page.plain(" ".join(assessment.cautions)))
    for finding in assessment.safety:
        assert page.plain(finding.sentence()) in text
        assert text.index(page.plain(finding.sentence())) < text.index("SUSPECTS")


@every_sample
def test_figures_are_those_of_the_machine_readable_result(sample: Path) -> None:
    result = json.loads(json.dumps(assessed_sample(sample).as_dict()))
    text = flowed(assessed_sample(sample), Page(80))
    budget = result["budget"]
    for key, label in (("demand_A", "loads need"), ("available_A", "as marked")):
        shown = "cannot tell" if budget[key] is None else f"{budget[key] * 1e3:.1f}"
        assert f"{label} {shown}" in text
    for state in result["states"]:
        for rail in state["rails"]:
            marked, low, high = (rail[key] for key in ("voltage_V", "voltage_low_V", "voltage_high_V"))
            shown = "cannot tell" if marked is None else f"{marked:.3g} V"
            assert f"{shown} {low:.3g} to {high:.3g} V" in text
    best = result["suspects"][0]["probability"]
    shown = "over 99 %" if best >= 0.995 else f"{best * 100:.0f} %"
    assert f">1 {shown}" in text


@every_sample
def test_the_check_first_on_the_machines_list_is_next(sample: Path) -> None:
    assessment = assessed_sample(sample)
    text = flowed(assessment, Page(80))
    if not assessment.next_checks:
        assert "NEXT no further check" in text
        return
    first = assessment.next_checks[0]
    assert f"NEXT {Words(assessment.case.board).check(first.check)} ({first.condition}, {first.minutes:g} min)" in text


@pytest.mark.parametrize(
    ("name", "headline"),
    [
        ("proofer-relay-lets-go", "MOST LIKELY dropper: capacitance lost"),
        ("fan-never-starts", "MOST LIKELY 12 V rail zener: shorted"),
        ("pump-float-ignored", "MOST LIKELY logic rail feed: open"),
        ("hood-lamp-stays-off", "MOST LIKELY lamp relay coil: open"),
    ],
)
def test_the_headline_names_what_is_wrong(name: str, headline: str) -> None:
    assert headline in flowed(sample(name), Page(80))


def with_probabilities(*changed: tuple[str, float]) -> Assessment:
    """The healthy sample with its suspects' probabilities replaced, the named ones first."""
    assessment = sample("proofer-healthy")
    wanted = dict(changed)
    suspects = [
        replace(suspect, probability=wanted.pop(suspect.fault, 0.0))
        for suspect in sorted(assessment.suspects, key=lambda suspect: suspect.fault not in wanted)
    ]
    return replace(assessment, suspects=tuple(sorted(suspects, key=lambda suspect: -suspect.probability)))


def test_a_sound_supply_is_told_to_look_elsewhere() -> None:
    text = flowed(with_probabilities(("no-fault", 0.97), ("inrush-high", 0.03)), Page(80))
    assert "THIS SUPPLY DOES WHAT IT SHOULD 97 % Look elsewhere in the appliance" in text
    assert "The safety findings stand all the same." in text


def test_a_supply_that_is_only_likely_sound_is_checked_further() -> None:
    text = flowed(with_probabilities(("no-fault", 0.6), ("inrush-high", 0.4)), Page(80))
    assert "THIS SUPPLY DOES WHAT IT SHOULD 60 % Likely, not sure: make the next check." in text


def test_a_fault_that_lets_the_loads_run_is_no_sure_culprit() -> None:
    text = flowed(with_probabilities(("inrush-high", 0.95), ("no-fault", 0.05)), Page(80))
    assert "MOST LIKELY inrush resistor: risen (95 %) Put this right first" in text
    assert "the marked loads still run with it: if the complaint stays, look further." in text


def test_nothing_stands_out_under_one_half() -> None:
    text = flowed(with_probabilities(("no-fault", 0.31), ("inrush-high", 0.27), ("unexplained", 0.42)), Page(80))
    assert "NOTHING STANDS OUT best is 42 %, unexplained" in text
    assert "MOST LIKELY" not in text


def test_what_no_fault_explains_says_so_and_shows_the_readings() -> None:
    text = flowed(with_probabilities(("unexplained", 0.71), ("no-fault", 0.29)), Page(80))
    assert "UNEXPLAINED 71 %: no single fault accounts for these readings" in text
    assert "READINGS against a healthy board" in text
    assert "relay rail, all off 24.76 V" in text


def test_at_most_six_suspects_are_listed_and_the_rest_summed() -> None:
    names = ("no-fault", "inrush-high", "inrush-open", "diode-open", "diode-short", "dropper-open", "dropper-short", "mains-low")
    shares = (0.30, 0.20, 0.15, 0.12, 0.10, 0.06, 0.04, 0.03)
    lines = lines_of(with_probabilities(*zip(names, shares, strict=True)), Page(80))
    start = lines.index("SUSPECTS, most likely first")
    listed = lines[start + 1 : start + 8]
    assert [line[1] for line in listed] == ["1", "2", "3", "4", "5", "6", " "]
    assert listed[0].startswith(">1      30 %  ███         no fault in this supply")
    assert listed[-1] == "         7 %  █           all others together"  # 4 % and 3 %
    assert lines[start + 8] == ""


def test_a_case_without_readings_has_no_suspect_but_a_next_check() -> None:
    text = flowed(assessed_once(loads(TEMPLATE)), Page(40))
    assert "NO READINGS YET, SO NO SUSPECT" in text
    assert "NEXT" in text
    assert "MOST LIKELY" not in text


def test_a_board_with_a_divided_dropper_gets_its_cautions_and_a_verdict() -> None:
    divided = TEMPLATE.replace('kind = "capacitor"', 'kind = "divider"\nshunt_capacitance = "1 uF"')
    text = flowed(assessed_once(loads(divided)), Page(40))
    assert text.startswith("NOT ISOLATED")
    assert "divider's second capacitor" in text


def test_what_cannot_be_known_is_told_in_words() -> None:
    unread = TEMPLATE.replace('capacitance = "560 nF"', 'capacitance = "unknown"').replace('"4 mA"', '"unknown"')
    text = flowed(assessed_once(loads(unread)), Page(80))
    assert "Marked unreadable." in text
    assert "Current budget: cannot tell from what is marked on the board." in text
    assert "None" not in text
    assert "nan" not in text


def test_the_half_wave_rule_of_thumb_is_named_for_what_it_is() -> None:
    # Application notes print the RMS of a half sine: pi/2 times its mean where no series resistance counts.
    assessment = sample("pump-dead")
    assert assessment.budget is not None
    thumb = assessment.budget.rule_of_thumb
    assert thumb is not None
    assert f"rule of thumb would say {thumb * 1e3:.1f} mA: that is the RMS of a half sine, not the mean." in flowed(
        assessment, Page(40)
    )
    assert "rule of thumb" not in flowed(sample("proofer-healthy"), Page(40))


HOSTILE = (
    "\x1b[31mred\x1b[0m\x07",
    "two\nlines\r\tand a tab",
    "\u202eright to left\u2066",
    "\u009b2J",
    "[bold]markup[/] {0} {name} %s",
    "電源" * 15,
    "x" * 60,
    "\u200b\u200d",
    "🔌 12 V",
    "e\u0301" * 30,
)


def assert_fits(lines: list[Line], page: Page) -> None:
    assert max(cells(line.text) for line in lines) <= page.width
    assert all(sign.isprintable() for line in lines for sign in line.text)
    if page.ascii:
        "".join(line.text for line in lines).encode("ascii")


def named(case: Case, name: str) -> Case:
    """The template's board with its rail and its relay named `name`, and one reading there."""
    board = case.board
    rails = tuple(replace(rail, name=name) for rail in board.rails)
    renamed = tuple(replace(load, rail=name, name=name if load.switched else load.name) for load in board.loads)
    reading = Reading(what="rail-voltage", rail=name, on=(name,), value=8.6)
    ticket = replace(case.ticket, complaint=name, number=name)
    return replace(case, board=replace(board, rails=rails, loads=renamed, name=name), readings=(reading,), ticket=ticket)


@pytest.mark.parametrize("name", HOSTILE)
@every_page
def test_no_name_can_break_a_line_a_table_or_the_bar(name: str, page: Page) -> None:
    case = named(loads(TEMPLATE), name)
    words = Words(case.board)
    check = words.check(case.readings[0])
    assert_fits(paragraph(page, check, first="NEXT  "), page)
    if not page.narrow:
        assert_fits(table(page, [("reading", "read", "if so"), (check, "8.6 V", name)]), page)
    budget = Budget((name,), 0.035, 0.03, 0.04, 0.024, 3.8e-7, None)
    assert_fits(budget_lines(budget, Effective(), words, page), page)


@every_page
def test_a_whole_report_survives_the_worst_name(page: Page) -> None:
    assessment = assessed_once(named(loads(TEMPLATE), "".join(HOSTILE)))
    assert_fits(report_lines(assessment, page), page)


# Words


@pytest.mark.parametrize(
    ("probability", "shown"),
    [
        (1.0, "over 99 %"), (0.9951, "over 99 %"), (0.9949, "99 %"), (0.125, "13 %"), (0.5, "50 %"), (0.006, "1 %"),
        (0.0049, "under 1 %"), (0.0, "under 1 %"),
    ],
)
def test_nothing_is_ever_certain_or_impossible(probability: float, shown: str) -> None:
    assert percent(probability) == shown


BOARD = loads(TEMPLATE).board
LAMP = Load(name="run lamp", short="lamp", kind="led", rail="12 V rail", switched=True, forward_voltage=2.0, resistance=1e3)
TWO = replace(BOARD, loads=(*BOARD.loads, LAMP), rails=(replace(BOARD.rails[0], short="12 V"),))


def test_states_in_words() -> None:
    words = Words(TWO)
    assert words.state(None) == ""
    assert words.state(()) == "all off"
    assert words.state(("run lamp",)) == "run lamp on"
    assert words.state(("run lamp", "motor relay")) == "all on"
    assert Words(TWO, short=True).state(("run lamp",)) == "lamp on"
    three = replace(TWO, loads=(*TWO.loads, replace(LAMP, name="door lamp")))
    assert Words(three).state(("run lamp", "door lamp")) == "run lamp and door lamp on"
    nothing_switched = replace(BOARD, loads=BOARD.loads[:1])
    assert Words(nothing_switched).state(()) == ""


def test_checks_in_words() -> None:
    words = Words(TWO)
    assert words.check(Check(what="rail-voltage", rail="12 V rail", on=())) == "12 V rail, all off"
    assert words.check(Check(what="rail-voltage", rail="12 V rail", on=(), when="warm")) == "12 V rail, all off, warm"
    assert Words(TWO, short=True).check(Check(what="reservoir-esr", rail="12 V rail")) == "12 V reservoir ESR"
    assert words.check(Check(what="dropper-capacitance", lifted=True)) == "dropper capacitance, one leg lifted"
    assert words.check(Check(what="dropper-capacitance")) == "dropper capacitance, across the bleeder"
    assert words.check(Check(what="look", rail="12 V rail")) == "look, 12 V rail"
    injected = Check(what="rail-injection", rail="12 V rail", on=(), clamp=0.02, limit=14.4)
    assert words.check(injected) == "12 V rail on the bench supply, all off, up to 20 mA, up to 14.4 V"


def test_a_low_end_no_meter_can_show_is_left_out() -> None:
    assert expectation(Expected(low=-1.5e-5, high=2.3e-5), "reservoir-leakage") == "under 23 µA"
    assert expectation(Expected(low=-0.02, high=0.02), "rail-voltage") == "-20 to 20 mV"  # a rail can be below common
    assert expectation(Expected(words=("yes", "no")), "load-responds") == "yes or no"


def test_readings_against_a_healthy_band() -> None:
    band, reading = Expected(low=10.0, high=12.0), Reading(what="rail-voltage", rail="12 V rail", on=(), value=9.0)
    assert [judged(replace(reading, value=value), band) for value in (9.0, 10.0, 12.0, 12.1)] == ["low", "ok", "ok", "high"]
    word = Reading(what="coil-resistance", load="motor relay", value="open")
    assert judged(word, band) == "bad"
    assert judged(word, Expected(words=("open",))) == "ok"
    assert judged(Reading(what="look", value=("residue",)), Expected(words=("weak evidence, never proof",))) == ""


def test_a_factor_of_two_speaks_for_or_against() -> None:
    reading = Reading(what="mains-voltage", value=230.0)
    rows = [Because(reading, None, Expected(), Expected(), weight) for weight in (0.31, 0.0, -0.31)]
    assert [says(row) for row in rows] == ["for", "either", "against"]


# The case file that `new` writes


def test_every_optional_key_of_the_template_can_be_used() -> None:
    used = re.sub(r"^#(?=[a-z\[])", "", TEMPLATE, flags=re.M)
    assert used != TEMPLATE
    case = loads(used)
    assert [rail.name for rail in case.board.rails] == ["12 V rail", "logic rail"]
    assert len(case.readings) == 3


def test_the_template_is_a_sound_board_of_our_own() -> None:
    assessment = assessed_once(loads(TEMPLATE))
    assert assessment.safety == ()
    assert assessment.budget is not None
    assert assessment.budget.available_low is not None
    assert assessment.budget.demand is not None
    assert assessment.budget.available_low > assessment.budget.demand
    assert all(rail.regulating for state in assessment.states for rail in state.rails)
    plain = tomllib.loads(TEMPLATE)
    assert not (plain["board"]["dropper"]["capacitance"] == "220 nF" and "24 V" in TEMPLATE)
    assert max(map(len, TEMPLATE.splitlines())) <= 120


def test_the_general_caution_has_the_volts_that_count_as_dead() -> None:
    from benchtool.cli import CAUTION

    assert f"under {known.DEAD_VOLTS:g} V" in CAUTION
    assert not PROMISES.search(CAUTION)
    assert "isolat" in CAUTION
    assert "discharg" in CAUTION


def test_a_rail_without_a_short_name_keeps_its_own_on_narrow_pages() -> None:
    rail = Rail(name="only rail", fed_by="rectifier")
    assert Words(replace(BOARD, rails=(rail,)), short=True).rail("only rail") == "only rail"
