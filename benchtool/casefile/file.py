"""A case file, format 1: TOML text ↔ `Case`.

Why one module: whoever opens, checks or saves a case comes through these four functions, and no other part
of the tool knows what the file looks like. All problems of a file come out at once, and nothing is written
that would not read back.
"""

from __future__ import annotations

import os
import re
import stat
import tomllib
from dataclasses import dataclass, replace
from typing import Annotated

from benchtool.board import Board, Mains, Table, Whole
from benchtool.case import Case, Meter, Repair, Safe, Ticket
from benchtool.casefile.check import check_board, check_repair
from benchtool.casefile.readings import read_readings, reading_to_toml
from benchtool.casefile.save import file_name, reason_of, save_text
from benchtool.casefile.scan import comments_of, has_long_key
from benchtool.casefile.schema import Findings, Place, Toml, read_record, read_table, stand_in_record, to_toml
from benchtool.errors import CaseError, FileError, Problem
from benchtool.printable import printable, quoted, shown

FORMAT = 1
LARGEST = 1_000_000
"""Largest case file that is read [bytes]; 500 readings take about 50 000."""
TOP = Place()
NO_TICKET, NOT_SAFE_YET, USUAL_METER = Ticket(), Safe(), Meter()


@dataclass(frozen=True, slots=True, kw_only=True)
class Sheet:
    """The tables at the top of the file, but for those that need the board read first."""

    format: Annotated[int, Whole(FORMAT, FORMAT)]
    ticket: Annotated[Ticket, Table(Ticket, "ticket")] = NO_TICKET
    safe: Annotated[Safe, Table(Safe, "safe")] = NOT_SAFE_YET
    mains: Annotated[Mains, Table(Mains, "mains")]
    meter: Annotated[Meter, Table(Meter, "meter")] = USUAL_METER


def load(path: str | os.PathLike[str]) -> Case:
    """The case in a file. FileError where it is no text, CaseError with all problems of its content."""
    return loads(read_text(path), file_name(path))


def loads(text: str, name: str = "case") -> Case:
    """The case in a text; `name` stands before every problem.

    CaseError with all of them, FileError where the text is too large for a case.
    """
    if len(text) > LARGEST:
        raise FileError(name, f"too large for a case file, which holds at most {LARGEST} bytes")
    text = text.removeprefix("\ufeff")  # a mark that some editors put before UTF-8
    data = _parse(text, name)
    _refuse_other_formats(data, name)
    findings = Findings()
    case = _read_case(data, findings)
    findings.raise_any(name, data)
    return replace(case, text=text)


def dump(case: Case, path: str | os.PathLike[str]) -> str | None:
    """Save a case in one step; gives the name of the `.bak` that keeps the previous content, as `save_text` does.

    CaseError where it would not read back, FileError where it cannot be written; the file is unchanged then.
    """
    text = dumps(case)
    loads(text, file_name(path))
    return save_text(path, text)


def dumps(case: Case) -> str:
    """The case as a text: its own, with comments, order and spelling, changed only where the case differs."""
    from benchtool.casefile.render import edited, fresh  # only here: tomlkit is slow to import

    new = to_data(case)
    if case.text is None:
        return fresh(new)
    try:
        text = edited(case.text, to_data(loads(case.text)), new)
        if loads(text) == case:
            return text
    except (CaseError, LookupError):  # tables in an order that tomlkit loses its way in
        pass
    return fresh(new, comments_of(case.text))


def read_text(path: str | os.PathLike[str]) -> str:
    """The text of a file; FileError where it is missing, a folder, too large or no UTF-8."""
    name = file_name(path)
    try:
        _refuse_unless_file(os.stat(path).st_mode, name)
        with open(path, "rb") as stream:
            content = stream.read(LARGEST + 1)
    except (OSError, ValueError) as failure:
        raise FileError(name, f"cannot be read: {reason_of(failure)}") from failure
    return decode(content, name)


def decode(content: bytes, name: str) -> str:
    """The text of a file's or a pipe's bytes; FileError where they are too many or no UTF-8 text."""
    if len(content) > LARGEST:
        raise FileError(name, f"too large for a case file, which holds at most {LARGEST} bytes")
    try:
        text = content.decode("utf-8")
    except UnicodeDecodeError as failure:
        raise FileError(name, f"not a text in UTF-8: byte {failure.start} is none") from failure
    if "\0" in text:
        raise FileError(name, "not a text: it holds zero bytes")
    return text


def _refuse_unless_file(mode: int, name: str) -> None:
    """A folder has no text, and a device or pipe might never end."""
    if stat.S_ISDIR(mode):
        raise FileError(name, "a folder, not a case file")
    if not stat.S_ISREG(mode):
        raise FileError(name, "not an ordinary file")


TOO_DEEP = Problem("the file", "", "tables nested too deeply", "a table inside another, a few levels at most")
LONGEST_LOOKED_AT = 200
"""How much of a faulty line is searched for a value without quotes [characters]."""
BARE_VALUE = re.compile(r"""=\s*((?:[^\s"'\[\]{},#=]|,(?=[0-9]))(?:[^"'\[\]{},#=]|,(?=[0-9]))*)(?=[,}]|$)""")
TOMLLIB_PLACE = re.compile(r" \(at (?:line (\d+), column \d+|end of document)\)$")


def _parse(text: str, name: str) -> Toml:
    """The TOML of a text; CaseError with the line where it is none."""
    problem = TOO_DEEP
    try:
        if not has_long_key(text):
            return tomllib.loads(text)
    except RecursionError:
        pass
    except ValueError as failure:  # TOMLDecodeError is one; a number of thousands of figures is a plain one
        problem = _syntax_problem(text, str(failure))
    raise CaseError(name, [problem])


def _syntax_problem(text: str, message: str) -> Problem:
    place = TOMLLIB_PLACE.search(message)
    lines = text.splitlines() or [""]
    number = int(place[1]) if place and place[1] else len(lines)
    line = lines[min(number, len(lines)) - 1].strip()
    bare = _value_without_quotes(line[:LONGEST_LOOKED_AT].split("#")[0])
    reason = f"TOML ({printable(TOMLLIB_PLACE.sub('', message), 100)})"
    allowed = reason if bare is None else f"put the value in quotes: {quoted(bare)}"
    return Problem("", f"line {number}", quoted(line), allowed)


def _value_without_quotes(line: str) -> str | None:
    """The first value of a line that stands bare and is none in TOML: `470 nF`, `coil`; None where there is none."""
    values = (match[1].strip() for match in BARE_VALUE.finditer(line))
    return next((value for value in values if not _is_toml(f"x = {value}")), None)


def _is_toml(line: str) -> bool:
    try:
        tomllib.loads(line)
    except ValueError:
        return False
    return True


def _refuse_other_formats(data: Toml, name: str) -> None:
    """A file of another format is not read further: its keys may mean something else."""
    number = data.get("format")
    if isinstance(number, int) and not isinstance(number, bool) and number != FORMAT:
        newer = "; this file was made by a newer version of the tool" if number > FORMAT else ""
        raise CaseError(name, [Problem("", "format", shown(number), f"{FORMAT}{newer}")])


def _read_case(data: Toml, findings: Findings) -> Case:
    sheet = read_record(Sheet, data, TOP, findings, also=("board", "reading", "repair"))
    board = _read_board(data, sheet.mains, findings)
    check_board(board, findings)
    readings = read_readings(data.get("reading", []), TOP, board, findings)
    repair = _read_repair(data.get("repair", {}), board, findings)
    return Case(
        board=board, ticket=sheet.ticket, safe=sheet.safe, meter=sheet.meter, readings=readings, repair=repair
    )


def _read_board(data: Toml, mains: Mains, findings: Findings) -> Board:
    if "board" not in data:
        findings.add(TOP, "board", "nothing", "a table (required)")
        return stand_in_record(Board, mains=mains)
    return read_table(Board, data["board"], TOP, "board", findings, mains=mains)


def _read_repair(value: object, board: Board, findings: Findings) -> Repair:
    entries = value.get("reading", []) if isinstance(value, dict) else []
    readings = read_readings(entries, TOP.inside("repair"), board, findings)
    repair = read_table(Repair, value, TOP, "repair", findings, also=("reading",), readings=readings)
    check_repair(repair, board, findings)
    return repair


ORDER = ("format", "ticket", "safe", "mains", "board", "meter", "reading", "repair")
"""The tables of a fresh file from top to bottom."""


def to_data(case: Case) -> dict[str, object]:
    """The plain tables of a case in the order of a fresh file; what has its default is left out."""
    sheet = Sheet(format=FORMAT, ticket=case.ticket, safe=case.safe, mains=case.board.mains, meter=case.meter)
    repair = to_toml(case.repair)
    if case.repair.readings:
        repair["reading"] = [reading_to_toml(reading) for reading in case.repair.readings]
    data = {
        **to_toml(sheet),
        "board": to_toml(case.board),
        "reading": [reading_to_toml(reading) for reading in case.readings],
        "repair": repair,
    }
    return {key: data[key] for key in ORDER if data.get(key)}
