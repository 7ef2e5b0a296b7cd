"""The README: what it tells a newcomer to type works, and its tables say what the tool has."""

from __future__ import annotations

import re
import shlex
from pathlib import Path

import pytest

from benchtool import cli, errors
from benchtool.casefile import load
from benchtool.catalogue.readings import READINGS, ReadingKind
from benchtool.words import typed_value
from tests.assessed import SAMPLES, assessed_once

README = Path(__file__).parent.parent.joinpath("README.md").read_text(encoding="utf-8")
COMMAND = re.compile(r"(?:^ *|`)(benchtool [^`\n]+)", re.MULTILINE)


def part(heading: str) -> str:
    """The text under a heading, up to the next one of whatever rank."""
    return re.split(r"^#+ ", README.split(f"# {heading}\n")[1], maxsplit=1, flags=re.MULTILINE)[0]


def rows(text: str) -> list[list[str]]:
    """The cells of a table, without its heading."""
    lines = [line for line in text.splitlines() if line.startswith("|")]
    return [[cell.strip() for cell in line.strip("|").split("|")] for line in lines[2:]]


def test_every_line_of_your_own_board_works_in_its_order(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.chdir(tmp_path)
    monkeypatch.setattr("benchtool.assessment.assess", assessed_once)
    commands = COMMAND.findall(part("Your own board"))
    for command in commands:
        assert cli.main(shlex.split(command)[1:]) == 0, (command, capsys.readouterr().err)
    assert [shlex.split(command)[1] for command in commands] == ["new", "assess", "assess"]
    assert ["--save" in command for command in commands] == [False, False, True]
    assert [reading.what for reading in load("my-case.toml").readings] == ["rail-voltage"]
    assert Path("my-case.toml.bak").exists()


def test_the_set_up_is_two_lines_that_install() -> None:
    blocks = re.findall(r"^```\n(.*?)^```$", README, re.MULTILINE | re.DOTALL)[:2]
    assert [block.count("\n") for block in blocks] == [1, 1]
    assert ["pip install" in block for block in blocks] == [True, True]


def test_the_samples_are_those_of_the_folder() -> None:
    listed = [row[0].strip("`") for row in rows(part("Samples"))]
    assert listed == [path.name for path in SAMPLES]
    for row, path in zip(rows(part("Samples")), SAMPLES, strict=True):
        case = load(path)
        mains = case.board.mains
        assert row[1] == f"{case.board.name}, {case.board.rectifier}, {mains.voltage:g} V {mains.frequency:g} Hz"
        assert row[2] == case.ticket.complaint


def test_the_exit_statuses_are_those_of_the_command_line() -> None:
    kinds = (errors.BenchtoolError, errors.QuantityError, errors.CaseError, errors.FileError)
    told = re.findall(r"(?:^|; )([0-9]+) ", part("Exit status").replace("\n", " ").strip())
    expected = {0, cli.USAGE, cli.FILE, cli.INTERRUPTED, *(kind.exit_status for kind in kinds)}
    assert set(errors.BenchtoolError.__subclasses__()) == set(kinds[1:])
    assert [int(status) for status in told] == sorted(expected)


def row_of(kind: ReadingKind) -> list[str]:
    """A reading's row of the table but for what it is: word with what it needs, board, what it may say, values."""
    unit = [typed_value(kind).split()[-1]] if kind.unit is not None else []
    needs = " ".join([kind.name, *(key.upper() for key in kind.needs)])
    return [f"`{needs}`", kind.condition, ", ".join(kind.may), ", ".join([*unit, *kind.words])]


def test_the_readings_are_those_of_the_catalogue() -> None:
    table = rows(part("Readings"))
    assert [[word, *others] for word, _, *others in table] == [row_of(kind) for kind in READINGS]
    assert all(what for _, what, *_ in table)
