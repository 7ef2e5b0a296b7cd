"""Why a suspect is a suspect: what was read, what it should have been with this fault and without, and how much that weighs."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from benchtool.board import Board, Rail, nominal_voltage
from benchtool.catalogue.readings import READING_KINDS
from benchtool.catalogue.runs import runs
from benchtool.catalogue.shown import Shown, View
from benchtool.catalogue.shows import SHOWS
from benchtool.diagnosis.likelihood import accuracy_of
from benchtool.diagnosis.posterior import Evidence, log_sum
from benchtool.observed import Accuracy, Check, Meter, Reading
from benchtool.physics.bench import Bench
from benchtool.physics.laws import Array, accuracy_band, two_sigma
from benchtool.physics.sequence import METER_BLUR, coordinate

BAND = (2.5, 97.5)
"""Percent points of every range that is told."""
MOSTLY = 0.5
"""Share of the specimens that must show a word before the word is told in place of a range."""
WORDS_TOLD = 0.25
"""Chance from which a word is told among several."""
TOO_HIGH = 1.5
"""Times its nominal voltage from which a rail is out of hand, whatever still works on it; common practice, no source."""


@dataclass(frozen=True, slots=True)
class Expected:
    """What a reading should show: words, or a range from `low` to `high` [the reading's unit]."""

    words: tuple[str, ...] = ()
    low: float | None = None
    high: float | None = None


@dataclass(frozen=True, slots=True)
class Because:
    """One reading's say on one suspect; `weight` is log10 of P(reading | this) over P(reading | healthy).

    `read`: between which values the meter's data sheet puts what was read [the reading's unit], None for words.
    """

    reading: Reading
    read: tuple[float, float] | None
    if_this: Expected
    if_healthy: Expected
    weight: float


def expected(bench: Bench, board: Board, check: Check, meter: Meter) -> Expected:
    """What `check` should show on the specimens of `bench`, the meter's own inaccuracy included."""
    if check.what == "look":
        return Expected(words=("weak evidence, never proof",))
    shown = SHOWS[check.what](View(bench, board, check, meter))
    if shown.value is None:
        return Expected(words=_words(shown.chances))
    for flag, word in ((shown.opened, "open"), (shown.shorted, "short")):
        if flag is not None and word in READING_KINDS[check.what].words and float(np.mean(flag)) > MOSTLY:
            return Expected(words=(word,))
    values = _as_metered(shown, accuracy_of(READING_KINDS[check.what], meter))
    low, high = np.maximum(np.percentile(values, BAND), READING_KINDS[check.what].low)
    return Expected(low=float(low), high=float(high))


def _words(chances: dict[str, Array]) -> tuple[str, ...]:
    means = {word: float(np.mean(chance)) for word, chance in chances.items()}
    likely = sorted((word for word, mean in means.items() if mean >= WORDS_TOLD), key=lambda word: -means[word])
    return tuple(likely) or (max(means, key=lambda word: means[word]),)


def _as_metered(shown: Shown, accuracy: Accuracy) -> Array:
    assert shown.value is not None
    values = shown.value[np.isfinite(shown.value)]
    limit = two_sigma(values, accuracy.relative, accuracy.floor)
    return np.asarray(values + limit * (2.0 * coordinate(METER_BLUR, values.size) - 1.0))


def because(item: Evidence, healthy: Evidence, board: Board, meter: Meter, readings: Sequence[Reading]) -> tuple[Because, ...]:
    """Every reading's say on the hypothesis of `item`; ranges as they were before any reading."""
    return tuple(
        Because(
            reading=reading,
            read=_guaranteed(reading, meter),
            if_this=expected(item.first.bench, board, reading.check, meter),
            if_healthy=expected(healthy.first.bench, board, reading.check, meter),
            weight=(_alone(item.first, row) - _alone(healthy.first, row)) / float(np.log(10.0)),
        )
        for row, reading in enumerate(readings)
    )


def _guaranteed(reading: Reading, meter: Meter) -> tuple[float, float] | None:
    if not isinstance(reading.value, float):
        return None
    accuracy = accuracy_of(READING_KINDS[reading.what], meter)
    return accuracy_band(reading.value, accuracy.relative, accuracy.floor)


def _alone(item: Evidence, row: int) -> float:
    """Logarithm of the likelihood of one reading by itself."""
    return log_sum(item.densities[row] + item.log_prior)


def fails_to_run(item: Evidence, board: Board) -> bool:
    """Whether boards with this hypothesis, as the readings leave them, mostly fail to run their marked loads once warm.

    A board with a rail too high, its loads on or off, does not run: it destroys itself.
    """
    on = board.switched_loads()
    works = np.ones(item.bench.specimens.count)
    for index, rail in enumerate(board.rails):
        highest = _highest_held(board, rail)
        for state in ((), on):
            works[item.bench.settled(state, warm=True).rail_voltage[index] > highest] = 0.0
    for load in range(len(board.loads)):
        meant, unasked = runs(item.bench, board, load, on, warm=True)
        works = np.minimum(works, meant * (1.0 - unasked))
    return float(np.sum(item.shares() * works)) < 0.5


def _highest_held(board: Board, rail: Rail) -> float:
    """Volts above which a rail stands too high: its reservoir's rating, or `TOO_HIGH` times its nominal voltage [V]."""
    nominal, rated = nominal_voltage(board, rail), rail.reservoir.rated_voltage if rail.reservoir is not None else None
    return min(np.inf if nominal is None else TOO_HIGH * nominal, np.inf if rated is None else rated)
