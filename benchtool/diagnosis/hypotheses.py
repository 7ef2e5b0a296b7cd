"""What may be wrong with a board: every fault at every place it can sit, the pairs of the trade, and no fault at all."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from benchtool.board import Board
from benchtool.catalogue.faults import (
    FAULTS,
    FAULTS_BY_NAME,
    NO_FAULT,
    NO_FAULT_WEIGHT,
    PAIR_SHARE,
    PAIRS,
    SELDOM_ALONE_SHARE,
    Fault,
    Pair,
)
from benchtool.catalogue.strikes import Place

SAID = {"wrong-part": 100.0}
"""Times its weight that a fault counts which the case file itself speaks for: a print unlike the value that the board wants is a
hundred times likelier where that is what ails it. Common practice, no source.
"""


@dataclass(frozen=True, slots=True)
class Struck:
    """One fault at one place."""

    fault: Fault
    place: Place


@dataclass(frozen=True, slots=True)
class Hypothesis:
    """A way the board may be: the faults on it, the cause first, none for a sound board; `weight` is relative [per mille]."""

    faults: tuple[Struck, ...]
    weight: float

    @property
    def name(self) -> str:
        """The first fault's name."""
        return self.faults[0].fault.name if self.faults else NO_FAULT

    @property
    def label(self) -> str:
        """The hypothesis in words."""
        if not self.faults:
            return "no fault in this supply"
        return ", with ".join(struck.fault.label_at(struck.place) for struck in self.faults)


def hypotheses_of(board: Board) -> tuple[Hypothesis, ...]:
    """Every hypothesis for `board`, the sound board first. A fault's weight is shared by its places; absent parts drop out."""
    places = {fault.name: fault.places(board) for fault in FAULTS}
    singles = [
        Hypothesis((Struck(fault, place),), _alone(fault, places) * SAID.get(fault.name, 1.0) / len(places[fault.name]))
        for fault in FAULTS
        for place in places[fault.name]
    ]
    pairs = [hypothesis for pair in PAIRS for hypothesis in _pair(pair, places)]
    return (Hypothesis((), NO_FAULT_WEIGHT), *singles, *pairs)


def _possible(pair: Pair, places: dict[str, tuple[Place, ...]]) -> bool:
    return bool(places[pair.cause] and places[pair.effect])


def _alone(fault: Fault, places: dict[str, tuple[Place, ...]]) -> float:
    seldom = any(pair.cause == fault.name and pair.seldom_alone and _possible(pair, places) for pair in PAIRS)
    return fault.weight * (1.0 - SELDOM_ALONE_SHARE) if seldom else fault.weight


def _pair(pair: Pair, places: dict[str, tuple[Place, ...]]) -> Iterator[Hypothesis]:
    cause, effect = FAULTS_BY_NAME[pair.cause], FAULTS_BY_NAME[pair.effect]
    joint = [(here, there) for here in places[cause.name] for there in places[effect.name] if _together(here, there, effect)]
    if pair.seldom_alone:
        siblings = [other for other in PAIRS if other.cause == pair.cause and _possible(other, places)]
        weight = cause.weight * SELDOM_ALONE_SHARE / max(len(siblings), 1)
    else:
        weight = PAIR_SHARE * min(cause.weight, effect.weight)
    for here, there in joint:
        yield Hypothesis((Struck(cause, here), Struck(effect, there)), weight / len(joint))


def _together(here: Place, there: Place, effect: Fault) -> bool:
    """An open zener harms the reservoir of its own rail; everything else may sit anywhere."""
    return not (effect.name == "reservoir-leaky" and here.rail is not None and here.rail != there.rail)
