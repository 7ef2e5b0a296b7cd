"""Which fault accounts for the readings: Bayes' rule over specimens, in logarithms until the last line.

For every hypothesis specimens are drawn from the part tolerances and the fault's severities by one fixed sequence. A reading's
likelihood under a hypothesis is its mean over them. Hypotheses that lead are drawn a second time, closer around the severities
that account for the readings, so that a sharp reading is not judged by a handful of specimens.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from benchtool.board import Board
from benchtool.catalogue.faults import UNEXPLAINED_WEIGHT
from benchtool.catalogue.readings import READING_KINDS
from benchtool.catalogue.shown import View
from benchtool.catalogue.shows import SHOWS
from benchtool.catalogue.strikes import scene_of
from benchtool.diagnosis.hypotheses import Hypothesis, hypotheses_of
from benchtool.diagnosis.likelihood import accuracy_of, log_density, log_uniform_density, look_log_chance
from benchtool.observed import Meter, Reading
from benchtool.physics import constants as known
from benchtool.physics.bench import Bench
from benchtool.physics.laws import Array, two_sigma
from benchtool.physics.sequence import OTHER_SEVERITY, SECOND_SEVERITY, SEVERITY, coordinate
from benchtool.physics.specimens import Specimens, concatenate, population_near

DRAWN = 256
"""Specimens a hypothesis."""
REDRAWN = 1024
LEADS_FROM = 0.005
"""Share of all that is explained from which a hypothesis is drawn again around the severities that count."""
COUNTS_FROM = 1e-3
"""Share of the best specimen's likelihood from which a severity counts."""

ELSEWHERE = ("bleeder-resistance",)
"""Readings that belong to the safety findings and do not compete for the complaint."""


@dataclass(frozen=True, slots=True)
class Evidence:
    """All readings under all specimens of one hypothesis: log densities (readings, n), and log weight of each specimen (n,)."""

    hypothesis: Hypothesis
    bench: Bench
    densities: Array
    log_prior: Array
    wide: Evidence | None = None

    @property
    def first(self) -> Evidence:
        """The evidence with every severity drawn evenly, as before any reading."""
        return self if self.wide is None else self.wide

    @property
    def log_joint(self) -> Array:
        """Logarithm of each specimen's share in the likelihood of all readings, (n,)."""
        return np.asarray(self.densities.sum(axis=0) + self.log_prior)

    @property
    def log_likelihood(self) -> float:
        """Logarithm of the likelihood of all readings."""
        return log_sum(self.log_joint)

    def shares(self) -> Array:
        """Each specimen's share in the hypothesis given the readings, (n,), adding up to one."""
        return np.asarray(np.exp(self.log_joint - self.log_likelihood))


@dataclass(frozen=True, slots=True)
class Posterior:
    """Every hypothesis with its evidence and probability; `unexplained` stands apart. Probabilities add up to one.

    `explained`: the same probabilities if one of the hypotheses did account for the readings, however unlikely that is.
    """

    board: Board
    meter: Meter
    readings: tuple[Reading, ...]
    evidence: tuple[Evidence, ...]
    probabilities: Array
    unexplained: float
    uniform: Array
    explained: Array


def log_sum(values: Array) -> float:
    """Logarithm of the sum of exponentials, without overflow."""
    top = float(np.max(values))
    return top + float(np.log(np.sum(np.exp(values - top))))


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
    read, near = mains_read(readings), near_parts(board, meter, readings)
    if read is None:
        return population_near(board, count, known.READING_MAINS_SPREAD, near)
    spread = float(two_sigma(read, meter.ac_voltage.relative, meter.ac_voltage.floor)) / read
    there = replace(board, mains=replace(board.mains, voltage=read))
    return population_near(there, count, spread, near)


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


def usable(board: Board, readings: Sequence[Reading]) -> tuple[Reading, ...]:
    """The readings that weigh on the suspects, each once, in one order whatever order they were taken in."""
    weighing = [reading for reading in readings if reading.what not in ELSEWHERE]
    in_place = {_order(board, reading): reading for reading in reversed(weighing)}
    return tuple(in_place[place] for place in sorted(in_place))


def _order(board: Board, reading: Reading) -> tuple[str | int | bool | tuple[int, ...], ...]:
    """A place in line that does not hang on names; the same reading has the same place."""
    rails, loads = [rail.name for rail in board.rails], [load.name for load in board.loads]
    rail = rails.index(reading.rail) if reading.rail is not None else -1
    load = loads.index(reading.load) if reading.load is not None else -1
    on = tuple(sorted(loads.index(name) for name in reading.on or ()))
    return (reading.what, rail, load, on, reading.when, reading.lifted, str(reading.value))


def posterior_of(board: Board, meter: Meter, readings: Sequence[Reading]) -> Posterior:
    """The probabilities of everything that may be wrong with `board`, given `readings`."""
    taken = usable(board, readings)
    judge = _Judge(board, meter, taken)
    evidence = judge.first()
    evidence = [
        judge.again(item) if probability > LEADS_FROM else item
        for item, probability in zip(evidence, _normalised(_logs(evidence)), strict=True)
    ]
    probabilities, unexplained = _weigh(judge, evidence)
    explained = _normalised(_logs(evidence))
    return Posterior(board, meter, taken, tuple(evidence), probabilities, unexplained, judge.uniform, explained)


def _weigh(judge: _Judge, evidence: Sequence[Evidence]) -> tuple[Array, float]:
    """Bayes' rule: prior weight times likelihood, `unexplained` competing with readings that are mistakes."""
    unexplained = np.log(UNEXPLAINED_WEIGHT) + float(judge.uniform.sum())
    shares = _normalised(np.append(_logs(evidence), unexplained))
    return shares[:-1], float(shares[-1])


def _logs(evidence: Sequence[Evidence]) -> Array:
    return np.array([np.log(item.hypothesis.weight) + item.log_likelihood for item in evidence])


def _normalised(logs: Array) -> Array:
    return np.asarray(np.exp(logs - log_sum(logs)))


class _Judge:
    """Draws specimens of a hypothesis and judges the readings on them."""

    def __init__(self, board: Board, meter: Meter, readings: tuple[Reading, ...]) -> None:
        self.board, self.meter, self.readings = board, meter, readings
        self.uniform = np.array([log_uniform_density(reading, board) for reading in readings])
        self._mains_known = mains_read(readings) is not None

    def first(self) -> list[Evidence]:
        """Every hypothesis, its severities evenly drawn; all of them settled in one pass."""
        hypotheses = hypotheses_of(self.board)
        healthy, log_share = reading_population(self.board, self.meter, self.readings, DRAWN)
        struck = [self._strike(hypothesis, healthy, 0.0, 1.0) for hypothesis in hypotheses]
        bench = Bench(concatenate(struck), crowd=True)
        densities = self._densities(bench)
        level = np.full(DRAWN, log_share - np.log(DRAWN))
        slices = [slice(start, start + DRAWN) for start in range(0, bench.specimens.count, DRAWN)]
        return [
            self._evidence(hypothesis, bench.part(where), densities[:, where], level)
            for hypothesis, where in zip(hypotheses, slices, strict=True)
        ]

    def again(self, item: Evidence) -> Evidence:
        """A hypothesis drawn closer: only the severities that account for the readings, their chance weighed in."""
        joint = item.log_joint
        severity = coordinate(SEVERITY, len(joint))
        counts = severity[joint > joint.max() + np.log(COUNTS_FROM)]
        margin = 2.0 / len(joint)
        low, high = max(float(counts.min()) - margin, 0.0), min(float(counts.max()) + margin, 1.0)
        healthy, log_share = reading_population(self.board, self.meter, self.readings, REDRAWN)
        bench = Bench(self._strike(item.hypothesis, healthy, low, high), crowd=True)
        level = np.full(REDRAWN, log_share + np.log(high - low) - np.log(REDRAWN))
        return replace(self._evidence(item.hypothesis, bench, self._densities(bench), level), wide=item)

    def _strike(self, hypothesis: Hypothesis, healthy: Specimens, low: float, high: float) -> Specimens:
        specimens = healthy
        for number, struck in enumerate(hypothesis.faults):
            if self._mains_known and struck.fault.name in ("mains-low", "mains-high"):
                continue
            if number == 0:
                severity = low + (high - low) * coordinate(SEVERITY, healthy.count)
            else:
                severity = coordinate(SECOND_SEVERITY, healthy.count)
            scene = scene_of(self.board, struck.place, severity, coordinate(OTHER_SEVERITY, healthy.count))
            specimens = struck.fault.strike(specimens, scene)
        return specimens

    def _densities(self, bench: Bench) -> Array:
        rows = np.zeros((len(self.readings), bench.specimens.count))
        for row, reading in enumerate(self.readings):
            if reading.what in ("look", "mains-voltage"):
                continue
            rows[row] = log_density(SHOWS[reading.what](View(bench, self.board, reading.check, self.meter)), reading, self.meter)
        return rows

    def _evidence(self, hypothesis: Hypothesis, bench: Bench, densities: Array, level: Array) -> Evidence:
        rows = densities.copy()
        for row, reading in enumerate(self.readings):
            if reading.what == "look":
                rows[row] = look_log_chance(hypothesis, reading.value)
            if reading.what == "mains-voltage" and isinstance(reading.value, float):
                rows[row] = self._log_mains(hypothesis, reading.value)
        return Evidence(hypothesis, bench, rows, level)

    def _log_mains(self, hypothesis: Hypothesis, volts: float) -> float:
        """Mains are anywhere in their range; with `mains-low` and `mains-high` anywhere in a band beyond it."""
        nominal, variation = self.board.mains.voltage, self.board.mains.variation
        slack = float(two_sigma(volts, self.meter.ac_voltage.relative, self.meter.ac_voltage.floor))
        bands = {"mains-low": (0.70 - variation, 1.0 - variation), "mains-high": (1.0 + variation, 1.20 + variation)}
        low, high = bands.get(hypothesis.name, (1.0 - variation, 1.0 + variation))
        low, high = low * nominal, high * nominal
        outside = max(low - volts, volts - high, 0.0)
        return float(-np.log(max(high - low, slack)) - 0.5 * (2.0 * outside / slack) ** 2)
