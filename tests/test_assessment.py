"""The one door: a valid case always gets a verdict, whole and finite, whatever was read and whatever cannot be read off."""

from __future__ import annotations

import json
from dataclasses import replace
from typing import Any

import pytest

from benchtool import assess, casefile
from benchtool.assessment import states_of
from benchtool.board import UNKNOWN, Board
from benchtool.case import Case, Ticket
from benchtool.catalogue.accepted import accepted, lacking
from benchtool.catalogue.readings import READINGS, ReadingKind
from benchtool.observed import Reading
from tests.some_boards import CONTRACT, FULL, draw_few, read
from tests.test_samples import check_result, ranked


@pytest.fixture(autouse=True)
def coarse(monkeypatch: pytest.MonkeyPatch) -> None:
    """Most tests here do not hang on figures."""
    draw_few(monkeypatch, 8, coarse=True)


@pytest.fixture
def fine(coarse: None, monkeypatch: pytest.MonkeyPatch) -> None:
    """For those that do."""
    monkeypatch.undo()


def checked(case: Case) -> dict[str, Any]:
    found: dict[str, Any] = assess(case).as_dict()
    check_result(found)
    return found


def unreadable(board: Board) -> Board:
    """Every value that the case format lets be unknown."""

    def known(part: Any, *names: str) -> Any:
        return None if part is None else replace(part, **dict.fromkeys(names, UNKNOWN))

    rails = tuple(
        replace(rail, zener=known(rail.zener, "voltage"), reservoir=known(rail.reservoir, "capacitance")) for rail in board.rails
    )
    loads = tuple(
        known(load, *(name for name in ("current", "resistance") if getattr(load, name) is not None)) for load in board.loads
    )
    return replace(
        board, rails=rails, loads=loads, dropper=known(board.dropper, "capacitance"), inrush=known(board.inrush, "resistance"),
        bleeder=known(board.bleeder, "resistance"),
    )


@pytest.mark.parametrize("case", [CONTRACT, FULL], ids=["contract", "full"])
def test_a_board_of_which_nothing_can_be_read_gets_an_answer(case: Case) -> None:
    board = unreadable(case.board)
    for readings in ((), case.readings, (read("rail-voltage", 9.0, rail=board.rails[0].name),)):
        found = checked(replace(case, board=board, readings=readings))
        assert found["budget"]["available_A"] is None
        assert found["budget"]["demand_A"] is None
        assert found["states"][0]["rails"][0]["voltage_V"] is None
        assert found["effective"]["capacitance_F"] is None


@pytest.mark.usefixtures("fine")
def test_what_cannot_be_read_widens_the_bands() -> None:
    def width(board: Board) -> float:
        rail = states_of(board, ())[0].rails[0]
        assert rail.voltage_low is not None
        assert rail.voltage_high is not None
        return rail.voltage_high - rail.voltage_low

    assert width(unreadable(FULL.board)) > 2.0 * width(FULL.board)


def test_a_board_without_loads() -> None:
    found = checked(replace(FULL, board=replace(FULL.board, loads=())))
    assert found["budget"]["on"] == []
    assert [state["on"] for state in found["states"]] == [[]]
    assert not [suspect for suspect in found["suspects"] if suspect["load"] is not None]


def test_the_least_board_that_a_file_may_hold() -> None:
    least = casefile.loads("""
format = 1
mains = { voltage = "230 V", frequency = "50 Hz" }
board.rectifier = "half-wave"
board.dropper.capacitance = "330 nF"
[[board.rail]]
name = "rail"
fed_by = "rectifier"
""")
    found = checked(least)
    rail = found["states"][0]["rails"][0]
    assert (rail["regulating"], rail["zener_current_A"], rail["zener_power_W"]) == (None, None, None)
    assert [item["fault"] for item in found["safety"]] == ["no-bleeder"]
    assert found["case"] is None


# --- readings of every kind and size


def every_reading(board: Board, value: Any) -> tuple[Reading, ...]:
    """One reading of every kind at every place of the board, its value by `value(kind, board)`."""
    found = []
    for kind in READINGS:
        rails = board.rails if "rail" in kind.needs else (None,)
        loads = board.loads if "load" in kind.needs else (None,)
        places = [(rail, load) for rail in rails for load in loads if lacking(kind, board, rail, load) is None]
        for rail, load in places:
            name, user = rail and rail.name, load and load.name
            found.append(read(kind.name, value(kind, board), rail=name, load=user))
    return tuple(found)


def last_word(kind: ReadingKind) -> Any:
    return (kind.words[-1],) if kind.several else kind.words[-1]


def middle(kind: ReadingKind, board: Board) -> Any:
    return last_word(kind) if kind.unit is None else 0.05 * accepted(kind, board)[1]


def zero(kind: ReadingKind, board: Board) -> Any:
    return last_word(kind) if kind.unit is None else 0.0


def highest(kind: ReadingKind, board: Board) -> Any:
    return last_word(kind) if kind.unit is None else accepted(kind, board)[1]


def lowest(kind: ReadingKind, board: Board) -> Any:
    return last_word(kind) if kind.unit is None else accepted(kind, board)[0]


def word(kind: ReadingKind, board: Board) -> Any:
    return last_word(kind) if kind.words else 0.05 * accepted(kind, board)[1]


VALUES = (zero, lowest, middle, highest, word)


@pytest.mark.parametrize("value", VALUES, ids=lambda value: value.__name__)
@pytest.mark.parametrize("case", [CONTRACT, FULL], ids=["contract", "full"])
def test_every_kind_of_reading_at_once(case: Case, value: Any) -> None:
    readings = every_reading(case.board, value)
    assert {kind.name for kind in READINGS} - {reading.what for reading in readings} <= {"shunt-capacitance", "feed-resistance"}
    checked(replace(case, readings=readings))


ALONE = tuple(reading for value in (zero, highest) for reading in every_reading(FULL.board, value) if reading.rail != "lower")


@pytest.mark.parametrize("reading", ALONE, ids=lambda reading: f"{reading.what} {reading.value}")
def test_one_reading_at_an_end_of_what_a_file_accepts(reading: Reading) -> None:
    if reading.load in (None, "relay"):
        checked(replace(FULL, readings=(reading,)))


@pytest.mark.parametrize("volts", [-5.0, -0.7, -0.001, -0.0])
def test_a_negative_rail(volts: float) -> None:
    for rail in ("upper", "lower"):
        checked(replace(FULL, readings=(read("rail-voltage", volts, rail=rail),)))


@pytest.mark.usefixtures("fine")
def test_a_rail_near_twice_the_crest_is_an_open_zener() -> None:
    """A half-wave board with an open zener doubles (published values). 3 mA = f·C·(2·crest − V): 618 V at 50 Hz, 1 µF, 240 V."""
    half = replace(
        FULL.board, rectifier="half-wave", mains=replace(FULL.board.mains, voltage=240.0), rails=FULL.board.rails[:1],
        loads=(replace(FULL.board.loads[0], rail="upper"),),
    )
    volts = 2.0 * 240.0 * 2.0**0.5 - 0.003 / (50.0 * 1e-6)
    found = checked(replace(FULL, board=half, readings=(read("rail-voltage", volts, rail="upper"),)))
    assert (found["suspects"][0]["fault"], found["suspects"][0]["rail"]) == ("zener-open", "upper")


# --- what it says and where


def test_the_ticket_names_the_case() -> None:
    assert checked(replace(FULL, ticket=Ticket(number="R-1")))["case"] == "R-1"


@pytest.mark.usefixtures("fine")
def test_a_divided_dropper_gets_a_verdict_of_its_own() -> None:
    dropper = replace(FULL.board.dropper, kind="divider", shunt_capacitance=1e-6)
    found = checked(replace(FULL, board=replace(FULL.board, dropper=dropper)))
    assert "shunt-capacitor-lost" in {suspect["fault"] for suspect in found["suspects"]}
    assert found["states"][0]["supply_current_A"] > 0.0


def test_a_state_that_was_read_is_shown_once_whatever_the_order_of_its_loads() -> None:
    one = read("inrush-voltage", 3.0, on=("relay", "lamp"))
    other = read("dropper-voltage", 220.0, on=("lamp", "relay"))
    states = [frozenset(state["on"]) for state in checked(replace(FULL, readings=(one, other)))["states"]]
    assert states == [frozenset(), frozenset(FULL.board.switched_loads()), frozenset(("relay", "lamp"))]


@pytest.mark.usefixtures("fine")
def test_a_sound_board_read_as_sound_has_no_fault() -> None:
    """24.3 V are the contract's own reading with its loads off; 4.82 V and 223 V its section 2; every part as it is marked."""
    readings = (
        read("rail-voltage", 24.3, rail="relay rail"),
        read("zener-test", 18.0, rail="relay rail"),
        read("zener-test", 5.1, rail="logic rail"),
        read("inrush-voltage", 4.82),
        read("dropper-voltage", 223.0),
        read("dropper-capacitance", 680e-9, lifted=True),
        read("reservoir-capacitance", 220e-6, rail="relay rail"),
        read("reservoir-capacitance", 100e-6, rail="logic rail"),
        read("reservoir-esr", 0.3, rail="relay rail"),
        read("load-responds", "yes", load="heater relay"),
    )
    assert ranked(checked(replace(CONTRACT, readings=readings))) == ("no-fault", None, None)


def test_the_result_is_json_and_the_same_every_time() -> None:
    case = replace(FULL, readings=(read("rail-voltage", 12.0, rail="upper", on=("relay",)),))
    one, other = (json.dumps(checked(case), allow_nan=False) for _ in range(2))
    assert one == other


@pytest.mark.usefixtures("fine")
def test_the_states_as_marked_are_those_of_the_contract() -> None:
    """The case format, section 2; confirmed there by an independent time-step simulation within 2 %."""
    state = checked(CONTRACT)["states"][0]
    for key, value in (
        ("supply_current_A", 0.0409), ("line_current_A", 0.0482), ("inrush_voltage_V", 4.82), ("dropper_voltage_V", 223.0),
        ("inrush_power_W", 0.232), ("apparent_power_VA", 11.1),
    ):
        assert state[key] == pytest.approx(value, rel=0.02), key
    assert state["rails"][0]["voltage_V"] == pytest.approx(23.3, rel=0.02)
    assert state["rails"][0]["regulating"] is True
