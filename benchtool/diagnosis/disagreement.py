"""Readings that do not go together: pairs that no fault of the list accounts for as well as a mistake would."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import combinations

import numpy as np

from benchtool.catalogue.readings import READING_KINDS
from benchtool.catalogue.shows import SHOWS
from benchtool.diagnosis.likelihood import LEAST
from benchtool.diagnosis.posterior import Evidence, Posterior, log_sum
from benchtool.observed import Reading
from benchtool.physics.laws import Array

CLEARLY = 2.0
"""Natural logarithm by which a mistake must account for the pair better than the best single fault."""


@dataclass(frozen=True, slots=True)
class Disagreement:
    """Two readings; `implied` is what the first implies for the second [its unit], low and high, None for words."""

    first: Reading
    second: Reading
    implied: tuple[float, float] | None


def disagreements(posterior: Posterior) -> tuple[Disagreement, ...]:
    """Every pair of readings that no single fault reconciles."""
    singles = [item.first for item in posterior.evidence if len(item.hypothesis.faults) < 2]
    return tuple(_found(posterior, singles))


def _found(posterior: Posterior, singles: list[Evidence]) -> Iterator[Disagreement]:
    uniform = posterior.uniform
    for first, second in combinations(range(len(posterior.readings)), 2):
        together = max(_log_joint(item, (first, second)) for item in singles)
        apart = uniform[first] + uniform[second]
        possible = all(max(_log_joint(item, (row,)) for item in singles) > uniform[row] for row in (first, second))
        if possible and together < apart - CLEARLY:
            readings = posterior.readings
            yield Disagreement(readings[first], readings[second], _implied(posterior, singles, first, second))


def _log_joint(item: Evidence, rows: tuple[int, ...]) -> float:
    """Logarithm of the likelihood of some of the readings alone."""
    return log_sum(item.densities[list(rows)].sum(axis=0) + item.log_prior)


def _implied(posterior: Posterior, singles: list[Evidence], first: int, second: int) -> tuple[float, float] | None:
    """What the first reading implies for the second: the 95 % range under the single fault that best accounts for the first."""
    reading = posterior.readings[second]
    if READING_KINDS[reading.what].unit is None or not isinstance(reading.value, float):
        return None
    likeliest = max(singles, key=lambda item: np.log(item.hypothesis.weight) + _log_joint(item, (first,)))
    shown = SHOWS[reading.what](likeliest.bench, posterior.board, reading.check).value
    assert shown is not None
    weights = np.exp(np.maximum(likeliest.densities[first] + likeliest.log_prior, LEAST))
    return weighted_range(np.where(np.isfinite(shown), shown, np.nan), weights)


def weighted_range(values: Array, weights: Array) -> tuple[float, float] | None:
    """The 2.5 and 97.5 % points of weighted `values`; None where more than half the weight has no number."""
    finite = np.isfinite(values)
    total, counted = float(weights.sum()), float(weights[finite].sum())
    if total <= 0.0 or counted < 0.5 * total:
        return None
    order = np.argsort(values[finite])
    sorted_values, cumulative = values[finite][order], np.cumsum(weights[finite][order]) / counted
    low, high = np.searchsorted(cumulative, [0.025, 0.975])
    last = len(sorted_values) - 1
    return float(sorted_values[min(low, last)]), float(sorted_values[min(high, last)])
