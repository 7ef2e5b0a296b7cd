"""The specimens of every hypothesis of a board, and what readings are worth on them.

They belong to the board and not to its readings: what they settle to is worked out once a board and kept, and a new reading only
weighs them anew. Arrays over them have the shape (hypotheses, each), flat (hypotheses · each,) on the bench.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import replace
from functools import cached_property, lru_cache

import numpy as np

from benchtool.board import Board
from benchtool.catalogue.shown import Shown, View
from benchtool.catalogue.shows import SHOWS
from benchtool.catalogue.strikes import scene_of
from benchtool.diagnosis.hypotheses import Hypothesis, hypotheses_of
from benchtool.diagnosis.likelihood import log_density, look_log_chance
from benchtool.observed import Check, Meter, Reading
from benchtool.physics import constants as known
from benchtool.physics.bench import Bench
from benchtool.physics.laws import Array, Flags
from benchtool.physics.sequence import OTHER_SEVERITY, SECOND_SEVERITY, SEVERITY, coordinate
from benchtool.physics.specimens import Specimens, concatenate, population

EACH, IN_ALL, LEAST_EACH = 256, 16384, 32
"""Specimens a hypothesis; in all, so that a board of forty loads is no hundred times slower; and at least."""
BOARDS_KEPT = 8
"""Boards whose crowds are kept."""
USUAL_SHARE = 0.7
"""Share of the specimens whose mains stand where they do while reading; the rest go as far as the mains vary, for a mains reading
that says so.
"""
TAILS = ((0.0, 0.02, 0.98, 1.0), (-0.1, 0.0, 1.0, 1.1))
"""A coordinate, and the severity it stands for: two in a hundred faults are a little worse or milder than their range says, by as
much as a tenth of it. Common practice, no source.
"""
ESR_BEYOND = 3.0
"""Times the upper end of the healthy spread that the worst of sound old reservoirs reach; common practice, no source."""
RULED_OUT = -60.0
"""Logarithm of the weight of specimens that do not count."""
OF_THE_MAINS = ("mains-low", "mains-high")


class Crowd:
    """Hypotheses of `board` with as many specimens each, on one bench."""

    def __init__(self, board: Board, hypotheses: tuple[Hypothesis, ...], bench: Bench) -> None:
        """`bench`: as many specimens of each of `hypotheses`, one after the other."""
        self.board, self.hypotheses, self.bench = board, hypotheses, bench
        self.each = bench.specimens.count // len(hypotheses)
        self._densities: dict[tuple[Reading, Meter], Array] = {}
        self._extended: dict[tuple[Hypothesis, ...], Crowd] = {}

    def extended(self, more: tuple[Hypothesis, ...]) -> Crowd:
        """This crowd with `more` hypotheses behind its own; the last one asked for is kept."""
        if more not in self._extended:
            healthy = _healthy(self.board, self.each)
            specimens = concatenate([struck(self.board, hypothesis, healthy) for hypothesis in more])
            bench = self.bench.extended(specimens)
            self._extended = {more: Crowd(self.board, (*self.hypotheses, *more), bench)}
        return self._extended[more]

    @property
    def shape(self) -> tuple[int, int]:
        """Hypotheses, and specimens of each."""
        return len(self.hypotheses), self.each

    @cached_property
    def sound(self) -> int:
        """Which hypothesis is the sound board."""
        return next(index for index, hypothesis in enumerate(self.hypotheses) if not hypothesis.faults)

    @cached_property
    def log_weights(self) -> Array:
        """Logarithm of the hypotheses' weights, (hypotheses,)."""
        return np.log([hypothesis.weight for hypothesis in self.hypotheses])

    def shown(self, check: Check, meter: Meter, where: Flags | None = None) -> Shown:
        """What `check` shows on the specimens, flat; only those at `where` (hypotheses, each) count."""
        return SHOWS[check.what](View(self.bench, self.board, check, meter, None if where is None else where.ravel()))

    def densities(self, reading: Reading, meter: Meter) -> Array:
        """Logarithm of the density of `reading` on every specimen, (hypotheses, each)."""
        key = reading, meter
        if key not in self._densities:
            self._densities[key] = densities_on(self.bench, self.board, self.hypotheses, reading, meter)
        return self._densities[key]

    def log_prior(self, *, mains_read: bool) -> Array:
        """Logarithm of the specimens' weights before any reading but, where it was read, of the mains; (hypotheses, each)."""
        weights = np.tile(self._mains_weights(mains_read), (len(self.hypotheses), 1))
        weights[[index for index in range(len(self.hypotheses)) if self.sets_mains(index)]] = 0.0
        return np.asarray(weights - np.log(np.exp(weights).sum(axis=1, keepdims=True)))

    def sets_mains(self, index: int) -> bool:
        """Whether hypothesis `index` puts the mains where it wants them."""
        return any(each.fault.name in OF_THE_MAINS for each in self.hypotheses[index].faults)

    def _mains_weights(self, mains_read: bool) -> Array:
        """Mains that were not read stand where they usually do; once read they may stand anywhere in their range; (each,)."""
        variation, usual = self.board.mains.variation, _usual(self.board)
        if variation <= usual:
            return np.zeros(self.each)
        off = np.abs(self.bench.specimens.mains[: self.each] / self.board.mains.voltage - 1.0)
        near, far = (usual / variation, 1.0 - usual / variation) if mains_read else (1.0, np.exp(RULED_OUT))
        return np.asarray(np.log(np.where(off <= usual, near / USUAL_SHARE, far / (1.0 - USUAL_SHARE))))

    def prepare(self) -> Iterator[tuple[int, int]]:
        """Settles the states that readings and checks are made in; yields how many are done, of how many."""
        switched = self.board.switched_loads()
        cold = dict.fromkeys([(), switched, *((name,) for name in switched)])
        states = [*((state, False) for state in cold), ((), True), (switched, True)]
        for done, (state, warm) in enumerate(states, start=1):
            self.bench.settled(state, warm=warm)
            yield done, len(states)



@lru_cache(maxsize=BOARDS_KEPT)
def crowd_of(board: Board) -> Crowd:
    """The crowd of `board`, made once."""
    hypotheses = hypotheses_of(board)
    healthy = _healthy(board, min(EACH, max(IN_ALL // len(hypotheses), LEAST_EACH)))
    bench = Bench(concatenate([struck(board, hypothesis, healthy) for hypothesis in hypotheses]), crowd=True)
    return Crowd(board, hypotheses, bench)


def _healthy(board: Board, count: int) -> Specimens:
    healthy = _as_while_reading(population(board, count), board)
    return replace(healthy, esr=_with_tails(healthy))


def _with_tails(healthy: Specimens) -> Array:
    """ESR [ohm], (rails, n): six in a hundred sound reservoirs are beyond the healthy spread."""
    low, high = known.ESR_HEALTHY
    fitted = healthy.reservoir > 0.0
    product = np.where(fitted, healthy.esr, 0.0) * healthy.reservoir
    place = np.log(np.maximum(product, low) / low) / np.log(high / low)
    return np.asarray(healthy.esr * ESR_BEYOND ** np.interp(place, [0.0, 0.94, 1.0], [0.0, 0.0, 1.0]))


Box = tuple[tuple[float, float], tuple[float, float]]
"""Between which values two coordinates of a hypothesis lie: its first fault's severity, and its second coordinate [1]."""
WHOLE: Box = ((0.0, 1.0), (0.0, 1.0))


def second_of(hypothesis: Hypothesis) -> int:
    """The second coordinate of a hypothesis: the second fault's severity, or what else its one fault changes."""
    return SECOND_SEVERITY if len(hypothesis.faults) > 1 else OTHER_SEVERITY


def struck(board: Board, hypothesis: Hypothesis, healthy: Specimens, box: Box = WHOLE) -> Specimens:
    """`healthy` specimens with the faults of `hypothesis`, its severities evenly within `box`."""
    sides = dict(zip((SEVERITY, second_of(hypothesis)), box, strict=True))

    def even(number: int) -> Array:
        low, high = sides.get(number, (0.0, 1.0))
        return np.interp(low + (high - low) * coordinate(number, healthy.count), *TAILS)

    specimens = healthy
    for number, fault in enumerate(hypothesis.faults):
        scene = scene_of(board, fault.place, even(SECOND_SEVERITY if number else SEVERITY), even(OTHER_SEVERITY))
        specimens = fault.fault.strike(specimens, scene)
    return specimens


def densities_on(
    bench: Bench, board: Board, hypotheses: Sequence[Hypothesis], reading: Reading, meter: Meter
) -> Array:
    """Logarithm of the density of `reading` on a bench with as many specimens of each of `hypotheses`, (hypotheses, each)."""
    shape = len(hypotheses), bench.specimens.count // len(hypotheses)
    if reading.what == "look":
        return np.array([look_log_chance(hypothesis, reading.value) for hypothesis in hypotheses])[:, None] * np.ones(shape)
    return log_density(SHOWS[reading.what](View(bench, board, reading.check, meter)), reading, meter).reshape(shape)


def _as_while_reading(healthy: Specimens, board: Board) -> Specimens:
    """Specimens drawn over all that the mains vary, most of them moved to where the mains stand while reading."""
    variation, usual = board.mains.variation, _usual(board)
    off = healthy.mains / board.mains.voltage - 1.0
    moved = np.sign(off) * np.interp(np.abs(off), [0.0, USUAL_SHARE * variation, variation], [0.0, usual, variation])
    factor = (1.0 + moved) / (1.0 + off)
    return replace(healthy, mains=healthy.mains * factor, crest=healthy.crest * factor)


def _usual(board: Board) -> float:
    """How far the mains stand from nominal while reading [1]."""
    return min(known.READING_MAINS_SPREAD, board.mains.variation)
