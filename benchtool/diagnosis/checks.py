"""Which check to make next: the information it is expected to give about the fault, and what it costs in minutes.

The gain of a check is the mutual information, in bits, between the hypothesis and what the meter will show, over the specimens
as the readings leave them.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from benchtool.board import Board
from benchtool.catalogue.accepted import lacking
from benchtool.catalogue.readings import READING_KINDS, READINGS, ReadingKind
from benchtool.catalogue.shown import Shown
from benchtool.catalogue.shows import SHOWS
from benchtool.diagnosis.evidence import Expected, expected
from benchtool.diagnosis.hypotheses import Hypothesis
from benchtool.diagnosis.outcomes import Decides, Outcomes, decided_by, outcomes_of
from benchtool.diagnosis.posterior import ELSEWHERE, Posterior
from benchtool.observed import Check
from benchtool.physics.laws import Flags

FIRST_LIVE_MINUTES = 5.0
FIRST_DEAD_MINUTES = 2.0
"""Extra minutes for the first live check, and for the first dead one after a live one; common practice, no source."""
MOST_ROWS = 48
"""Hypotheses that count for the gain at most, the most probable first."""
TOLD, SUSPECTS = 3, 3
"""Checks of which it is told what they should show, and the suspects for which."""
WORTH = 0.005
"""Gains below this are noise [bit]."""
COUNTS_FROM = 1e-8
"""Share of all that is explained from which a hypothesis counts for the gain."""
LIVE_PENALTY = 0.5
"""Dead before live: share of a live check's gain that counts, so that it comes first only if it tells twice as much a minute."""


@dataclass(frozen=True, slots=True)
class NextCheck:
    """A check worth making: its gain [bit], minutes with set-up, and whether the board is live meanwhile.

    Of the first few also what it should show, healthy and with each of the first suspects, and what would be decided by it.
    """

    check: Check
    condition: str
    gain: float
    minutes: float
    foretold: tuple[Foretold, ...] = ()
    turns: tuple[Decides, ...] = ()


@dataclass(frozen=True, slots=True)
class Foretold:
    """What a check should show under a hypothesis."""

    hypothesis: Hypothesis
    expected: Expected


def candidates(board: Board, taken: Sequence[Check], disagreeing: Sequence[Check] = ()) -> Iterator[Check]:
    """Every check this board allows that has not been made, states first off, then on.

    `disagreeing` ones come back, ahead of all, where they can be made in a better condition.
    """
    done = {_same(check) for check in taken}
    for check in disagreeing:
        again = taken_better(check, board)
        if again is not None and _same(again) not in done:
            yield again
    for kind in READINGS:
        if kind.name in SHOWS and kind.name not in ELSEWHERE:
            for check in _places(kind, board):
                better = _same(replace(check, lifted=True)) if check.what == "dropper-capacitance" else _same(check)
                if not {_same(check), better} & done:
                    yield check


def taken_better(check: Check, board: Board) -> Check | None:
    """The same check in a better condition, if there is one: with a leg lifted, or once the board is warm."""
    kind = READING_KINDS[check.what]
    if "lifted" in kind.may and not check.lifted and board.bleeder is not None:
        return replace(check, lifted=True)
    return replace(check, when="warm") if kind.condition == "live" and check.on and check.when == "cold" else None


def _same(check: Check) -> tuple[object, ...]:
    """What makes two checks the same, whatever order their loads are named in."""
    return check.what, check.rail, check.load, frozenset(check.on or ()), check.lifted, check.when


def _places(kind: ReadingKind, board: Board) -> Iterator[Check]:
    states: tuple[tuple[str, ...] | None, ...] = (None,)
    if "on" in kind.may:
        states = tuple(dict.fromkeys(((), board.switched_loads())))
    lifts = (False, True) if "lifted" in kind.may else (False,)
    for on in states:
        for lifted in lifts:
            if "rail" in kind.needs:
                rails = [rail for rail in board.rails if lacking(kind, board, rail=rail) is None]
                yield from (Check(what=kind.name, rail=rail.name, on=on) for rail in rails)
            elif "load" in kind.needs:
                loads = [load for load in board.loads if lacking(kind, board, load=load) is None]
                yield from (Check(what=kind.name, load=load.name) for load in loads)
            elif lacking(kind, board) is None:
                yield Check(what=kind.name, on=on, lifted=lifted)


def minutes_of(check: Check, last_condition: str | None) -> float:
    """Working time of a check [min], with the extra for the first live one and for going back to dead work."""
    kind = READING_KINDS[check.what]
    minutes = kind.minutes_lifted if check.lifted and kind.minutes_lifted is not None else kind.minutes
    if kind.condition == "live" and last_condition != "live":
        return minutes + FIRST_LIVE_MINUTES
    if kind.condition == "dead" and last_condition == "live":
        return minutes + FIRST_DEAD_MINUTES
    return minutes


def next_checks(
    posterior: Posterior, taken: Sequence[Check], *, power_allowed: bool = True, disagreeing: Sequence[Check] = ()
) -> tuple[NextCheck, ...]:
    """Checks not yet made, the most useful a minute first; dead checks before live ones of like use.

    `power_allowed`: whether the board may be powered at all; if not, no live check is proposed. `disagreeing`: checks whose
    readings disagree with others; they come back where they can be made in a better condition.
    """
    weigher = _Weigher(posterior)
    last = READING_KINDS[taken[-1].what].condition if taken else None
    found = []
    for check in dict.fromkeys(candidates(posterior.board, taken, disagreeing)):
        condition = READING_KINDS[check.what].condition
        if condition == "live" and not power_allowed:
            continue
        outcomes = weigher.outcomes(check)
        use = outcomes.gain_if_doubted()
        if use > WORTH:
            found.append((use, NextCheck(check, condition, outcomes.gain(), minutes_of(check, last)), outcomes))
    ordered = sorted(found, key=_usefulness, reverse=True)
    first = [weigher.told(item, outcomes) for _, item, outcomes in ordered[:TOLD]]
    return (*first, *(item for _, item, _ in ordered[TOLD:]))


def in_full(posterior: Posterior, item: NextCheck) -> NextCheck:
    """`item` with what it should show, healthy and with the first suspects, and what would be decided by it."""
    weigher = _Weigher(posterior)
    return weigher.told(item, weigher.outcomes(item.check))


def _usefulness(item: tuple[float, NextCheck, Outcomes]) -> float:
    use, check, _ = item
    return use * (LIVE_PENALTY if check.condition == "live" else 1.0) / check.minutes


class _Weigher:
    """Keeps the specimens' shares and works out one check after the other, on the hypotheses that count."""

    def __init__(self, posterior: Posterior) -> None:
        self._posterior = posterior
        self.rows = posterior.explained > COUNTS_FROM
        self.rows[np.argsort(-posterior.explained, kind="stable")[MOST_ROWS:]] = False
        self._shares = posterior.explained[self.rows, None] * posterior.shares()[self.rows]
        self._where = np.tile(self.rows[:, None], (1, posterior.crowd.each))

    def outcomes(self, check: Check) -> Outcomes:
        """What `check` may show, and on which of the hypotheses that count."""
        crowd, meter = self._posterior.crowd, self._posterior.meter
        shown = _of_rows(crowd.shown(check, meter, self._where), self._where.ravel())
        return outcomes_of(shown, self._shares, READING_KINDS[check.what], meter)

    def told(self, item: NextCheck, outcomes: Outcomes) -> NextCheck:
        """`item` with what it should show and what would be decided by its `outcomes`."""
        found, hypotheses = self._posterior, self._posterior.hypotheses
        suspects = [int(row) for row in np.argsort(-found.explained, kind="stable")[:SUSPECTS] if self.rows[row]]
        shown = list(dict.fromkeys([found.crowd.sound, *suspects]))
        ranges = expected(found, item.check, shown)
        return replace(
            item,
            foretold=tuple(Foretold(hypotheses[row], ranges[row]) for row in shown),
            turns=decided_by(outcomes, [hypotheses[row] for row in np.flatnonzero(self.rows)]),
        )


def _of_rows(shown: Shown, where: Flags) -> Shown:
    """Those of the specimens at `where` (n,)."""

    def part(values: Any) -> Any:
        return values[where] if isinstance(values, np.ndarray) and values.size == where.size else values

    chances = {word: part(chance) for word, chance in shown.chances.items()}
    return Shown(part(shown.value), part(shown.error), part(shown.opened), part(shown.shorted), chances)
