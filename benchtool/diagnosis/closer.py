"""Leading hypotheses drawn again, closer around the parts and severities that account for sharp readings."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from benchtool.board import Board
from benchtool.diagnosis.crowd import WHOLE, Box, Crowd, densities_on, second_of, struck
from benchtool.diagnosis.hypotheses import Hypothesis
from benchtool.diagnosis.likelihood import effective_number, tempered
from benchtool.diagnosis.nearby import Interval, healthy_near, mains_range, near_parts
from benchtool.observed import Meter, Reading
from benchtool.physics.bench import Bench
from benchtool.physics.laws import Array
from benchtool.physics.sequence import SEVERITY, coordinate
from benchtool.physics.specimens import concatenate

REDRAWN = 320
"""Specimens of a hypothesis that is drawn again."""
POOR = 0.025
"""Share of its specimens that a hypothesis must be worth, or it is drawn once more, closer still."""
LOOKED_AT = (8.0, 5.0, 4.0)
"""Effective number of specimens around which it is drawn, time after time: not the best one alone, for sharp readings leave it to
chance which of them that is.
"""
COUNTS_FROM = 0.03
"""Share of the best of these from which a severity counts."""
HARDLY = 0.85
"""Share of a severity's range that is not narrowed any further: it may be one that no reading hangs on."""
MARGIN, STEPS = 0.02, 32
"""How far around them, as a share of what they were drawn from; and the whole steps that severities are narrowed to, so that a
further reading mostly finds them drawn already.
"""


@dataclass(frozen=True, slots=True)
class Closer:
    """A hypothesis drawn again: log densities (readings, n) of all readings, and log weight of each specimen (n,)."""

    densities: Array
    log_prior: Array

    @property
    def joint(self) -> Array:
        """Logarithm of each specimen's share in the likelihood of all readings, (n,)."""
        return np.asarray(self.densities.sum(axis=0) + self.log_prior)


def drawn_closer(
    crowd: Crowd, meter: Meter, readings: tuple[Reading, ...], joint: Array, leaders: Sequence[int]
) -> dict[int, Closer]:
    """The hypotheses `leaders` drawn again, by number; `joint` (hypotheses, each): their log weights as first drawn."""
    boxes = dict.fromkeys(leaders, WHOLE)
    joints = {index: joint[index] for index in leaders}
    found: dict[int, Closer] = {}
    for number in LOOKED_AT:
        boxes = {index: _box_around(crowd, index, joints[index], box, number) for index, box in boxes.items()}
        drawn = _drawn(crowd, meter, readings, boxes)
        found |= drawn
        joints = {index: item.joint for index, item in drawn.items()}
        boxes = {index: box for index, box in boxes.items() if effective_number(joints[index]) < POOR * REDRAWN}
        if not boxes:
            break
    return found


def _box_around(crowd: Crowd, index: int, joint: Array, box: Box, number: float) -> Box:
    """Between which severities those `number` lie that count, of specimens of log weight `joint` (n,) drawn from `box`."""
    weights = tempered(joint, number)
    counts = weights > COUNTS_FROM * weights.max()
    numbers = SEVERITY, second_of(crowd.hypotheses[index])
    first, second = (
        _narrowed(coordinate(number, joint.size)[counts], side) for number, side in zip(numbers, box, strict=True)
    )
    return first, second


def _narrowed(coordinates: Array, side: tuple[float, float]) -> tuple[float, float]:
    low, width = side[0], side[1] - side[0]
    steps = STEPS / width
    least = np.floor((low + width * (float(coordinates.min()) - MARGIN)) * steps) / steps
    most = np.ceil((low + width * (float(coordinates.max()) + MARGIN)) * steps) / steps
    if most - least > HARDLY * width:
        return side
    return max(float(least), 0.0), min(float(most), 1.0)


def _drawn(
    crowd: Crowd, meter: Meter, readings: tuple[Reading, ...], boxes: Mapping[int, Box]
) -> dict[int, Closer]:
    if not boxes:
        return {}
    board, hypotheses = crowd.board, [crowd.hypotheses[index] for index in boxes]
    near = tuple(sorted(near_parts(board, meter, readings).items()))
    mains = mains_range(board, meter, readings)
    bench, log_share = _bench(board, near, mains, tuple(zip(hypotheses, boxes.values(), strict=True)), REDRAWN)
    densities = np.array([densities_on(bench, board, hypotheses, reading, meter) for reading in readings])
    found = {}
    for number, (index, box) in enumerate(boxes.items()):
        log_weight = log_share - float(np.log(REDRAWN)) + sum(float(np.log(high - low)) for low, high in box)
        if mains is not None and not crowd.sets_mains(index):
            log_weight += float(np.log(mains.reach / (board.mains.variation * board.mains.voltage)))
        found[index] = Closer(densities[:, number], np.full(REDRAWN, log_weight))
    return found


@lru_cache(maxsize=32)
def _bench(
    board: Board,
    near: tuple[tuple[str, tuple[float, float]], ...],
    mains: Interval | None,
    boxes: tuple[tuple[Hypothesis, Box], ...],
    count: int,
) -> tuple[Bench, float]:
    """Specimens of the hypotheses in `boxes`, kept for the next reading, and the logarithm of their share of all boards."""
    healthy, log_share = healthy_near(board, dict(near), mains, count)
    return Bench(concatenate([struck(board, hypothesis, healthy, box) for hypothesis, box in boxes]), crowd=True), log_share
