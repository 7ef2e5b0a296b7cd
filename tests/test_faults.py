"""What each fault does to the specimens: it changes them, it leaves legal values, and its two ends are those of the case format.

Severities: the case format, section 4 ("severity of faults"); they are common practice without a source there.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from benchtool.board import Board
from benchtool.catalogue.faults import FAULTS, FAULTS_BY_NAME
from benchtool.catalogue.strikes import Place, scene_of
from benchtool.physics.laws import Array
from benchtool.physics.specimens import ARRAYS, Specimens, as_marked, concatenate, population
from tests.some_boards import CONTRACT, FULL, every_board

BOARDS = every_board()


def ends(board: Board, name: str, place: Place | None = None) -> tuple[Specimens, Specimens]:
    """The board as marked, twice, and what the fault makes of it at severity nil and one."""
    fault, marked = FAULTS_BY_NAME[name], as_marked(board)
    sound = concatenate((marked, marked))
    severity = np.array([0.0, 1.0])
    return sound, fault.strike(sound, scene_of(board, place or fault.places(board)[0], severity, severity))


def changed(before: Specimens, after: Specimens) -> set[str]:
    return {name for name in ARRAYS if not np.array_equal(getattr(before, name), getattr(after, name))}


@pytest.mark.parametrize("name", BOARDS)
def test_every_fault_changes_the_board_and_leaves_legal_values(name: str) -> None:
    board = BOARDS[name]
    healthy, severity = population(board, 9), np.linspace(0.0, 1.0, 9)
    for fault in FAULTS:
        for place in fault.places(board):
            struck = fault.strike(healthy, scene_of(board, place, severity, severity))
            assert changed(healthy, struck), fault.name
            for each in ARRAYS:
                values: Array = getattr(struck, each)
                assert values.shape == getattr(healthy, each).shape, (fault.name, each)
                assert not np.isnan(values).any(), (fault.name, each)
                assert (values >= 0.0).all(), (fault.name, each)
            assert np.isfinite(struck.mains).all()
            assert np.isfinite(struck.capacitance).all()


@pytest.mark.parametrize("name", BOARDS)
def test_a_fault_leaves_the_sound_specimens_alone(name: str) -> None:
    board = BOARDS[name]
    healthy, again, severity = population(board, 5), population(board, 5), np.linspace(0.0, 1.0, 5)
    for fault in FAULTS:
        for place in fault.places(board):
            fault.strike(healthy, scene_of(board, place, severity, severity))
            assert changed(healthy, again) == set(), fault.name


@pytest.mark.parametrize("name", [fault.name for fault in FAULTS])
def test_only_the_place_struck_is_changed(name: str) -> None:
    """At one rail or load the other rows stay as they were."""
    board = FULL.board
    for place in FAULTS_BY_NAME[name].places(board):
        before, after = ends(board, name, place)
        row = place.rail if place.rail is not None else place.load
        for each in changed(before, after):
            old, new = getattr(before, each), getattr(after, each)
            if row is not None:
                assert np.array_equal(np.delete(old, row, axis=0), np.delete(new, row, axis=0))


# --- the two ends of every severity

# fault, part, its value as marked on the full board, share of it at severity nil and one
SHARES: tuple[tuple[str, str, float, float, float], ...] = (
    ("dropper-capacitance-lost", "capacitance", 1e-6, 0.02, 0.90),  # 2 % to the edge of a tolerance of 10 %
    ("inrush-high", "inrush", 100.0, 3.0, 300.0),
    ("zener-low", "zener", 24.0, 0.25, 0.85),
    ("reservoir-dried", "reservoir", 220e-6, 0.005, 0.40),
    ("coil-shorted-turns", "load_resistance", 2300.0, 0.15, 0.65),
    ("feed-high", "feed", 1000.0, 2.0, 30.0),
    ("wrong-part", "capacitance", 1e-6, 0.47, 0.47),
)


@pytest.mark.parametrize(("name", "part", "marked", "least", "most"), SHARES, ids=[row[0] for row in SHARES])
def test_shares_of_the_mark(name: str, part: str, marked: float, least: float, most: float) -> None:
    place = FAULTS_BY_NAME[name].places(FULL.board)[0]
    _, after = ends(FULL.board, name, place)
    assert row_of(after, part, place) == pytest.approx([least * marked, most * marked], rel=1e-9)


def row_of(specimens: Specimens, part: str, place: Place) -> Array:
    values: Any = getattr(specimens, part)
    row = place.rail if place.rail is not None else place.load
    return np.asarray(values if row is None else values[row])


def test_an_open_dropper_keeps_under_2_percent() -> None:
    _, after = ends(FULL.board, "dropper-open")
    assert (after.capacitance <= 0.02 * 1e-6 * (1.0 + 1e-12)).all()


def test_a_lost_dropper_mostly_keeps_10_to_85_percent() -> None:
    severity = np.linspace(0.0, 1.0, 1001)
    lost = FAULTS_BY_NAME["dropper-capacitance-lost"]
    left = lost.strike(population(FULL.board, 1001), scene_of(FULL.board, Place(), severity, severity)).capacitance / 1e-6
    assert np.mean((left >= 0.10) & (left <= 0.85)) > 0.8
    assert (np.diff(left) > 0.0).all()


def test_a_shorted_zener_has_0_3_to_20_ohm() -> None:
    _, after = ends(FULL.board, "zener-short")
    assert after.zener_short[0] == pytest.approx([0.3, 20.0])


def test_a_dried_reservoir_has_0_5_to_20_ohm_more() -> None:
    before, after = ends(FULL.board, "reservoir-dried")
    assert (after.esr - before.esr)[0] == pytest.approx([0.5, 20.0])


def test_a_shorted_dropper_has_about_half_an_ohm() -> None:
    _, after = ends(FULL.board, "dropper-short")
    assert after.dropper_short == pytest.approx([0.5, 0.5], abs=0.3)


@pytest.mark.parametrize(
    ("name", "part"),
    [
        ("fuse-open", "fuse"), ("inrush-open", "inrush"), ("zener-open", "zener"), ("feed-open", "feed"), ("joint-open", "joint"),
        ("dropper-open", "dropper_resistance"),
    ],
)
def test_open_parts_conduct_nothing(name: str, part: str) -> None:
    place = FAULTS_BY_NAME[name].places(FULL.board)[0]
    _, after = ends(FULL.board, name, place)
    assert np.isposinf(row_of(after, part, place)).all()


NORMAL_LOAD = 0.0222
"""Demand of the contract's board [A]: the case format, section 2, budget; confirmed there by a time-step simulation."""
RELAY_RAIL, LOGIC_RAIL = 23.1, 5.1
"""Its rails' nominal voltages [V]: 18 V + 5.1 V, stacked."""


@pytest.mark.parametrize(("name", "part"), [("reservoir-leaky", "reservoir_leak"), ("board-leakage", "board_leak")])
def test_leaks_draw_half_to_four_times_the_normal_load(name: str, part: str) -> None:
    for place, volts in zip(FAULTS_BY_NAME[name].places(CONTRACT.board), (RELAY_RAIL, LOGIC_RAIL), strict=True):
        _, after = ends(CONTRACT.board, name, place)
        assert volts / row_of(after, part, place) == pytest.approx([0.5 * NORMAL_LOAD, 4.0 * NORMAL_LOAD], rel=0.02)


def test_a_load_draws_half_to_four_times_the_normal_load_too_much() -> None:
    controller, relay = FAULTS_BY_NAME["load-excess"].places(CONTRACT.board)
    before, after = ends(CONTRACT.board, "load-excess", controller)
    more = after.load_current[0] - before.load_current[0]
    assert more == pytest.approx([0.5 * NORMAL_LOAD, 4.0 * NORMAL_LOAD], rel=0.02)
    _, after = ends(CONTRACT.board, "load-excess", relay)  # between the two rails: 18 V
    # As a sink and as a resistor: which of the two hangs on the other coordinate, nil and one here.
    assert after.load_current[1].tolist() == pytest.approx([0.5 * NORMAL_LOAD, 0.0], rel=0.02)
    assert (18.0 * after.load_excess[1]).tolist() == pytest.approx([0.0, 4.0 * NORMAL_LOAD], rel=0.02)


def test_mains_faults_leave_the_range_of_the_mains() -> None:
    _, low = ends(CONTRACT.board, "mains-low")
    _, high = ends(CONTRACT.board, "mains-high")
    assert (low.mains <= 207.0 + 1e-9).all()  # 230 V − 10 % (IEC 60038)
    assert (high.mains >= 253.0 - 1e-9).all()  # 230 V + 10 %
    assert low.crest / low.mains == pytest.approx(2.0**0.5)


def test_in_a_bridge_all_junctions_are_alike_and_else_either_diode_fails() -> None:
    half_wave = next(board for board in BOARDS.values() if board.rectifier == "half-wave")
    for name in ("diode-open", "diode-short"):
        _, bridge = ends(FULL.board, name)
        _, other = ends(half_wave, name)
        assert bridge.junction[0] == bridge.junction[1]
        assert other.junction[0] != other.junction[1]


def test_faults_of_one_board_do_not_share_what_they_do() -> None:
    """Two faults that do the same to the same part could never be told apart: `coil-open` is the `load-open` of coils."""
    seen: dict[tuple[Any, ...], str] = {}
    for fault in FAULTS:
        for place in fault.places(FULL.board):
            before, after = ends(FULL.board, fault.name, place)
            key = tuple((each, getattr(after, each).tobytes()) for each in sorted(changed(before, after)))
            assert key not in seen, (fault.name, place, seen.get(key))
            seen[key] = fault.name
