"""What a check may turn out to show, and what that would say: a table of hypotheses against outcomes.

Words are outcomes as they are; numbers are sorted into classes as wide as the meter and the physics can tell apart.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from benchtool.catalogue.readings import ReadingKind
from benchtool.catalogue.shown import Shown
from benchtool.diagnosis.hypotheses import Hypothesis
from benchtool.diagnosis.likelihood import LOGARITHMIC, SMALLEST, spread, word_chance
from benchtool.observed import Meter
from benchtool.physics.laws import Array, Flags
from benchtool.physics.sequence import METER_BLUR, coordinate

CLASSES = 12
"""Classes that a number is sorted into."""
DOUBT = 0.5
"""Power of the hypotheses' shares with which a check is chosen: rarer suspects count for more than their priors, so that a first
suspect is put to the test and not only confirmed by what is likely anyway.
"""


HARDLY_EVER = 0.01
"""Chance up to which an outcome is not told."""


@dataclass(frozen=True, slots=True)
class Outcomes:
    """`table` (hypotheses, outcomes): joint shares. The first outcomes are `words`, the rest numbers between `edges` [unit]."""

    table: Array
    words: tuple[str, ...]
    edges: Array

    def gain(self) -> float:
        """Mutual information between hypothesis and outcome [bit]."""
        return _information(self.table)

    def gain_if_doubted(self) -> float:
        """The same with the hypotheses brought closer together, for somebody who does not quite trust the priors [bit]."""
        shares = self.table.sum(axis=1, keepdims=True)
        doubted = np.where(shares > 0.0, self.table * np.maximum(shares, 1e-300) ** (DOUBT - 1.0), 0.0)
        return _information(doubted / doubted.sum())


@dataclass(frozen=True, slots=True)
class Decides:
    """Outcomes that leave one hypothesis in the lead: a word, or numbers from `low` to `high` [the check's unit], None for an end
    that is open; with the `chance` that they are read, and the `probability` that the hypothesis then has.
    """

    hypothesis: Hypothesis
    word: str | None
    low: float | None
    high: float | None
    chance: float
    probability: float


def decided_by(outcomes: Outcomes, hypotheses: Sequence[Hypothesis]) -> tuple[Decides, ...]:
    """What would be decided by what is read: for each word, and each run of classes with one of `hypotheses`, the rows, in the
    lead.
    """
    table, words = outcomes.table / outcomes.table.sum(), len(outcomes.words)

    def decides(columns: Array, word: str | None, low: float | None = None, high: float | None = None) -> Decides:
        shares, chance = columns.sum(axis=1), float(columns.sum())
        row = int(shares.argmax())
        return Decides(hypotheses[row], word, low, high, chance, float(shares[row]) / chance if chance > 0.0 else 0.0)

    found = [decides(table[:, [column]], word) for column, word in enumerate(outcomes.words)]
    numbers = table[:, words:]
    leads, last = numbers.argmax(axis=0), numbers.shape[1]
    starts = [column for column in range(last) if column == 0 or leads[column] != leads[column - 1]]
    for start, end in pairwise([*starts, last]):
        low = None if start == 0 else float(outcomes.edges[start])
        high = None if end == last else float(outcomes.edges[end])
        found.append(decides(numbers[:, start:end], None, low, high))
    return tuple(each for each in found if each.chance > HARDLY_EVER)


def _information(table: Array) -> float:
    """Mutual information of a joint table (hypotheses, outcomes) [bit], by its definition."""
    outcome, hypothesis = table.sum(axis=0), table.sum(axis=1)
    expected = hypothesis[:, None] * outcome[None, :]
    positive = table > 0.0
    return float(np.sum(table[positive] * np.log2(table[positive] / expected[positive])))


def outcomes_of(shown: Shown, shares: Array, kind: ReadingKind, meter: Meter) -> Outcomes:
    """The outcomes of a check that shows `shown` (hypotheses · each,) on specimens of joint `shares` (hypotheses, each)."""
    if shown.value is None:
        columns = [(shares * shown.chances[word].reshape(shares.shape)).sum(axis=1) for word in kind.words]
        return Outcomes(np.array(columns).T, kind.words, np.zeros(0))
    number, blurred = _is_number(shown, kind), _scaled(_blur(shown, kind, meter, shares.shape), kind)
    counts = number.reshape(shares.shape) & (shares > 0.0)
    edges = _edges(blurred, counts, shares, _scaled_sigma(shown, kind, meter).reshape(shares.shape))
    words = [(shares * np.where(number, 0.0, word_chance(shown, word)).reshape(shares.shape)).sum(axis=1) for word in kind.words]
    numbers = _sorted(blurred, np.where(counts, shares, 0.0), edges)
    unscaled = np.exp(edges) if kind.unit in LOGARITHMIC else edges
    return Outcomes(np.column_stack([*words, numbers]), kind.words, unscaled)


def _edges(values: Array, counts: Flags, shares: Array, sigma: Array) -> Array:
    """Classes of like numbers of specimens, no narrower than twice a typical sigma; at least one."""
    seen = values[counts]
    if not seen.size:
        return np.array([0.0, 1.0])
    low, high = float(seen.min()), float(seen.max())
    typical = float(np.average(np.minimum(sigma[counts], 1e6), weights=shares[counts]))
    classes = int(np.clip((high - low) / max(2.0 * typical, 1e-12), 1, CLASSES))
    edges = np.unique(np.quantile(seen, np.linspace(0.0, 1.0, classes + 1)))
    return edges if edges.size > 1 else np.array([low, low + 1e-9])


def _sorted(values: Array, shares: Array, edges: Array) -> Array:
    """Shares (hypotheses, each) of each class, (hypotheses, classes)."""
    classes, rows = len(edges) - 1, len(shares)
    index = np.clip(np.searchsorted(edges, values, side="right") - 1, 0, classes - 1)
    place = index + classes * np.arange(rows)[:, None]
    counted = np.bincount(place.ravel(), weights=shares.ravel(), minlength=rows * classes)
    return np.asarray(counted, dtype=float).reshape(rows, classes)


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


def _blur(shown: Shown, kind: ReadingKind, meter: Meter, shape: tuple[int, ...]) -> Array:
    """Numbers as a meter would show them, `shape` (hypotheses, each): moved by their own sigma, evenly within ± √3 of it."""
    assert shown.value is not None
    value = np.where(np.isfinite(shown.value), shown.value, 0.0).reshape(shape)
    even = coordinate(METER_BLUR, shape[1])
    return np.asarray(value + spread(shown, kind, meter).reshape(shape) * np.sqrt(3.0) * (2.0 * even - 1.0))


def _scaled_sigma(shown: Shown, kind: ReadingKind, meter: Meter) -> Array:
    """One sigma on the scale of the classes, (n,)."""
    assert shown.value is not None
    sigma = spread(shown, kind, meter)
    if kind.unit in LOGARITHMIC:
        return np.asarray(sigma / np.maximum(np.abs(np.where(np.isfinite(shown.value), shown.value, 1.0)), SMALLEST[kind.unit]))
    return sigma
