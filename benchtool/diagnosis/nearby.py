"""What readings of single parts and of the mains leave of where these may lie, so that specimens can be drawn near them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from benchtool.board import Board
from benchtool.catalogue.readings import READING_KINDS
from benchtool.diagnosis.likelihood import accuracy_of
from benchtool.observed import Meter, Reading
from benchtool.physics import constants as known
from benchtool.physics.laws import two_sigma
from benchtool.physics.specimens import Specimens, population_near


def mains_read(readings: Sequence[Reading]) -> float | None:
    """The mains voltage that was read [V RMS], the mean where there are several readings; None without one."""
    read = [r.value for r in readings if r.what == "mains-voltage" and isinstance(r.value, float) and r.value > 1.0]
    return float(np.mean(sorted(read))) if read else None


def reading_population(
    board: Board, meter: Meter, readings: Sequence[Reading], count: int
) -> tuple[Specimens, float]:
    """Healthy boards as they stood while reading, and the logarithm of their share of all boards.

    Mains nominal ± 4 %, or what was read within the meter's accuracy. A part that was itself read is drawn near that value, so
    that many sharp readings of single parts do not leave a handful of specimens.
    """
    read = mains_read(readings)
    mains = None if read is None else Interval(read, float(two_sigma(read, meter.ac_voltage.relative, meter.ac_voltage.floor)))
    return healthy_near(board, near_parts(board, meter, readings), mains, count)


@dataclass(frozen=True, slots=True)
class Interval:
    """A value and how far it may be off, in one unit."""

    middle: float
    reach: float


def healthy_near(
    board: Board, near: dict[str, tuple[float, float]], mains: Interval | None, count: int
) -> tuple[Specimens, float]:
    """Healthy boards at `mains` [V], or where they usually stand, their parts `near` what they were read as."""
    if mains is None:
        return population_near(board, count, min(known.READING_MAINS_SPREAD, board.mains.variation), near)
    there = replace(board, mains=replace(board.mains, voltage=mains.middle))
    return population_near(there, count, mains.reach / mains.middle, near)


def mains_range(board: Board, meter: Meter, readings: Sequence[Reading]) -> Interval | None:
    """What is left of the range of the mains [V] by a reading of them; None without one, or where it is beyond that range."""
    read = mains_read(readings)
    if read is None:
        return None
    sigma = float(two_sigma(read, meter.ac_voltage.relative, meter.ac_voltage.floor)) / 2.0
    nominal, variation = board.mains.voltage, board.mains.variation
    low = max(read - NEAR_SIGMAS * sigma, nominal * (1.0 - variation))
    high = min(read + NEAR_SIGMAS * sigma, nominal * (1.0 + variation))
    return Interval((low + high) / 2.0, (high - low) / 2.0) if low < high else None


OF_ONE_PART = {
    "dropper-capacitance": "dropper",
    "inrush-resistance": "inrush",
    "feed-resistance": "feed:{rail}",
    "zener-test": "zener:{rail}",
    "reservoir-capacitance": "reservoir:{rail}",
    "coil-resistance": "load:{load}",
    "load-current": "load:{load}",
}
"""Readings that show the value of one part and nothing else."""
NEAR_SIGMAS = 4.0
PART_ERROR = 0.03
"""One sigma, as a share, that covers the physics' error and smoothing of these readings."""


def near_parts(board: Board, meter: Meter, readings: Sequence[Reading]) -> dict[str, tuple[float, float]]:
    """Between which values a part lies that was read by itself, by its name in the case file."""
    near: dict[str, tuple[float, float]] = {}
    for reading in readings:
        drawn = [load.kind for load in board.loads if load.name == reading.load and reading.what == "load-current"]
        across_bleeder = reading.what == "dropper-capacitance" and not reading.lifted and board.bleeder is not None
        if reading.what in OF_ONE_PART and isinstance(reading.value, float) and not across_bleeder and drawn in ([], ["current"]):
            accuracy = accuracy_of(READING_KINDS[reading.what], meter)
            limit = float(two_sigma(reading.value, accuracy.relative, accuracy.floor)) / 2.0
            width = NEAR_SIGMAS * float(np.hypot(limit, PART_ERROR * reading.value))
            name = OF_ONE_PART[reading.what].format(rail=reading.rail, load=reading.load)
            near[name] = reading.value - width, reading.value + width
    return near
