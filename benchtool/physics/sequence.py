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


def points(dimensions: int, count: int) -> Array:
    """`count` points of Richtmyer's sequence, shape (dimensions, count), each coordinate evenly over 0 to 1.

    Multiples of the square roots of the primes, modulo one (R. D. Richtmyer, LA-1342, 1951; value from memory).
    """
    steps = np.sqrt(np.array(_primes(dimensions), dtype=float))
    return np.asarray((0.5 + steps[:, None] * np.arange(1, count + 1)) % 1.0)
