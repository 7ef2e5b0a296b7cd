"""Readings that do not go together: pairs that no fault of the list accounts for as well as a mistake would."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import combinations

import numpy as np

from benchtool.catalogue.readings import READING_KINDS
from benchtool.diagnosis.likelihood import LEAST, log_sum
from benchtool.diagnosis.posterior import Posterior
from benchtool.observed import Reading
from benchtool.physics.laws import Array

CLEARLY = 2.0
"""Natural logarithm by which a mistake must account for the pair better than the best single fault."""
LEADING = 0.1
"""Probability from which a pair of faults reconciles readings too."""
RATHER = 1.5
"""Natural logarithm from which one of two readings is called the likelier mistake."""


@dataclass(frozen=True, slots=True)
class Disagreement:
    """Two readings; `implied` is what the first implies for the second [its unit], low and high, None for words.

    `doubtful`: the one that is the likelier mistake, None where neither is by much.
    """

    first: Reading
    second: Reading
    implied: tuple[float, float] | None
    doubtful: Reading | None = None


def disagreements(posterior: Posterior) -> tuple[Disagreement, ...]:
    """Every pair of readings that no single fault reconciles, nor two faults that lead."""
    return tuple(_found(posterior)) if len(posterior.readings) > 1 else ()


def _found(posterior: Posterior) -> Iterator[Disagreement]:
    uniform, readings, alone = posterior.uniform, posterior.readings, posterior.alone()
    singles = [index for index, hypothesis in enumerate(posterior.hypotheses) if len(hypothesis.faults) < 2]
    leading = [index for index, probability in enumerate(posterior.probabilities) if probability > LEADING]
    together = _together(posterior, sorted({*singles, *leading}))
    best = alone[:, singles].max(axis=1)
    for first, second in combinations(range(len(readings)), 2):
        possible = best[first] > uniform[first] and best[second] > uniform[second]
        if possible and together[first, second] < uniform[first] + uniform[second] - CLEARLY:
            likeliest = max(singles, key=lambda index: posterior.crowd.log_weights[index] + alone[first, index])
            implied, doubtful = _implied(posterior, likeliest, first, second), _doubtful(posterior, first, second)
            yield Disagreement(readings[first], readings[second], implied, doubtful)


def _doubtful(posterior: Posterior, first: int, second: int) -> Reading | None:
    """Which of two readings is the likelier mistake: the one without which the hypotheses account better for all the others."""
    without = [_log_without(posterior, row) + float(posterior.uniform[row]) for row in (first, second)]
    if abs(without[0] - without[1]) < RATHER:
        return None
    return posterior.readings[first if without[0] > without[1] else second]


def _log_without(posterior: Posterior, row: int) -> float:
    """Logarithm of the likelihood of all readings but one, the hypotheses weighed by their priors."""
    rest = np.delete(posterior.densities, row, axis=0).sum(axis=0) + posterior.log_prior
    return float(log_sum(log_sum(rest) + posterior.crowd.log_weights))


def _together(posterior: Posterior, rows: list[int]) -> Array:
    """Logarithm of the likelihood of every two readings together under that of the hypotheses `rows` that reconciles them best,
    (readings, readings): between the specimens drawn first, or those drawn closer, where two sharp readings may meet.
    """
    found = [_log_pairs(posterior.densities[:, index], posterior.log_prior[index]) for index in rows]
    found += [_log_pairs(posterior.closer[i].densities, posterior.closer[i].log_prior) for i in rows if i in posterior.closer]
    return np.asarray(np.max(found, axis=0))


def _log_pairs(densities: Array, log_prior: Array) -> Array:
    """Logarithm of the likelihood of every two readings together, of (readings, n) and (n,); (readings, readings)."""
    tops = densities.max(axis=1)
    shares = np.exp(densities - tops[:, None])
    joint = (shares * np.exp(log_prior)) @ shares.T
    return np.asarray(np.log(np.maximum(joint, 1e-300)) + tops[:, None] + tops)


def _implied(posterior: Posterior, likeliest: int, first: int, second: int) -> tuple[float, float] | None:
    """What the first reading implies for the second: the 95 % range under the single fault that best accounts for the first."""
    reading, crowd = posterior.readings[second], posterior.crowd
    if READING_KINDS[reading.what].unit is None or not isinstance(reading.value, float):
        return None
    shown = crowd.shown(reading.check, posterior.meter).value
    assert shown is not None
    here = shown.reshape(crowd.shape)[likeliest]
    log_weights = posterior.densities[first, likeliest] + posterior.log_prior[likeliest]
    return weighted_range(np.where(np.isfinite(here), here, np.nan), np.exp(np.maximum(log_weights, LEAST)))


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
