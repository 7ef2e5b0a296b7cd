"""Every fault this tool knows: where on a board it can sit, how often it does, what shows of it, what it does to a specimen.

One row a fault in `FAULTS`; what it does to the parts stands in `strikes.py`. Weights are per thousand and signs in percent:
common practice, no source; they describe boards of this kind after 5 to 20 years. Edit them here.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from benchtool.board import Board
from benchtool.catalogue import strikes
from benchtool.catalogue.strikes import Place, Strike

Places = Callable[[Board], tuple[Place, ...]]

ANYWHERE = (Place(),)


def _if(present: Callable[[Board], bool]) -> Places:
    return lambda board: ANYWHERE if present(board) else ()


def _rails(suits: Callable[[Board, int], bool]) -> Places:
    return lambda board: tuple(
        Place(rail=index, name=rail.name) for index, rail in enumerate(board.rails) if suits(board, index)
    )


def _loads(suits: Callable[[Board, int], bool]) -> Places:
    return lambda board: tuple(
        Place(load=index, name=load.name) for index, load in enumerate(board.loads) if suits(board, index)
    )


@dataclass(frozen=True, slots=True)
class Fault:
    """One kind of fault. `part` and `label` may hold {name}, the rail's or load's name.

    `weight` is shared by all places; `sign` is the chance [%] that a look shows `sign_word`.
    """

    name: str
    part: str
    label: str
    weight: float
    sign: float
    sign_word: str
    places: Places
    strike: Strike

    def part_at(self, place: Place) -> str:
        """The part's name as the case file writes it."""
        return self.part.format(name=place.name)

    def label_at(self, place: Place) -> str:
        """The fault in words, with its part first."""
        return self.label.format(name=place.name)


def _capacitor(board: Board) -> bool:
    return board.dropper.kind != "resistor"


def _divider(board: Board) -> bool:
    return board.dropper.kind == "divider"


def _zener(board: Board, index: int) -> bool:
    return board.rails[index].zener is not None


def _reservoir(board: Board, index: int) -> bool:
    return board.rails[index].reservoir is not None


def _fed(board: Board, index: int) -> bool:
    return board.rails[index].fed_through in ("resistor", "regulator")


def _by_resistor(board: Board, index: int) -> bool:
    return board.rails[index].fed_through == "resistor"


def _coil(board: Board, index: int) -> bool:
    return board.loads[index].kind == "coil"


def _switched(board: Board, index: int) -> bool:
    return board.loads[index].switched


def _any(board: Board, index: int) -> bool:
    return True


def _not_coil(board: Board, index: int) -> bool:
    return board.loads[index].kind != "coil"


def _wrong(board: Board) -> bool:
    return board.dropper.fitted is not None and board.dropper.fitted != board.dropper.capacitance


CRACKED, SCORCHED, BROWNED = "cracked dropper", "scorched inrush", "browned board"
BURNT, BULGED, DRY = "burnt zener", "bulged reservoir", "dry joint"

FAULTS: tuple[Fault, ...] = (
    Fault("dropper-capacitance-lost", "dropper", "dropper: capacitance lost", 500, 3, CRACKED, _if(_capacitor), strikes.dropper_lost),
    Fault("dropper-open", "dropper", "dropper: open", 15, 10, CRACKED, lambda board: ANYWHERE, strikes.dropper_open),
    Fault("dropper-short", "dropper", "dropper: shorted", 5, 60, CRACKED, lambda board: ANYWHERE, strikes.dropper_short),
    Fault("wrong-part", "dropper", "dropper: wrong value fitted", 5, 50, "earlier repair", _if(_wrong), strikes.wrong_part),
    Fault("shunt-capacitor-lost", "shunt", "divider's second capacitor: capacitance lost", 60, 3, CRACKED, _if(_divider), strikes.shunt_lost),
    Fault("shunt-capacitor-open", "shunt", "divider's second capacitor: open", 5, 10, CRACKED, _if(_divider), strikes.shunt_open),
    Fault("shunt-capacitor-short", "shunt", "divider's second capacitor: shorted", 3, 60, CRACKED, _if(_divider), strikes.shunt_short),
    Fault("fuse-open", "fuse", "fuse: open", 10, 50, "blown fuse", _if(lambda board: board.fuse is not None), strikes.fuse_open),
    Fault(
        "varistor-short", "varistor", "varistor: shorted", 8, 85, "cracked varistor",
        _if(lambda board: board.varistor is not None), strikes.varistor_short,
    ),
    Fault("inrush-open", "inrush", "inrush resistor: open", 55, 50, SCORCHED, _if(lambda b: b.inrush is not None), strikes.inrush_open),
    Fault("inrush-high", "inrush", "inrush resistor: risen", 8, 50, SCORCHED, _if(lambda b: b.inrush is not None), strikes.inrush_high),
    Fault("diode-open", "rectifier", "rectifier: a diode open", 5, 5, BROWNED, lambda board: ANYWHERE, strikes.diode_open),
    Fault("diode-short", "rectifier", "rectifier: a diode shorted", 12, 10, BROWNED, lambda board: ANYWHERE, strikes.diode_short),
    Fault("zener-open", "zener:{name}", "{name} zener: open", 5, 30, BURNT, _rails(_zener), strikes.zener_open),
    Fault("zener-short", "zener:{name}", "{name} zener: shorted", 35, 25, BURNT, _rails(_zener), strikes.zener_short),
    Fault("zener-low", "zener:{name}", "{name} zener: conducts too low", 8, 15, BURNT, _rails(_zener), strikes.zener_low),
    Fault("reservoir-dried", "reservoir:{name}", "{name} reservoir: dried out", 95, 30, BULGED, _rails(_reservoir), strikes.reservoir_dried),
    Fault("reservoir-leaky", "reservoir:{name}", "{name} reservoir: leaky", 15, 40, BULGED, _rails(_reservoir), strikes.reservoir_leaky),
    Fault("board-leakage", "rail:{name}", "{name}: leakage over the board", 8, 70, "residue", _rails(_any), strikes.board_leakage),
    Fault("feed-open", "feed:{name}", "{name} feed: open", 10, 30, BROWNED, _rails(_fed), strikes.feed_open),
    Fault("feed-high", "feed:{name}", "{name} feed: risen", 5, 30, BROWNED, _rails(_by_resistor), strikes.feed_high),
    Fault("feed-short", "feed:{name}", "{name} feed: shorted", 4, 15, BROWNED, _rails(_fed), strikes.feed_short),
    Fault("load-excess", "load:{name}", "{name}: draws too much", 15, 10, BROWNED, _loads(_any), strikes.load_excess),
    Fault("load-open", "load:{name}", "{name}: draws nothing", 5, 10, BROWNED, _loads(_not_coil), strikes.load_open),
    Fault("coil-open", "load:{name}", "{name} coil: open", 8, 3, BROWNED, _loads(_coil), strikes.load_open),
    Fault("coil-shorted-turns", "load:{name}", "{name} coil: shorted turns", 4, 25, BROWNED, _loads(_coil), strikes.shorted_turns),
    Fault("switch-open", "load:{name}", "{name}'s transistor: open", 10, 5, BROWNED, _loads(_switched), strikes.switch_open),
    Fault("switch-stuck-on", "load:{name}", "{name}'s transistor: stuck on", 10, 8, BROWNED, _loads(_switched), strikes.switch_stuck),
    Fault("joint-open", "joint", "joint or track: open", 35, 60, DRY, strikes.joints, strikes.joint_open),
    Fault("mains-low", "mains", "mains: below its range", 3, 0, BROWNED, lambda board: ANYWHERE, strikes.mains_low),
    Fault("mains-high", "mains", "mains: above its range", 1, 0, BROWNED, lambda board: ANYWHERE, strikes.mains_high),
)
FAULTS_BY_NAME = {fault.name: fault for fault in FAULTS}

NO_FAULT = "no-fault"
UNEXPLAINED = "unexplained"
NO_FAULT_WEIGHT = 80.0
UNEXPLAINED_WEIGHT = 12.0

SOUND_SIGNS = {BROWNED: 1.0 / 3.0, DRY: 0.10, "earlier repair": 0.10}
"""What a look shows on a sound old board; every other word `SOUND_OTHER` of the time. Common practice, no source."""
SOUND_OTHER = 0.01


@dataclass(frozen=True, slots=True)
class Pair:
    """Two faults that occur together in the trade, the cause first; `seldom_alone` where the cause rarely comes by itself."""

    cause: str
    effect: str
    seldom_alone: bool = False


PAIRS: tuple[Pair, ...] = (
    Pair("dropper-short", "inrush-open", seldom_alone=True),
    Pair("dropper-short", "fuse-open", seldom_alone=True),
    Pair("dropper-short", "zener-short", seldom_alone=True),
    Pair("varistor-short", "fuse-open", seldom_alone=True),
    Pair("zener-open", "reservoir-leaky"),
    Pair("zener-open", "load-excess"),
    Pair("dropper-capacitance-lost", "reservoir-dried"),
)
PAIR_SHARE = 0.1
"""A pair's weight as a share of its rarer part's weight."""
SELDOM_ALONE_SHARE = 0.8
"""Share of `seldom_alone` causes that come with one of their pairs."""
