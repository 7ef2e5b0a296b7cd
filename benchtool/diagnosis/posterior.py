"""Which fault accounts for the readings: Bayes' rule over specimens, in logarithms until the last line.

Every hypothesis has specimens, drawn from the part tolerances and the fault's severities by one fixed sequence (`crowd.py`). A
reading's likelihood under a hypothesis is its mean over them. A leading hypothesis that sharp readings leave few specimens is
drawn again, closer around the parts and severities that account for them, so that it is not judged by a handful.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from benchtool.board import Board
from benchtool.catalogue.faults import UNEXPLAINED_WEIGHT
from benchtool.diagnosis.closer import Closer, drawn_closer
from benchtool.diagnosis.crowd import Crowd, crowd_of
from benchtool.diagnosis.hypotheses import Hypothesis
from benchtool.diagnosis.likelihood import effective_number, log_sum, log_uniform_density, tempered
from benchtool.diagnosis.nearby import mains_read
from benchtool.diagnosis.pairs import promising_pairs
from benchtool.observed import Meter, Reading
from benchtool.physics.laws import Array

LEADS_FROM = 0.005
"""Share of all that is explained from which a hypothesis leads."""
MOST_LEADERS = 6
LIKE_A_MISTAKE = 3.0
"""Natural logarithm by which a mistake must account for a reading better than the first hypothesis does."""
ENOUGH = 0.15
"""Share of its specimens that a leading hypothesis must still be worth to be judged as it stands."""
SPREAD_OVER = 24.0
"""Effective number of specimens over which a hypothesis is spread at least where what it would show next is foretold."""

ELSEWHERE = ("bleeder-resistance",)
"""Readings that belong to the safety findings and do not compete for the complaint."""


@dataclass(frozen=True, slots=True)
class Posterior:
    """Every hypothesis of the crowd with its probability; `unexplained` stands apart. Probabilities add up to one.

    densities (readings, hypotheses, each): logarithm of each reading's density; log_prior (hypotheses, each): of the specimens'
    weights; log_likelihood (hypotheses,): of all readings. `explained`: the probabilities if one of the hypotheses did account
    for the readings, however unlikely that is. `uniform` (readings,): log densities of mistakes. `closer`, by hypothesis.
    """

    crowd: Crowd
    meter: Meter
    readings: tuple[Reading, ...]
    densities: Array
    log_prior: Array
    log_likelihood: Array
    closer: dict[int, Closer]
    probabilities: Array
    unexplained: float
    uniform: Array
    explained: Array

    @property
    def board(self) -> Board:
        """The board."""
        return self.crowd.board

    @property
    def hypotheses(self) -> tuple[Hypothesis, ...]:
        """Everything that may be wrong with it."""
        return self.crowd.hypotheses

    def alone(self) -> Array:
        """Logarithm of the likelihood of every reading by itself, (readings, hypotheses)."""
        return log_sum(self.densities + self.log_prior)

    def shares(self) -> Array:
        """Each specimen's share in its hypothesis as the readings leave it, (hypotheses, each), rows adding up to one.

        Where sharp readings leave but a few they are spread over more, for what is foretold from them is no better than that.
        """
        joint = self.densities.sum(axis=0) + self.log_prior
        return np.array([tempered(row, SPREAD_OVER) for row in joint])


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
    """The probabilities of everything that may be wrong with `board`, given `readings`.

    Where a reading is more like a mistake under what accounts for the rest, pairs of faults that account for both come in.
    """
    taken, crowd = usable(board, readings), crowd_of(board)
    found = _weighed(crowd, meter, taken)
    logs = found.log_likelihood + crowd.log_weights
    alone, best = found.alone(), int(np.argmax(logs))
    if not (alone[:, best] < found.uniform - LIKE_A_MISTAKE).any():
        return found
    pairs = promising_pairs(crowd.hypotheses, alone, float(logs[best]) + float(np.log(LEADS_FROM)))
    return _weighed(crowd.extended(pairs), meter, taken) if pairs else found


def _weighed(crowd: Crowd, meter: Meter, taken: tuple[Reading, ...]) -> Posterior:
    """Bayes' rule: prior weight times likelihood, `unexplained` competing with readings that are mistakes."""
    densities = np.array([crowd.densities(reading, meter) for reading in taken]).reshape(len(taken), *crowd.shape)
    log_prior = crowd.log_prior(mains_read=mains_read(taken) is not None)
    joint = densities.sum(axis=0) + log_prior
    logs, weights = log_sum(joint), crowd.log_weights
    closer = drawn_closer(crowd, meter, taken, joint, _leaders(densities, log_prior, logs, weights))
    for index, item in closer.items():
        logs[index] = log_sum(item.joint)
    uniform = np.array([log_uniform_density(reading, crowd.board) for reading in taken])
    shares = _normalised(np.append(logs + weights, np.log(UNEXPLAINED_WEIGHT) + float(uniform.sum())))
    return Posterior(
        crowd=crowd,
        meter=meter,
        readings=taken,
        densities=densities,
        log_prior=log_prior,
        log_likelihood=logs,
        closer=closer,
        probabilities=shares[:-1],
        unexplained=float(shares[-1]),
        uniform=uniform,
        explained=_normalised(logs + weights),
    )


def _normalised(logs: Array) -> Array:
    return np.asarray(np.exp(logs - log_sum(logs)))


def _leaders(densities: Array, log_prior: Array, logs: Array, weights: Array) -> list[int]:
    """The hypotheses worth drawing again: left but few specimens, and in the lead, or it may be so.

    Where two sharp readings leave hardly a specimen that accounts for both, the product of what each is worth by itself tells
    what the hypothesis may come to.
    """
    joint = densities.sum(axis=0) + log_prior
    apart = log_sum(densities + log_prior).sum(axis=0) if len(densities) else logs
    hope = _normalised(np.maximum(logs, apart) + weights)
    few = effective_number(joint) < ENOUGH * joint.shape[1]
    ordered = np.argsort(-hope, kind="stable")[:MOST_LEADERS]
    return [int(index) for index in ordered if few[index] and hope[index] > LEADS_FROM]
