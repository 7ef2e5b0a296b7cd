"""Finished lines to an output: bold where a terminal shows it, plain everywhere else, never a crash over a sign.

Why last: what is said is settled before. A pipe, a file and a printer get the same lines without their styles.
"""

from __future__ import annotations

import os
from collections.abc import Sequence
from typing import TextIO

from benchtool.report.layout import DRAWN, Line

STYLES = {"body": "", "heading": "bold", "headline": "bold reverse", "caution": "bold", "danger": "bold reverse"}


def needs_ascii(stream: TextIO) -> bool:
    """Whether the output's encoding lacks one of the signs that are drawn."""
    return not can_encode(DRAWN, stream)


def can_encode(text: str, stream: TextIO) -> bool:
    """Whether the output's encoding holds every sign of the text."""
    try:
        text.encode(stream.encoding or "utf-8")
    except (UnicodeEncodeError, LookupError):
        return False
    return True


def wants_style(stream: TextIO, no_color: bool) -> bool:
    """Whether escape codes are welcome: on a terminal, unless option or environment say no."""
    return stream.isatty() and not no_color and not os.environ.get("NO_COLOR")


def write_lines(lines: Sequence[Line], stream: TextIO, *, styled: bool) -> None:
    """Write every line; a sign of a name that the encoding lacks becomes a question mark."""
    encoding = stream.encoding or "utf-8"
    fit = [Line(line.text.encode(encoding, "replace").decode(encoding), line.role) for line in lines]
    if not styled:
        stream.write("".join(f"{line.text}\n" for line in fit))
        return
    from rich.console import Console  # 40 ms, and only for a terminal
    from rich.text import Text

    console = Console(file=stream, highlight=False, markup=False, emoji=False)
    for line in fit:
        console.print(Text(line.text, style=STYLES[line.role]), soft_wrap=True)
