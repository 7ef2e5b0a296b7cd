"""The verdict as plain text, in the order a technician needs it: what can kill, what is wrong, why, what to do next.

Why plain first: a printer, a pipe and a screen reader get the same report as the terminal.
"""

from __future__ import annotations

from collections.abc import Iterator

from benchtool.board import Board, Unknown
from benchtool.case import Case
from benchtool.diagnosis.effective import Effective
from benchtool.quantities import show
from benchtool.report.bar import budget_lines
from benchtool.report.evidence import (
    disagreement_lines,
    evidence_lines,
    named,
    next_lines,
    states_lines,
    suspects_lines,
    turning_lines,
)
from benchtool.report.layout import Line, Page, paragraph
from benchtool.result import Assessment, Suspect
from benchtool.words import CANNOT_TELL, Words, percent, value_of

STANDS_OUT = 0.5
"""Probability from which a suspect stands out."""
HALF_A_PERCENT = 0.005
"""What is shown as 50 % counts as such."""
SURE_ENOUGH = 0.9
"""Probability from which a repair comes before another check."""
CAUSED_FROM = 0.2
"""Probability from which a part that seldom fails by itself is told to have a cause."""
CAUSED = ("fuse-open", "inrush-open", "varistor-short")
HAS_A_CAUSE = "A blown fuse or fusible resistor has a cause: find the short first. Replace like for like."
REPLACED = ("dropper-capacitance-lost", "dropper-open", "wrong-part")
"""Faults that a new dropper as marked puts right."""
NO_MAINS = 0.1
"""Share of nominal under which the mains that were read did not reach the board."""
GAP = (Line(""),)


def report_lines(assessment: Assessment, page: Page) -> list[Line]:
    """The whole report on one page width; cautions always come first."""
    words = Words(assessment.case.board, short=page.narrow)
    blocks = [
        caution_lines(assessment, page),
        safety_lines(assessment, page),
        case_lines(assessment.case, page),
        headline_lines(assessment, page),
    ]
    blocks.extend(_verdict_blocks(assessment, words, page))
    filled = [block for block in blocks if block]
    return [line for number, block in enumerate(filled) for line in ((*GAP, *block) if number else block)]


def _verdict_blocks(assessment: Assessment, words: Words, page: Page) -> Iterator[list[Line]]:
    suspects = assessment.suspects
    if assessment.budget is not None:
        effective = assessment.effective or Effective()
        budget = budget_lines(assessment.budget, effective, words, page)
        yield [*budget, *effective_lines(assessment, words, page)]
    yield suspects_lines(suspects, page, still_run=may_run(assessment))
    told = _told_by(suspects)
    yield [*evidence_lines(told, words, page), *turning_lines(told, assessment.next_checks, words, page)]
    checks = next_lines(assessment.next_checks, suspects, words, page)
    yield [*disagreement_lines(assessment.disagreements, words, page), *checks]
    yield states_lines(assessment.states, words, page)


def _told_by(suspects: tuple[Suspect, ...]) -> Suspect:
    """The suspect whose evidence is shown: the first, or the sound board where nothing explains the readings."""
    if suspects[0].hypothesis is not None:
        return suspects[0]
    return next(suspect for suspect in suspects if suspect.hypothesis is not None and not named(suspect))


def caution_lines(assessment: Assessment, page: Page) -> list[Line]:
    """The standing cautions, each with its heading on the same line."""
    return [
        line for caution in assessment.cautions for line in paragraph(page, caution, rest="  ", role="caution")
    ]


def safety_lines(assessment: Assessment, page: Page) -> list[Line]:
    """What endangers the user on this board, before anything about its fault."""
    lines: list[Line] = []
    for finding in assessment.safety:
        likely = "" if finding.probability >= 1.0 else f" ({percent(finding.probability)})"
        lines.extend(paragraph(page, f"{finding.sentence()}{likely}", first="SAFETY  ", rest="  ", role="danger"))
    return lines


def case_lines(case: Case, page: Page) -> list[Line]:
    """Which ticket and board this is, as far as the file says."""
    ticket = case.ticket
    who = ", ".join(part for part in (ticket.number, ticket.appliance, case.board.name) if part)
    lines = paragraph(page, who, role="heading") if who else []
    if ticket.complaint:
        lines.extend(paragraph(page, f"Complaint: {ticket.complaint}", rest="  "))
    return lines


def headline_lines(assessment: Assessment, page: Page) -> list[Line]:
    """One headline to act on, and the sentence that says how."""
    head, rest, action = _headline(assessment)
    if _no_mains(assessment.case):
        action = "No mains reached the board while reading: plug, fuse, transformer."
    action = " ".join([action, *_cause(assessment.suspects)])
    return [*paragraph(page, rest, first=f"{head}  ", rest="  ", role="headline"), *paragraph(page, action)]


def _no_mains(case: Case) -> bool:
    read = [reading.value for reading in case.readings if reading.what == "mains-voltage"]
    return bool(read) and isinstance(read[-1], float) and read[-1] < NO_MAINS * case.board.mains.voltage


def _cause(suspects: tuple[Suspect, ...]) -> Iterator[str]:
    """What to look for before a blown part is replaced."""
    best = suspects[0] if suspects else None
    if best is not None and best.hypothesis is not None and best.probability >= CAUSED_FROM:
        blown = any(struck.fault.name in CAUSED for struck in best.hypothesis.faults)
        yield from [HAS_A_CAUSE] if blown else []


def _headline(assessment: Assessment) -> tuple[str, str, str]:
    """The verdict in capitals, what belongs to it, and the sentence to act on."""
    suspects = assessment.suspects
    best = suspects[0]
    share = percent(best.probability)
    if not any(suspect.because for suspect in suspects):
        action = "The list shows what usually fails on such a board. Make the next check."
        return "NO READINGS YET, SO NO SUSPECT", "", action
    if best.probability < STANDS_OUT - HALF_A_PERCENT:
        return "NOTHING STANDS OUT", f"best is {share}, {best.label}", "The next check tells more than this list."
    if best.hypothesis is None:
        return "UNEXPLAINED", f"{share}: no single fault accounts for these readings", _doubt(assessment)
    if not named(best):
        return "THIS SUPPLY DOES WHAT IT SHOULD", share, _elsewhere(assessment)
    return "MOST LIKELY", f"{best.label} ({share})", _action(best, assessment)


def _doubt(assessment: Assessment) -> str:
    if len(_told_by(assessment.suspects).because) == 1:
        return "It fits no fault on the list: take it again, or check the values typed."
    again = "Take the readings that disagree again" if assessment.disagreements else "Take the doubtful one again"
    return f"One of them is wrong, or several parts are. {again} before any part is replaced."


def _elsewhere(assessment: Assessment) -> str:
    words = "Look elsewhere in the appliance: relay contacts, sensors, wiring, what the board switches."
    if assessment.suspects[0].probability < SURE_ENOUGH:
        words = f"Likely, not sure: make the next check. {words}"
    return f"{words} The safety findings stand all the same." if assessment.safety else words


def may_run(assessment: Assessment) -> bool:
    """Whether the loads' needs are known and the readings do not show the first rail getting less."""
    budget, effective = assessment.budget, assessment.effective
    if budget is None or budget.demand is None:
        return False
    return effective is None or effective.current_high is None or effective.current_high >= budget.demand


def _action(best: Suspect, assessment: Assessment) -> str:
    if assessment.disagreements:
        words = "The readings disagree: settle that first."
    elif best.probability >= SURE_ENOUGH:
        words = " ".join(["Put this right first, then take the same readings again.", *_replacement(best, assessment.case.board)])
    else:
        words = "Likely, not sure: make the next check before any part is replaced."
    if best.explains_complaint or not may_run(assessment):
        return words
    return f"{words} By the figures the marked loads still run with it: if the complaint stays, look further."


def _replacement(best: Suspect, board: Board) -> Iterator[str]:
    """What to fit in the place of a dropper that has failed, as far as its mark can be read."""
    dropper = board.dropper
    marked = dropper.resistance if dropper.kind == "resistor" else dropper.capacitance
    if best.fault not in REPLACED or not isinstance(marked, float):
        return
    if dropper.kind == "resistor":
        power = "" if dropper.rated_power is None else f", {show(dropper.rated_power, 'W')}"
        yield f"Fit {show(marked, 'ohm')}{power}, flameproof (what the board is marked with)."
        return
    safety_class = dropper.safety_class if dropper.safety_class not in (None, "none") else "X2"
    yield f"Fit {show(marked, 'F')}, class {safety_class}, its data sheet allowing series duty (what the board is marked with)."


def effective_lines(assessment: Assessment, words: Words, page: Page) -> list[Line]:
    """What the dropper acts as, by which reading, against where the rail lets go and what is marked."""
    effective = assessment.effective or Effective()
    sentences = [_acts_as(effective, words), *_against(assessment)]
    return paragraph(page, " ".join(sentence for sentence in sentences if sentence))


def _acts_as(effective: Effective, words: Words) -> str:
    source = _source(effective, words)
    low, high = effective.capacitance_low, effective.capacitance_high
    if low is not None and high is not None:
        span = f"{show(low, 'F')} to {show(high, 'F')}"
        figure = span if effective.capacitance is None else f"{show(effective.capacitance, 'F')} ({span})"
        return f"The dropper acts as {figure}, from {source}."
    if low is not None and not effective.smooth:
        return f"The first rail is not smooth: its mean only says that the dropper is at least {show(low, 'F')}, from {source}."
    if low is not None:
        return f"The first rail regulates, so the dropper is at least {show(low, 'F')}, from {source}. No upper bound yet."
    if effective.current_low is not None and effective.current_high is not None:
        span = f"{show(effective.current_low, 'A')} to {show(effective.current_high, 'A')}"
        figure = span if effective.current is None else f"{show(effective.current, 'A')} ({span})"
        return f"The first rail gets {figure}, from {source}."
    if words.board.dropper.kind == "resistor":
        return f"What the first rail really gets: {CANNOT_TELL} from these readings."
    return f"What the dropper acts as: {CANNOT_TELL} from these readings."


def _source(effective: Effective, words: Words) -> str:
    return " and ".join(f"{value_of(reading)} ({words.check(reading)})" for reading in effective.readings)


def _against(assessment: Assessment) -> Iterator[str]:
    board, budget = assessment.case.board, assessment.budget
    dropper = board.dropper
    if dropper.kind != "resistor":
        if budget is not None and board.rails[0].zener is not None:
            dropout = budget.dropout_capacitance
            known = dropout is not None
            yield f"The rail lets go under {show(dropout, 'F')}." if known else f"Where the rail lets go: {CANNOT_TELL}."
        marked = dropper.capacitance
        yield f"Marked {'unreadable' if marked is None or isinstance(marked, Unknown) else show(marked, 'F')}."
    for reading in assessment.case.readings:
        if reading.what == "dropper-capacitance":
            yield f"Meter said {value_of(reading)}{', one leg lifted' if reading.lifted else ''}."
    if budget is not None and budget.rule_of_thumb is not None:
        thumb = show(budget.rule_of_thumb, "A")
        yield f"Application notes' rule of thumb would say {thumb}: that is the RMS of a half sine, not the mean."
