"""Holds the boards of the simulated bench to the contract, to each other, and to their generator.

What the file must hold is listed here from the case format, not from the generator's own tables.
"""

from __future__ import annotations

import json
import math
from collections import Counter
from typing import Any

import pytest

from benchtool.board import Board
from benchtool.casefile import loads
from benchtool.casefile.readings import read_reading
from benchtool.casefile.schema import Findings, Place
from tests.reference.bench_boards import DESIGNS, case_text, states
from tests.reference.bench_make import BOARDS, draw, plan
from tests.reference.quantities import to_si

BENCH: dict[str, Any] = json.loads(BOARDS.read_text(encoding="utf-8"))
ROWS: list[dict[str, Any]] = BENCH["boards"]
CASES: dict[str, Board] = {name: loads(text).board for name, text in BENCH["designs"].items()}
FAULTS = {
    "dropper-capacitance-lost", "dropper-open", "dropper-short", "shunt-capacitor-lost", "shunt-capacitor-open",
    "shunt-capacitor-short", "wrong-part", "fuse-open", "varistor-short", "inrush-open", "inrush-high", "bleeder-open",
    "bleeder-low", "diode-open", "diode-short", "zener-open", "zener-short", "zener-low", "reservoir-dried", "reservoir-leaky",
    "board-leakage", "feed-open", "feed-high", "feed-short", "load-excess", "load-open", "coil-open", "coil-shorted-turns",
    "switch-open", "switch-stuck-on", "joint-open", "mains-low", "mains-high", "no-fault", "unexplained",
}  # fmt: skip  # case format, "Faults"
PAIRS = {
    "dropper-short + inrush-open", "dropper-short + fuse-open", "dropper-short + zener-short", "varistor-short + fuse-open",
    "zener-open + reservoir-leaky", "zener-open + load-excess", "dropper-capacitance-lost + reservoir-dried",
}  # fmt: skip  # case format, under the faults
SHAPES = """
bridge half-wave half-wave-zener / capacitor resistor divider / plug fixed / 1 2 3 / none zener resistor regulator /
coil resistor led gate current / varistor fuse bleeder inrush
""".replace("\n", " ")  # case format, section 1
LIVE = {
    "mains-voltage", "rail-voltage", "rail-ripple", "rail-ripple-rms", "line-current", "inrush-voltage", "dropper-voltage",
    "dropper-dc-voltage", "load-responds",
}  # fmt: skip  # case format, "Readings"
WORST = 1.5  # a third of the boards has meters so much worse than stated
SIGMAS = 5.0  # of the meter: no reading of the few hundred looked at here is further off by chance


def label(fault: dict[str, Any]) -> str:
    return " + ".join([fault["fault"], *([fault["with"]["fault"]] if "with" in fault else [])])


def value_of(board: dict[str, Any], what: str, rail: str | None = None, on: Any = None, lifted: Any = None) -> Any:
    """Return a reading as the file has it, its quantity in SI units."""
    found = [row[5] for row in board["readings"] if row[0] == what and row[1] == rail and row[3] == on and row[4] == lifted]
    assert len(found) == 1, (board["number"], what)
    return to_si(found[0])


def test_case_texts_are_the_designs() -> None:
    """The texts have been loaded above; those of a wrong part in place say which, beside the design's own lines."""
    for name, text in BENCH["designs"].items():
        plain = "".join(line for line in text.splitlines(keepends=True) if not line.startswith("fitted"))
        assert plain == case_text(DESIGNS[name.partition(", ")[0]]), name
    assert {name.partition(", ")[0] for name in CASES} == set(DESIGNS)


def test_every_fault_and_pair_of_the_contract_is_there_evenly() -> None:
    counts = Counter(label(board["fault"]) for board in ROWS if board["draw"] == "even")
    assert set(counts) == {*FAULTS, *PAIRS}
    assert sum(counts.values()) == 200
    assert max(counts.values()) - min(counts.values()) <= 1


def test_lost_droppers_lead_where_the_priors_drew() -> None:
    """Published values: 500 per mille of all faults, more where parts are absent, none on a resistor dropper."""
    drawn = [board for board in ROWS if board["draw"] == "priors"]
    counts = Counter(label(board["fault"]) for board in drawn)
    assert len(drawn) == 120
    assert 0.3 < counts["dropper-capacitance-lost"] / len(drawn) < 0.65
    assert counts.most_common(1)[0][0] == "dropper-capacitance-lost"
    assert counts["bleeder-open"] == counts["bleeder-low"] == 0


def test_every_shape_is_there() -> None:
    seen = Counter[str]()
    for board in ROWS:
        case = CASES[board["design"]]
        parts = [name for name in ("varistor", "fuse", "bleeder", "inrush") if getattr(case, name) is not None]
        feeds = {rail.fed_through or "none" for rail in case.rails}
        seen.update({case.rectifier, case.dropper.kind, case.connected_by, str(len(case.rails)), *feeds, *parts})
        seen.update(load.kind for load in case.loads)
    assert set(seen) == set(SHAPES.split()) - {"/"}
    assert min(seen.values()) >= 15


def test_no_high_rail_hangs_on_a_small_dropper() -> None:
    """220 nF give 13 mA on 24 V from 230 V 50 Hz: too little for a relay there (charge balance)."""
    for case in CASES.values():
        high = any(rail.zener is not None and rail.zener.voltage == 24.0 for rail in case.rails)
        assert not high or 220e-9 not in (case.dropper.capacitance, case.dropper.fitted)


@pytest.mark.parametrize("name", CASES)
def test_every_reading_is_one_the_board_allows(name: str) -> None:
    keys = ("what", "rail", "load", "on", "lifted", "value")
    for board in ROWS:
        findings = Findings()
        for number, row in enumerate(board["readings"] if board["design"] == name else []):
            table = {key: part for key, part in zip(keys, row, strict=True) if part is not None}
            read_reading(table, Place().entry("reading", number, None), CASES[name], findings)
        findings.raise_any(f"board {board['number']}", {})


def test_nothing_is_read_twice_and_a_running_board_in_every_state() -> None:
    for board in ROWS:
        asked = Counter(json.dumps(row[:5]) for row in board["readings"])
        assert max(asked.values()) == 1, board["number"]
        live = Counter(row[0] for row in board["readings"] if row[0] in LIVE)
        case, design = CASES[board["design"]], DESIGNS[board["design"].partition(", ")[0]]
        assert board["powered"] == bool(live), board["number"]
        if board["powered"]:
            assert live["load-responds"] == len(case.loads)
            assert live["rail-ripple"] == live["rail-voltage"] == len(case.rails) * len(states(design)), board["number"]


def test_sound_boards_do_their_work() -> None:
    sound = [board for board in ROWS if board["fault"]["fault"] in ("no-fault", "bleeder-open", "bleeder-low")]
    assert len(sound) >= 15
    assert all(board["works"] for board in sound)


def test_worn_droppers_read_what_they_have_kept() -> None:
    """The lifted reading is the part itself: 2 % + 0.2 nF at two sigma (case format, [meter])."""
    worn = [board for board in ROWS if board["fault"]["fault"] in ("dropper-capacitance-lost", "wrong-part")]
    assert len(worn) > 50
    for board in worn:
        farads = board["fault"]["capacitance"]
        sigma = 0.5 * WORST * math.hypot(0.02 * farads, 0.2e-9)
        assert abs(value_of(board, "dropper-capacitance", lifted=True) - farads) < SIGMAS * sigma + 1e-3 * farads


@pytest.mark.parametrize("number", [152, 221, 237])
def test_boards_come_from_their_generator(number: int) -> None:
    """A board of each rectifier, drawn and simulated again, reads the same but for its meter: 0.5 % + 20 mV at two sigma."""
    board, specimen = ROWS[number], draw(number)
    assert (board["number"], board["draw"]) == (number, plan()[number].draw)
    for rail in specimen.settled([])["rails"]:
        volts = rail["voltage_V"]
        sigma = 0.5 * WORST * math.hypot(0.005 * volts, 0.02)
        read = value_of(board, "rail-voltage", rail["name"], on=[])
        assert abs(read - volts) < SIGMAS * sigma, rail["name"]
        assert volts > 1.0  # a dead rail would prove nothing
