"""The fixed sequence that specimens are drawn by: each coordinate even, and no two of them in step."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from scipy.stats import qmc

from benchtool.physics.sequence import LAST_PART, coordinate

DRAWN = 256
USUAL = 28  # coordinates: three rails and half a dozen loads; the sample cases draw by 11 to 20


def points(coordinates: int, count: int) -> Any:
    return np.array([coordinate(number, count) for number in range(coordinates)])


def test_every_coordinate_of_the_sequence_is_even() -> None:
    drawn = points(LAST_PART, DRAWN)
    assert drawn.shape == (LAST_PART, DRAWN)
    assert drawn.min() >= 0.0
    assert drawn.max() < 1.0
    # An even spread over 0 to 1: mean 1/2, variance 1/12. Chance would miss the mean by 0.018 (one standard error) and more.
    np.testing.assert_allclose(drawn[:USUAL].mean(axis=1), 0.5, atol=0.018)
    np.testing.assert_allclose(drawn[:USUAL].var(axis=1), 1.0 / 12.0, rtol=0.05)
    np.testing.assert_allclose(drawn.mean(axis=1), 0.5, atol=3 * 0.018)


def discrepancy(sample: Any) -> float:
    return float(qmc.discrepancy(np.asarray(sample).T, method="L2-star"))


@pytest.mark.parametrize("coordinates", [1, 2, 3, 4])
def test_the_sequence_is_more_even_than_chance(coordinates: int) -> None:
    random = np.random.default_rng(20)
    by_chance = [discrepancy(random.random((coordinates, DRAWN))) for _ in range(20)]
    assert discrepancy(points(coordinates, DRAWN)) < min(by_chance)


def test_pairs_of_an_ordinary_board_s_coordinates_are_more_even_than_chance() -> None:
    random = np.random.default_rng(20)
    by_chance = np.mean([discrepancy(random.random((2, DRAWN))) for _ in range(50)])
    drawn = points(20, DRAWN)
    pairs = [discrepancy(drawn[[first, second]]) for second in range(20) for first in range(second)]
    assert np.mean(pairs) < 0.75 * by_chance


def correlations(coordinates: Any) -> Any:
    return np.abs(np.corrcoef(coordinates) - np.eye(len(coordinates)))


def test_no_two_coordinates_of_an_ordinary_board_go_together() -> None:
    # Independent samples of this size stay under 4/√n; a pair beyond it would tie two parts of every specimen to each other.
    assert correlations(points(USUAL, DRAWN)).max() < 4.0 / np.sqrt(DRAWN)


def test_no_two_coordinates_of_a_large_board_go_together() -> None:
    # Three rails and twenty loads draw by sixty coordinates; severity of a fault and blur of the meter come on top.
    assert correlations(points(80, DRAWN)).max() < 0.5


def test_the_sequence_is_the_same_each_time() -> None:
    # Richtmyer's: multiples of √2, √3, √5 modulo one, from the middle (R. D. Richtmyer, LA-1342, 1951; value from memory).
    np.testing.assert_allclose(points(3, 1)[:, 0], (np.sqrt([2.0, 3.0, 5.0]) + 0.5) % 1.0)
