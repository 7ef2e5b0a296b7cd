"""Which check to make next: the information it is expected to give about the fault, and what it costs in minutes.

The gain of a check is the mutual information, in bits, between the hypothesis and what the meter will show, over the specimens
as the readings leave them. Coarse: numbers are sorted into classes as wide as the meter and the physics can tell apart.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np

from benchtool.board import Board
from benchtool.catalogue.accepted import lacking
from benchtool.catalogue.readings import READING_KINDS, READINGS, ReadingKind
from benchtool.catalogue.shown import Shown, View
from benchtool.catalogue.shows import SHOWS
from benchtool.diagnosis.likelihood import LOGARITHMIC, SMALLEST, spread, word_chance
from benchtool.diagnosis.posterior import ELSEWHERE, Posterior
from benchtool.observed import Check, Meter
from benchtool.physics.laws import Array, Flags
from benchtool.physics.sequence import METER_BLUR, coordinate

FIRST_LIVE_MINUTES = 5.0
FIRST_DEAD_MINUTES = 2.0
"""Extra minutes for the first live check, and for the first dead one after a live one; common practice, no source."""
CLASSES = 12
"""Classes that a number is sorted into."""
WORTH = 0.005
"""Gains below this are noise [bit]."""
COUNTS_FROM = 1e-4
"""Share of all that is explained from which a hypothesis counts for the gain."""
LIVE_PENALTY = 0.5
"""Dead before live: share of a live check's gain that counts, so that it comes first only if it tells twice as much a minute."""


@dataclass(frozen=True, slots=True)
class NextCheck:
    """A check worth making: its gain [bit], minutes with set-up, and whether the board is live meanwhile."""

    check: Check
    condition: str
    gain: float
    minutes: float


def candidates(board: Board, taken: Sequence[Check]) -> Iterator[Check]:
    """Every check this board allows that has not been made, states first off, then on."""
    done = {_same(check) for check in taken}
    for kind in READINGS:
        if kind.name in SHOWS and kind.name not in ELSEWHERE:
            for check in _places(kind, board):
                better = _same(replace(check, lifted=True)) if check.what == "dropper-capacitance" else _same(check)
                if not {_same(check), better} & done:
                    yield check


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


def next_checks(posterior: Posterior, taken: Sequence[Check], *, power_allowed: bool = True) -> tuple[NextCheck, ...]:
    """Checks not yet made, the most useful a minute first; dead checks before live ones of like use.

    `power_allowed`: whether the board may be powered at all; if not, no live check is proposed.
    """
    weigher = _Weigher(posterior)
    last = READING_KINDS[taken[-1].what].condition if taken else None
    found = []
    for check in candidates(posterior.board, taken):
        condition = READING_KINDS[check.what].condition
        if condition == "live" and not power_allowed:
            continue
        gain = weigher.gain(check)
        if gain > WORTH:
            found.append(NextCheck(check, condition, gain, minutes_of(check, last)))
    return tuple(sorted(found, key=_usefulness, reverse=True))


def _usefulness(item: NextCheck) -> float:
    return item.gain * (LIVE_PENALTY if item.condition == "live" else 1.0) / item.minutes


class _Weigher:
    """Keeps the specimens' shares and works out the gain of one check after the other."""

    def __init__(self, posterior: Posterior) -> None:
        self._posterior = posterior
        chosen = [
            (item, share)
            for item, share in zip(posterior.evidence, posterior.explained, strict=True)
            if share > COUNTS_FROM
        ]
        self._evidence = [item for item, _ in chosen]
        self._shares = [probability * item.shares() for item, probability in chosen]

    def gain(self, check: Check) -> float:
        """Expected information about the hypothesis [bit]."""
        board, meter = self._posterior.board, self._posterior.meter
        kind = READING_KINDS[check.what]
        shown = [SHOWS[check.what](View(item.bench, board, check, meter)) for item in self._evidence]
        if kind.unit is None:
            return self._gain(_word_table(shown, self._shares, kind.words))
        return self._gain(_number_table(shown, self._shares, kind, meter))

    @staticmethod
    def _gain(table: Array) -> float:
        """Mutual information of a joint table (hypotheses, outcomes), by its definition."""
        outcome, hypothesis = table.sum(axis=0), table.sum(axis=1)
        expected = hypothesis[:, None] * outcome[None, :]
        positive = table > 0.0
        return float(np.sum(table[positive] * np.log2(table[positive] / expected[positive])))


def _word_table(shown: Sequence[Shown], shares: Sequence[Array], words: Sequence[str]) -> Array:
    return np.array(
        [[float(np.sum(share * item.chances[word])) for word in words] for item, share in zip(shown, shares, strict=True)]
    )


def _number_table(shown: Sequence[Shown], shares: Sequence[Array], kind: ReadingKind, meter: Meter) -> Array:
    """Joint shares of hypothesis and class: the kind's words first, then numbers, blurred by their own sigma."""
    blurred = [_scaled(_blur(item, kind, meter), kind) for item in shown]
    numbers = [_is_number(item, kind) for item in shown]
    sigma = _resolution(shown, numbers, shares, kind, meter)
    seen = np.concatenate([values[number] for values, number in zip(blurred, numbers, strict=True)] or [np.zeros(1)])
    low, high = (float(seen.min()), float(seen.max())) if seen.size else (0.0, 1.0)
    classes = int(np.clip((high - low) / max(2.0 * sigma, 1e-12), 1, CLASSES))
    edges = np.quantile(seen, np.linspace(0.0, 1.0, classes + 1)) if seen.size else np.array([0.0, 1.0])
    edges = np.unique(edges)
    rows = []
    for item, values, number, share in zip(shown, blurred, numbers, shares, strict=True):
        words = [float(np.sum(share * np.where(number, 0.0, word_chance(item, word)))) for word in kind.words]
        index = np.clip(np.searchsorted(edges, values, side="right") - 1, 0, max(len(edges) - 2, 0))
        counted = np.bincount(index[number], weights=share[number], minlength=max(len(edges) - 1, 1))
        rows.append(np.concatenate([words, counted]))
    return np.array(rows)


def _is_number(shown: Shown, kind: ReadingKind) -> Flags:
    assert shown.value is not None
    number = np.isfinite(shown.value)
    for flag, word in ((shown.opened, "open"), (shown.shorted, "short")):
        if flag is not None and word in kind.words:
            number = number & ~flag
    return number


def _scaled(values: Array, kind: ReadingKind) -> Array:
    """Numbers on the scale they are judged on: volts as they are, the rest by its logarithm."""
    if kind.unit in LOGARITHMIC:
        return np.asarray(np.log(np.maximum(np.abs(values), SMALLEST[kind.unit])))
    return values


def _blur(shown: Shown, kind: ReadingKind, meter: Meter) -> Array:
    """Numbers as a meter would show them: moved by their own sigma, evenly within ± √3 of it."""
    assert shown.value is not None
    value = np.where(np.isfinite(shown.value), shown.value, 0.0)
    even = coordinate(METER_BLUR, len(value))
    return np.asarray(value + spread(shown, kind, meter) * np.sqrt(3.0) * (2.0 * even - 1.0))


def _resolution(
    shown: Sequence[Shown], numbers: Sequence[Flags], shares: Sequence[Array], kind: ReadingKind, meter: Meter
) -> float:
    """A typical sigma on the scale of the classes: the mean over all specimens' shares."""
    total, weight = 0.0, 0.0
    for item, number, share in zip(shown, numbers, shares, strict=True):
        sigma = spread(item, kind, meter)
        if kind.unit in LOGARITHMIC:
            assert item.value is not None
            sigma = sigma / np.maximum(np.abs(np.where(np.isfinite(item.value), item.value, 1.0)), SMALLEST[kind.unit])
        total += float(np.sum(share[number] * np.minimum(sigma[number], 1e6)))
        weight += float(np.sum(share[number]))
    return total / weight if weight > 0.0 else 1.0
