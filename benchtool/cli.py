"""The command line: which command, which case, where the result goes, and the exit status.

Why so thin: every answer comes from `assess` and the report, which the screens use too. Nothing heavy is
imported before a command needs it, so that `--help` is there at once.
"""

from __future__ import annotations

import argparse
import os
import shlex
import sys
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from typing import TYPE_CHECKING, NoReturn, TextIO

import benchtool

if TYPE_CHECKING:
    from _typeshed import SupportsWrite

    from benchtool.case import Case
    from benchtool.report.layout import Page
    from benchtool.result import Assessment

PROGRAM = "benchtool"
COMMANDS = ("assess", "new")
USAGE, FILE, INTERRUPTED = 2, 4, 130
WORKING = "Trying every fault on boards within tolerance ..."
STDIN = "-"

CAUTION = """\
CAUTION
  Boards without a transformer are NOT ISOLATED: every point can be at mains.
  Power one only through an isolating transformer. Before every dead reading
  unplug, wait, discharge the dropper and every reservoir, and measure on a
  DC range: each of them and the plug pins must be under 5 V.
  Local codes and licensed practice come first.
"""
EXAMPLES = """\
examples:
  benchtool new opener.toml              a commented case file to fill in
  benchtool assess opener.toml           the verdict on it
  benchtool assess opener.toml --reading "dropper-capacitance lifted 231n"
  benchtool assess opener.toml --json    the same for scripts

"""
ASSESS_EXAMPLES = """\
examples:
  benchtool assess opener.toml
  benchtool assess opener.toml --reading "rail-voltage '12 V rail' 12.4 V"
  benchtool assess opener.toml --save \\
      --reading "rail-voltage '12 V rail' on 'motor relay' 8.6 V"
  benchtool assess - --json < opener.toml

"""
NEW_EXAMPLES = """\
examples:
  benchtool new opener.toml

"""


class _Parser(argparse.ArgumentParser):
    """Help with the examples first and the caution last; a usage error in one plain sentence."""

    examples = ""

    def format_help(self) -> str:
        return f"{self.examples}{super().format_help()}\n{CAUTION}"

    def _print_message(self, message: str, file: SupportsWrite[str] | None = None) -> None:
        """Unlike the library's own, without swallowing that the output is full or gone."""
        (file or sys.stdout).write(message)

    def error(self, message: str) -> NoReturn:
        _complain(f"{message}. Help: {self.prog} --help")
        raise SystemExit(USAGE)


def _parser() -> _Parser:
    plain = _Parser(add_help=False)
    no_codes = "no bold, no escape codes"
    plain.add_argument("--no-color", action="store_true", default=argparse.SUPPRESS, help=no_codes)
    description = "Bench diagnosis of mains supplies without a transformer."
    parser = _Parser(prog=PROGRAM, description=description, parents=[plain], allow_abbrev=False)
    parser.examples = EXAMPLES
    parser.add_argument("--version", action="version", version=f"{PROGRAM} {benchtool.__version__}")
    commands = parser.add_subparsers(dest="command", metavar="COMMAND", required=True)
    assess = commands.add_parser("assess", parents=[plain], allow_abbrev=False, help="the verdict on a case")
    assess.examples = ASSESS_EXAMPLES
    assess.add_argument("case", metavar="CASE", help="case file, or - for standard input")
    reading = "a reading beside those in the file; may be given several times"
    assess.add_argument("--reading", metavar="TEXT", action="append", default=[], help=reading)
    assess.add_argument("--save", action="store_true", help="keep the given readings in the file")
    assess.add_argument("--json", action="store_true", help="the result for scripts, SI units, not rounded")
    assess.set_defaults(run=_assess)
    new = commands.add_parser("new", parents=[plain], allow_abbrev=False, help="write a commented case file")
    new.examples = NEW_EXAMPLES
    new.add_argument("path", metavar="PATH", help="the file to make; one that is there is left alone")
    new.set_defaults(run=_new)
    return parser


def main(argv: Sequence[str] | None = None) -> int:
    """Run one command and give its exit status; never a traceback for anything a user can do."""
    words = list(sys.argv[1:] if argv is None else argv)
    if sys.stdout is None:  # started with its output closed: there is nobody to tell a result
        _complain("standard output: cannot be written: it is closed")
        return FILE
    try:
        status = _usage(words) or _run(words)
        sys.stdout.flush()
    except BrokenPipeError:
        _forget_output()
        return 0
    except KeyboardInterrupt:
        _complain("stopped")
        return INTERRUPTED
    except OSError as failure:  # files are read and written behind FileError: what is left is the output
        _forget_output()
        _complain(f"standard output: cannot be written: {failure.strerror or failure}")
        return FILE
    return status


def entry() -> NoReturn:
    """The installed command."""
    raise SystemExit(main())


def _usage(words: Sequence[str]) -> int:
    """Without a command nothing can be guessed; a file name alone most likely wants its verdict."""
    if words and (words[0] in COMMANDS or (words[0].startswith("-") and words[0] != STDIN)):
        return 0
    case = shlex.quote(words[0]) if len(words) == 1 else "CASE"
    verdict = f"{PROGRAM} assess {case}"
    _complain(f"give a command: for the verdict on a case file it is {verdict}. Help: {PROGRAM} --help")
    return USAGE


def _run(words: Sequence[str]) -> int:
    try:
        arguments = _parser().parse_args(words)
    except SystemExit as finished:
        return int(finished.code or 0)
    from benchtool.errors import BenchtoolError

    try:
        status: int = arguments.run(arguments)
    except BenchtoolError as failure:
        _complain(str(failure))
        return failure.exit_status
    return status


def _assess(arguments: argparse.Namespace) -> int:
    from dataclasses import replace

    from benchtool.assessment import assess
    from benchtool.casefile import dump
    from benchtool.report.given import given_readings, merged, replaced_lines, saved_lines
    from benchtool.report.layout import Line
    from benchtool.report.terminal import write_lines

    refused = _cannot_save(arguments)
    if refused:
        _complain(refused)
        return USAGE
    case = _case(arguments.case)
    merge = merged(case.readings, given_readings(arguments.reading, case.board))
    case = replace(case, readings=merge.readings)
    with _working():
        assessment = assess(case)
    backup = dump(case, arguments.case) if arguments.save else None
    if arguments.json:
        _write_json(assessment, sys.stdout)
        return 0
    page = _page()
    _write_report(assessment, page, sys.stdout, no_color="no_color" in arguments)
    notes = replaced_lines(merge, case.board, page, saved=arguments.save)
    if arguments.save:
        notes += saved_lines(merge, arguments.case, backup, page)
    write_lines([Line(""), *notes] if notes else [], sys.stdout, styled=False)
    return 0


@contextmanager
def _working() -> Iterator[None]:
    """Says on a terminal what takes a second or two, and wipes it away again."""
    if sys.stderr is None or not sys.stderr.isatty():
        yield
        return
    sys.stderr.write(f"{WORKING}\r")
    sys.stderr.flush()
    try:
        yield
    finally:
        sys.stderr.write(f"{' ' * len(WORKING)}\r")
        sys.stderr.flush()


def _cannot_save(arguments: argparse.Namespace) -> str | None:
    if not arguments.save:
        return None
    if arguments.case == STDIN:
        return "--save needs a case file: what comes from standard input cannot be saved there"
    return None if arguments.reading else "--save keeps what --reading gives, and no reading was given"


def _case(name: str) -> Case:
    from benchtool.casefile import LARGEST, decode, load, loads
    from benchtool.errors import FileError

    if name != STDIN:
        return load(name)
    where = "standard input"
    if sys.stdin is None:
        raise FileError(where, "cannot be read: it is closed")
    content = sys.stdin.buffer.read(LARGEST + 1)
    return loads(decode(content, where), where)


def _columns() -> int:
    import shutil

    return shutil.get_terminal_size((80, 24)).columns


def _page() -> Page:
    from benchtool.report.layout import LEAST, MOST, Page
    from benchtool.report.terminal import needs_ascii

    return Page(width=min(max(_columns(), LEAST), MOST), ascii=needs_ascii(sys.stdout))


def _write_report(assessment: Assessment, page: Page, stream: TextIO, *, no_color: bool) -> None:
    from benchtool.report.terminal import wants_style, write_lines
    from benchtool.report.text import report_lines

    write_lines(report_lines(assessment, page), stream, styled=wants_style(stream, no_color))


def _write_json(assessment: Assessment, stream: TextIO) -> None:
    import json

    from benchtool.report.terminal import can_encode

    plain = assessment.as_dict()
    text = json.dumps(plain, indent=2, ensure_ascii=False, allow_nan=False)
    if not can_encode(text, stream):  # escapes say the same
        text = json.dumps(plain, indent=2, allow_nan=False)
    stream.write(f"{text}\n")


def _new(arguments: argparse.Namespace) -> int:
    from benchtool.report.layout import Line, paragraph
    from benchtool.report.template import write_template
    from benchtool.report.terminal import write_lines

    if arguments.path == STDIN:
        _complain("new needs the name of a file to make")
        return USAGE
    write_template(arguments.path)
    page = _page()
    steps = (
        f"1. Open {arguments.path} and put in what is printed on your parts.",
        "2. Take the # off the readings at its end, and put yours in.",
        f"3. {PROGRAM} assess {shlex.quote(arguments.path)}",
    )
    lines = [line for step in steps for line in paragraph(page, step, rest="   ")]
    heading, *text = CAUTION.splitlines()
    caution = paragraph(page, f"{heading}: {' '.join(text)}", rest="  ", role="caution")
    written = paragraph(page, f"Written: {arguments.path}")
    write_lines([*written, *lines, Line(""), *caution], sys.stdout, styled=False)
    return 0


def _complain(message: str) -> None:
    """One plain message on standard error, folded, without signs that a terminal would obey.

    Every line of it is a problem: all but the first are set in, and what is folded further still.
    """
    for number, line in enumerate(message.split("\n")):
        shown = "".join(sign if sign.isprintable() else "?" for sign in line)
        print(_folded(shown, "  " if number else f"{PROGRAM}: "), file=sys.stderr)


def _folded(text: str, first: str) -> str:
    """The text in lines as wide as the terminal; no file name is cut and no command parted, for copying."""
    import re
    import textwrap

    from benchtool.report.layout import LEAST, NO_BREAK, glued

    command = re.compile(rf"(?<=\b{PROGRAM}) |(?<=\b{PROGRAM} assess) |(?<=\b{PROGRAM} new) ")
    fold = textwrap.TextWrapper(
        max(_columns(), LEAST), initial_indent=first, subsequent_indent="    ", break_long_words=False, break_on_hyphens=False
    )
    return fold.fill(command.sub(NO_BREAK, glued(text))).replace(NO_BREAK, " ")


def _forget_output() -> None:
    """Whoever read the output is gone: nothing more goes there, the interpreter's own last flush included."""
    with open(os.devnull, "wb") as nowhere:
        os.dup2(nowhere.fileno(), sys.stdout.fileno())
