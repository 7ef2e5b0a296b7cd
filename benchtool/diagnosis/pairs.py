"""Two faults at once that the trade has no name for, considered only where no single fault accounts for the readings.

Any two faults may sit on one board, and most often the second one shows in nothing that was read; claiming it then would be a
guess. So a pair has to account for what neither of its faults does alone.
"""

from __future__ import annotations

from itertools import combinations

import numpy as np

from benchtool.catalogue.faults import PAIRS
from benchtool.diagnosis.hypotheses import Hypothesis
from benchtool.physics.laws import Array

MOST_PAIRS = 6
"""Pairs that are looked into at once."""
OF_ALL = 1000.0
"""Weights are per mille: the product of two chances, times two, is 2·w·w/1000 (published values, priors)."""
HELPS_FROM = 3.0
"""Natural logarithm by which a pair must be able to account for the readings better than either of its faults."""


def promising_pairs(hypotheses: tuple[Hypothesis, ...], alone: Array, beat: float) -> tuple[Hypothesis, ...]:
    """The pairs most likely to account for readings of log likelihood `alone` (readings, hypotheses) under each single fault,
    each reading by whichever of the two does it better; only those that could come to `beat`, the logarithm of the best.
    """
    named = {frozenset((pair.cause, pair.effect)) for pair in PAIRS}
    singles = [index for index, hypothesis in enumerate(hypotheses) if len(hypothesis.faults) == 1]
    found: list[tuple[float, Hypothesis]] = []
    for first, second in combinations(singles, 2):
        cause, effect = hypotheses[first].faults[0], hypotheses[second].faults[0]
        if cause.fault.name == effect.fault.name or {cause.fault.name, effect.fault.name} in named:
            continue
        both = float(np.maximum(alone[:, first], alone[:, second]).sum())
        weight = 2.0 * hypotheses[first].weight * hypotheses[second].weight / OF_ALL
        helps = both - max(float(alone[:, first].sum()), float(alone[:, second].sum()))
        if helps > HELPS_FROM and both + np.log(weight) > beat:
            ordered = (cause, effect) if hypotheses[first].weight >= hypotheses[second].weight else (effect, cause)
            found.append((both + float(np.log(weight)), Hypothesis(ordered, weight)))
    return tuple(pair for _, pair in sorted(found, key=lambda item: -item[0])[:MOST_PAIRS])
