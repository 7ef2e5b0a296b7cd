"""A fixed quasi-random sequence: the same board is always judged on the same specimens, without a random generator.

The first coordinates are multiples of square roots of primes, modulo one: even in pairs and threes as well as each by itself.
So many of them begin to move together, so later ones take each of `count` equal steps once, in an order shuffled by an integer
hash: no two of those go together however many there are. Every machine gives the same.
"""

from __future__ import annotations

from functools import cache

import numpy as np
from numpy.typing import NDArray

from benchtool.physics.laws import Array

PRIMES = (2, 3, 5, 7, 11, 13, 17, 19, 23, 29, 31, 37, 41, 43, 47, 53, 59, 61, 67, 71, 73, 79, 83, 89, 97, 101, 103, 107)
"""One for each of the first coordinates: Richtmyer's sequence (LA-1342, 1951; value from memory)."""
SEVERITY, SECOND_SEVERITY, OTHER_SEVERITY, METER, METER_WINDOW, METER_BLUR = range(6)
"""Coordinates for what is no part: how bad a fault is, and what depends on the meter."""
FIRST_PART, LAST_PART = 6, 262
"""Coordinates for the parts of a board: more than the largest board a case file accepts has."""


@cache
def coordinate(number: int, count: int) -> Array:
    """`count` values of coordinate `number` [1], evenly over 0 to 1; (count,), read-only."""
    values = _lattice(PRIMES[number], count) if number < len(PRIMES) else _shuffled(number, count)
    values.flags.writeable = False
    return values


def _lattice(prime: int, count: int) -> Array:
    return np.asarray((0.5 + np.sqrt(float(prime)) * np.arange(1, count + 1)) % 1.0)


def _shuffled(number: int, count: int) -> Array:
    start = np.uint64(number * 0x9E3779B9 + 1) << np.uint64(20)
    order = np.argsort(_mixed(np.arange(count, dtype=np.uint64) + start), kind="stable")
    return np.asarray((order + 0.5) / count)


def _mixed(values: NDArray[np.uint64]) -> NDArray[np.uint64]:
    """SplitMix64's finaliser: an integer hash."""
    values = (values ^ (values >> np.uint64(30))) * np.uint64(0xBF58476D1CE4E5B9)
    values = (values ^ (values >> np.uint64(27))) * np.uint64(0x94D049BB133111EB)
    return np.asarray(values ^ (values >> np.uint64(31)))
