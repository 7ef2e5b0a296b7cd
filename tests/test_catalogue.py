"""The catalogue against the case format: every reading and every fault of its two tables, with the published weights and signs.

The tables below are copied from the case format (section 1) and from the published values; they are not read from the code.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from benchtool.board import Board
from benchtool.catalogue.accepted import accepted
from benchtool.catalogue.faults import (
    FAULTS,
    FAULTS_BY_NAME,
    NO_FAULT,
    NO_FAULT_WEIGHT,
    PAIR_SHARE,
    PAIRS,
    SELDOM_ALONE_SHARE,
    SOUND_SIGNS,
    UNEXPLAINED,
    UNEXPLAINED_WEIGHT,
)
from benchtool.catalogue.readings import READING_KINDS, READINGS
from benchtool.catalogue.shown import View
from benchtool.catalogue.shows import SHOWS
from benchtool.catalogue.strikes import scene_of
from benchtool.diagnosis.safety import SENTENCES
from benchtool.observed import Check, Meter
from benchtool.physics.bench import Bench
from benchtool.physics.specimens import Specimens, population
from tests.some_boards import CONTRACT, FULL, every_board

OS = ("open", "short")
GOS = ("good", "open", "short")
LOOKS = (
    "nothing seen", "bulged reservoir", "scorched inrush", "burnt zener", "cracked dropper", "cracked varistor", "blown fuse",
    "browned board", "residue", "dry joint", "earlier repair",
)
# source: the case format, section 1, table of readings: what, qualifiers, unit, condition, words, minutes
TABLE: tuple[tuple[str, tuple[str, ...], str | None, str, tuple[str, ...], float], ...] = (
    ("mains-voltage", (), "V", "live", (), 1),
    ("rail-voltage", ("rail", "on"), "V", "live", (), 1),
    ("rail-ripple", ("rail", "on"), "V", "live", (), 4),
    ("rail-ripple-rms", ("rail", "on"), "V", "live", (), 1),
    ("line-current", ("on",), "A", "live", (), 8),
    ("inrush-voltage", ("on",), "V", "live", (), 2),
    ("dropper-voltage", ("on",), "V", "live", (), 2),
    ("dropper-dc-voltage", ("on",), "V", "live", (), 2),
    ("load-responds", ("load",), None, "live", ("yes", "no", "always on", "chatters", "lets go"), 1),
    ("dropper-capacitance", ("lifted",), "F", "dead", OS, 2),
    ("shunt-capacitance", (), "F", "dead", OS, 6),
    ("fuse-resistance", (), "ohm", "dead", ("open",), 1),
    ("varistor-resistance", (), "ohm", "dead", OS, 4),
    ("path-resistance", (), "ohm", "dead", ("open",), 1),
    ("inrush-resistance", (), "ohm", "dead", OS, 1),
    ("bleeder-resistance", (), "ohm", "dead", ("open",), 1),
    ("rectifier-test", (), None, "dead", GOS, 3),
    ("feed-resistance", ("rail",), "ohm", "dead", OS, 1),
    ("zener-test", ("rail",), "V", "dead", OS, 6),
    ("reservoir-capacitance", ("rail",), "F", "dead", OS, 5),
    ("reservoir-esr", ("rail",), "ohm", "dead", ("open",), 1),
    ("reservoir-leakage", ("rail",), "A", "dead", (), 10),
    ("rail-leakage", ("rail",), "A", "dead", (), 10),
    ("rail-injection", ("rail", "on", "clamp", "limit"), "V", "dead", (), 3),
    ("load-current", ("load",), "A", "dead", (), 6),
    ("coil-resistance", ("load",), "ohm", "dead", OS, 1),
    ("switch-test", ("load",), None, "dead", GOS, 4),
    ("tap-test", (), None, "dead", ("no change", "cuts out", "comes back"), 4),
    ("look", ("rail", "load"), None, "dead", LOOKS, 2),
)
# source: the case format, section 1, table of faults: name → qualifier
QUALIFIER = {
    **dict.fromkeys((
        "dropper-capacitance-lost", "dropper-open", "dropper-short", "wrong-part", "fuse-open", "varistor-short", "inrush-open",
        "inrush-high", "diode-open", "diode-short", "mains-low", "mains-high",
    ), ""),
    **dict.fromkeys((
        "zener-open", "zener-short", "zener-low", "reservoir-dried", "reservoir-leaky", "board-leakage", "feed-open", "feed-high",
        "feed-short",
    ), "rail"),
    **dict.fromkeys(("load-excess", "load-open", "coil-open", "coil-shorted-turns", "switch-open", "switch-stuck-on"), "load"),
}
DIVIDER = ("shunt-capacitor-lost", "shunt-capacitor-open", "shunt-capacitor-short")
SAFETY_FAULTS = ("bleeder-open", "bleeder-low")
# source: the published values, priors: fault → weight per thousand, sign in percent
PRIORS = {
    "dropper-capacitance-lost": (500, 3), "dropper-open": (15, 10), "dropper-short": (5, 60), "inrush-open": (55, 50),
    "inrush-high": (8, 50), "fuse-open": (10, 50), "varistor-short": (8, 85), "diode-open": (5, 5), "diode-short": (12, 10),
    "zener-open": (5, 30), "zener-short": (35, 25), "zener-low": (8, 15), "reservoir-dried": (95, 30),
    "reservoir-leaky": (15, 40), "board-leakage": (8, 70), "feed-open": (10, 30), "feed-high": (5, 30), "feed-short": (4, 15),
    "load-excess": (15, 10),
    "load-open": (5, 10), "joint-open": (35, 60), "coil-open": (8, 3), "coil-shorted-turns": (4, 25), "wrong-part": (5, 50),
    "switch-open": (10, 5), "switch-stuck-on": (10, 8), "mains-low": (3, 0), "mains-high": (1, 0),
}
NAMED_PAIRS = {
    ("dropper-short", "inrush-open"), ("dropper-short", "fuse-open"), ("dropper-short", "zener-short"),
    ("varistor-short", "fuse-open"), ("zener-open", "reservoir-leaky"), ("zener-open", "load-excess"),
    ("dropper-capacitance-lost", "reservoir-dried"),
}
RAIL_OR_LOAD = {"rail", "load"}


# --- readings


def test_the_readings_are_those_of_the_table() -> None:
    assert [kind.name for kind in READINGS] == [row[0] for row in TABLE]


@pytest.mark.parametrize("row", TABLE, ids=lambda row: row[0])
def test_a_reading_is_as_the_table_says(row: tuple[str, tuple[str, ...], str | None, str, tuple[str, ...], float]) -> None:
    name, qualifiers, unit, condition, words, minutes = row
    kind = READING_KINDS[name]
    assert {*kind.needs, *kind.may} == set(qualifiers)
    assert set(kind.needs) == (set() if name == "look" else RAIL_OR_LOAD & set(qualifiers))
    assert (kind.unit, kind.condition, set(kind.words), kind.minutes) == (unit, condition, set(words), minutes)
    assert kind.several == (name == "look")


def test_only_the_lifted_dropper_costs_other_minutes() -> None:
    lifted = {kind.name: kind.minutes_lifted for kind in READINGS if kind.minutes_lifted is not None}
    assert lifted == {"dropper-capacitance": 6}


METERS = {  # source: the case format, section 1 [meter] and section 4 "meters"
    "dc_voltage": {"rail-voltage", "zener-test", "rail-injection", "dropper-dc-voltage"},
    "ac_voltage": {"mains-voltage", "dropper-voltage"},
    "ac_low_voltage": {"inrush-voltage", "rail-ripple-rms"},
    "ripple": {"rail-ripple"},
    "capacitance": {"dropper-capacitance", "shunt-capacitance", "reservoir-capacitance"},
    "resistance": {
        "fuse-resistance", "varistor-resistance", "path-resistance", "inrush-resistance", "bleeder-resistance", "feed-resistance",
        "reservoir-esr", "coil-resistance",
    },
    "ac_current": {"line-current"},
    "dc_current": {"reservoir-leakage", "rail-leakage", "load-current"},
}


def test_every_number_is_read_by_its_instrument() -> None:
    found = {meter: {kind.name for kind in READINGS if kind.meter == meter} for meter in METERS}
    assert found == METERS
    assert {kind.name for kind in READINGS if kind.meter is None} == {kind.name for kind in READINGS if kind.unit is None}


def test_what_a_file_accepts() -> None:
    """Source: the case format, section 4. 230 V + 10 % has a crest of 357.8 V."""
    board = CONTRACT.board
    assert accepted(READING_KINDS["rail-voltage"], board) == pytest.approx((-5.0, 2.2 * 253.0 * 2.0**0.5))
    assert accepted(READING_KINDS["dropper-voltage"], board) == pytest.approx((0.0, 1.6 * 230.0))
    assert accepted(READING_KINDS["dropper-dc-voltage"], board) == pytest.approx((0.0, 2.0 * 253.0 * 2.0**0.5))
    for kind in READINGS:
        if kind.unit is not None:
            low, high = accepted(kind, board)
            assert low <= 0.0 < high, kind.name


# --- faults


def test_every_fault_of_the_table_is_known() -> None:
    known = {*FAULTS_BY_NAME, *SENTENCES, NO_FAULT, UNEXPLAINED}
    wanted = {*QUALIFIER, "joint-open", *SAFETY_FAULTS, "no-fault", "unexplained"}
    assert wanted <= known
    assert set(FAULTS_BY_NAME) - {*QUALIFIER, "joint-open", *DIVIDER} == set()


def test_the_faults_of_a_divider_are_known() -> None:
    """Weights 60, 5 and 3 (published values)."""
    assert [FAULTS_BY_NAME[name].weight for name in DIVIDER if name in FAULTS_BY_NAME] == [60, 5, 3]


def test_bleeder_faults_do_not_compete_with_the_suspects() -> None:
    assert not set(SAFETY_FAULTS) & set(FAULTS_BY_NAME)


@pytest.mark.parametrize("name", PRIORS)
def test_weights_and_signs_are_the_published_ones(name: str) -> None:
    fault = FAULTS_BY_NAME[name]
    assert (fault.weight, fault.sign) == PRIORS[name]
    assert fault.sign_word in LOOKS


def test_the_rest_of_the_priors_is_the_published_one() -> None:
    assert set(PRIORS) == {fault.name for fault in FAULTS} - set(DIVIDER)
    assert (NO_FAULT_WEIGHT, UNEXPLAINED_WEIGHT) == (80, 12)
    assert {(pair.cause, pair.effect) for pair in PAIRS} == NAMED_PAIRS
    assert (PAIR_SHARE, SELDOM_ALONE_SHARE) == (0.1, 0.8)
    assert {pair.cause for pair in PAIRS if pair.seldom_alone} == {"dropper-short", "varistor-short"}
    assert SOUND_SIGNS["browned board"] == pytest.approx(1 / 3)
    assert SOUND_SIGNS["dry joint"] == 0.10


@pytest.mark.parametrize("name", QUALIFIER)
def test_a_fault_sits_where_the_table_says(name: str) -> None:
    places = FAULTS_BY_NAME[name].places(FULL.board)
    assert places
    for place in places:
        told = "rail" if place.rail is not None else "load" if place.load is not None else ""
        assert told == QUALIFIER[name]
        names = {"rail": [r.name for r in FULL.board.rails], "load": [load.name for load in FULL.board.loads], "": [""]}[told]
        assert place.name in names


# source: the case format, section 1: how parts are named
PART_OF = {
    "dropper-open": "dropper", "inrush-open": "inrush", "fuse-open": "fuse", "varistor-short": "varistor",
    "diode-short": "rectifier", "zener-low": "zener:upper", "reservoir-dried": "reservoir:upper", "feed-open": "feed:lower",
    "load-excess": "load:controller", "coil-open": "load:relay", "wrong-part": "dropper",
}


@pytest.mark.parametrize("name", PART_OF)
def test_parts_are_named_as_in_the_case_file(name: str) -> None:
    fault = FAULTS_BY_NAME[name]
    assert fault.part_at(fault.places(FULL.board)[0]) == PART_OF[name]


@pytest.mark.parametrize(("name", "board"), every_board().items(), ids=every_board())
def test_faults_sit_only_on_parts_that_are_there(name: str, board: Board) -> None:
    present = {fault.name: fault.places(board) for fault in FAULTS}
    assert bool(present["fuse-open"]) == (board.fuse is not None)
    assert bool(present["inrush-high"]) == (board.inrush is not None)
    assert bool(present["varistor-short"]) == (board.varistor is not None)
    assert bool(present["dropper-capacitance-lost"]) == (board.dropper.kind == "capacitor")
    assert bool(present["wrong-part"]) == (board.dropper.fitted is not None)
    assert len(present["zener-low"]) == sum(rail.zener is not None for rail in board.rails)
    assert len(present["coil-open"]) == sum(load.kind == "coil" for load in board.loads)
    assert len(present["switch-open"]) == len(board.switched_loads())


# --- readings of struck specimens


def test_the_physics_foretells_every_reading_but_the_one_it_names() -> None:
    """`look` hangs on the fault itself."""
    assert set(READING_KINDS) - set(SHOWS) == {"look"}


def board_with(name: str) -> Board:
    """A board on which this fault can sit, and which the physics can settle."""
    if name not in DIVIDER:
        return FULL.board
    return replace(FULL.board, dropper=replace(FULL.board.dropper, kind="divider", shunt_capacitance=2.2e-6))


def struck_specimens(board: Board, name: str) -> list[Specimens]:
    """The fault at each of its places, at severities from end to end."""
    fault, severity = FAULTS_BY_NAME[name], np.linspace(0.0, 1.0, 7)
    assert fault.places(board)
    return [fault.strike(population(board, 7), scene_of(board, place, severity, severity[::-1])) for place in fault.places(board)]


@pytest.mark.parametrize("name", FAULTS_BY_NAME)
def test_chances_of_words_add_up_to_one(name: str) -> None:
    board = board_with(name)
    words = [kind for kind in READINGS if kind.unit is None and kind.name in SHOWS]
    assert {kind.name for kind in words} == {"load-responds", "rectifier-test", "switch-test", "tap-test"}
    for specimens in struck_specimens(board, name):
        bench = Bench(specimens)
        for kind in words:
            for load in board.loads if "load" in kind.needs else (None,):
                check = Check(what=kind.name, load=load.name if load else None)
                shown = SHOWS[kind.name](View(bench, board, check, Meter()))
                assert set(shown.chances) == set(kind.words)
                stacked = np.array(list(shown.chances.values()))
                assert (stacked >= 0.0).all()
                assert stacked.sum(axis=0) == pytest.approx(np.ones(7), abs=1e-12)


@pytest.mark.parametrize("name", FAULTS_BY_NAME)
def test_numbers_that_a_struck_board_shows_can_be_read(name: str) -> None:
    """Finite, or the word for it; never a number that a case file would refuse for being under its lower bound."""
    board = board_with(name)
    for specimens in struck_specimens(board, name):
        bench = Bench(specimens)
        for kind in READINGS:
            if kind.unit is None or kind.name not in SHOWS:
                continue
            check = Check(what=kind.name, rail=board.rails[1].name, load="relay", on=())
            shown = SHOWS[kind.name](View(bench, board, check, Meter()))
            assert shown.value is not None
            number = np.isfinite(shown.value)
            worded = np.zeros(number.shape, dtype=bool)
            for flag in (shown.opened, shown.shorted):
                worded |= flag if flag is not None else False
            assert worded[~number].all(), kind.name
            assert (shown.value[number] >= accepted(kind, board)[0]).all(), kind.name
            assert (np.broadcast_to(shown.error, number.shape) >= 0.0).all(), kind.name
