"""Readings that do not go together: pairs that no fault of the list accounts for as well as a mistake would."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import combinations

import numpy as np

from benchtool.catalogue.readings import READING_KINDS
from benchtool.catalogue.shown import View
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
    singles = [item for item in posterior.evidence if len(item.hypothesis.faults) < 2]
    return tuple(_found(posterior, [item.first for item in singles], [item for item in singles if item.wide is not None]))


def _found(posterior: Posterior, singles: list[Evidence], closer: list[Evidence]) -> Iterator[Disagreement]:
    """`closer`: hypotheses drawn again around the readings, where two sharp ones may meet between the first specimens."""
    uniform, readings = posterior.uniform, posterior.readings
    if len(readings) < 2:
        return
    together = np.max([_log_pairs(item) for item in (*singles, *closer)], axis=0)
    alone = np.max([_log_singles(item) for item in singles], axis=0)
    for first, second in combinations(range(len(readings)), 2):
        possible = alone[first] > uniform[first] and alone[second] > uniform[second]
        if possible and together[first, second] < uniform[first] + uniform[second] - CLEARLY:
            yield Disagreement(readings[first], readings[second], _implied(posterior, singles, first, second))


def _log_pairs(item: Evidence) -> Array:
    """Logarithm of the likelihood of every two readings together, (readings, readings)."""
    tops = item.densities.max(axis=1)
    shares = np.exp(item.densities - tops[:, None])
    joint = (shares * np.exp(item.log_prior)) @ shares.T
    return np.asarray(np.log(np.maximum(joint, 1e-300)) + tops[:, None] + tops)


def _log_singles(item: Evidence) -> Array:
    """Logarithm of the likelihood of every reading alone, (readings,)."""
    return np.array([_log_alone(item, row) for row in range(len(item.densities))])


def _log_alone(item: Evidence, row: int) -> float:
    return log_sum(item.densities[row] + item.log_prior)


def _implied(posterior: Posterior, singles: list[Evidence], first: int, second: int) -> tuple[float, float] | None:
    """What the first reading implies for the second: the 95 % range under the single fault that best accounts for the first."""
    reading = posterior.readings[second]
    if READING_KINDS[reading.what].unit is None or not isinstance(reading.value, float):
        return None
    likeliest = max(singles, key=lambda item: np.log(item.hypothesis.weight) + _log_alone(item, first))
    shown = SHOWS[reading.what](View(likeliest.bench, posterior.board, reading.check, posterior.meter)).value
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
