"""Why a suspect is a suspect: what was read, what it should have been with this fault and without, and how much that weighs."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from benchtool.board import Board, Rail, nominal_voltage
from benchtool.catalogue.readings import READING_KINDS
from benchtool.catalogue.runs import runs
from benchtool.diagnosis.likelihood import accuracy_of
from benchtool.diagnosis.posterior import Posterior
from benchtool.observed import Accuracy, Check, Meter, Reading
from benchtool.physics.laws import Array, Flags, accuracy_band, two_sigma
from benchtool.physics.sequence import METER_BLUR, coordinate

BAND = (2.5, 97.5)
"""Percent points of every range that is told."""
MOSTLY = 0.5
"""Share of the specimens that must show a word before the word is told in place of a range."""
WORDS_TOLD = 0.25
"""Chance from which a word is told among several."""
COUNT_WITHIN = 5.0
"""Logarithm by which a specimen's weight may fall short of the heaviest and still count for a range."""
COUNTS_FROM, GLANCE = 1e-3, 32
"""Share of all that is explained from which all specimens of a hypothesis are looked at, and how many are otherwise."""
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


def evidence_of(posterior: Posterior) -> list[tuple[Because, ...]]:
    """For every hypothesis each reading's say on it; ranges as they were before any reading."""
    alone = posterior.alone()
    weights = (alone - alone[:, posterior.crowd.sound, None]) / float(np.log(10.0))
    rows = []
    for number, reading in enumerate(posterior.readings):
        told = expected(posterior, reading.check)
        healthy, read = told[posterior.crowd.sound], _guaranteed(reading, posterior.meter)
        rows.append([Because(reading, read, this, healthy, float(weights[number, h])) for h, this in enumerate(told)])
    return [tuple(row[index] for row in rows) for index in range(len(posterior.hypotheses))]


def expected(posterior: Posterior, check: Check, rows: Sequence[int] | None = None) -> list[Expected]:
    """What `check` should show under every hypothesis, the meter's own inaccuracy included; where `rows` are given only those
    count.
    """
    crowd, meter = posterior.crowd, posterior.meter
    if check.what == "look":
        return [Expected(words=("weak evidence, never proof",))] * len(crowd.hypotheses)
    where = np.zeros(crowd.shape, dtype=bool)
    where[slice(None) if rows is None else list(rows)] = True
    shown, kind = crowd.shown(check, meter, where), READING_KINDS[check.what]
    counts = posterior.log_prior > posterior.log_prior.max(axis=1, keepdims=True) - COUNT_WITHIN
    if shown.value is None:
        chances = {word: _means(chance.reshape(crowd.shape), counts) for word, chance in shown.chances.items()}
        return [Expected(words=_words({word: float(c[h]) for word, c in chances.items()})) for h in range(len(counts))]
    found = _ranges(shown.value.reshape(crowd.shape), counts, accuracy_of(kind, meter), kind.low)
    for flag, word in ((shown.opened, "open"), (shown.shorted, "short")):
        if flag is not None and word in kind.words:
            mostly = _means(flag.reshape(crowd.shape), counts) > MOSTLY
            found = [Expected(words=(word,)) if mostly[h] else range_of for h, range_of in enumerate(found)]
    return found


def _means(values: Array | Flags, counts: Flags) -> Array:
    """Means over those that count, row by row."""
    return np.asarray((values * counts).sum(axis=1) / counts.sum(axis=1))


def _words(means: dict[str, float]) -> tuple[str, ...]:
    likely = sorted((word for word, mean in means.items() if mean >= WORDS_TOLD), key=lambda word: -means[word])
    return tuple(likely) or (max(means, key=lambda word: means[word]),)


def _ranges(values: Array, counts: Flags, accuracy: Accuracy, least: float) -> list[Expected]:
    """The 95 % ranges of the rows of `values` (hypotheses, each), as the meter may show them."""
    limit = two_sigma(np.where(np.isfinite(values), values, 0.0), accuracy.relative, accuracy.floor)
    metered = values + limit * (2.0 * coordinate(METER_BLUR, values.shape[1]) - 1.0)
    found = []
    for row, counted in zip(metered, counts & np.isfinite(values), strict=True):
        low, high = np.percentile(row[counted], BAND) if counted.any() else (np.nan, np.nan)
        found.append(Expected(low=max(float(low), least), high=max(float(high), least)) if counted.any() else Expected())
    return found


def _guaranteed(reading: Reading, meter: Meter) -> tuple[float, float] | None:
    if not isinstance(reading.value, float):
        return None
    accuracy = accuracy_of(READING_KINDS[reading.what], meter)
    return accuracy_band(reading.value, accuracy.relative, accuracy.floor)


def fails_to_run(posterior: Posterior) -> Flags:
    """Which boards, as the readings leave them, mostly fail to run their marked loads once warm: for every hypothesis.

    A board with a rail too high, its loads on or off, does not run: it destroys itself. Of hypotheses that hardly count only the
    first `GLANCE` specimens are looked at.
    """
    crowd, board, on = posterior.crowd, posterior.board, posterior.board.switched_loads()
    looked = np.tile(np.arange(crowd.each) < GLANCE, (len(crowd.hypotheses), 1)) | (posterior.explained > COUNTS_FROM)[:, None]
    where = looked.ravel()
    works = np.ones(where.size)
    for state in ((), on):
        settled = crowd.bench.settled(state, warm=True, where=where)
        for index, rail in enumerate(board.rails):
            works[settled.rail_voltage[index] > _highest_held(board, rail)] = 0.0
    for load in range(len(board.loads)):
        meant, unasked = runs(crowd.bench, board, load, on, warm=True, where=where)
        works = np.minimum(works, meant * (1.0 - unasked))
    shares = np.where(looked, posterior.shares(), 0.0)
    return np.asarray((shares * works.reshape(crowd.shape)).sum(axis=1) < 0.5 * shares.sum(axis=1))


def _highest_held(board: Board, rail: Rail) -> float:
    """Volts above which a rail stands too high: its reservoir's rating, or `TOO_HIGH` times its nominal voltage [V]."""
    nominal, rated = nominal_voltage(board, rail), rail.reservoir.rated_voltage if rail.reservoir is not None else None
    return min(np.inf if nominal is None else TOO_HIGH * nominal, np.inf if rated is None else rated)
