"""A fixed quasi-random sequence: the same board is always judged on the same specimens, without a random generator."""

from __future__ import annotations

from functools import cache

import numpy as np

from benchtool.physics.laws import Array


@cache
def _primes(count: int) -> tuple[int, ...]:
    found: list[int] = []
    candidate = 2
    while len(found) < count:
        if all(candidate % prime for prime in found):
            found.append(candidate)
        candidate += 1
    return tuple(found)


PART_COORDINATES = 256
"""Coordinates for the parts of a board: more than the largest board a case file accepts has."""
SEVERITY, SECOND_SEVERITY, OTHER_SEVERITY, METER, METER_WINDOW, METER_BLUR = range(6)
"""Coordinates for what is no part: how bad a fault is, and what depends on the meter."""


def apart(coordinate: int, count: int) -> Array:
    """`count` points of a coordinate that no part is drawn by, evenly over 0 to 1; (count,)."""
    step = np.sqrt(float(_primes(PART_COORDINATES + coordinate + 1)[-1]))
    return np.asarray((0.5 + step * np.arange(1, count + 1)) % 1.0)


def points(dimensions: int, count: int) -> Array:
    """`count` points of Richtmyer's sequence, shape (dimensions, count), each coordinate evenly over 0 to 1.

    Multiples of the square roots of the primes, modulo one (R. D. Richtmyer, LA-1342, 1951; value from memory).
    """
    steps = np.sqrt(np.array(_primes(dimensions), dtype=float))
    return np.asarray((0.5 + steps[:, None] * np.arange(1, count + 1)) % 1.0)
