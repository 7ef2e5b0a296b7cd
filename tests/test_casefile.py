"""The case file: what is read and what is refused. Expected values stand in the case format itself."""

from __future__ import annotations

import datetime
import os
import time
from collections.abc import Callable
from pathlib import Path

import pytest
from hypothesis import HealthCheck, settings

from benchtool import casefile
from benchtool.board import UNKNOWN
from benchtool.case import Case
from benchtool.errors import CaseError, FileError, Problem
from benchtool.observed import Accuracy, Reading

CONTRACT = (Path(__file__).parent / "data" / "contract.toml").read_text(encoding="utf-8")
ESR = Reading(what="reservoir-esr", rail="relay rail", value=0.5)
MAINS_READ = Reading(what="mains-voltage", value=231.0)
SLOW = settings(
    max_examples=60,
    derandomize=True,
    deadline=None,
    suppress_health_check=[HealthCheck.too_slow, HealthCheck.data_too_large],
)


def contract() -> Case:
    return casefile.loads(CONTRACT)


def problems(text: str) -> tuple[Problem, ...]:
    with pytest.raises(CaseError) as caught:
        casefile.loads(text, "proofer.toml")
    return caught.value.problems


def swapped(old: str, new: str) -> str:
    assert old in CONTRACT
    return CONTRACT.replace(old, new, 1)


def only(text: str) -> Problem:
    (problem,) = problems(text)
    return problem


# --- reading ---


def test_the_format_s_own_example_is_read_in_full() -> None:
    case = contract()
    board = case.board
    assert (board.mains.voltage, board.mains.frequency, board.mains.variation) == (230.0, 50.0, 0.1)
    assert (board.dropper.capacitance, board.dropper.fitted, board.dropper.safety_class) == (
        680e-9,
        470e-9,
        "X2",
    )
    assert board.fuse is not None
    assert board.fuse.rated_current == 1.0
    assert board.inrush is not None
    assert (board.inrush.resistance, board.inrush.fusible) == (100.0, True)
    assert board.bleeder is not None
    assert (board.bleeder.resistance, board.bleeder.in_series) == (470e3, 2)
    assert [rail.name for rail in board.rails] == ["relay rail", "logic rail"]
    upper, lower = board.rails
    assert upper.zener is not None
    assert (upper.zener.voltage, upper.zener.clamps_to) == (18.0, "logic rail")
    assert (lower.fed_by, lower.fed_through) == ("relay rail", "zener")
    assert [load.kind for load in board.loads] == ["current", "coil"]
    assert board.switched_loads() == ("heater relay",)
    assert case.ticket.received == datetime.date(2026, 10, 14)
    assert case.safe.last_time == datetime.datetime(2026, 10, 14, 14, 7)
    assert case.meter.ac_low_voltage == Accuracy(0.015, 0.010)
    assert [reading.value for reading in case.readings] == [24.3, 14.2, 182e-9]
    assert [reading.on for reading in case.readings] == [(), ("heater relay",), None]
    assert case.readings[2].lifted
    assert case.repair.replaced[0].part == "dropper"
    assert case.repair.readings[0].value == 22.9


def test_only_what_is_required_is_enough() -> None:
    case = casefile.loads(MINIMAL)
    assert case.readings == ()
    assert (case.board.mains.variation, case.board.ambient, case.board.connected_by) == (0.1, 40.0, "plug")
    assert case.board.dropper.tolerance is None


MINIMAL = """format = 1
mains = { voltage = "230 V", frequency = "50 Hz" }
board.rectifier = "half-wave"
board.dropper.capacitance = "0u33"
[[board.rail]]
name = "rail"
fed_by = "rectifier"
"""


def test_a_part_that_cannot_be_read_is_unknown_where_the_format_allows_it() -> None:
    case = casefile.loads(swapped('current = "3.5 mA"', 'current = "unknown"'))
    assert case.board.loads[0].current is UNKNOWN
    refused = only(swapped('voltage = "230 V"', 'voltage = "unknown"'))
    assert (refused.table, refused.key) == ("[mains]", "voltage")


@pytest.mark.parametrize("ending", ["\n", "\r\n"])
@pytest.mark.parametrize("start", ["", "\ufeff"])
def test_line_ends_and_marks_of_other_editors_are_read(ending: str, start: str, tmp_path: Path) -> None:
    path = tmp_path / "case.toml"
    path.write_bytes((start + CONTRACT.replace("\n", ending)).encode())
    assert casefile.load(path) == contract()


@pytest.mark.parametrize(
    ("written", "value"),
    [
        ('"13.1"', 13.1),
        ('"0"', 0.0),
        ('"-5 V"', -5.0),
        ('"13V1"', 13.1),
        ('"13,1 v"', 13.1),
        ('"715 V"', 715.0),
    ],
)
def test_values_that_a_file_accepts(written: str, value: float) -> None:
    # -5 V to 2.2 x the highest crest (230 V x 1.1 x sqrt 2 x 2.2 = 787 V): the case format, section 4
    assert casefile.loads(swapped('"24.3 V"', written)).readings[0].value == value


def test_a_reading_may_be_one_of_its_words_or_several_for_a_look() -> None:
    text = CONTRACT + '\n[[reading]]\nwhat = "look"\nvalue = ["residue", "dry joint"]\n'
    text += '[[reading]]\nwhat = "look"\nrail = "relay rail"\nvalue = "burnt zener"\n'
    text += '[[reading]]\nwhat = "fuse-resistance"\nvalue = "open"\n'
    values = [reading.value for reading in casefile.loads(text).readings[3:]]
    assert values == [("residue", "dry joint"), ("burnt zener",), "open"]


# --- content that is refused ---


@pytest.mark.parametrize(
    ("old", "new", "table", "key"),
    [
        ("format = 1", "", "", "format"),
        ("format = 1", 'format = "1"', "", "format"),
        ("format = 1", "format = true", "", "format"),
        ("format = 1", "format = 2", "", "format"),
        ("[safe]", "[safer]", "", "safer"),
        ("variation =", "wobble =", "[mains]", "wobble"),
        ('tolerance = "10 %"\nfitted', 'tolernace = "10 %"\nfitted', "[board.dropper]", "tolernace"),
        ('capacitance = "680 nF"  ', 'capacitance = "680"  ', "[board.dropper]", "capacitance"),
        ('capacitance = "680 nF"  ', "capacitance = 680e-9  ", "[board.dropper]", "capacitance"),
        ('capacitance = "680 nF"  ', 'capacitance = "0 nF"  ', "[board.dropper]", "capacitance"),
        ('capacitance = "680 nF"  ', 'capacitance = "-680 nF"  ', "[board.dropper]", "capacitance"),
        ('capacitance = "680 nF"  ', 'capacitance = "24 V"  ', "[board.dropper]", "capacitance"),
        ('rectifier = "bridge"', 'rectifier = "delta"', "[board]", "rectifier"),
        ("in_series = 2", "in_series = 0", "[board.bleeder]", "in_series"),
        ("in_series = 2", "in_series = true", "[board.bleeder]", "in_series"),
        ("fusible = true", 'fusible = "yes"', "[board.inrush]", "fusible"),
        ("made = 2012", "made = 20120", "[board]", "made"),
        ("received = 2026-10-14", 'received = "yesterday"', "[ticket]", "received"),
        ("received = 2026-10-14", "received = 2026-10-14T00:00:00", "[ticket]", "received"),
        ("last_time = 2026-10-14T14:07:00", "last_time = 2026-10-14T14:07:00Z", "[safe]", "last_time"),
        ('ripple = "5 % + 20 mV"', 'ripple = "5 % + 0 V"', "[meter]", "ripple"),
        ('ripple = "5 % + 20 mV"', 'ripple = "often"', "[meter]", "ripple"),
        ('voltage = "18 V", ', 'voltage = "0 V", ', '[[board.rail]] 1 "relay rail"', "zener.voltage"),
        ('resistance = "810 ohm"', 'resistance = "0"', '[[board.load]] 2 "heater relay"', "resistance"),
        ('complaint = "relay', 'complaint = "\\u001b[31mrelay', "[ticket]", "complaint"),
        ('value = "24.3 V"', "value = 24.3", '[[reading]] 1 "rail-voltage"', "value"),
        ('value = "24.3 V"', 'value = "788 V"', '[[reading]] 1 "rail-voltage"', "value"),
        ('value = "24.3 V"', 'value = "-5.1 V"', '[[reading]] 1 "rail-voltage"', "value"),
        ('value = "24.3 V"', "", '[[reading]] 1 "rail-voltage"', "value"),
        ('value = "182 nF"', 'value = "182"', '[[reading]] 3 "dropper-capacitance"', "value"),
        ('what = "dropper-capacitance"', 'what = "dropper"', '[[reading]] 3 "dropper"', "what"),
        ('when = "cold"', 'when = "hot"', '[[reading]] 1 "rail-voltage"', "when"),
        ("on = []   ", 'on = "none"   ', '[[reading]] 1 "rail-voltage"', "on"),
        ("on = []   ", 'on = ["controller"]   ', '[[reading]] 1 "rail-voltage"', "on"),
        (
            "lifted = true",
            'lifted = true\nrail = "relay rail"',
            '[[reading]] 3 "dropper-capacitance"',
            "rail",
        ),
        ('part = "dropper"', 'part = "zener:top"', '[[repair.replaced]] 1 "zener:top"', "part"),
        ('value = "22.9 V"', 'value = "22.9 F"', '[[repair.reading]] 1 "rail-voltage"', "value"),
    ],
)
def test_one_thing_wrong_is_one_problem_that_says_where(old: str, new: str, table: str, key: str) -> None:
    problem = only(swapped(old, new))
    assert (problem.table, problem.key) == (table, key)


@pytest.mark.parametrize(
    ("old", "new", "words"),
    [
        ("format = 1", "format = 2", ["1", "newer"]),
        ("variation =", "variatoin =", ["variation (probably meant)"]),
        ('"680 nF"  ', "680  ", ['"680 nF"', "1 pF to 100 uF"]),
        ('tolerance = "10 %"\nfitted', "tolerance = -3\nfitted", ['"10 %"', "0 % to 95 %"]),
        ('tolerance = "10 %"\nfitted', "tolerance = 12\nfitted", ['"12 %"']),
        ('value = "24.3 V"', "value = -7", ['"12 V"']),
        ('value = "24.3 V"', 'value = "-7 V"', ["leads swapped?"]),
        ('value = "24.3 V"', "value = 13.1", ['"13.1 V"']),
        ('rectifier = "bridge"', 'rectifier = "delta"', ['"bridge"', '"half-wave"', '"half-wave-zener"']),
        ('value = "182 nF"', 'value = "shrunk"', ['"open" or "short"']),
        ("on = []   ", 'on = ["fan"]   ', ['"heater relay"']),
        ('value = "24.3 V"', 'value = "900 V"', ["-5 V to 787 V"]),
    ],
)
def test_a_problem_says_what_is_allowed(old: str, new: str, words: list[str]) -> None:
    problem = only(swapped(old, new))
    assert [word for word in words if word not in problem.allowed] == []


def test_all_problems_come_out_together_in_the_order_of_the_file() -> None:
    text = CONTRACT
    for old, new in [
        ('frequency = "50 Hz"', 'frequency = "fifty"'),
        ("made = 2012", "maid = 2012"),
        ('capacitance = "680 nF"', 'capacitance = "0 F"'),
        ('name = "logic rail"', 'name = "relay rail"'),
        ('rail = "logic rail"\nreturns', 'rail = "motor rail"\nreturns'),
        ('resistance = "810 ohm"', 'resistance = "-810 ohm"'),
        (
            'rail = "relay rail"\non = ["heater relay"]\nvalue = "14.2 V"',
            'rail = "aux rail"\nvalue = "14.2 V"',
        ),
        ('value = "182 nF"', 'value = "182"'),
    ]:
        assert old in text
        text = text.replace(old, new, 1)
    told = [(problem.table, problem.key) for problem in problems(text)]
    expected = [
        ("[mains]", "frequency"),
        ("[board]", "maid"),
        ("[board.dropper]", "capacitance"),
        ('[[board.rail]] 2 "relay rail"', "name"),
        ('[[board.load]] 1 "controller"', "rail"),
        ('[[board.load]] 2 "heater relay"', "resistance"),
        ('[[reading]] 2 "rail-voltage"', "rail"),
        ('[[reading]] 3 "dropper-capacitance"', "value"),
    ]
    assert [place for place in told if place in expected] == expected


def test_the_message_names_file_table_key_found_and_allowed() -> None:
    with pytest.raises(CaseError, match="made") as caught:
        casefile.loads(swapped("made = 2012", "made = 1012"), "proofer.toml")
    assert (
        str(caught.value)
        == "proofer.toml: [board] made: found 1012; allowed: a whole number without quotes, 1900 to 2200"
    )


def test_missing_tables_are_each_named_once() -> None:
    told = [(problem.table, problem.key) for problem in problems("")]
    assert told == [("", "format"), ("", "mains"), ("", "board")]
    assert [
        (problem.table, problem.key) for problem in problems(MINIMAL.replace("rectifier", "name", 1))
    ] == [("[board]", "rectifier")]
    assert only(MINIMAL.replace("board.dropper.capacitance", "ticket.number")).key == "dropper"


@pytest.mark.parametrize("wrong", ["5", "[]", "[5]", '"x"', "true", "1979-05-27"])
@pytest.mark.parametrize("key", ["ticket", "mains", "board", "meter", "reading", "repair", "safe"])
def test_a_value_where_tables_belong_is_refused_in_words(key: str, wrong: str) -> None:
    if key == "reading" and wrong == "[]":
        assert casefile.loads(f"{key} = {wrong}\n{MINIMAL}").readings == ()
        return
    text = f"{key} = {wrong}\n" + "".join(
        line for line in MINIMAL.splitlines(True) if not line.startswith(key)
    )
    assert any(problem.key == key or key == "board" for problem in problems(text))


def test_what_stands_in_a_message_is_short_and_printable() -> None:
    long = "\\u001b" + "x" * 5000
    for problem in problems(
        swapped('rectifier = "bridge"', f'rectifier = "{long}"').replace("made =", f'"{long}" =')
    ):
        assert len(str(problem)) < 400
        assert str(problem).isprintable()


@pytest.mark.parametrize(
    ("text", "line"),
    [
        ("format = 1\nticket = [\n", "line 2"),
        ("format = 1\n[board\n", "line 2"),
        ("a = 1\na = 2\n", "line 2"),
        ("x = \x00", "line 1"),
    ],
)
def test_broken_toml_is_told_with_its_line(text: str, line: str) -> None:
    assert only(text).key == line


@pytest.mark.parametrize(
    "deep", ["[" * 100_000, "{a=" * 50_000, "[" * 3000 + "]" * 3000, "1\n" + "b." * 100_000 + "b = 1"]
)
def test_deep_nesting_is_refused_in_words(deep: str) -> None:
    assert problems(f"a = {deep}")


def test_a_number_of_thousands_of_figures_is_refused_in_words() -> None:
    assert problems(f"format = {'9' * 5000}")
    assert problems(f"format = 0x{'f' * 5000}")


def test_sane_limits_are_said() -> None:
    rail = (
        '\n[[board.rail]]\nname = "{}"\nfed_by = "rail"\nfed_through = "resistor"\nfeed_resistance = "1k"\n'
    )
    assert len(casefile.loads(MINIMAL + "".join(rail.format(n) for n in range(7))).board.rails) == 8
    assert only(MINIMAL + "".join(rail.format(n) for n in range(8))).allowed == "1 to 8"
    load = '\n[[board.load]]\nname = "load {}"\nkind = "current"\nrail = "rail"\ncurrent = "1 mA"\n'
    assert only(MINIMAL + "".join(load.format(n) for n in range(41))).allowed == "0 to 40"
    reading = '\n[[reading]]\nwhat = "mains-voltage"\nvalue = "230"\n'
    assert only(MINIMAL + reading * 501).allowed == "0 to 500"


def seconds(work: Callable[[], object]) -> float:
    """The best of three runs."""
    times = []
    for _ in range(3):
        start = time.perf_counter()
        work()
        times.append(time.perf_counter() - start)
    return min(times)


def test_a_file_full_of_problems_takes_no_longer_than_its_size_warrants() -> None:
    def readings(count: int) -> str:
        return MINIMAL + '[[reading]]\nwhat = "tea-leaves"\nvalue = "5"\n' * count

    # ten times the readings: linear work with room for noise, far from the hundredfold of quadratic work
    assert seconds(lambda: problems(readings(500))) < 40 * seconds(lambda: problems(readings(50)))


def test_unknown_keys_beyond_counting_are_counted() -> None:
    found = problems(MINIMAL + "[ticket]\n" + "".join(f"key{n} = 1\n" for n in range(1000)))
    assert len(found) == 51
    assert found[-1].found == "950 more unknown keys"


def test_dots_in_words_are_no_nesting() -> None:
    dotted = ".".join("abcdefghijklmnop")
    case = casefile.loads(f'# {dotted}\n{MINIMAL}[ticket]\nnumber = "{dotted}"\n')
    assert case.ticket.number == dotted


# --- files that are refused ---


def reason(path: str | Path) -> str:
    with pytest.raises(FileError) as caught:
        casefile.load(path)
    return caught.value.reason


def test_a_file_that_is_none(tmp_path: Path) -> None:
    assert "No such file" in reason(tmp_path / "none.toml")
    assert "folder" in reason(tmp_path)
    assert "cannot be read" in reason("a\0b")
    assert "cannot be read" in reason("x" * 5000)


def test_a_binary_is_told_from_a_text(tmp_path: Path) -> None:
    path = tmp_path / "picture.toml"
    path.write_bytes(b"\x89PNG\r\n\x1a\n" + bytes(range(256)))
    assert "UTF-8" in reason(path)
    path.write_bytes(b"format = 1\0\0\0")
    assert "zero bytes" in reason(path)


def test_a_file_of_fifty_megabytes_is_refused_without_reading_it(tmp_path: Path) -> None:
    path = tmp_path / "huge.toml"
    with path.open("wb") as stream:
        stream.truncate(50_000_000)
    assert "too large" in reason(path)
    with pytest.raises(FileError, match="too large"):
        casefile.loads("#" * 2_000_000)


def test_a_pipe_does_not_hang_the_reader(tmp_path: Path) -> None:
    os.mkfifo(tmp_path / "pipe")
    assert "ordinary file" in reason(tmp_path / "pipe")
