"""What the dropper acts as: current and capacitance back-solved from the readings, with the marked loads.

A rail that regulates only tells that the supply is at least enough; one that has left regulation tells how much it gets.
Low and high are the 2.5 and 97.5 % points over part tolerances, mains, crest factor and meter; the dropper's own tolerance has
no part in them, since it is what is asked for.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import lru_cache

import numpy as np

from benchtool.board import Board, nominal_voltage
from benchtool.catalogue.readings import READING_KINDS
from benchtool.catalogue.shown import View
from benchtool.catalogue.shows import LINE_ERROR, RAIL_ERROR, SHOWS
from benchtool.diagnosis.likelihood import accuracy_of
from benchtool.diagnosis.nearby import near_parts, reading_population
from benchtool.observed import Check, Meter, Reading
from benchtool.physics.bench import Bench
from benchtool.physics.budget import (
    agreed,
    back_solved_capacitance,
    capacitance_giving,
    dropout_capacitance,
    regulating,
)
from benchtool.physics.laws import Array, two_sigma
from benchtool.physics.mean_value import demand_at, means
from benchtool.physics.sequence import METER, coordinate
from benchtool.physics.specimens import Specimens, as_marked

DRAWN = 256
MOSTLY = 0.5
"""Share of healthy boards that must regulate in a state before a reading there can say that the rail does."""
LOW, HIGH = 2.5, 97.5
"""Percent points of a 95 % band."""
BARELY = 2.0
"""A supply under this many times what the bleeder alone brings cannot be told from one without a dropper."""
BY_LINE = ("line-current", "inrush-voltage")
"""Readings that tell the dropper's current on the mains side."""


@dataclass(frozen=True, slots=True)
class Effective:
    """Back-solved current into the first rail [A] and dropper [F]; None where only a bound, or nothing, is known.

    `smooth`: whether the first rail is; of one that is not the mean tells only the least supply.
    """

    capacitance: float | None = None
    capacitance_low: float | None = None
    capacitance_high: float | None = None
    current: float | None = None
    current_low: float | None = None
    current_high: float | None = None
    smooth: bool = True
    readings: tuple[Reading, ...] = ()

    @property
    def spread(self) -> float:
        """High over low; infinite for a mere bound."""
        if self.current_low is None or self.current_high is None or self.current_low <= 0.0:
            return float("inf")
        return self.current_high / self.current_low


def effective_of(board: Board, meter: Meter, readings: Sequence[Reading]) -> Effective:
    """The tightest figure that one of the readings gives, else the best lower bound, else nothing."""
    telling = tuple(reading for reading in readings if near_parts(board, meter, [reading]) or reading.what == "mains-voltage")
    solver, smooth = _solver(board, meter, telling, DRAWN), not any(_rough(board, reading) for reading in readings)
    figures = [figure for reading in readings if (figure := solver.figure(reading, smooth=smooth)) is not None]
    if figures:
        return min(figures, key=lambda figure: figure.spread)
    bounds = [bound for reading in readings if (bound := solver.bound(reading)) is not None]
    return max(bounds, key=lambda bound: bound.current_low or 0.0, default=Effective())


ROUGH_PP, ROUGH_RMS, ROUGH_RESERVOIR = 0.10, 0.03, 0.5
"""Ripple over the rail's nominal voltage, reservoir over its mark: beyond them the mean of the first rail sags by itself."""


def _rough(board: Board, reading: Reading) -> bool:
    """Whether this reading says that the first rail is not smooth, so that its mean tells only the least supply."""
    first = board.rails[0]
    volts = nominal_voltage(board, first)
    if reading.rail != first.name or not isinstance(reading.value, float):
        return False
    if reading.what == "reservoir-capacitance" and first.reservoir is not None:
        mark = first.reservoir.capacitance
        return isinstance(mark, float) and reading.value < ROUGH_RESERVOIR * mark
    limits = {"rail-ripple": ROUGH_PP, "rail-ripple-rms": ROUGH_RMS}
    return volts is not None and reading.what in limits and reading.value > limits[reading.what] * volts


@lru_cache(maxsize=32)
def _solver(board: Board, meter: Meter, readings: tuple[Reading, ...], count: int) -> _Solver:
    return _Solver(board, meter, readings, count)


class _Solver:
    """The healthy spread of the board with everything but the dropper, and the board as marked; `readings` are those that say
    where the spread lies. What was worked out for a reading is kept.
    """

    def __init__(self, board: Board, meter: Meter, readings: Sequence[Reading], count: int) -> None:
        self.board, self.meter = board, meter
        self.spread, _ = reading_population(board, meter, readings, count)
        self.marked = as_marked(board)
        self.bench = Bench(self.spread, crowd=True)
        self._kept: dict[tuple[Reading, str], Effective | None] = {}

    def figure(self, reading: Reading, *, smooth: bool) -> Effective | None:
        """What this reading says outright, or None where it says nothing or only a bound; `smooth`: the first rail is."""
        key = reading, "smooth" if smooth else "rough"
        if key not in self._kept:
            self._kept[key] = self._figure(reading, smooth)
        return self._kept[key]

    def bound(self, reading: Reading) -> Effective | None:
        """The least supply that holds the first rail where this reading found it regulating."""
        key = reading, "bound"
        if key not in self._kept:
            self._kept[key] = self._bound(reading)
        return self._kept[key]

    def _figure(self, reading: Reading, smooth: bool) -> Effective | None:
        if not isinstance(reading.value, float):
            return None
        if reading.what == "rail-voltage" and self._on_first_rail(reading):
            low = self._band(reading) == "below" and smooth
            return self._by_rail(reading, reading.value) if low else None
        if reading.what in BY_LINE and self.board.dropper.kind == "capacitor":
            return self._by_line(reading, reading.value)
        return None

    def _bound(self, reading: Reading) -> Effective | None:
        if reading.what != "rail-voltage" or not self._on_first_rail(reading):
            return None
        band = self._band(reading)
        if band == "below" and isinstance(reading.value, float):
            whole = self._by_rail(reading, reading.value)
            return Effective(
                capacitance_low=whole.capacitance_low,
                current_low=whole.current_low,
                smooth=False,
                readings=whole.readings,
            )
        if band != "within":
            return None
        on, warm = reading.on or (), reading.when == "warm"
        if self.board.dropper.kind != "capacitor" or self.board.rails[0].zener is None:
            return None
        capacitance = dropout_capacitance(self.spread, on, warm=warm)
        low = _point(capacitance, LOW)
        if low is None:
            return None
        held = _with(self.spread, capacitance)
        supply = means(held, on, warm=warm).supply_current
        return Effective(capacitance_low=low, current_low=_point(supply, LOW), readings=(reading,))

    def _on_first_rail(self, reading: Reading) -> bool:
        return reading.rail == self.board.rails[0].name

    def _band(self, reading: Reading) -> str:
        """Whether the reading lies below, within or above what healthy boards show; below also where they do not regulate."""
        regulates = regulating(self.bench.settled(reading.on, warm=reading.when == "warm"), 0)
        if regulates is None or float(np.mean(regulates)) < MOSTLY:
            return "below"
        shown = SHOWS[reading.what](View(self.bench, self.board, reading.check, self.meter)).value
        assert shown is not None
        assert isinstance(reading.value, float)
        slack = self._two_sigma(reading.check, reading.value)
        if reading.value < np.percentile(shown, LOW) - slack:
            return "below"
        return "above" if reading.value > np.percentile(shown, HIGH) + slack else "within"

    def _two_sigma(self, check: Check, value: float) -> float:
        accuracy = accuracy_of(READING_KINDS[check.what], self.meter)
        return float(two_sigma(value, accuracy.relative, accuracy.floor))

    def _read(self, reading: Reading, value: float) -> Array:
        """The true value behind the reading, spread over the two sigma of meter and physics, (n,)."""
        share = LINE_ERROR if reading.what in BY_LINE else RAIL_ERROR
        limit = np.hypot(self._two_sigma(reading.check, value), 2.0 * share * abs(value))
        return np.asarray(np.maximum(value + limit * (2.0 * coordinate(METER, DRAWN) - 1.0), 0.0))

    def _by_rail(self, reading: Reading, value: float) -> Effective:
        on, warm = reading.on or (), reading.when == "warm"
        read, here = self._read(reading, value), np.full(self.marked.count, value)
        current = demand_at(self.spread, on, warm, read)
        nominal = demand_at(self.marked, on, warm, here)
        capacitor = self.board.dropper.kind == "capacitor"
        capacitance = back_solved_capacitance(self.spread, current, read) if capacitor else np.full(DRAWN, np.nan)
        at_mark = back_solved_capacitance(self.marked, nominal, here) if capacitor else np.array([np.nan])
        return _effective(reading, at_mark, capacitance, nominal, current)

    def _by_line(self, reading: Reading, value: float) -> Effective | None:
        on, warm, what = reading.on or (), reading.when == "warm", reading.what

        def solve(specimens: Specimens, read: Array) -> tuple[Array, Array]:
            if what == "inrush-voltage":
                read = read / specimens.inrush
            capacitance = capacitance_giving(specimens, on, warm, lambda found: found.line_current, read)
            found = means(_with(specimens, capacitance), on, warm=warm)
            return capacitance, np.where(np.isfinite(capacitance), found.supply_current, np.nan)

        capacitance, current = solve(self.spread, self._read(reading, value))
        if _point(capacitance, LOW) is None:
            return None
        at_mark, nominal = solve(self.marked, np.full(self.marked.count, value))
        found = _effective(reading, at_mark, capacitance, nominal, current)
        if found.current is None or found.current > BARELY * self._without_dropper(on, warm):
            return found
        return replace(found, capacitance=None, capacitance_low=0.0)

    def _without_dropper(self, on: tuple[str, ...], warm: bool) -> float:
        """The current that the bleeder alone would bring into the first rail of the board as marked [A]."""
        bare = replace(self.marked, capacitance=1e-6 * self.marked.capacitance)
        return float(np.mean(means(bare, on, warm=warm).supply_current))


def _with(specimens: Specimens, capacitance: Array) -> Specimens:
    return replace(specimens, capacitance=np.where(capacitance > 0.0, capacitance, 1e-6 * specimens.capacitance))


def _effective(reading: Reading, at_mark: Array, capacitance: Array, nominal: Array, current: Array) -> Effective:
    return Effective(
        capacitance=agreed(at_mark),
        capacitance_low=_point(capacitance, LOW),
        capacitance_high=_point(capacitance, HIGH),
        current=agreed(nominal),
        current_low=_point(current, LOW),
        current_high=_point(current, HIGH),
        readings=(reading,),
    )


def _point(values: Array, percent: float) -> float | None:
    """A percent point, or None where more than a tenth of the specimens have no answer."""
    finite = values[np.isfinite(values)]
    return None if finite.size < 0.9 * values.size else float(np.percentile(finite, percent))
