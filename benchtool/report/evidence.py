"""The parts of the report that list things: suspects, evidence, disagreements, next checks, states.

Why apart from the report's order: each list is laid out twice, as a table and for narrow pages.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence

from benchtool.diagnosis.checks import NextCheck
from benchtool.diagnosis.disagreement import Disagreement
from benchtool.diagnosis.evidence import Because
from benchtool.quantities import show
from benchtool.report.bar import SURE, page_bar
from benchtool.report.layout import Line, Page, padded, paragraph, table
from benchtool.result import RailState, State, Suspect
from benchtool.words import CANNOT_TELL, Words, band, expectation, judged, outcome, percent, typed, value_of

LISTED = 6
"""Suspects listed one by one."""
LISTED_FROM = 0.01
"""Probability from which a suspect is listed."""
TELLS_FROM = 0.3
"""Weight from which a reading speaks for or against: a factor of two."""
THEN = 2
"""Checks named after the next one."""
SMOOTH = 1e-3
"""Ripple under which no figure is given: meters show none [V]."""
LITTLE = 0.1
"""Information under which a check tells next to nothing [bit]."""
SETTLED = 0.95
"""Probability of the first suspect from which such a check only confirms it."""
POINTS_FROM = 0.6
"""Probability from which an outcome is said to point to a suspect."""

CONDITIONS = {
    "dead": "Disconnect the mains, discharge and measure before it.",
    "live": "Only through an isolating transformer; clip on with the power off, one hand; disconnect and discharge after it.",
}


def named(suspect: Suspect) -> bool:
    """Whether the suspect is a fault, and not `no-fault` or `unexplained`."""
    return suspect.hypothesis is not None and bool(suspect.hypothesis.faults)


def suspects_lines(suspects: Sequence[Suspect], page: Page, *, still_run: bool) -> list[Line]:
    """The suspects worth a line, with a bar of 10 % a cell beside the figure; the rest summed up.

    still_run: whether to say with which faults the marked loads still run.
    """
    listed = [suspect for suspect in suspects if suspect.probability >= LISTED_FROM][:LISTED]
    others = suspects[len(listed) :]
    lines = paragraph(page, "SUSPECTS, most likely first", role="heading")
    rank = 0
    for suspect in listed:
        rank += suspect.hypothesis is not None
        mark = f"{'>' if suspect is suspects[0] else ' '}{rank if suspect.hypothesis is not None else ' '}"
        runs = still_run and named(suspect) and not suspect.explains_complaint
        remark = " (loads still run)" if runs else ""
        lines.extend(_suspect(page, mark, suspect.probability, suspect.label + remark))
    if others:
        together = sum(suspect.probability for suspect in others)
        lines.extend(_suspect(page, "  ", together, "all others together"))
    return lines


def _suspect(page: Page, mark: str, probability: float, label: str) -> list[Line]:
    bar = "" if page.narrow else f"{page_bar(page, padded(SURE * int(probability * 10.0 + 0.5), 12))}"
    return paragraph(page, label, first=f"{mark} {percent(probability):>9}  {bar}")


def evidence_lines(suspect: Suspect, words: Words, page: Page) -> list[Line]:
    """What was read, what it should be with this fault and without, and whether it speaks for the fault."""
    if not suspect.because:
        return []
    if not named(suspect):
        return _against_healthy(suspect, words, page)
    heading = paragraph(page, f"EVIDENCE for {suspect.label}", role="heading")
    if page.narrow:
        return [*heading, *_told(suspect.because, words, page, compare=True)]
    rows = [("reading", "read", "if so", "if healthy", "says")]
    for row in suspect.because:
        what = row.reading.what
        if_so, healthy = expectation(row.if_this, what), expectation(row.if_healthy, what)
        rows.append((words.check(row.reading), value_of(row.reading), if_so, healthy, says(row)))
    return [*heading, *table(page, rows)]


def _against_healthy(suspect: Suspect, words: Words, page: Page) -> list[Line]:
    heading = paragraph(page, "READINGS against a healthy board", role="heading")
    if page.narrow:
        return [*heading, *_told(suspect.because, words, page, compare=False)]
    rows = [("reading", "read", "healthy", "")]
    for row in suspect.because:
        healthy, verdict = expectation(row.if_healthy, row.reading.what), judged(row.reading, row.if_healthy)
        rows.append((words.check(row.reading), value_of(row.reading), healthy, verdict))
    return [*heading, *table(page, rows)]


def _told(rows: Sequence[Because], words: Words, page: Page, *, compare: bool) -> Iterator[Line]:
    """Readings on a narrow page: the name, then what was read and what should have been."""
    for row in rows:
        if_so, healthy = (expectation(expected, row.reading.what) for expected in (row.if_this, row.if_healthy))
        parts = [f"read {value_of(row.reading)}"]
        if compare and if_so == healthy:
            parts.append(f"either way {healthy}")
        elif compare:
            parts.extend([f"if so {if_so}", f"healthy {healthy}"])
        else:
            parts.append(f"healthy {healthy}")
        verdict = SAID[says(row)] if compare else judged(row.reading, row.if_healthy)
        yield from paragraph(page, words.check(row.reading), first=" ", rest="  ")
        yield from paragraph(page, "; ".join(parts) + (f": {verdict}" if verdict else ""), first="   ")


SAID = {"for": "speaks for it", "against": "speaks against it", "either": "goes with either"}
"""The marks of the table, where there is room for words only."""


def says(row: Because) -> str:
    """Whether the reading speaks for the suspect, against it, or neither."""
    if abs(row.weight) < TELLS_FROM:
        return "either"
    return "for" if row.weight > 0.0 else "against"


def disagreement_lines(items: Sequence[Disagreement], words: Words, page: Page) -> list[Line]:
    """Every pair of readings that no single fault reconciles, and what the one means for the other."""
    sentences = [words.disagreement(item) for item in items]
    return [line for sentence in sentences for line in paragraph(page, sentence, first="DISAGREE  ", rest="  ")]


def next_lines(
    checks: Sequence[NextCheck], suspects: Sequence[Suspect], words: Words, page: Page
) -> list[Line]:
    """The check to make next, what it costs and tells, and two to follow, among them the best dead one."""
    if not checks:
        return paragraph(page, "no further check would tell much about these suspects.", first="NEXT  ")
    first, *others = _with_a_dead_one(checks)
    text = f"{_costs(first, words)}. {CONDITIONS[first.condition]} {tells(first, suspects)}"
    lines = paragraph(page, text, first="NEXT  ")
    lines.extend(paragraph(page, f'--reading "{typed(first.check)}"', first="type  "))
    lines.extend(_foretold(first, page))
    lines.extend(_decides(first, page))
    for number, check in enumerate(others):
        lines.extend(paragraph(page, f"{_costs(check, words)}.", first="then  " if number == 0 else "      "))
    return lines


def _foretold(item: NextCheck, page: Page) -> list[Line]:
    """What the check should show, healthy and with the first suspects, a line a range."""
    who: dict[str, list[str]] = {}
    for each in item.foretold:
        label = each.hypothesis.label if each.hypothesis.faults else "healthy"
        who.setdefault(expectation(each.expected, item.check.what), []).append(label)
    lines: list[Line] = []
    for number, (shown, labels) in enumerate(who.items()):
        first = "shows " if number == 0 else "      "
        lines.extend(paragraph(page, f"{shown}  if {'; or '.join(labels)}", first=first, rest="        "))
    return lines


def _decides(item: NextCheck, page: Page) -> list[Line]:
    """What would be decided by what is read, a line an outcome."""
    lines: list[Line] = []
    for number, turn in enumerate(item.turns if len(item.turns) > 1 else ()):
        points = f"points to {turn.hypothesis.label}" if turn.probability >= POINTS_FROM else "does not decide it"
        first = "means " if number == 0 else "      "
        lines.extend(paragraph(page, f"{outcome(turn, item.check.what)}  {points}", first=first, rest="        "))
    return lines


def turning_lines(suspect: Suspect, checks: Sequence[NextCheck], words: Words, page: Page) -> list[Line]:
    """What would change the verdict: of the first checks, the outcome that would most likely put another suspect first."""
    turns = [
        (turn, item)
        for item in checks
        for turn in item.turns
        if turn.hypothesis is not suspect.hypothesis and turn.probability >= POINTS_FROM and len(item.turns) > 1
    ]
    if suspect.hypothesis is None or not turns:
        return []
    turn, item = max(turns, key=lambda each: each[0].chance)
    reads = f"{words.check(item.check)} {outcome(turn, item.check.what)}"
    return paragraph(page, f"{reads} would point to {turn.hypothesis.label}.", first="BUT  ")


def _with_a_dead_one(checks: Sequence[NextCheck]) -> list[NextCheck]:
    """The checks to show: the first ones, the last of them giving way to the best dead one where all are live."""
    shown, rest = list(checks[: 1 + THEN]), checks[1 + THEN :]
    dead = [check for check in rest if check.condition == "dead"]
    return [*shown[:-1], dead[0]] if dead and all(check.condition == "live" for check in shown) else shown


def _costs(item: NextCheck, words: Words) -> str:
    return f"{words.check(item.check)} ({item.condition}, {item.minutes:g} min)"


def tells(item: NextCheck, suspects: Sequence[Suspect]) -> str:
    """How much of what is still open the check is expected to settle."""
    if item.gain < LITTLE:
        stands = bool(suspects) and suspects[0].probability >= SETTLED
        return "The verdict stands without it: it would only confirm it." if stands else "It tells little that is not known."
    open_still = [suspect.probability for suspect in suspects if suspect.probability > 0.0]
    doubt = -sum(probability * math.log2(probability) for probability in open_still)
    share = min(item.gain / doubt, 0.99) if doubt > 0.0 else 0.0
    return f"On average it settles about {percent(share)} of what is still open."


def states_lines(states: Sequence[State], words: Words, page: Page) -> list[Line]:
    """Every rail in every state as marked, with the band of healthy boards."""
    heading = paragraph(page, "STATES of a board as marked", role="heading")
    if page.narrow:
        return [*heading, *(line for state in states for line in _state_narrow(state, words, page))]
    rows = [("rail", "as marked", "healthy", "ripple, p-p", "regulates")]
    rows.extend(_state_row(rail, state, words) for state in states for rail in state.rails)
    return [*heading, *table(page, rows)]


def _state_row(rail: RailState, state: State, words: Words) -> tuple[str, str, str, str, str]:
    healthy = band(rail.voltage_low, rail.voltage_high, "V")
    smooth = rail.ripple_pp_high is not None and rail.ripple_pp_high < SMOOTH
    ripple = f"under {show(SMOOTH, 'V')}" if smooth else band(rail.ripple_pp_low, rail.ripple_pp_high, "V", digits=2)
    return _place(rail, state, words), show(rail.voltage, "V"), healthy, ripple, _regulates(rail)


def _place(rail: RailState, state: State, words: Words) -> str:
    return ", ".join(part for part in (words.rail(rail.name), words.state(state.on)) if part)


def _state_narrow(state: State, words: Words, page: Page) -> Iterator[Line]:
    for rail in state.rails:
        yield from paragraph(page, _place(rail, state, words), first=" ", rest="  ")
        _, voltage, healthy, ripple, regulates = _state_row(rail, state, words)
        told = f"{voltage}; healthy {healthy}; ripple, p-p: {ripple}; regulates: {regulates}"
        yield from paragraph(page, told, first="   ")


def _regulates(rail: RailState) -> str:
    return CANNOT_TELL if rail.regulating is None else "yes" if rail.regulating else "no"
