"""The budget bar against its rules, worked by hand on a board whose currents need no computer."""

from __future__ import annotations

from dataclasses import replace

import pytest

from benchtool.casefile import loads
from benchtool.diagnosis.effective import Effective
from benchtool.observed import Reading
from benchtool.physics.budget import Budget
from benchtool.report.bar import (
    CELL_SIZES,
    Difference,
    Scale,
    budget_lines,
    heavier,
    initials,
    need_bar,
    need_of,
    scale_for,
    supply_bar,
    ticks,
)
from benchtool.report.layout import Page, cells
from benchtool.words import Words

STACKED = """
format = 1
[mains]
voltage = "230 V"
frequency = "50 Hz"
[board]
rectifier = "bridge"
[board.dropper]
capacitance = "680 nF"
[[board.rail]]
name = "relay rail"
fed_by = "rectifier"
zener = { voltage = "18 V", clamps_to = "logic rail" }
[[board.rail]]
name = "logic rail"
fed_by = "relay rail"
fed_through = "zener"
zener = { voltage = "5.1 V" }
[[board.load]]
name = "heater relay"
kind = "coil"
rail = "relay rail"
returns_to = "logic rail"
switched = true
resistance = "810 ohm"
nominal_voltage = "18 V"
[[board.load]]
name = "controller"
kind = "current"
rail = "logic rail"
current = "3.5 mA"
"""
FED = """
format = 1
[mains]
voltage = "230 V"
frequency = "50 Hz"
[board]
rectifier = "bridge"
[board.dropper]
capacitance = "680 nF"
[[board.rail]]
name = "upper"
fed_by = "rectifier"
zener = { voltage = "15.1 V" }
[[board.rail]]
name = "lower"
fed_by = "upper"
fed_through = "resistor"
feed_resistance = "2 kohm"
zener = { voltage = "5.1 V" }
[[board.load]]
name = "lamp"
kind = "resistor"
rail = "upper"
resistance = "1.51 kohm"
[[board.load]]
name = "logic"
kind = "current"
rail = "lower"
current = "2 mA"
"""
STACKED_BOARD = loads(STACKED).board
ON = ("heater relay",)
RELAY_ON = Reading(what="rail-voltage", rail="relay rail", on=ON, value=14.2)
BUDGET = Budget(
    on=ON, available=0.0409, available_low=0.0328, available_high=0.0498, demand=0.0222,
    dropout_capacitance=3.66e-7, rule_of_thumb=None,
)
READ = Effective(
    capacitance=1.81e-7, capacitance_low=1.63e-7, capacitance_high=2.09e-7, current=0.0112, current_low=0.0102,
    current_high=0.0125, readings=(RELAY_ON,),
)
BOUND = Effective(capacitance_low=4.7e-8, current_low=0.0035, readings=(RELAY_ON,))


def drawn(effective: Effective, page: Page, budget: Budget = BUDGET) -> list[str]:
    return [line.text for line in budget_lines(budget, effective, Words(STACKED_BOARD), page)]


def test_the_case_formats_own_example_is_drawn_cell_by_cell() -> None:
    # Source of the currents: the case format's worked example. By its own rules at 1 mA a cell: 10.2 is 10 cells and
    # 12.5 is 13 (half up); 3.5 is 4 cells inside the 22 of 22.2; a coil at -10 % takes 18 V / 729 ohm = 24.7 mA, 25 cells.
    assert drawn(READ, Page(80)) == [
        "CURRENT INTO relay rail, 1 mA a cell",
        " mA, heater relay on      0         10        20        30        40        50",
        " rail gets now     11.2   ██████████▒▒▒",
        " loads need        22.2   cccchhhhhhhhhhhhhhhhhh▒▒▒",
        " SHORT BY          11.0              ×××××××××××",
        " as marked         40.9   █████████████████████████████████▒▒▒▒▒▒▒▒▒▒▒▒▒▒▒▒▒",
        "                          c controller, h heater relay",
        "                          ▒ over mains and tolerance",
    ]


def test_ascii_takes_one_cell_for_one_cell() -> None:
    unicode, plain = drawn(READ, Page(80)), drawn(READ, Page(80, ascii=True))
    assert [cells(line) for line in unicode] == [len(line) for line in plain]
    assert plain[2] == " rail gets now     11.2   ##########:::"
    assert plain[4] == " SHORT BY          11.0              xxxxxxxxxxx"


def test_a_mere_bound_ends_in_an_arrow_and_the_difference_is_drawn_from_the_mark() -> None:
    lines = drawn(BOUND, Page(80))
    assert lines[2] == " rail gets now    > 3.5   ████→"
    assert lines[5] == " OVER BY as marked 18.7                         +++++++++++++++++++"  # 22 to 41 cells
    assert not any("SHORT" in line for line in lines)


def test_every_figure_stands_apart_from_its_label() -> None:
    # 22.2 - 4.2 mA: the longest label with a figure of four signs; 22.2 mA are 44 cells of 0.5 mA from column 27 on.
    short = replace(BUDGET, available=0.0042, available_low=0.0032, available_high=0.0052)
    row = next(line for line in drawn(BOUND, Page(80), short) if "SHORT" in line)
    assert row.startswith(" SHORT BY as marked 18.0  ")
    assert cells(row) == 26 + 44


@pytest.mark.parametrize("width", [80, 40])
def test_a_board_short_by_its_marks_says_so(width: int) -> None:
    short = replace(BUDGET, available=0.0042, available_low=0.0032, available_high=0.0052)
    told = "By its marks this board cannot hold relay rail with heater relay on: check the values typed, or it was built so."
    assert " ".join(" ".join(drawn(BOUND, Page(width), short)).split()).endswith(told)
    assert "By its marks" not in " ".join(drawn(BOUND, Page(width)))


def test_a_current_read_on_the_mains_side_is_not_called_the_rails() -> None:
    by_line = Reading(what="inrush-voltage", on=ON, value=1.2)
    lines = drawn(Effective(current=0.0112, current_low=0.0102, current_high=0.0125, readings=(by_line,)), Page(80))
    assert lines[2].startswith(" by mains current  11.2   ")


def test_one_row_on_a_narrow_page_at_two_milliamperes_a_cell() -> None:
    # 10.2 mA is 5 cells of 2 mA and 12.5 mA is 6.
    assert drawn(READ, Page(40)) == ["BUDGET, heater relay on, 2 mA a cell", "gets 11.2 █████▒ need 22.2 mA SHORT 11.0"]


def test_without_room_for_a_bar_the_figures_stay() -> None:
    assert drawn(READ, Page(32)) == ["BUDGET, heater relay on, mA", " gets 11.2, needs 22.2", " SHORT 11.0"]


@pytest.mark.parametrize("width", [80, 40, 32])
def test_what_cannot_be_known_is_told_in_words(width: int) -> None:
    unknown = Budget(ON, None, None, None, None, None, None)
    text = " ".join(" ".join(drawn(READ, Page(width), unknown)).split())
    assert "cannot tell" in text
    assert "SHORT" not in text
    assert "OVER" not in text
    assert "cannot tell" in " ".join(drawn(Effective(), Page(width), unknown))


@pytest.mark.parametrize(
    ("greatest", "room", "size"),
    [
        (0.0498, 54, 1e-3),  # 50 cells
        (0.0544, 54, 1e-3),  # 54 cells, rounded
        (0.0546, 54, 2e-3),  # 55 would not fit
        (0.0053, 54, 1e-4),
        (0.0056, 54, 2e-4),
        (0.9, 54, 2e-2),
    ],
)
def test_the_finest_cell_that_fits_is_chosen(greatest: float, room: int, size: float) -> None:
    scale = scale_for(greatest, room)
    assert scale.size == size
    assert scale.cells(greatest) <= room


def test_cells_round_half_up_and_never_leave_the_bar() -> None:
    scale = Scale(1e-3, 54)
    assert [scale.cells(current) for current in (0.0, 0.4e-3, 0.5e-3, 12.5e-3, 13.49e-3)] == [0, 0, 1, 13, 13]
    assert scale.cells(1.0) == 54
    assert scale.cells(-1.0) == 0


def test_figures_over_the_bar_stand_on_their_own_cell() -> None:
    for size in CELL_SIZES:
        row = ticks(Scale(size, 54))
        assert len(row) <= 54
        for label in row.split():
            cell = float(label) * 1e-3 / size
            assert row[round(cell) :].startswith(label)
        assert len(row.split()) == (11 if size == 2e-3 else 6)  # every five cells at 2 mA a cell, else every ten


def test_under_half_a_cell_it_is_even() -> None:
    scale = Scale(1e-3, 54)
    assert Difference(0.0204, 0.0200).word(scale) == "EVEN"
    assert Difference(0.0204, 0.0200).bar(scale) == ""
    assert Difference(0.0206, 0.0200).word(scale) == "OVER BY"
    assert Difference(0.0194, 0.0200).word(scale) == "SHORT BY"


def test_a_second_load_with_the_same_initial_takes_its_next_free_letter() -> None:
    assert initials(["heater", "hood lamp", "HH", "123", "oho"]) == ["h", "o", "a", "b", "c"]
    assert initials(["電", "Ω"]) == ["a", "b"]
    assert initials(["a"] * 30)[26:] == ["?"] * 4


def test_current_that_runs_on_in_a_stack_is_not_counted_twice() -> None:
    # By hand: the relay's 18 V / 810 ohm = 22.2 mA run on through the logic rail, where the controller takes 3.5 of them.
    need = need_of(STACKED_BOARD, 18.0 / 810.0, Words(STACKED_BOARD), Page())
    assert [sign for sign, _ in need.parts] == ["c", "h"]
    assert [current for _, current in need.parts] == pytest.approx([3.5e-3, 18.0 / 810.0])
    assert need.heaviest == pytest.approx(18.0 / 729.0)
    assert need_bar(need, Scale(1e-3, 54)) == "cccc" + "h" * 18 + "▒▒▒"


def test_a_resistors_feed_is_told_apart_from_the_loads() -> None:
    # By hand: (15.1 - 5.1) V / 2 kohm = 5 mA whatever the logic takes, and 15.1 V / 1.51 kohm = 10 mA for the lamp.
    board = loads(FED).board
    need = need_of(board, 0.015, Words(board), Page())
    assert [sign for sign, _ in need.parts] == ["·", "l"]
    assert [current for _, current in need.parts] == pytest.approx([5e-3, 10e-3])
    assert need_bar(need, Scale(1e-3, 54)).startswith("·" * 5 + "l" * 10)


def test_the_heavy_end_of_a_tolerance() -> None:
    relay, controller = STACKED_BOARD.loads
    assert heavier(relay).resistance == pytest.approx(729.0)  # 10 % assumed for a coil
    assert heavier(controller).current == pytest.approx(4.2e-3)  # 20 % assumed for a current


def test_bounds_of_a_supply() -> None:
    scale = Scale(1e-3, 20)
    assert supply_bar(None, None, scale) == ""
    assert supply_bar(0.004, 0.0065, scale) == "████▒▒▒"
    assert supply_bar(0.5, None, scale) == "█" * 19 + "→"
