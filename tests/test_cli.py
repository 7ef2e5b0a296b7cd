"""The command line: exit statuses, one plain message for every mistake, and outputs of every kind."""

from __future__ import annotations

import io
import json
import os
import re
import shlex
import subprocess
import sys
from pathlib import Path

import pytest

import benchtool
from benchtool import cli
from benchtool.report.layout import Page
from benchtool.report.template import TEMPLATE
from benchtool.report.text import report_lines
from tests.assessed import assessed_once, sample_path

SAMPLE = sample_path("pump-dead")
RUN = [sys.executable, "-m", "benchtool"]
RAIL_READING = "rail-voltage '12 V rail' on 'motor relay' 8.6 V"
Captured = pytest.CaptureFixture[str]


@pytest.fixture(autouse=True)
def _plain_surroundings(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("COLUMNS", "80")
    monkeypatch.setenv("TERM", "xterm")
    monkeypatch.delenv("NO_COLOR", raising=False)
    monkeypatch.setattr("benchtool.assessment.assess", assessed_once)


@pytest.fixture
def case_file(tmp_path: Path) -> Path:
    path = tmp_path / "opener.toml"
    path.write_text(TEMPLATE, encoding="utf-8")
    return path


def complaint(capsys: Captured, *words: str) -> tuple[int, str]:
    """Exit status and message of a command that must fail, with nothing on standard output."""
    status = cli.main(words)
    out, err = capsys.readouterr()
    assert out == ""
    assert err.startswith("benchtool: ")
    assert "Traceback" not in err
    return status, err


def unfolded(message: str) -> list[str]:
    """The problems of a message, each on one line again."""
    return message.replace("\n    ", " ").splitlines()


def test_assess_ends_with_0_whatever_it_finds(capsys: Captured) -> None:
    assert cli.main(["assess", str(SAMPLE)]) == 0
    out, err = capsys.readouterr()
    assert out.startswith("NOT ISOLATED")
    assert "MOST LIKELY  inrush resistor: open" in out
    assert "\x1b" not in out
    assert err == ""


def test_the_width_is_that_of_the_surroundings(capsys: Captured, monkeypatch: pytest.MonkeyPatch) -> None:
    for columns, least, most in (("40", 30, 40), ("20", 25, 32), ("300", 90, 100)):
        monkeypatch.setenv("COLUMNS", columns)
        cli.main(["assess", str(SAMPLE)])
        longest = max(map(len, capsys.readouterr().out.splitlines()))
        assert least <= longest <= most


def test_json_is_the_result_of_the_python_door(capsys: Captured) -> None:
    assert cli.main(["assess", str(SAMPLE), "--json"]) == 0
    printed = json.loads(capsys.readouterr().out, parse_constant=pytest.fail)
    expected = assessed_once(benchtool.load(SAMPLE)).as_dict()
    assert printed == json.loads(json.dumps(expected, allow_nan=False))
    assert any("isolat" in caution for caution in printed["cautions"])


def test_standard_input_is_a_case(capsys: Captured, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(sys, "stdin", io.TextIOWrapper(io.BytesIO(SAMPLE.read_bytes())))
    assert cli.main(["assess", "-"]) == 0
    from_pipe = capsys.readouterr().out
    cli.main(["assess", str(SAMPLE)])
    assert from_pipe == capsys.readouterr().out


def test_a_given_reading_counts_and_is_not_kept(capsys: Captured, case_file: Path) -> None:
    assert cli.main(["assess", str(case_file), "--reading", RAIL_READING]) == 0
    assert "12 V rail, motor relay on" in capsys.readouterr().out
    assert case_file.read_text(encoding="utf-8") == TEMPLATE
    assert not list(case_file.parent.glob("*.bak"))


def test_save_keeps_the_readings_and_every_comment(capsys: Captured, case_file: Path) -> None:
    words = ["assess", str(case_file), "--save", "--reading", RAIL_READING, "--reading", "dropper-capacitance lifted 231n"]
    assert cli.main(words) == 0
    capsys.readouterr()
    saved = case_file.read_text(encoding="utf-8")
    assert [reading.what for reading in benchtool.load(case_file).readings] == ["rail-voltage", "dropper-capacitance"]
    comments = [line for line in TEMPLATE.splitlines() if "#" in line]
    assert set(comments) <= set(saved.splitlines())
    assert case_file.with_name("opener.toml.bak").read_text(encoding="utf-8") == TEMPLATE


def saved_reading(capsys: Captured, case_file: Path, reading: str, *options: str) -> str:
    """What a save of one reading prints behind the report."""
    assert cli.main(["assess", str(case_file), "--save", "--reading", reading, *options]) == 0
    out, err = capsys.readouterr()
    assert err == ""
    return out


def test_save_says_what_it_did(capsys: Captured, case_file: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(case_file.parent)
    name = Path(case_file.name)
    kept = "Kept 1 reading in opener.toml; the file before is opener.toml.bak.\n"
    assert saved_reading(capsys, name, "rail-voltage '12 V rail' 7.4 V").endswith(f"\n\n{kept}")
    replaced = "Replaced 7.4 V by 7.2 V: 12 V rail, all off.\n"
    assert saved_reading(capsys, name, "rail-voltage '12 V rail' 7.2 V").endswith(f"\n\n{replaced}{kept}")
    again = saved_reading(capsys, name, "rail-voltage '12 V rail' 7.2 V")
    assert again.endswith("\n\nNothing to keep: opener.toml says so already.\n")
    assert [reading.value for reading in benchtool.load(name).readings] == [7.2]
    assert "7.4 V" in Path("opener.toml.bak").read_text(encoding="utf-8")


def test_a_save_says_nothing_in_json(capsys: Captured, case_file: Path) -> None:
    assert json.loads(saved_reading(capsys, case_file, RAIL_READING, "--json"))["format"] == 1


def test_a_point_read_again_counts_once_also_without_a_save(capsys: Captured, case_file: Path) -> None:
    saved_reading(capsys, case_file, "rail-voltage '12 V rail' 7.4 V")
    before = case_file.read_text(encoding="utf-8")
    assert cli.main(["assess", str(case_file), "--reading", "rail-voltage 7.2 V"]) == 0
    out = capsys.readouterr().out
    assert out.endswith("\n\n7.2 V counts in place of 7.4 V: 12 V rail, all off.\n")
    assert out.count("7.4 V") == 1
    assert case_file.read_text(encoding="utf-8") == before


def test_other_points_and_further_looks_are_added(capsys: Captured, case_file: Path) -> None:
    for line in (
        "rail-voltage 7.4 V", "rail-voltage on 'motor relay' 7.1 V", "rail-voltage warm 7.0 V", "look residue", "look dry joint",
    ):
        assert "Replaced" not in saved_reading(capsys, case_file, line)
    assert len(benchtool.load(case_file).readings) == 5


def test_new_writes_a_case_that_can_be_judged_and_says_what_next(capsys: Captured, tmp_path: Path) -> None:
    path = tmp_path / "opener.toml"
    assert cli.main(["new", str(path)]) == 0
    out = capsys.readouterr().out
    assert "benchtool assess" in out
    assert "isolat" in out
    assert "discharg" in out
    assert cli.main(["assess", str(path)]) == 0


def test_new_leaves_a_file_that_is_there_alone(capsys: Captured, case_file: Path) -> None:
    case_file.write_text("mine", encoding="utf-8")
    status, message = complaint(capsys, "new", str(case_file))
    assert status == 4
    assert "stands there already" in message
    assert case_file.read_text(encoding="utf-8") == "mine"


@pytest.mark.parametrize("words", [["--help"], ["assess", "--help"], ["new", "--help"]])
def test_help_shows_examples_first_and_carries_the_caution(capsys: Captured, words: list[str]) -> None:
    assert cli.main(words) == 0
    out = capsys.readouterr().out
    assert out.startswith("examples:\n  benchtool ")
    assert out.endswith(cli.CAUTION)


def test_every_example_of_the_help_is_understood(
    capsys: Captured, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    monkeypatch.setattr(sys, "stdin", io.TextIOWrapper(io.BytesIO(TEMPLATE.encode())))
    text = (cli.EXAMPLES + cli.ASSESS_EXAMPLES).replace("\\\n", "")
    examples = [line.strip() for line in text.splitlines() if line.startswith("  benchtool")]
    for example in examples:
        command = re.split(r" {3,}(?=[a-z])| <", example)[0]  # what follows is a remark, or the shell's
        assert cli.main(shlex.split(command)[1:]) == 0, command
        capsys.readouterr()
    assert len(examples) == 8


def test_version(capsys: Captured) -> None:
    assert cli.main(["--version"]) == 0
    assert capsys.readouterr().out == f"benchtool {benchtool.__version__}\n"


@pytest.mark.parametrize(
    ("words", "told"),
    [
        ([], "benchtool assess CASE"),
        (["board.toml"], "benchtool assess board.toml"),
        (["my board.toml"], "benchtool assess 'my board.toml'"),
        (["-"], "benchtool assess -"),
        (["judge", "board.toml"], "benchtool assess CASE"),
        (["--no-color"], "COMMAND"),
        (["--bogus"], "Help: benchtool --help"),
        (["assess"], "CASE"),
        (["assess", "a", "--read", "x"], "--read"),
        (["assess", "a", "b"], "b"),
        (["assess", "a", "--save"], "no reading was given"),
        (["assess", "-", "--save", "--reading", "x"], "standard input cannot be saved"),
        (["new"], "PATH"),
        (["new", "-"], "name of a file"),
        (["assess", "a", "--\x1b[31m"], "?[31m"),
    ],
)
def test_usage_is_2_and_one_line(capsys: Captured, words: list[str], told: str) -> None:
    status, message = complaint(capsys, *words)
    assert status == 2
    (line,) = unfolded(message)
    assert told in line
    assert max(map(len, message.splitlines())) <= 80


def test_files_that_are_no_case_are_4(capsys: Captured, tmp_path: Path) -> None:
    binary = tmp_path / "picture.toml"
    binary.write_bytes(bytes(range(256)))
    for name in (tmp_path / "missing.toml", tmp_path, binary):
        status, message = complaint(capsys, "assess", str(name))
        assert status == 4
        assert str(name) in message
        assert len(unfolded(message)) == 1
    assert complaint(capsys, "new", str(tmp_path / "no folder" / "a.toml"))[0] == 4


def test_a_case_with_problems_is_3_and_tells_all_of_them(capsys: Captured, case_file: Path) -> None:
    text = TEMPLATE.replace("rated_voltage", "rated_volts").replace('"4 mA"', '"4 m/s"')
    case_file.write_text(text, encoding="utf-8")
    status, message = complaint(capsys, "assess", str(case_file))
    assert status == 3
    assert "rated_volts" in message
    assert "4 m/s" in message


def test_problems_after_the_first_are_set_in_and_all_are_folded(
    capsys: Captured, case_file: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("COLUMNS", "50")
    words = ["--reading", "fuse-resistance 0.2", "--reading", "rail-voltage 900 V"]
    _, message = complaint(capsys, "assess", str(case_file), *words)
    first, second = unfolded(message)
    assert "this board has no fuse; [board.fuse] would add one" in first
    assert second.startswith("  --reading: ")
    assert message.count("benchtool: ") == 1
    assert max(map(len, message.splitlines())) <= 50


@pytest.mark.parametrize("columns", ["32", "46", "80"])
def test_folding_parts_neither_a_command_nor_a_value_from_its_unit(
    capsys: Captured, case_file: Path, monkeypatch: pytest.MonkeyPatch, columns: str
) -> None:
    monkeypatch.setenv("COLUMNS", columns)
    assert "benchtool assess board.toml." in complaint(capsys, "board.toml")[1]
    message = complaint(capsys, "assess", str(case_file), "--reading", "rail-voltage 900 V")[1]
    assert "-5 V" in message
    assert "787 V" in message


def test_bad_readings_are_3_told_together_and_nothing_is_saved(capsys: Captured, case_file: Path) -> None:
    words = ["--reading", "rail-voltage 'no rail' 5 V", "--reading", "colour red", "--reading", RAIL_READING, "--save"]
    status, message = complaint(capsys, "assess", str(case_file), *words)
    assert status == 3
    assert '"no rail"' in message
    assert '"colour"' in message
    assert case_file.read_text(encoding="utf-8") == TEMPLATE


def test_an_error_without_a_status_of_its_own_is_1(capsys: Captured, monkeypatch: pytest.MonkeyPatch) -> None:
    def fail(case: object) -> None:
        raise benchtool.BenchtoolError("something in words")

    monkeypatch.setattr("benchtool.assessment.assess", fail)
    assert complaint(capsys, "assess", str(SAMPLE)) == (1, "benchtool: something in words\n")


def test_an_interrupt_is_130(capsys: Captured, monkeypatch: pytest.MonkeyPatch) -> None:
    def stop(case: object) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr("benchtool.assessment.assess", stop)
    assert complaint(capsys, "assess", str(SAMPLE)) == (130, "benchtool: stopped\n")


@pytest.mark.parametrize("name", ["stdin", "stdout"])
def test_a_closed_stream_is_told(capsys: Captured, monkeypatch: pytest.MonkeyPatch, name: str) -> None:
    monkeypatch.setattr(sys, name, None)
    status = cli.main(["assess", "-"])
    monkeypatch.undo()
    assert status == 4
    assert "closed" in capsys.readouterr().err


def test_a_reader_that_leaves_early_is_no_error() -> None:
    with subprocess.Popen([*RUN, "assess", str(SAMPLE)], stdout=subprocess.PIPE, stderr=subprocess.PIPE) as started:
        assert started.stdout is not None
        assert started.stderr is not None
        started.stdout.close()
        complaints = started.stderr.read()
    assert complaints == b""
    assert started.returncode == 0


def test_a_full_disk_behind_the_output_is_told() -> None:
    with open("/dev/full", "wb") as full:
        done = subprocess.run([*RUN, "--help"], stdout=full, stderr=subprocess.PIPE, check=False, text=True)
    assert done.returncode == 4
    assert done.stderr.startswith("benchtool: standard output: cannot be written")
    assert done.stderr.count("\n") == 1


class Screen(io.TextIOWrapper):
    """Standard output of a given encoding that calls itself a terminal."""

    def __init__(self, encoding: str = "utf-8") -> None:
        self.bytes = io.BytesIO()
        super().__init__(self.bytes, encoding=encoding, write_through=True)

    def isatty(self) -> bool:
        return True


@pytest.mark.parametrize("encoding", ["ascii", "latin-1", "utf-8"])
def test_no_encoding_is_too_small(encoding: str, case_file: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    case_file.write_text(TEMPLATE.replace("window opener control", "電源 Ω"), encoding="utf-8")
    screen = Screen(encoding)
    monkeypatch.setattr(sys, "stdout", screen)
    assert cli.main(["assess", str(case_file)]) == 0
    text = screen.bytes.getvalue().decode(encoding)
    assert ("10 kΩ" in text) == (encoding == "utf-8")
    assert ("10 kohm" in text) == (encoding != "utf-8")
    assert ("█" in text) == (encoding == "utf-8")


def test_an_ascii_surrounding_gets_ascii() -> None:
    surroundings = {**os.environ, "PYTHONIOENCODING": "ascii"}
    done = subprocess.run([*RUN, "assess", str(SAMPLE)], env=surroundings, capture_output=True, check=True)
    assert "10 kohm" in done.stdout.decode("ascii")
    assert done.stderr == b""


def test_json_in_ascii_says_the_same(monkeypatch: pytest.MonkeyPatch) -> None:
    screen = Screen("ascii")
    monkeypatch.setattr(sys, "stdout", screen)
    assert cli.main(["assess", str(SAMPLE), "--json"]) == 0
    printed = json.loads(screen.bytes.getvalue().decode("ascii"))
    assert printed == json.loads(json.dumps(assessed_once(benchtool.load(SAMPLE)).as_dict()))


@pytest.mark.parametrize(
    ("words", "no_color", "styled"), [([], None, True), (["--no-color"], None, False), ([], "1", False), ([], "", True)]
)
def test_escape_codes_only_on_a_terminal_that_wants_them(
    words: list[str], no_color: str | None, styled: bool, monkeypatch: pytest.MonkeyPatch
) -> None:
    if no_color is not None:
        monkeypatch.setenv("NO_COLOR", no_color)
    screen = Screen()
    monkeypatch.setattr(sys, "stdout", screen)
    assert cli.main(["assess", str(SAMPLE), *words]) == 0
    output = screen.bytes.getvalue().decode()
    assert ("\x1b[" in output) == styled
    plain = re.sub(r"\x1b\[[0-9;]*m", "", output)
    assert plain == "".join(f"{line.text}\n" for line in report_lines(assessed_once(benchtool.load(SAMPLE)), Page(80)))


def test_public_names_are_there_on_asking() -> None:
    assert set(benchtool.__all__) <= set(dir(benchtool))
    case = benchtool.loads(TEMPLATE)
    assert benchtool.loads(benchtool.dumps(case)) == case
    name = "nothing"
    with pytest.raises(AttributeError, match="no attribute 'nothing'"):
        getattr(benchtool, name)


class _Terminal(io.StringIO):
    def isatty(self) -> bool:
        return True


def test_a_terminal_is_told_what_takes_its_time_and_nothing_of_it_stays(
    case_file: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    terminal = _Terminal()
    monkeypatch.setattr(sys, "stderr", terminal)
    assert cli.main(["assess", str(case_file), "--json"]) == 0
    first, wiped, last = terminal.getvalue().split("\r")
    assert first == cli.WORKING
    assert wiped == " " * len(cli.WORKING)
    assert last == ""
