"""How well a specimen accounts for a reading: the logarithm of its probability density, per specimen.

Numbers in volts are judged as they are, numbers in ohms, farads and amperes in their logarithm, so that a density means the
same thing for every suspect and for `unexplained`, which is spread evenly over what a case file accepts.
"""

from __future__ import annotations

import numpy as np

from benchtool.board import Board
from benchtool.catalogue.accepted import accepted
from benchtool.catalogue.faults import SOUND_OTHER, SOUND_SIGNS
from benchtool.catalogue.readings import LOOK_WORDS, READING_KINDS, ReadingKind
from benchtool.catalogue.shown import Shown
from benchtool.catalogue.shows import SURE
from benchtool.diagnosis.hypotheses import Hypothesis
from benchtool.observed import Accuracy, Meter, Reading, ReadingValue
from benchtool.physics.laws import Array, two_sigma

LEAST = -34.0
"""Logarithm of the least density: a gross mistake is always possible."""
WORD_FOR_NUMBER = 0.5
"""Chance that a number as good as the word (next to no capacitance, a few millivolts) is noted as the word."""
SMOOTHING = 0.012
"""One sigma, as a share, below which a number is not told apart: as coarse as the specimens are drawn."""
LOGARITHMIC = ("ohm", "F", "A")
SMALLEST = {"ohm": 0.05, "F": 1e-11, "A": 1e-6}
"""What a meter can tell from nothing; numbers below it count as it."""


def accuracy_of(kind: ReadingKind, meter: Meter) -> Accuracy:
    """The accuracy of the instrument that takes this reading; nothing for readings in words."""
    return Accuracy(0.0, 0.0) if kind.meter is None else getattr(meter, kind.meter)


def spread(shown: Shown, kind: ReadingKind, meter: Meter) -> Array:
    """One sigma of a shown number, meter and physics together [kind.unit], (n,)."""
    assert shown.value is not None
    value = np.where(np.isfinite(shown.value), shown.value, 0.0)
    accuracy = accuracy_of(kind, meter)
    instrument = two_sigma(value, accuracy.relative, accuracy.floor) / 2.0
    error = np.where(np.isfinite(shown.error), shown.error, 0.0)
    return np.asarray(np.sqrt(instrument**2 + error**2 + (SMOOTHING * value) ** 2))


def log_density(shown: Shown, reading: Reading, meter: Meter) -> Array:
    """Logarithm of the density of `reading` on each specimen, (n,)."""
    kind, value = READING_KINDS[reading.what], reading.value
    if isinstance(value, str):
        return np.maximum(np.log(np.maximum(word_chance(shown, value), 1e-300)), LEAST)
    assert isinstance(value, float)
    return np.maximum(_number(shown, value, kind, meter), LEAST)


def word_chance(shown: Shown, word: str) -> Array:
    """Chance of a word on each specimen, (n,); of `open` and `short` also where the reading is mostly a number."""
    if shown.value is None:
        return shown.chances[word]
    flag = shown.opened if word == "open" else shown.shorted
    if flag is None:
        return np.full(shown.value.shape, 1.0 - SURE)
    return np.where(flag, np.where(np.isfinite(shown.value), WORD_FOR_NUMBER, SURE), 1e-5)


def _number(shown: Shown, value: float, kind: ReadingKind, meter: Meter) -> Array:
    assert shown.value is not None
    finite = np.isfinite(shown.value)
    sigma = np.maximum(spread(shown, kind, meter), 1e-15)
    centre = np.where(finite, shown.value, 0.0)
    density = -0.5 * ((value - centre) / sigma) ** 2 - np.log(sigma * np.sqrt(2.0 * np.pi))
    if kind.unit in LOGARITHMIC:
        density = density + np.log(max(abs(value), SMALLEST[kind.unit]))
    for flag in (shown.opened, shown.shorted):
        if flag is not None and kind.words:
            density = density + np.where(flag, np.log(1.0 - WORD_FOR_NUMBER), 0.0)
    return np.where(finite, density, LEAST)


def log_uniform_density(reading: Reading, board: Board) -> float:
    """Logarithm of the density of `reading` if it were a mistake: evenly over what a file accepts, words over the words.

    Where a kind knows both numbers and words, either has half.
    """
    kind = READING_KINDS[reading.what]
    if isinstance(reading.value, tuple):
        return float(len(LOOK_WORDS) * np.log(0.5))
    share = float(np.log(0.5)) if kind.unit is not None and kind.words else 0.0
    if isinstance(reading.value, str):
        return float(-np.log(len(kind.words)) + share)
    low, high = accepted(kind, board)
    span = np.log(high / SMALLEST[kind.unit]) if kind.unit in LOGARITHMIC else high - low
    return float(-np.log(span) + share)


def look_log_chance(hypothesis: Hypothesis, value: ReadingValue) -> float:
    """Logarithm of the chance that a look shows just these words on a board with this hypothesis. Weak evidence, never proof."""
    seen = {value} if isinstance(value, str) else set(value if isinstance(value, tuple) else ())
    chances = {word: SOUND_SIGNS.get(word, SOUND_OTHER) for word in LOOK_WORDS if word != "nothing seen"}
    for struck in hypothesis.faults:
        word, sign = struck.fault.sign_word, struck.fault.sign / 100.0
        chances[word] = 1.0 - (1.0 - chances[word]) * (1.0 - sign)
    return float(sum(np.log(chance if word in seen else 1.0 - chance) for word, chance in chances.items()))


def log_sum(values: Array) -> Array:
    """Logarithm of the sum of exponentials over the last axis, without overflow."""
    top = values.max(axis=-1)
    return np.asarray(top + np.log(np.exp(values - top[..., None]).sum(axis=-1)))


def effective_number(joint: Array) -> Array:
    """How many equal specimens those of log weight `joint` are worth, over the last axis: (Σw)² / Σw² (Kish)."""
    return np.asarray(np.exp(2.0 * log_sum(joint) - log_sum(2.0 * joint)))


def tempered(joint: Array, number: float) -> Array:
    """Weights of log weight `joint` (n,), adding up to one, flattened by a power under one until `number` specimens count."""
    power, wanted = 1.0, min(number, joint.size / 2.0)
    while power > 1e-3 and effective_number(power * joint) < wanted:
        power *= 0.7
    return np.asarray(np.exp(power * joint - log_sum(power * joint)))
